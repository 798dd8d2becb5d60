"""Numbers, a group's own one in the reference: its tag, its versions, the way to edit it, withdrawing it."""

import html

import streamlit as st

from labbook.app import session
from labbook.app.shelf_forms import with_reason
from labbook.book.clock import local
from labbook.book.registry_rows import versions_of
from labbook.registry.group import Registry


def tag(registry: Registry, key: str) -> str:
    """'own, version 2' as HTML."""
    return f'<span class="lb-tag">{html.escape(f"own, version {registry.versions[key]}")}</span>'


@st.cache_data(max_entries=64, show_spinner=False)
def _versions(state: str, key: str) -> list[dict]:
    return session.book().ask(versions_of, "number", key)


def acts(key: str) -> None:
    """Edit, withdraw, and every version with who, when and why."""
    with st.container(horizontal=True, gap="small", vertical_alignment="center"):
        st.button("Edit", icon=":material/edit:", key=f"numbers:edit:{key}",
                  on_click=session.set_address, kwargs={"part": "new", "number": key})  # fmt: skip
        with st.popover("Withdraw", icon=":material/inventory_2:"):
            session.note(f"{key} leaves forms, columns and axes; its versions stay in the book.")
            with_reason(f"withdraw:{key}", f"Withdraw {key}", lambda why: _withdraw(key, why))
    versions = _versions(session.state_of_book(), key)
    with st.expander(f"{len(versions)} version{'s' if len(versions) != 1 else ''}"):
        st.html("".join(_version(row) for row in versions))


def _withdraw(key: str, why: str) -> str:
    session.book().withdraw("number", key, why=why, by=session.handle())
    session.set_address(number=None)
    return f"{key} is withdrawn; its versions stay in the book"


def _version(row: dict) -> str:
    """One version: number, formula, who, when and why."""
    content = row["content"]
    formula = f"<code>{html.escape(content['formula'])}</code>" if content else "withdrawn"
    why = f"; because: {html.escape(row['why'])}" if row["why"] else ""
    when = f"{local(row['at']):%Y-%m-%d %H:%M}"
    return (f'<div style="margin-bottom:0.4rem"><b>{row["version"]}</b>&ensp;{formula}<br>'
            f'<span class="lb-note">{html.escape(row["by"])}, {when}{why}</span></div>')  # fmt: skip
