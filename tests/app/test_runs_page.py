"""The Runs page: address to filter and back, the query in words, the table, downloads, empty states."""

import csv
import json
import math
import re
import shlex

import numpy as np
import pytest
from click.testing import CliRunner

from labbook.api import Book
from labbook.app import runs, runs_cells, runs_table
from labbook.app.column_width import wide_enough
from labbook.book import addresses, queries
from labbook.book.asking import Question
from labbook.book.easing import eased
from labbook.book.limits import in_limit_unit, limits, range_in_words
from labbook.charts.histogram import BINS, histogram
from labbook.cli import main
from labbook.errors import Refusal
from labbook.registry.group import Registry, at_birth
from labbook.registry.regimes import Band, Regime


@pytest.fixture
def book(demo_book):
    with Book.open(demo_book) as opened:
        yield opened


@pytest.fixture
def page(open_page, demo_book):
    return open_page(demo_book, "runs")


def field(page, label):
    """The one text field with a label."""
    (found,) = [w for w in page.at.text_input if w.label == label]
    return found


def asked_for(page, key):
    """The address's texts of a parameter: AppTest gives a single one bare."""
    given = page.at.query_params[key]
    return [given] if isinstance(given, str) else list(given)


def words(page):
    return next(m.value for m in page.at.markdown if " of " in m.value and "runs" in m.value)


def found(page):
    return int(re.search(r": ([\d\u202f]+) of", words(page))[1].replace("\u202f", ""))


# ---- addresses


FULL = Question(
    regimes=("creeping", "working tail"), ranges={"Sp": (1.25, 3.0), "mu": (0.5, math.inf)},
    fluids=("gly88-a",), swimmers=("reed-01",), materials=("mid-a",), people=("knot", "pike"),
    since="2026-03-01", until="2026-06-30T12:00", text="camera 50%", state="all",
)  # fmt: skip


def test_an_address_says_a_question_and_is_read_back_to_the_same(book):
    known = book.ask(queries.choices)
    again, said = addresses.read_question(addresses.parameters(FULL), known, at_birth())
    assert said == []
    assert again == FULL


def test_an_address_keeps_twelve_digits_of_a_limit(book):
    asked = Question(ranges={"Sp": (1.23456789, 3.0)})
    again, _ = addresses.read_question(addresses.parameters(asked), book.ask(queries.choices), at_birth())
    assert again.ranges["Sp"][0] == 1.23456789


@pytest.mark.parametrize(
    ("given", "word"),
    [
        ({"regime": ["sluggish"]}, "sluggish"),
        ({"range": ["Sp:one:3"]}, "'one'"),
        ({"range": ["Sp:3:1"]}, "empty"),
        ({"range": ["Sp:nan:1"]}, "no number"),
        ({"range": ["speed:1:2"]}, "speed"),
        ({"range": ["Sp"]}, "Sp:1:3"),
        ({"fluid": ["honey"]}, "honey"),
        ({"since": ["last week"]}, "last week"),
        ({"state": ["gone"]}, "gone"),
    ],
)
def test_what_an_address_says_wrongly_is_named_and_the_rest_is_used(book, given, word):
    asked, said = addresses.read_question(given | {"swimmer": ["reed-01"]}, book.ask(queries.choices), at_birth())
    assert len(said) == 1
    assert word in said[0]
    assert asked == Question(swimmers=("reed-01",))


SPOKEN = ["Sp=rate:f,power:1", "St=amplitude:half"]


def test_an_address_says_dialects_and_is_read_back_to_the_same():
    dialects, said = addresses.read_dialects(SPOKEN, at_birth())
    assert said == [] and addresses.dialect_texts(dialects, at_birth()) == SPOKEN
    assert dialects["Sp"] == {"length": "L_tail", "rate": "f", "coefficient": "cylinder_finite", "power": 1}


def test_the_house_dialect_needs_no_words_and_an_address_is_read_in_the_groups_house():
    assert addresses.read_dialects(["Sp=house", "Re=length:L_body"], at_birth()) == ({}, [])
    ours = Registry(house={"Sp": {"rate": "f"}})
    dialects, _ = addresses.read_dialects(["Sp=power:1"], ours)
    assert dialects["Sp"]["rate"] == "f" and addresses.dialect_texts(dialects, ours) == ["Sp=power:1"]
    assert addresses.read_dialects(["Sp=rate:f"], ours) == ({}, [])


