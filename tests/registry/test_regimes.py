"""The regimes at birth: their printed limits, on the signed value."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS
from labbook.registry.regimes import REGIMES, regime, regimes_of


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
    held = regime("working tail").holds(np.array([0.5, 1.0, math.nan, 4.0, 5.0]))
    assert held.tolist() == [False, True, False, True, False]


def test_every_band_stands_on_a_number_and_names_its_source():
    for name, row in REGIMES.items():
        assert row.name == name and row.number in NUMBERS and row.source and row.low < row.high


def test_an_unknown_regime_is_refused_with_those_that_exist():
    with pytest.raises(Refusal, match="one of creeping, nearly creeping"):
        regime("turbulent")
