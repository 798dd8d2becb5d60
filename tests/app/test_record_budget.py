"""The uncertainty budget on a run's sheet: its number, bars, advice, caution, and the Monte Carlo check."""

import json
from html import unescape

import pyarrow
import pyarrow.ipc
import pytest
from streamlit.testing.v1 import AppTest

from labbook.api import Book
from labbook.app.record_budget import interval_in_words
from labbook.book.budgets import budgets, simulate

RUN = "R-0500"
CHECK = "Check by Monte Carlo"


@pytest.fixture
def target(demo_copy):
    return demo_copy


def html(page):
    return unescape("\n".join([*page.texts(), *(m.value for m in page.at.markdown)]))


def choice(page):
    (found,) = [w for w in page.at.selectbox if w.label == "Budget of"]
    return found


def bars(page):
    """{name of a source: its share as written} of the budget's chart."""
    charts = [c.proto for c in page.at.get("vega_lite_chart") if "budget_names" in c.proto.spec]
    assert len(charts) == 1
    (layer,) = [part for part in json.loads(charts[0].spec)["layer"] if part["name"] == "budget_names"]
    (rows,) = [d.data.data for d in charts[0].datasets if d.name == layer["data"]["name"]]
    table = pyarrow.ipc.open_stream(rows).read_pandas()
    return dict(zip(table["name"], table["text"], strict=True))


def wide_run(target):
    """A run whose amplitude is known to a third, like one read by eye."""
    with Book.open(target) as book:
        sheet = book.sheet(RUN)
        return book.record(swimmer=sheet.texts["swimmer"], fluid=sheet.texts["fluid"], f="0.50(1) Hz",
                           theta0="0.30(10) rad", T="23.0(1) degC", U="0.0309(5) mm/s", by="wren",
                           at="2026-06-25T10:00", confirm=True)  # fmt: skip


def test_the_budget_of_sp_comes_first_with_its_advice_and_totals(open_page, target):
    page = open_page(target, "runs", run=RUN)
    with Book.open(target) as book:
        one = book.ask(budgets, RUN)["Sp"]
    assert choice(page).value == "Sp"
    shown = bars(page)
    assert len(shown) == len(one.contributions)
    assert shown["swimmer: D tube outer diameter"] == f"{100 * one.contributions[0].share:.0f} %"
    assert "f drive frequency" in shown  # the run's own are not ascribed to anybody
    text = html(page)
    assert f"{one.advice}." in text
    assert f"u {one.u:.2g} from own {one.u_own:.2g} and shared {one.u_shared:.2g}" in text
    assert "may mislead" not in text  # nothing of this run is beyond 15 %


def test_every_number_of_the_run_can_be_chosen(open_page, target):
    page = open_page(target, "runs", run=RUN)
    with Book.open(target) as book:
        found = book.ask(budgets, RUN)
    assert len(choice(page).options) == len(found)
    choice(page).set_value("stride")
    page.run()
    sources = {"U speed along the swimming axis", "f drive frequency", "swimmer: L_body overall length"}
    assert set(bars(page)) == sources
    advice = found["stride"].advice
    assert f"{advice[0].upper()}{advice[1:]}." in html(page)


def test_monte_carlo_is_drawn_on_request_and_stands_beside_first_order(open_page, target):
    page = open_page(target, "runs", run=RUN)
    assert "first order" not in html(page)
    page.press(CHECK)
    with Book.open(target) as book:
        found = book.ask(simulate, RUN, "Sp")
    text = html(page)
    first = interval_in_words(found.value - 1.96 * found.u, found.value + 1.96 * found.u, found.u)
    drawn = interval_in_words(found.sample.low, found.sample.high, found.u)
    assert first != drawn and f">{first}<" in text and f">{drawn}<" in text
    assert "Each of the 200\u202f000 draws has a result." in text
    assert "First order is borne out" in text
    # it is of this number: another one has to be asked for
    choice(page).set_value("Re")
    page.run()
    assert "First order is borne out" not in html(page)


