"""Which stretches of a number the regimes cover twice or not at all, open and closed limits respected."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from labbook.registry.regime_coverage import covered, gaps, overlaps
from labbook.registry.regimes import INF, REGIMES, Band, Regime


def rows(*bands):
    """Regimes a, b, c ... of (low, high) or (low, high, low_closed, high_closed) on Sp."""
    return [Regime("abcdef"[i], (Band("Sp", *band),), "made up") for i, band in enumerate(bands)]


def said(found):
    return [stretch.sentence for stretch in found]


@pytest.mark.parametrize("number", ["Re_omega", "Sp", "St"])
def test_at_birth_nothing_is_covered_twice_or_left_out_between(number):
    # creeping < 0.1 and nearly creeping >= 0.1 meet without a gap
    assert overlaps(REGIMES.values(), number) == [] == gaps(REGIMES.values(), number)


def test_how_far_the_regimes_reach_at_birth():
    assert covered(REGIMES.values(), "St") == "0.2 <= St <= 0.4"
    assert covered(REGIMES.values(), "Sp") == "every Sp"
    assert covered(REGIMES.values(), "Wo") == ""


@pytest.mark.parametrize(("bands", "twice", "never"), [
    ([(0, 1), (2, 3)], [], ["no regime covers 1 < Sp < 2"]),
    ([(0, 1, True, False), (2, 3, False, True)], [], ["no regime covers 1 <= Sp <= 2"]),
    ([(0, 1, True, False), (1, 3)], [], []),
    ([(0, 1), (1, 3)], ["'a' and 'b' both cover Sp = 1"], []),
    ([(0, 1, True, False), (1, 3, False, True)], [], ["no regime covers Sp = 1"]),
    ([(-INF, 1, True, False), (1, INF, False, True)], [], ["no regime covers Sp = 1"]),
    ([(0, 2), (1, 3)], ["'a' and 'b' both cover 1 <= Sp <= 2"], []),
    ([(0, 2, True, False), (1, 3, False, True)], ["'a' and 'b' both cover 1 < Sp < 2"], []),
    ([(0, 4), (1, 2)], ["'a' and 'b' both cover 1 <= Sp <= 2"], []),
    ([(0, 2), (0, 2)], ["'a' and 'b' both cover 0 <= Sp <= 2"], []),
    ([(-INF, 1), (-INF, 2)], ["'a' and 'b' both cover Sp <= 1"], []),
    ([(0, INF), (5, INF)], ["'a' and 'b' both cover Sp >= 5"], []),
    ([(-INF, 3), (2, INF, False)], ["'a' and 'b' both cover 2 < Sp <= 3"], []),
    ([(0, 3), (1, 3), (2, 4)],
     ["'a' and 'b' both cover 1 <= Sp < 2", "'a', 'b' and 'c' all cover 2 <= Sp <= 3"], []),
    ([(0, 1), (2, 3), (4, 5)], [], ["no regime covers 1 < Sp < 2", "no regime covers 3 < Sp < 4"]),
    ([(1, 2, False, False)], [], []),  # outside the lowest and the highest limit nothing is asked
    ([], [], []),
])  # fmt: skip
def test_by_hand(bands, twice, never):
    assert said(overlaps(rows(*bands), "Sp")) == twice
    assert said(gaps(rows(*bands), "Sp")) == never
    assert said(overlaps(reversed(rows(*bands)), "Sp")) == [
        s.replace("'a' and 'b'", "'b' and 'a'").replace("'a', 'b' and 'c'", "'c', 'b' and 'a'") for s in twice
    ]


def test_the_interval_is_there_for_the_page():
    (gap,) = gaps(rows((0, 1), (2, 3, False, True)), "Sp")
    assert (gap.low, gap.high, gap.low_closed, gap.high_closed, gap.regimes) == (1.0, 2.0, False, True, ())
    assert gap.words == "1 < Sp <= 2"


def test_regimes_on_two_numbers_or_another_one_are_left_aside():
    both = Regime("both", (Band("Sp", 0, 9), Band("St", 0, 9)), "made up")
    other = Regime("other", (Band("St", 0, 9),), "made up")
    found = [*rows((0, 1), (2, 3)), both, other]
    assert overlaps(found, "Sp") == [] and said(gaps(found, "Sp")) == ["no regime covers 1 < Sp < 2"]
    assert covered(found, "Sp") == "0 <= Sp <= 3"


LIMITS = st.sampled_from([-INF, 0.0, 1.0, 2.0, 3.0, INF])


@given(
    st.lists(st.tuples(LIMITS, LIMITS, st.booleans(), st.booleans()).filter(
        lambda b: b[0] < b[1] and b[:2] != (-INF, INF)), max_size=5),
    st.sampled_from([-1.0, 0.0, 0.5, 1.0, 1.5, 2.0, 2.5, 3.0, 4.0]),
)  # fmt: skip
@settings(max_examples=1500)
def test_a_value_lies_in_a_stretch_exactly_when_that_many_regimes_hold_it(bands, value):
    found = rows(*bands)
    holding = [r.name for r in found if r.holds(value)]

    def inside(stretches):
        return [
            s for s in stretches
            if (s.low < value or s.low == value and s.low_closed)
            and (value < s.high or s.high == value and s.high_closed)
        ]  # fmt: skip

    twice = [tuple(holding)] if len(holding) > 1 else []
    assert [s.regimes for s in inside(overlaps(found, "Sp"))] == twice
    between = bool(bands) and min(b[0] for b in bands) < value < max(b[1] for b in bands)
    assert len(inside(gaps(found, "Sp"))) == (1 if between and not holding else 0)
