"""The app's entry: page set-up, navigation, and the line that says which book this is and who you are."""

from pathlib import Path

import streamlit as st

from labbook.app import bench, ledger, numbers, plan, runs, session, shelf, style, trends
from labbook.errors import LabbookError

PAGES = (
    (bench.page, "Bench", "bench"),
    (runs.page, "Runs", "runs"),
    (trends.page, "Trends", "trends"),
    (plan.page, "Plan", "plan"),
    (shelf.page, "Shelf", "shelf"),
    (numbers.page, "Numbers", "numbers"),
    (ledger.page, "Ledger", "ledger"),
)
LOOPBACK = ("127.0.0.1", "localhost", "::1")


def main() -> None:
    st.set_page_config(page_title="labbook", page_icon=Path(__file__).with_name("icon.png"), layout="wide")
    style.apply()
    if st.get_option("server.address") not in LOOPBACK:
        st.error("labbook binds to this machine only: served to others it would need sign-in. "
                 "Start it with `labbook open`.")  # fmt: skip
        st.stop()
    pages = [
        st.Page(function, title=title, url_path=path, default=path == "bench") for function, title, path in PAGES
    ]
    st.session_state["pages"] = dict(zip((path for _, _, path in PAGES), pages, strict=True))
    chosen = st.navigation(pages, position="top")
    try:
        with st.container(key="lb-who"):
            session.choose_handle()
        with st.container(key="lb-message"):  # always there, so that a message moves nothing
            session.show_message()
        chosen.run()
    except LabbookError as error:
        st.error(str(error))


main()