@pytest.mark.parametrize(("text", "word"), [
    ("Sp=rate:rpm", "'rpm'"), ("wall=x:1", "'wall'"), ("Sp", "Sp=rate:f,power:1"), ("", "''"),
    ("Sp=rate:f,rate:f", "twice"), ("St=rate:omega", "already"),
])  # fmt: skip
def test_a_dialect_that_cannot_be_read_is_said_and_the_others_are_used(text, word):
    dialects, said = addresses.read_dialects([*SPOKEN, text], at_birth())
    assert len(said) == 1 and word in said[0]
    assert addresses.dialect_texts(dialects, at_birth()) == SPOKEN


# ---- limits: the expected values are the SI definitions of the units


def test_a_bare_limit_is_in_the_usual_unit_and_one_with_a_unit_in_that():
    assert limits("mu", "500", "0.9 Pa.s") == pytest.approx((0.5, 0.9), rel=1e-12)  # rounding of one product
    assert limits("T", "20", "") == pytest.approx((293.15, math.inf))
    assert limits("Sp", "", "3") == (-math.inf, 3.0)
    assert limits("U", "-1", "0") == pytest.approx((-1e-3, 0.0))
    assert limits("Sp", "", " ") is None
    assert range_in_words("mu", 0.5, math.inf) == "μ from 500 mPa.s"
    assert in_limit_unit("T", np.array([273.15])) == pytest.approx([0.0], abs=1e-9)  # of 273.15, exact here


@pytest.mark.parametrize(("low", "high"), [("x", ""), ("3", "1"), ("nan", "1"), ("1 kg", "")])
def test_a_limit_that_is_none_is_refused(low, high):
    with pytest.raises(Refusal):
        limits("mu", low, high)


# ---- the histogram


def test_the_histogram_counts_every_positive_value_once_and_marks_the_range():
    values = np.geomspace(0.1, 10.0, 101)  # 51 of them are at most 1
    bars = histogram(np.append(values, [-1.0, 0.0, np.nan]), high=1.0).layer[0].data.values
    assert sum(b["n"] for b in bars) == 101
    inside = sum(b["n"] for b in bars if b["inside"])
    assert inside in (50, 51)  # the value on the limit itself falls in the bin above it
    assert len(bars) <= BINS + 1


# ---- the page


def test_the_page_says_the_question_and_the_same_count_as_the_book(page, book):
    page.go(regime=["creeping", "working tail"], range="Sp:1:3", since="2026-03-01")
    n = len(book.runs(regime=["creeping", "working tail"], ranges={"Sp": (1, 3)}, since="2026-03-01"))
    assert n > 0
    assert found(page) == n
    for word in ("creeping and working tail", "Sp", "kept", "since 2026-03-01"):
        assert word in words(page)


def test_a_link_fills_the_widgets_and_a_widget_then_wins(page):
    page.go(regime="creeping", person="knot")
    pills = page.at.button_group(key="runs:filter:regimes")
    assert list(pills.value) == ["creeping"]
    pills.set_value(["working tail"])
    page.run()
    assert asked_for(page, "regime") == ["working tail"]
    page.run()  # and stays so
    assert asked_for(page, "regime") == ["working tail"]
    assert asked_for(page, "person") == ["knot"]
    assert list(page.at.button_group(key="runs:filter:regimes").value) == ["working tail"]


def test_another_link_wins_over_the_widgets_before_it(page):
    page.go(regime="creeping")
    page.at.button_group(key="runs:filter:regimes").set_value(["inertial"])
    page.run()
    page.go(swimmer="reed-01")
    assert list(page.at.button_group(key="runs:filter:regimes").value) == []
    assert "regime" not in page.at.query_params


def test_a_range_is_typed_in_two_fields_and_a_bad_limit_stands_there_and_changes_nothing(page):
    field(page, "from").set_value("1.5")
    page.run()
    assert asked_for(page, "range") == ["Sp:1.5:inf"]
    field(page, "to").set_value("much")
    page.run()
    assert asked_for(page, "range") == ["Sp:1.5:inf"]
    assert any("much" in s for s in page.said())
    assert field(page, "to").value == "much"
    page.press("Sp from 1.5")
    assert "range" not in page.at.query_params


def test_a_moment_in_the_address_stays_one_while_other_widgets_change(page):
    page.go(since="2026-03-01T14:00")
    page.at.button_group(key="runs:filter:regimes").set_value(["creeping"])
    page.run()
    assert asked_for(page, "since") == ["2026-03-01T14:00"]


