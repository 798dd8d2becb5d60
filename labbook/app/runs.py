"""Page runs."""

import streamlit as st


def page() -> None:
    """The page."""
    st.write("runs")
