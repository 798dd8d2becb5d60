"""Restating values: the worked rod in each dialect, round trips, and what a missing dimension does."""

import itertools
import math

import numpy as np
import pytest

from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS
from labbook.registry.dialects import AT_BIRTH, CHOICES, DIALECTS, completed, formula_of
from labbook.registry.formula import parse
from labbook.registry.quantities import QUANTITIES
from labbook.registry.restating import restate
from labbook.registry.swimmer_share import DIMENSIONS, drag

# The worked rod: L 20 mm, d 1 mm, E 1.5 MPa, mu 1 Pa.s, f 2 Hz, EI 7.3631078e-8 N.m2. Its house value is
# 3.07367, with the zeta_n of Tirado & Garcia de la Torre 1979
ROD = dict(L_tail=0.02, L_body=0.024, d=1e-3)
HOUSE_VALUE = 3.07367
WAVES = ("gray_hancock_1955", "lighthill")


def spoken(choices, value=HOUSE_VALUE, **others):
    return float(restate("Sp", value, choices=choices, inputs=ROD | others).value)


# each answer was recomputed independently (EI = E pi d^4/64), to the figures shown: half of the last is
# 2e-6, and the house value was rounded to six figures too
@pytest.mark.parametrize(("choices", "answer"), [
    ({}, 3.07367),
    ({"coefficient": "spheroid_asymptotic"}, 3.00847),
    ({"coefficient": "cylinder_two_term"}, 3.06623),
    ({"coefficient": "cylinder_finite"}, 3.07367),
    ({"coefficient": "log_slender"}, 3.10560),
    ({"coefficient": "mu"}, 2.28595),
    ({"coefficient": "four_pi_mu"}, 4.30397),
    ({"coefficient": "eight_pi_mu"}, 5.11832),
    ({"coefficient": "spheroid_asymptotic", "rate": "f"}, 1.90020),
    ({"coefficient": "mu", "rate": "f"}, 2.28595 / 1.58323),  # (2 pi)^(1/4) = 1.58323
    ({"length": "L_body"}, 3.07367 * 1.2),
    # length changes the length factor alone
    ({"length": "L_body", "coefficient": "log_slender"}, 3.10560 * 1.2),
])  # fmt: skip
def test_the_worked_rod_in_each_dialect(choices, answer):
    assert spoken(choices) == pytest.approx(answer, rel=5e-6)


@pytest.mark.parametrize(("choices", "answer"), [
    ({"coefficient": "spheroid_asymptotic", "power": 1}, 81.918),
    ({"coefficient": "eight_pi_mu", "power": 1}, 8 * math.pi * 4 * math.pi * 0.02**4 / 7.3631078e-8),
])  # fmt: skip
def test_the_fourth_power(choices, answer):
    # four times the relative rounding of a quarter power
    assert spoken(choices) == pytest.approx(answer, rel=2e-5)


def test_slender_body_codes_differ_by_their_logarithm():
    # 8 pi mu omega L^4/EI with c = -ln(e (a/L)^2): the spheroid's fourth power is that over c + 2
    c = -math.log(math.e * (5e-4 / 0.02) ** 2)
    eight = spoken({"coefficient": "eight_pi_mu", "power": 1})
    assert eight / (c + 2) == pytest.approx(81.918, rel=2e-5)


def test_the_waving_filaments_take_their_wave_from_the_helix():
    # wave/a = 100: Gray & Hancock 1955 2.61891, Lighthill 1976 3.70649 (recomputed), finite cylinder 3.26861.
    # Gray & Hancock's wave is the pitch; Lighthill's is measured along the filament: 30-40-50 mm
    finite = 3.26861
    gray = spoken({"coefficient": "gray_hancock_1955"}, pitch=0.05)
    assert gray == pytest.approx(HOUSE_VALUE * (2.61891 / finite) ** 0.25, rel=5e-6)
    along = spoken({"coefficient": "lighthill"}, pitch=0.03, R_helix=0.04 / (2 * math.pi))
    assert along == pytest.approx(HOUSE_VALUE * (3.70649 / finite) ** 0.25, rel=5e-6)


@pytest.mark.parametrize("row", DIALECTS, ids=lambda row: f"{row.of} {row.choices}")
def test_the_published_rows(row):
    # from the house value that the catalogue's formula gives to the answer from outside
    inputs = {k: row.example[k] for k in ("L_tail", "L_body") if k in row.example}
    inputs["d"] = 2 * row.example.get("a", math.nan)
    house = parse(NUMBERS[row.of].formula, QUANTITIES).value(row.example)
    found = restate(row.of, house, choices=row.choices, inputs=inputs)
    assert found.value == pytest.approx(row.answer, rel=row.tolerance) and found.why is None


# ---- any dialect from any other