def test_a_bad_address_is_said_on_the_page(page):
    page.go(regime=["sluggish", "creeping"])
    assert any("sluggish" in s for s in page.said())
    assert asked_for(page, "regime") == ["creeping"]
    page.go(run="R-99999")
    assert any("R-99999" in s for s in page.said())


def test_the_link_and_the_command_ask_the_same(page, book):
    page.go(regime=["working tail"], series="rush-03 sweep 14 Apr")
    link, command = (c.value for c in page.at.code)
    assert "regime=working+tail" in link
    options = shlex.split(command)
    assert options[:2] == ["labbook", "runs"]
    assert options[options.index("--series") + 1] == "rush-03 sweep 14 Apr"


def test_columns_come_from_the_address_in_the_tables_order(page):
    page.go(columns="Sp,f,nonsense,swimmer")
    assert list(page.at.dataframe[0].value.columns) == ["code", "swimmer", "f", "Sp"]


def test_a_column_that_the_table_has_not_is_said_and_the_others_are_shown(page):
    page.go(columns="at,Zzz,Yyy,Sp")
    (sentence,) = page.said()
    assert "columns 'Zzz', 'Yyy': the table has no such columns; the others are shown." in sentence
    assert list(page.at.dataframe[0].value.columns) == ["code", "at", "Sp"]
    page.go(columns="Zzz")
    assert "column 'Zzz': the table has no such column; the usual ones are shown." in page.said()[0]
    assert list(page.at.dataframe[0].value.columns) == ["code", *runs_table.USUAL]
    assert page.go(columns="at,Sp").said() == [] and page.go().said() == []


# ---- what another browser takes away


OWN = {"key": "Mq", "name": "half a magnetic number", "formula": "m_mag * B / (mu * f * L_tail**3)",
       "compares": "magnetic to viscous torque", "source": "own definition", "answer": "2.5",
       "example": "m_mag = 4 mA.m2, B = 5 mT, mu = 1 Pa.s, f = 1 Hz, L_tail = 20 mm"}  # fmt: skip


@pytest.fixture
def shared(open_page, demo_copy):
    """(page, book): Runs asked by an own number and an own regime, and the book as another browser has it."""
    with Book.open(demo_copy) as other:
        other.define_number(**OWN, by="finch")
        drawn = Regime("drawn", (Band("Mq", 0.0, 1e6),), "own definition")
        other.set_regime(drawn, why="to try", by="finch")
        asked = {"range": "Mq:1e-9:1e9", "regime": ["drawn", "creeping"], "columns": "at,Mq,Sp"}
        page = open_page(demo_copy, "runs", **asked)
        assert page.said() == [] and found(page) > 0
        yield page, other


def take_away(other, *what):
    for kind, key in what:
        other.withdraw(kind, key, why="not needed", by="finch")


GONE = (("regime", "drawn"), ("number", "Mq"))


@pytest.mark.parametrize("touch", ["a filter", "a popover", "nothing"])
def test_what_another_browser_withdrew_is_said_and_the_rest_is_shown(shared, touch):
    page, other = shared
    take_away(other, *GONE)
    person = other.runs(regime="creeping", columns=())["by"].iloc[0]
    if touch == "a filter":
        page.at.multiselect(key="runs:filter:person").set_value([person])
    elif touch == "a popover":
        page.at.multiselect(key="runs:columns").set_value(["at", "Sp", "U"])
    page.run()
    said = page.said()
    assert sum("regime 'drawn': no regime has this name" in s for s in said) == 1
    assert sum("'Mq' is no quantity or number of a run" in s for s in said) == 1
    assert all(s.count("In the filter, ") == (touch == "a filter") for s in said if "column" not in s)
    assert sum("column 'Mq': the table has no such column" in s for s in said) == (touch != "a popover")
    people = {"person": [person]} if touch == "a filter" else {}
    assert found(page) == len(other.runs(regime="creeping", columns=(), **people))
    assert asked_for(page, "regime") == ["creeping"] and "range" not in page.at.query_params
    assert list(page.at.button_group(key="runs:filter:regimes").value) == ["creeping"]
    page.run()
    page.at.button_group(key="runs:filter:regimes").set_value([])
    page.run()  # the next touch: it was said
    assert not any("regime" in s or "quantity" in s for s in page.said())


