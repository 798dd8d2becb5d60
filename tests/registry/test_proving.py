"""The proof and the sensitivities that a page shows while a formula is typed."""

import math

import numpy as np
import pytest
import uncertainties
from hypothesis import given, settings
from hypothesis import strategies as st

from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS
from labbook.registry.formula import parse
from labbook.registry.proving import proof, sensitivities
from labbook.registry.quantities import QUANTITIES


@pytest.mark.parametrize(("text", "sentence"), [
    # by hand from the SI units
    ("rho * U * L_body / mu", "a pure number"),
    ("f * A_tip", "not a pure number: L T^-1 is left over"),
    ("rho * U / mu", "not a pure number: L^-1 is left over"),
    ("m_mag * B / (mu * b**3 * omega)", "a pure number"),
    ("E / mu", "not a pure number: T^-1 is left over"),
    ("f + mu", "adds T^-1 to M L^-1 T^-1; terms must agree"),
    ("rho * speed", "'speed' is not a key of the vocabulary"),
    ("sin(f)", "calls are not allowed; use + - * / ** and brackets"),
    ("rho *", "cannot be read; write e.g. rho * U * L_body / mu"),
    ("", "cannot be read; write e.g. rho * U * L_body / mu"),
    (None, "cannot be read; write e.g. rho * U * L_body / mu"),
    ("2 * pi", "holds no quantity; write e.g. rho * U * L_body / mu"),
])  # fmt: skip
def test_what_a_page_says(text, sentence):
    found = proof(text)
    assert found.sentence == sentence
    assert found.is_pure is (sentence == "a pure number")


def test_a_proof_keeps_what_could_be_read():
    mixed = proof("f + mu")
    assert mixed.formula is not None and mixed.keys == ("f", "mu")
    assert isinstance(mixed.refusal, Refusal) and mixed.left_over == ""
    assert proof("sin(f)").formula is None and proof("sin(f)").keys == ()
    left = proof(" f * A_tip ")
    assert (left.text, left.keys, left.left_over) == ("f * A_tip", ("f", "A_tip"), "L T^-1")
    assert left.refusal is None


def test_another_vocabulary_may_be_proved_against():
    few = {key: QUANTITIES[key] for key in ("f", "A_tip", "U")}
    assert proof("f * A_tip / U", few).is_pure
    assert "not a key" in proof("rho * U * L_body / mu", few).sentence


@given(st.text(max_size=320) | st.text("fUmurho+-*/()0123456789. ", max_size=60))
@settings(max_examples=800, deadline=None)
@pytest.mark.filterwarnings("ignore::SyntaxWarning")  # Python's reader warns of texts such as 1if
def test_any_text_has_a_proof(text):
    found = proof(text)
    assert found.is_pure or found.refusal is not None or found.left_over


@pytest.mark.parametrize("key", NUMBERS)
def test_slopes_agree_with_uncertainties(key):
    row = NUMBERS[key]
    u = {name: 0.01 * abs(value) + 1e-9 for name, value in row.example.items()}
    measured = {name: uncertainties.ufloat(value, u[name]) for name, value in row.example.items()}
    by_library = eval(row.formula, {"__builtins__": {}}, measured | {"pi": math.pi})
    found = sensitivities(row.parsed, row.example, u)
    assert [s.key for s in found] == list(row.inputs)
    for name, slope, relative, contribution in found:
        # both differentiate exactly: rounding alone
        expected = by_library.derivatives[measured[name]]
        assert slope == pytest.approx(expected, rel=1e-12, abs=1e-300)
        assert contribution == pytest.approx(abs(expected) * u[name], rel=1e-12, abs=1e-300)
        exponent = expected * row.example[name] / by_library.nominal_value
        assert relative == pytest.approx(exponent, rel=1e-12, abs=1e-15)


def test_relative_slopes_of_the_sperm_number_are_its_exponents():
    # a product of powers: d ln y/d ln x is the exponent (JCGM 100:2008, 5.1.6)
    row = NUMBERS["Sp"]
    found = {s.key: s.relative_slope for s in sensitivities(row.parsed, row.example, {})}
    assert found == pytest.approx({"L_tail": 1.0, "zeta_n": 0.25, "omega": 0.25, "EI": -0.25}, rel=1e-12)


def test_missing_inputs_are_named():
    row = NUMBERS["Sp"]
    with pytest.raises(Refusal, match="this run lacks zeta_n, EI"):
        sensitivities(row.parsed, {"L_tail": 0.02, "omega": 6.0, "zeta_n": None, "EI": math.nan}, {})


def test_an_unknown_uncertainty_is_not_a_small_one():
    values, u = {"f": 2.0, "A_tip": 0.1, "U": 4.0}, {"f": 0.1, "A_tip": None, "U": math.nan}
    found = {s.key: s for s in sensitivities(parse("f * A_tip / U", QUANTITIES), values, u)}
    assert found["f"].contribution == pytest.approx(0.1 / 4 * 0.1, rel=1e-12)
    assert math.isnan(found["A_tip"].contribution) and math.isnan(found["U"].contribution)
    assert found["U"].slope == pytest.approx(-2.0 * 0.1 / 16, rel=1e-12)


@pytest.mark.parametrize(("text", "values"), [
    ("f * A_tip / U", {"f": 1.0, "A_tip": 1.0, "U": 0.0}),
    ("U**0.5 / U**0.5", {"U": -1.0}),
    ("(U / (f * d))**0.3", {"U": -1.0, "f": 1.0, "d": 1.0}),
    ("U**12 * f", {"U": 1e200, "f": 1.0}),
])  # fmt: skip
def test_where_a_formula_has_no_value_nothing_is_made_up(text, values):
    with pytest.raises(Refusal, match="has no value for this run"):
        sensitivities(parse(text, QUANTITIES), values, {})


def test_slopes_at_zero():
    # d(U^2 + lam)/dU = 2 U = 0 and d/dlam = 1; the root rises straight up at 0
    rows = sensitivities(parse("U**2 + lam", QUANTITIES), {"U": 0.0, "lam": 0.0}, {"lam": 0.5})
    smooth = {s.key: s for s in rows}
    assert smooth["U"].slope == 0.0
    assert smooth["lam"].slope == 1.0 and smooth["lam"].contribution == 0.5
    assert math.isnan(smooth["lam"].relative_slope)
    steep = sensitivities(parse("1 + lam**0.5", QUANTITIES), {"lam": 0.0}, {"lam": 0.5})
    assert steep[0].slope == math.inf and steep[0].contribution == math.inf


def test_numpy_scalars_and_whole_numbers_will_do():
    values = {"f": 2, "A_tip": np.float32(0.5), "U": np.int64(4)}
    found = sensitivities(parse("f * A_tip / U", QUANTITIES), values, {})
    assert [s.slope for s in found] == pytest.approx([0.125, 0.5, -0.0625], rel=1e-12)
