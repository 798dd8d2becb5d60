"""Page ledger."""

import streamlit as st


def page() -> None:
    """The page."""
    st.write("ledger")
