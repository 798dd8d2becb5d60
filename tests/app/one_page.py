"""One page of the app alone, run without a browser over a book of its own."""

import html

from streamlit.testing.v1 import AppTest


def script(name):
    """What AppTest runs: the app's pages with the one under test in front."""
    import importlib

    import streamlit as st

    pages = {}
    for path in ("bench", "runs", "trends", "plan", "shelf", "numbers", "ledger"):
        function = importlib.import_module(f"labbook.app.{path}").page if path == name else (lambda: None)
        pages[path] = st.Page(function, title=path, url_path=path, default=path == name)
    st.session_state["pages"] = pages
    from labbook.app import session

    session.show_message()
    st.navigation(list(pages.values()), position="hidden").run()


class OnePage:
    """A page, its book's file and what stands on it."""

    def __init__(self, monkeypatch, book, name, **address):
        monkeypatch.setenv("LABBOOK_OPEN", str(book))
        monkeypatch.setenv("LABBOOK_BY", "wren")
        self.at = AppTest.from_function(script, args=(name,), default_timeout=60)
        self.go(**address)

    def go(self, **address):
        self.at.query_params.clear()
        for key, value in address.items():
            self.at.query_params[key] = value
        return self.run()

    def run(self):
        self.at.run()
        assert not self.at.exception, self.at.exception
        return self

    def texts(self):
        """Every piece of HTML on the page, in order."""
        return [block.proto.body for block in self.at.get("html")]

    def words(self):
        return "\n".join(self.texts())

    def links(self):
        """{label: query string} of the links to other pages and records."""
        return {
            link.proto.label.replace("\\", ""): link.proto.query_string for link in self.at.get("page_link")
        }

    def fill(self, place, version=0, **cells):
        """Type into a form's fields without sending it."""
        for column, text in cells.items():
            self.at.text_input(key=f"{place}:{version}:{column}").set_value(text)
        return self

    def press(self, label):
        found = [b for b in self.at.button if b.label == label]
        assert len(found) == 1, (label, [b.label for b in self.at.button])
        found[0].click()
        return self.run()

    def said(self):
        """What was refused at the fields."""
        return [html.unescape(t) for t in self.texts() if "lb-refused" in t]