def test_a_number_withdrawn_while_its_range_is_being_typed_is_said(shared):
    page, other = shared
    take_away(other, GONE[0])
    page.run()
    assert page.at.selectbox(key="runs:filter:range_key").value == "Mq"
    take_away(other, GONE[1])
    field(page, "from").set_value("2")
    page.run()
    assert any("In the filter, range 'Mq:2:1000000000'" in s for s in page.said())
    assert page.at.selectbox(key="runs:filter:range_key").value == "Sp" and field(page, "from").value == ""


def test_the_table_sorts_by_si_value_under_what_is_written(book, page):
    page.go(columns="U,Sp")
    shown = page.at.dataframe[0].value
    assert shown["U"].is_monotonic_increasing is False
    runs = book.frame(Question(), keys=("U", "Sp"), newest=runs_table.TALL)
    # equal to the last bits: two equal values written differently are told apart by nextafter
    assert shown["U"].head(len(runs)).to_numpy() == pytest.approx(runs["U"].to_numpy(), rel=1e-14, nan_ok=True)


def test_equal_values_written_differently_keep_both_texts(book):
    runs = book.frame(Question(), keys=("U",), texts=("code", "typed"), newest=3)
    runs["U"], runs["u_U"] = [1e-3] * 3, [1e-4] * 3
    runs["typed"] = [{"U": [text, "mm/s", 1e-3, 1e-4, "stated"]} for text in ("1.0(1)", "1.00(10)", "1.0(1)")]
    label, values, texts = runs_cells.numeric(runs, "U", "U", {})
    assert label == "U (mm/s)"
    assert [texts[v] for v in values] == ["1.0(1)", "1.00(10)", "1.0(1)"]


def headings(page):
    """column -> heading of the table."""
    return {k: c.get("label") for k, c in json.loads(page.at.dataframe[0].proto.columns).items()}


def test_a_dialect_restates_its_column_and_its_heading_says_so(page, book):
    page.go(columns="Sp,U_scaled,regime", dialect=["Sp=rate:f,power:1", "U_scaled=rate:f"])
    shown = page.at.dataframe[0].value
    house = book.frame(Question(), keys=("Sp", "U_scaled"), newest=len(shown)).set_index("code")
    house = house.loc[shown["code"]]
    # physics.md section 9: Sp^4/(2 pi) and 2 pi U/(omega L theta0^2); equal but for the last bits, as above
    assert house["Sp"].notna().any()
    wanted = (house["Sp"] ** 4 / (2 * math.pi)).to_numpy()
    assert shown["Sp"].to_numpy() == pytest.approx(wanted, rel=1e-12, nan_ok=True)
    wanted = (house["U_scaled"] * 2 * math.pi).to_numpy()
    assert shown["U_scaled"].to_numpy() == pytest.approx(wanted, rel=1e-12, nan_ok=True)
    found = headings(page)
    assert found["Sp"] == "Sp (rate f, power 1)" and found["U_scaled"] == "U/(f L_tail θ₀²) (rate f)"
    assert "regimes and ranges are read in the house dialect" in words(page)
    page.go(columns="Sp,U_scaled,regime")
    assert headings(page)["Sp"] == "Sp" and "house dialect" not in words(page)
    # regimes stay those of the house dialect
    assert shown["regime"].tolist() == page.at.dataframe[0].value["regime"].tolist()
    working = set(book.runs(regime="working tail", columns=())["code"]) & set(shown["code"])
    assert working and set(shown["code"][shown["regime"].str.contains("working tail")]) == working


def test_a_dialect_is_chosen_in_the_popover_for_each_number_shown(page):
    page.go(columns="f,Sp,St")
    offered = [s.key for s in page.at.selectbox if s.key and s.key.startswith("runs:dialect")]
    assert offered == ["runs:dialect:Sp", "runs:dialect:St"]
    page.at.selectbox(key="runs:dialect:St").set_value("amplitude half")
    page.run()
    page.at.selectbox(key="runs:dialect:Sp").set_value("other…")
    page.run()
    page.at.selectbox(key="runs:dialect:Sp:power").set_value(1)
    page.run()
    assert sorted(asked_for(page, "dialect")) == ["Sp=power:1", "St=amplitude:half"]
    assert headings(page)["St"] == "St (amplitude half)"
    page.at.selectbox(key="runs:dialect:St").set_value("house")
    page.run()
    assert asked_for(page, "dialect") == ["Sp=power:1"]


def test_a_bad_dialect_is_said_on_the_page(page):
    page.go(columns="Sp", dialect=["Sp=rate:rpm", "St=rate:omega"])
    assert any("'rpm'" in s for s in page.said())
    assert headings(page)["Sp"] == "Sp"