def test_a_wide_input_is_marked_and_the_check_says_that_first_order_misleads(open_page, target):
    code = wide_run(target)
    page = open_page(target, "runs", run=code)
    sentence = "θ₀ carries 33 %: first order may mislead; check by Monte Carlo"
    (table,) = [t for t in page.texts() if "<th>formula</th>" in t]
    marked = [row for row in unescape(table).split("<tr>") if sentence in row]
    assert [row.split("</b>")[0] for row in marked] == [
        "<td><b>scaled speed", "<td><b>measured to predicted speed", "<td><b>F/(Δζ ω L_tail² θ₀²)"]  # fmt: skip
    assert html(page).count(sentence) == 3  # Sp, which is shown, does not have it among its inputs
    choice(page).set_value("U_scaled")
    page.run()
    assert html(page).count(sentence) == 4
    page.press(CHECK)
    assert any("lb-warned" in t and "First order misleads: it gives" in t for t in page.texts())
    assert "First order is borne out" not in html(page)


def test_a_run_without_any_number_says_so(open_page, target):
    with Book.open(target) as book:
        book.stock("swimmer", code="eel-9", form="undulating", L_body="300 mm", by="wren")
        cells = dict(swimmer="eel-9", fluid="water-1", f="2 Hz", at="2026-06-25T10:00")
        code = book.record(**cells, by="wren", confirm=True)
        assert book.ask(budgets, code) == {}
    page = open_page(target, "runs", run=code)
    assert f"{code} has no number" in html(page)
    assert not [w for w in page.at.selectbox if w.label == "Budget of"]
    assert CHECK not in [b.label for b in page.at.button]


def test_an_amended_run_gets_another_budget(open_page, target):
    page = open_page(target, "runs", run=RUN)
    before = bars(page)["f drive frequency"]
    with Book.open(target) as book:
        book.amend(RUN, why="a rough drive", by="wren", f="0.56(20) Hz")
    page.run()
    assert before == "0.3 %" and bars(page)["f drive frequency"] not in ("0.3 %", "0 %")
    assert "f carries 36 %" in html(page)


def narrow():
    """What AppTest runs: the panel beside Trends alone."""
    import streamlit as st

    from labbook.app import record

    pages = {name: st.Page(lambda: None, title=name, url_path=name) for name in ("runs", "bench")}
    st.session_state["pages"] = pages
    st.navigation(list(pages.values()), position="hidden")
    record.show("R-0500", place="trends", narrow=True)


def test_the_panel_beside_a_chart_has_bars_and_advice_and_no_check(target, monkeypatch):
    monkeypatch.setenv("LABBOOK_OPEN", str(target))
    at = AppTest.from_function(narrow, default_timeout=60).run()
    assert not at.exception
    assert [w.label for w in at.selectbox] == ["Budget of"]
    text = unescape("\n".join(block.proto.body for block in at.get("html")))
    assert "measure that better first" in text
    assert len(at.get("vega_lite_chart")) == 1
    assert not at.button


@pytest.mark.parametrize(("low", "high", "u", "text"), [
    (2.85353, 2.95312, 0.0255, "2.854 to 2.953"), (-0.011, 0.0301, 0.0105, "-0.0110 to 0.0301"),
    (1.23e-5, 4.56e-5, 8.3e-6, "1.23e-5 to 4.56e-5"), (2310.4, 2477.1, 52.0, "2310 to 2477"),
])  # fmt: skip
def test_an_interval_has_a_digit_more_than_u(low, high, u, text):
    assert interval_in_words(low, high, u) == text


def test_draws_without_a_result_are_counted_on_the_page(open_page, target):
    # a viscosity of 1.0 +- 0.4 Pa.s lies below zero in 0.62 % of normal draws (Phi(-2.5))
    with Book.open(target) as book:
        book.stock("fluid", code="thin-9", kind="measured", rho="1300(1) kg/m3", made="2026-06-20", by="wren")
        book.stock("reading", of="thin-9", key="mu", value="1.0(4) Pa.s", T="23.0(1) degC", on="2026-06-20", by="wren")
        swimmer = book.sheet(RUN).texts["swimmer"]
        code = book.record(swimmer=swimmer, fluid="thin-9", f="0.5 Hz", T="23.0(1) degC", by="wren",
                           at="2026-06-25T10:00", confirm=True)  # fmt: skip
    page = open_page(target, "runs", run=code)
    page.press(CHECK)
    assert "of 200\u202f000 draws (0.6 %) have no result and are left out." in html(page)
    assert "μ carries 40 %: first order may mislead; check by Monte Carlo" in html(page)