def swimmers(n=40, seed=3):
    """Rods, strips, tubes and helices in turn, at random; equal columns of u, 1 to 3 %."""
    rng = np.random.default_rng(seed)
    kind = np.arange(n) % 4
    found = {key: np.full(n, np.nan) for key in DIMENSIONS}
    found["L_tail"] = rng.uniform(0.01, 0.04, n)
    found["L_body"] = found["L_tail"] * rng.uniform(1.05, 1.6, n)
    size = rng.uniform(2e-4, 8e-4, n)
    for key, here, factor in (
        ("d", (kind == 0) | (kind == 3), 1.0), ("w", kind == 1, 2.0), ("t", kind == 1, 0.3),
        ("D", kind == 2, 1.0), ("d_in", kind == 2, 0.6), ("pitch", kind == 3, 20.0),
        ("R_helix", kind == 3, 3.0),
    ):  # fmt: skip
        found[key] = np.where(here, size * factor * rng.uniform(0.9, 1.1, n), np.nan)
    return found | {f"u_{key}": found[key] * rng.uniform(0.01, 0.03, n) for key in DIMENSIONS}


def runs(n=40, seed=4):
    """Every other quantity of a number, at random."""
    rng = np.random.default_rng(seed)
    scale = dict(rho=1000.0, mu=1.0, nu=1e-3, f=1.0, U=1e-3, A_tip=1e-2, theta0=0.3, lam=1.0, m_mag=1e-3,
                 B=1e-2)  # fmt: skip
    found = {key: size * rng.uniform(0.3, 3.0, n) for key, size in scale.items()}
    return found | {"omega": 2 * math.pi * found["f"], "E": 1e6 * rng.uniform(0.3, 3.0, n)}


def direct(number, choices, dims, others):
    """A number straight from its formula, the section worked out here."""
    rod, tube = np.isfinite(dims["d"]), np.isfinite(dims["D"])
    d, w, t, D, d_in = (dims[k] for k in ("d", "w", "t", "D", "d_in"))
    circle = math.pi / 64
    I_area = np.where(rod, circle * d**4, np.where(tube, circle * (D**4 - d_in**4), w * t**3 / 12))
    given = dims | others | {"a": np.where(rod, d / 2, np.where(tube, D / 2, (w + t) / 4)),
                             "EI": others["E"] * I_area}  # fmt: skip
    if "coefficient" in choices:
        given["zeta_n"] = others["mu"] * drag(choices["coefficient"], dims)
    return parse(formula_of(number, choices), QUANTITIES).value(given)


def every(number):
    names = CHOICES[number]
    return [dict(zip(names, options, strict=True)) for options in itertools.product(*names.values())]


@pytest.mark.parametrize("number", CHOICES)
def test_between_any_two_dialects_there_and_back(number):
    dims, others = swimmers(), runs()
    helix = np.arange(40) % 4 == 3
    right = [(choices, direct(number, choices, dims, others)) for choices in every(number)]
    for (old, value), (new, wanted) in itertools.product(right, repeat=2):
        there = restate(number, value, choices=new, house=old, inputs=dims)
        back = restate(number, there.value, choices=old, house=new, inputs=dims)
        wave = any(c.get("coefficient") in WAVES for c in (old, new))
        here = helix if wave else np.ones(40, bool)  # rods, strips and tubes have no pitch
        assert (np.isfinite(there.value) == here).all(), (old, new)
        # rounding alone: a few operations of 1e-16, the largest power being 4
        assert np.abs(there.value[here] / wanted[here] - 1).max() < 1e-12, (old, new)
        assert np.abs(back.value[here] / value[here] - 1).max() < 1e-12, (old, new)


def test_ids_of_swimmers_change_nothing():
    dims, others = swimmers(8), runs(4000)
    rng = np.random.default_rng(8)
    which = rng.integers(0, 8, 4000)
    many = {key: column[which] for key, column in dims.items()}
    value = direct("Sp", AT_BIRTH["Sp"], many, others)
    for ids in (which + 17, which.astype(np.int32), (which * 1000).astype(np.uint64), which * 10**9, -which):
        for choices in ({"coefficient": "lighthill", "length": "L_body"}, {"power": 1, "length": "L_body"}):
            given = value, 0.01 * value, 0.1 * value
            one = restate("Sp", *given, choices=choices, inputs=many)
            two = restate("Sp", *given, choices=choices, inputs=many | {"swimmer": ids})
            for a, b in ((one.value, two.value), (one.u_own, two.u_own), (one.u_shared, two.u_shared)):
                np.testing.assert_array_equal(a, b)
            assert (one.why is None) == (two.why is None)
            assert one.why is None or list(one.why) == list(two.why)


def test_texts_in_the_column_of_swimmers_are_passed_over():
    dims = swimmers(4) | {"swimmer": np.array(["a", "b", "c", "d"], dtype=object)}
    assert restate("Sp", np.ones(4), choices={"length": "L_body"}, inputs=dims).why is None


# ---- what is absent, and what is signed


def test_the_house_changes_nothing():
    value = np.array([2.5, math.nan])
    found = restate("Sp", value, value, value, choices={}, inputs={})
    np.testing.assert_array_equal(found.value, value)
    assert found.why is None
    house = {"rate": "f", "power": 1}
    assert float(restate("Sp", 2.5, choices=house, house=house, inputs={}).value) == 2.5


