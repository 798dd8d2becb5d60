"""Regimes: bands on one or two numbers, their printed limits on the signed value, and what cannot be one."""

import json
import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS
from labbook.registry.regimes import (
    COLOURS,
    INF,
    REGIMES,
    Band,
    Regime,
    checked,
    from_content,
    regime,
    regimes_of,
)

SOURCE = "common practice, no source"


# the bands on Re_omega and Sp: common practice, no source. Cruising 0.2 to 0.4: Taylor, Nudds & Thomas 2003
@pytest.mark.parametrize(("number", "value", "names"), [
    ("Re_omega", 1e-6, ["creeping"]), ("Re_omega", 0.0999, ["creeping"]),
    ("Re_omega", 0.1, ["nearly creeping"]), ("Re_omega", 1.0, ["nearly creeping"]),
    ("Re_omega", 1.0001, ["transitional"]), ("Re_omega", 1000.0, ["transitional"]),
    ("Re_omega", 1000.1, ["inertial"]),
    ("Sp", 0.99, ["stiff tail"]), ("Sp", 1.0, ["working tail"]), ("Sp", 4.0, ["working tail"]),
    ("Sp", 4.001, ["floppy tail"]),
    ("St", 0.2, ["cruising"]), ("St", 0.308, ["cruising"]), ("St", 0.4, ["cruising"]),
    ("St", 0.1999, []), ("St", 0.4001, []),
    ("St", -0.3, []),  # backwards is not cruising: the value is signed
    ("Sp", float("nan"), []), ("Sp", None, []), ("Wo", 1.0, []),
])  # fmt: skip
def test_where_a_value_falls(number, value, names):
    assert regimes_of({number: value}) == names


def test_a_run_falls_in_one_band_of_each_number():
    assert regimes_of({"Re_omega": 4.875752, "Sp": 3.07, "St": 0.3}) == [
        "transitional",
        "working tail",
        "cruising",
    ]
    assert regimes_of({}) == []


@given(st.sampled_from(("Re_omega", "Sp")), st.floats(0, allow_infinity=False))
def test_the_bands_of_a_number_leave_no_gap_and_no_overlap(number, value):
    assert len(regimes_of({number: value})) == 1


def test_arrays_and_absent_values():
    values = np.array([0.5, 1.0, math.nan, 4.0, 5.0])
    expected = [False, True, False, True, False]
    working = regime("working tail")
    assert working.holds({"Sp": values}).tolist() == expected
    assert working.holds(values).tolist() == expected  # the values of its one number alone
    assert working.bands[0].holds([0.5, 1.0, None, 4.0, 5.0]).tolist() == expected
    assert not working.holds({"St": values})


def test_every_band_stands_on_a_number_and_names_its_source():
    for name, row in REGIMES.items():
        assert row.name == name and row.number in NUMBERS and row.source and row.low < row.high
        assert checked(row, NUMBERS) is row


@pytest.mark.parametrize(("name", "words"), [
    ("creeping", "Re_omega < 0.1"), ("nearly creeping", "0.1 <= Re_omega <= 1"),
    ("transitional", "1 < Re_omega <= 1000"), ("inertial", "Re_omega > 1000"),
    ("cruising", "0.2 <= St <= 0.4"),
])  # fmt: skip
def test_bands_in_signs(name, words):
    assert REGIMES[name].words == words


def test_limits_are_written_whole():
    assert Band("Re", 1e6).words == "Re >= 1000000"
    assert Band("Re", 0.1234567, 2.5e-7 + 1).words == "0.1234567 <= Re <= 1.00000025"


# --- two numbers

BOTH = Regime(
    "slow and stiff", (Band("Re_omega", high=0.1, high_closed=False), Band("Sp", 0.5, 1.0)), SOURCE, "sky"
)


@pytest.mark.parametrize(("re", "sp", "held"), [
    (0.05, 0.7, True), (0.1, 0.7, False), (0.05, 0.4, False), (0.2, 2.0, False), (0.05, None, False),
    (math.nan, 0.7, False), (0.05, 0.5, True), (0.05, 1.0, True),
])  # fmt: skip
def test_both_bands_must_hold(re, sp, held):
    assert bool(BOTH.holds({"Re_omega": re, "Sp": sp})) is held
    assert ("slow and stiff" in regimes_of({"Re_omega": re, "Sp": sp}, REGIMES | {BOTH.name: BOTH})) is held


def test_two_numbers_on_arrays_and_in_signs():
    values = {"Re_omega": np.array([0.05, 0.05, 0.2]), "Sp": np.array([0.7, 2.0, 0.7])}
    assert BOTH.holds(values).tolist() == [True, False, False]
    assert BOTH.words == "Re_omega < 0.1 and 0.5 <= Sp <= 1"
    assert BOTH.numbers == ("Re_omega", "Sp")
    assert not np.any(BOTH.holds({"Sp": values["Sp"]}))


