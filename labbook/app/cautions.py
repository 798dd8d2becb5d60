"""Cautions on a page: open, or folded away where the hands come first."""

import streamlit as st

from labbook.app import session
from labbook.book.cautions import CAUTIONS


def show(names) -> None:
    """The cautions of these names, one under the other."""
    for name in names:
        session.caution(CAUTIONS[name])


def fold(names) -> None:
    """The same, folded away under one line, for pages where the hands come first."""
    if names:
        with st.expander(f"Mind: {', '.join(names)}", icon=":material/warning:"):
            show(names)