def test_left_out_choices_stay_those_of_the_house():
    house = {"coefficient": "mu"}
    found = restate("Sp", 2.28595, choices={"power": 1}, house=house, inputs={})
    assert float(found.value) == pytest.approx(2.28595**4, rel=1e-12)


def test_rate_amplitude_breadth_and_power_need_no_dimension():
    # Bainbridge's fish (from memory): 0.308 peak to peak is 0.154 with the half, 0.308 2 pi with omega
    found = restate("St", 0.308, choices={"amplitude": "half"}, inputs={})
    assert float(found.value) == pytest.approx(0.154, rel=1e-12)
    found = restate("St", 0.308, choices={"rate": "omega"}, inputs={})
    assert float(found.value) == pytest.approx(0.308 * 2 * math.pi, rel=1e-12)
    assert float(restate("slenderness", 20.0, choices={"breadth": "radius"}, inputs={}).value) == 40.0
    # 4 pi mu for mu is a plain factor too
    house = {"coefficient": "mu"}
    found = restate("Sp", 2.28595, choices={"coefficient": "four_pi_mu"}, house=house, inputs={})
    assert float(found.value) == pytest.approx(4.30397, rel=5e-6)


@pytest.mark.parametrize(("choices", "missing", "sentence"), [
    ({"length": "L_body"}, ("L_body",), "needs L_body"),
    ({"length": "L_body"}, ("L_tail",), "needs L_tail"),
    ({"coefficient": "gray_hancock_1955"}, ("pitch",), "needs a helix pitch"),
    ({"coefficient": "lighthill"}, ("pitch",), "needs a helix pitch"),
    ({"coefficient": "lighthill"}, ("R_helix",), "needs a helix radius"),
    ({"coefficient": "mu"}, ("d",), "needs the section: d, or D, or w and t"),
    ({"coefficient": "log_slender"}, ("L_tail",), "needs L_tail"),
])  # fmt: skip
def test_a_run_without_what_it_needs_says_so(choices, missing, sentence):
    rod = ROD | {"pitch": 0.05, "R_helix": 0.004}
    columns = {key: np.array([value, value, value, value]) for key, value in rod.items()}
    for key in missing:
        columns[key][1] = columns[key][3] = math.nan
    found = restate("Sp", [1.0, 2.0, math.nan, math.nan], choices=choices, inputs=columns)
    assert list(np.isnan(found.value)) == [False, True, True, True]
    assert list(found.why) == [None, sentence, None, None], "a run that had no value lost none"
    # a column that is not there at all
    without = {key: value for key, value in rod.items() if key not in missing}
    found = restate("Sp", [1.0, 2.0], choices=choices, inputs=without)
    assert np.isnan(found.value).all() and list(found.why) == [sentence] * 2


def test_a_tail_too_stout_for_a_model_says_so():
    stout = dict(L_tail=2e-3, L_body=3e-3, d=1e-3, pitch=1e-3, R_helix=1e-3)
    found = restate("Sp", 1.0, choices={"coefficient": "gray_hancock_1955"}, inputs=stout | {"pitch": 2e-4})
    assert np.isnan(found.value) and found.why.item() == "the tail is too stout for gray_hancock_1955"


def test_restating_a_length_needs_no_section():
    # a point from a paper, of which no more is known
    found = restate("Sp", 3.0, choices={"length": "L_body"}, inputs={"L_tail": 0.02, "L_body": 0.024})
    assert float(found.value) == pytest.approx(3.6, rel=1e-12) and found.why is None


def test_backward_swimming_stays_backward():
    value = np.array([-6e-3, 0.0, 6e-3])
    inputs = {"L_tail": 50e-6, "L_body": 60e-6, "u_L_tail": 1e-6, "u_L_body": 1e-6}
    # bull sperm (from memory) at 50/60 of its length
    u = 0.1 * np.abs(value), 1e-4 * np.ones(3)
    found = restate("Re", value, *u, choices={"length": "L_tail"}, inputs=inputs)
    assert found.value == pytest.approx([-5e-3, 0.0, 5e-3], rel=1e-12)
    assert found.u_own == pytest.approx([5e-4, 0.0, 5e-4], rel=1e-12)
    assert (found.u_shared > 0).all() and found.u_shared[1] == pytest.approx(1e-4 * 50 / 60, rel=1e-12)
    assert found.u_shared[0] == found.u_shared[2]


@pytest.mark.parametrize(("arguments", "reason"), [
    (dict(number="wall", choices={}), "no number of this key has dialects"),
    (dict(number="Sp", choices={"rate": "rpm"}), "one of omega, f"),
    (dict(number="Sp", choices={}, house={"rate": "rpm"}), "one of omega, f"),
    (dict(number="Sp", choices={"length": "L_body"}, u_shared=0.1), "u_L_tail"),
])  # fmt: skip
def test_what_is_refused(arguments, reason):
    with pytest.raises(Refusal) as refused:
        restate(value=1.0, inputs=ROD, **arguments)
    assert reason in str(refused.value)


def test_completed_choices_are_what_is_restated():
    # partial and complete choices, options as text
    whole = completed("Sp", {"rate": "f", "power": 1})
    assert spoken({"rate": "f", "power": "1"}) == spoken(whole)