@pytest.mark.parametrize("ask", [
    lambda r: r.number, lambda r: r.low, lambda r: r.high, lambda r: r.low_closed, lambda r: r.high_closed,
    lambda r: r.holds(0.7),
])  # fmt: skip
def test_a_regime_on_two_numbers_has_no_one_band(ask):
    # half of it would count runs that do not lie in it
    with pytest.raises(Refusal, match="stands on two numbers"):
        ask(BOTH)


# --- what cannot be


@pytest.mark.parametrize(("limits", "reason"), [
    ((1.0, 1.0), "must lie above"), ((2.0, 1.0), "swap the limits"), ((-INF, INF), "at least one limit"),
    ((math.nan, 1.0), "a limit is a number"), ((0.0, math.nan), "a limit is a number"),
    (("0", 1.0), "a limit is a number"), ((None, 1.0), "a limit is a number"),
    ((True, 2.0), "a limit is a number"),
    ((INF, INF), "must lie above"), ((0.0, 1.0, 1), "true or false"),
])  # fmt: skip
def test_a_band_that_cannot_be_is_refused(limits, reason):
    with pytest.raises(Refusal, match=reason):
        Band("Sp", *limits)


@pytest.mark.parametrize("number", ["", "U/f", None, "L tail"])
def test_a_band_needs_a_number(number):
    with pytest.raises(Refusal, match="one number's key"):
        Band(number, 0.0, 1.0)


@pytest.mark.parametrize(("change", "reason"), [
    ({"name": ""}, "one line"), ({"name": "   "}, "one line"), ({"name": " a"}, "one line"),
    ({"name": "a\nb"}, "one line"), ({"name": "a\tb"}, "one line"),
    ({"name": "a" * 65}, "1 to 64 characters"),
    ({"name": None}, "one line"), ({"bands": ()}, "one or two numbers"),
    ({"bands": (Band("Sp", 1.0), Band("St", 1.0), Band("Re", 1.0))}, "one or two numbers"),
    ({"bands": (Band("Sp", 1.0), Band("Sp", 2.0))}, "same number"),
    ({"bands": "Sp"}, "made of bands"), ({"bands": Band("Sp", 1.0)}, "made of bands"),
    ({"source": ""}, "needs a source"), ({"source": "  "}, "needs a source"),
    ({"source": None}, "needs a source"),
    ({"colour": "vermilion"}, "one of orange, sky"), ({"colour": "#0072B2"}, "one of orange, sky"),
])  # fmt: skip
def test_a_regime_that_cannot_be_is_refused(change, reason):
    with pytest.raises(Refusal, match=reason):
        replace(BOTH, **change)


def test_a_name_of_64_characters_and_every_colour_will_do():
    for colour in ("", *COLOURS):
        assert replace(BOTH, name="ü" * 64, colour=colour).colour == colour
    # the rust of the run in hand stays its own
    assert "vermilion" not in COLOURS and len(set(COLOURS)) == 6


def test_a_regime_on_an_unknown_number_is_refused():
    with pytest.raises(Refusal, match="no number has this key; one of Re_omega, St"):
        checked(BOTH, {"St", "Re_omega"})
    assert checked(BOTH, ["Re_omega", "Sp"]) is BOTH


def test_an_unknown_regime_is_refused_with_those_that_exist():
    with pytest.raises(Refusal, match="one of creeping, nearly creeping"):
        regime("turbulent")
    with pytest.raises(Refusal, match="one of slow and stiff"):
        regime("creeping", {BOTH.name: BOTH})


# --- to and from plain values


@pytest.mark.parametrize("row", [*REGIMES.values(), BOTH], ids=lambda r: r.name)
def test_a_regime_goes_through_json_and_comes_back(row):
    text = json.dumps(row.content(), allow_nan=False)  # JSON knows no infinity
    assert from_content(json.loads(text)) == row
    assert from_content(row.content()).content() == row.content()


@pytest.mark.parametrize("change", [
    {"bands": [{"number": "Sp"}]}, {"bands": None}, {"bands": [1]}, {"name": 3}, {"colour": "red"},
    {"bands": [{"number": "Sp", "low": 2, "high": 1, "low_closed": True, "high_closed": True}]},
])  # fmt: skip
def test_other_content_is_refused(change):
    with pytest.raises(Refusal):
        from_content(BOTH.content() | change)


@pytest.mark.parametrize("content", [{}, [], None, "creeping", {"name": "x"}])
def test_no_content_is_refused(content):
    with pytest.raises(Refusal, match="is not a regime's content"):
        from_content(content)
