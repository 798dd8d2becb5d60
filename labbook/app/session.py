"""What every page shares: the open book, who acts, messages kept over a rerun, and small HTML pieces."""

import html
import os
import uuid
from collections.abc import Callable, Sequence

import streamlit as st

from labbook.api import Book
from labbook.book.queries import head, people
from labbook.errors import LabbookError, Refusal, Refusals, Unconfirmed
from labbook.places import current_handle, default_book
from labbook.registry.group import Registry


@st.cache_resource(show_spinner="Opening the book")
def _opened(target: str) -> Book:
    return Book.open(target)


def book() -> Book:
    """The book that this app serves."""
    return _opened(os.environ.get("LABBOOK_OPEN") or default_book())


def state_of_book() -> str:
    """Changes with every act on the book: what cached results depend on."""
    return f"{book().target}:{book().ask(head)}"


def registry() -> Registry:
    """The open book's registry as it is now: ask once for a page, not once for a row."""
    return book().registry


def handle() -> str:
    """The handle that acts on this page."""
    return st.session_state.get("handle") or current_handle()


def choose_handle() -> None:
    """The book's name and the handle at the top right, with a way to change the handle."""
    known = sorted({*book().ask(people), current_handle(), handle()})
    with st.popover(f"{book().name} · {handle()}"):
        chosen = st.selectbox("Who are you?", known, index=known.index(handle()), accept_new_options=True,
                              help="A handle, not a name; it stands on every line of the ledger.")  # fmt: skip
        if chosen and chosen != handle():
            st.session_state["handle"] = chosen
            st.rerun()


def is_dark() -> bool:
    """Whether the browser shows the dark theme."""
    return st.context.theme.type == "dark"


# ---- messages that survive a rerun


def keep_message(text: str, icon: str = ":material/check:") -> None:
    """Show a message after the next rerun: one shown just before it would be lost."""
    st.session_state["message"] = (text, icon)


def show_message() -> None:
    """Show the message that was kept, once."""
    kept = st.session_state.pop("message", None)
    if kept is not None:
        st.success(kept[0], icon=kept[1])


def one_use_token(name: str) -> str:
    """A token that stays the same until `spend_token`, so that a double click logs once."""
    return st.session_state.setdefault(f"token:{name}", uuid.uuid4().hex)


def spend_token(name: str) -> None:
    """The act with this token is done; the next one gets another."""
    st.session_state.pop(f"token:{name}", None)


# ---- acts


def attempt(act: Callable[[], object], place: str) -> bool:
    """Run an act; keep what was refused or warned about under `place` and say whether it was done."""
    st.session_state.pop(f"refused:{place}", None)
    st.session_state.pop(f"warned:{place}", None)
    try:
        act()
    except Unconfirmed as warned:
        st.session_state[f"warned:{place}"] = warned.warnings
    except Refusals as several:
        said: dict[str, list[str]] = {}
        for finding in several.findings:
            said.setdefault(finding.field, []).append(str(finding))
        st.session_state[f"refused:{place}"] = {field: " ".join(texts) for field, texts in said.items()}
    except Refusal as refusal:
        st.session_state[f"refused:{place}"] = {refusal.field: str(refusal)}
    except LabbookError as error:
        st.session_state[f"refused:{place}"] = {"": str(error)}
    else:
        return True
    return False


def refused(place: str) -> dict[str, str]:
    """Field -> sentences of the last refused attempt at `place`."""
    return st.session_state.get(f"refused:{place}", {})


def warned(place: str) -> list[str]:
    """The warnings of the last attempt at `place`, waiting for one confirming touch."""
    return st.session_state.get(f"warned:{place}", [])


def forget(place: str) -> None:
    """Drop what the last attempt at `place` left."""
    st.session_state.pop(f"refused:{place}", None)
    st.session_state.pop(f"warned:{place}", None)


# ---- addresses


def address(key: str, default: str = "") -> str:
    """One value of the page's address."""
    return st.query_params.get(key, default)


def set_address(**values: str | Sequence[str] | None) -> None:
    """Write values into the address; empty ones leave it."""
    for key, value in values.items():
        if value:
            wanted = list(value) if not isinstance(value, str) else value
            have = st.query_params.get_all(key) if isinstance(wanted, list) else st.query_params.get(key)
            if have != wanted:
                st.query_params[key] = wanted
        elif key in st.query_params:
            del st.query_params[key]


def go(path: str, **values: str) -> None:
    """Open another page with an address of its own."""
    st.switch_page(st.session_state["pages"][path], query_params=values)


# ---- pieces of HTML (every text from the book is escaped)


def say_refused(sentence: str) -> None:
    """A refusal in the colour of the run in hand, right under its field."""
    st.html(f'<div class="lb-refused" role="alert">{html.escape(sentence)}</div>')


def note(text: str) -> None:
    """A quiet line."""
    st.html(f'<div class="lb-note">{html.escape(text)}</div>')


def caution(text: str) -> None:
    """A caution with its bar."""
    st.html(f'<div class="lb-caution">{html.escape(text)}</div>')


def warn(sentences: Sequence[str]) -> None:
    """Warnings, one below the other in one frame."""
    if sentences:
        lines = "".join(f"<div>{html.escape(s)}</div>" for s in sentences)
        st.html(f'<div class="lb-warned" role="status">{lines}</div>')


def tags(words: Sequence[str]) -> None:
    """Short words in a row, such as the regimes of a run."""
    st.html("".join(f'<span class="lb-tag">{html.escape(w)}</span>' for w in words) or "&nbsp;")


def table(header: Sequence[str], rows: Sequence[Sequence[str]], numeric: Sequence[int] = ()) -> None:
    """A plain table; the columns listed in `numeric` are right-aligned."""
    marks = [' class="n"' if i in numeric else "" for i in range(len(header))]
    head_ = "".join(f"<th{m}>{html.escape(h)}</th>" for h, m in zip(header, marks, strict=True))
    body = "".join(
        "<tr>" + "".join(f"<td{m}>{html.escape(str(c))}</td>" for c, m in zip(row, marks, strict=True)) + "</tr>"
        for row in rows
    )
    st.html(f'<table class="lb"><thead><tr>{head_}</tr></thead><tbody>{body}</tbody></table>')