def test_the_link_and_the_command_say_the_dialects(page):
    page.go(dialect=SPOKEN)
    link, command = (c.value for c in page.at.code)
    assert "dialect=Sp%3Drate%3Af%2Cpower%3A1" in link
    told = shlex.split(command)
    assert [told[i + 1] for i, word in enumerate(told) if word == "--dialect"] == SPOKEN
    done = CliRunner().invoke(main, [*told[1:], "--as", "csv", "--newest", "3"])
    assert done.exit_code == 0, done.output
    said = {row["dialect"] for row in csv.DictReader(done.stdout.splitlines())}
    assert said == {"Sp: rate f, power 1; St: amplitude half"}


def test_downloads_hold_the_restated_values_and_say_so(book):
    registry = book.registry
    dialects, _ = addresses.read_dialects(SPOKEN, registry)
    first, *table = runs.as_csv(book, Question(), ("f", "Sp"), dialects, registry).splitlines()
    assert "Sp in dialect rate f, power 1; regimes and ranges are read in the house dialect" in first
    rows = {row["code"]: row for row in csv.DictReader(table)}
    assert {row["dialect"] for row in rows.values()} == {"Sp: rate f, power 1"}, "St is no column"
    house = book.frame(Question(), keys=("Sp",), texts=("code",)).dropna()
    assert len(house) > 500
    for run in house.itertuples():
        assert float(rows[run.code]["Sp"]) == pytest.approx(run.Sp**4 / (2 * math.pi), rel=1e-12)
        # only the value moves the uncertainty: d ln(Sp^4) = 4 d ln Sp
        u = 4 * run.u_own_Sp / run.Sp * float(rows[run.code]["Sp"])
        assert float(rows[run.code]["u_own_Sp"]) == pytest.approx(u, rel=1e-9)
    plain = runs.as_csv(book, Question(), ("f", "Sp"), {}, registry).splitlines()
    assert "dialect" not in plain[0] and "dialect" not in plain[1]


def test_mixed_units_stay_in_the_cells(book):
    runs = book.frame(Question(), keys=("U",), texts=("code", "typed"), newest=2)
    runs["U"] = [1e-3, 2e-3]
    runs["typed"] = [{"U": ["1.0", "mm/s", 1e-3, 0, "digits"]}, {"U": ["2000 um/s", "um/s", 2e-3, 0, "digits"]}]
    label, values, texts = runs_cells.numeric(runs, "U", "U", {})
    assert label == "U"
    assert [texts[v] for v in values] == ["1.0 mm/s", "2000 um/s"]


def test_void_runs_are_marked_with_their_reason(page, book):
    page.go(state="void")
    shown = page.at.dataframe[0].value
    assert len(shown) == len(book.runs(state="void")) > 0
    assert all(text.startswith("void: ") and len(text) > 6 for text in shown["state"])


def test_only_the_newest_stand_in_the_table_until_more_is_asked(page, book):
    assert len(page.at.dataframe[0].value) == 200
    newest = book.runs(columns=())["code"].iloc[-1]
    assert page.at.dataframe[0].value["code"].iloc[0] == newest
    page.press("Show 200 more")
    assert len(page.at.dataframe[0].value) == 400


def test_a_question_without_answer_offers_what_to_leave_out(page, book):
    asked = Question(regimes=("creeping", "inertial"), people=("knot",))
    offers = book.ask(eased, asked)
    assert {what for what, _, _ in offers} == {"creeping", "inertial"}
    assert all(n == book.ask(queries.count, q) for _, n, q in offers)
    page.go(regime=["creeping", "inertial"], person="knot")
    assert found(page) == 0
    what, n, _ = offers[0]
    page.press(f"Leave out {what}: {n} runs")
    assert found(page) == n


def test_an_empty_book_teaches(open_page, tmp_path):
    Book.new(tmp_path / "new.db").close()
    page = open_page(tmp_path / "new.db", "runs")
    text = "\n".join(e.value for e in (*page.at.markdown, *page.at.code))
    for word in ("Shelf", "Bench", "labbook demo", "labbook load"):
        assert word in text


def test_a_column_is_as_wide_as_its_longest_cell_needs():
    # measured in Chromium with the table's font: '1.532(14)' takes 53 pixels, a cell's two edges 16
    wide = wide_enough("Sp", ["1.532(14)", "2.2"])
    assert 53 + 16 <= wide < 53 + 16 + 20
    assert wide_enough("U/(ω L_tail θ₀²)", []) > wide_enough("Sp", [])
