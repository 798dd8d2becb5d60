"""The formula tree: Python's arithmetic, complex-step slopes, dimensions, and text that must never run."""

import warnings

import numpy as np
import pint
import pytest
import uncertainties
from hypothesis import assume, example, given, settings
from hypothesis import strategies as st

from labbook.errors import Refusal
from labbook.registry import formula
from labbook.registry.catalogue import NUMBERS
from labbook.registry.formula import parse
from labbook.registry.quantities import QUANTITIES, dimension, written_dimension

INPUTS = {"f": 2.0, "mu": 0.7, "rho": 3.0, "U": 1.3, "L_tail": 5.0}
UNIT = pint.UnitRegistry(cache_folder=None)


def written_trees():
    """Texts of formulas over INPUTS with every operator, brackets and precedence as a person leaves them."""
    leaf = st.sampled_from((*INPUTS, "2", "0.5", "3.25", "pi"))
    power = st.sampled_from(("**2", "**0.5", "**0.25", "**-1", "**(1/4)", "**3", "**(-3/2)"))
    sign = st.sampled_from((" + ", " - ", " * ", " / ", "*", "/"))

    def grown(inner):
        pair = st.tuples(inner, sign, inner).map("".join)
        return st.one_of(
            pair, pair.map("({})".format), st.tuples(inner.map("({})".format), power).map("".join),
            inner.map("-({})".format), st.tuples(leaf, power).map("".join),
        )  # fmt: skip

    return st.recursive(leaf, grown, max_leaves=12)


def by_python(text, inputs):
    """Python's own arithmetic on a text that this module made itself."""
    return eval(text, {"__builtins__": {}}, inputs | {"pi": np.pi})


@given(written_trees())
@settings(max_examples=1000, deadline=None)
@example("2 - 3.25 - f")
@example("f / mu / rho")
@example("-f**2")
@example("f**-1 * mu")
@example("2 * f**2 + mu / rho * U")
def test_values_and_precedence_are_those_of_python(text):
    try:
        parsed = parse(text, QUANTITIES)
        expected = by_python(text, INPUTS)
    except (Refusal, ArithmeticError):
        assume(False)
    assume(
        isinstance(expected, float | int) and 1e-150 < abs(expected) < 1e6
    )  # a root of a negative is complex
    with np.errstate(all="ignore"), warnings.catch_warnings():
        warnings.simplefilter("ignore", RuntimeWarning)
        found = parsed.value(INPUTS)
    # **0.25 is two square roots here, another rounding; 1e-10: a difference of near equals loses digits
    assert found == pytest.approx(expected, rel=1e-10, abs=1e-10)


def test_arrays_go_through_as_arrays():
    parsed = parse("rho * omega * L_tail**2 / mu", QUANTITIES)
    found = parsed.value(dict(rho=970.0, omega=4 * np.pi, L_tail=np.array([0.02, 0.04]), mu=1.0))
    assert found == pytest.approx([4.875752, 4 * 4.875752], rel=1e-6)  # physics sheet, section 14


def test_keys_stand_in_order_of_appearance_and_once():
    assert parse("mu * f / mu * rho", QUANTITIES).keys == ("mu", "f", "rho")


@pytest.mark.parametrize("key", NUMBERS)
def test_the_complex_step_agrees_with_two_independent_slopes(key):
    row = NUMBERS[key]
    inputs = {name: float(row.example[name]) for name in row.inputs}
    measured = {name: uncertainties.ufloat(value, abs(value) * 0.01 + 1e-9) for name, value in inputs.items()}
    by_library = eval(row.formula, {"__builtins__": {}}, measured | {"pi": np.pi})
    for name, value in inputs.items():
        step = abs(value) * 1e-30 + 1e-40
        slope = np.imag(row.parsed.value(inputs | {name: value + 1j * step})) / step
        # the library differentiates the same text by rule: rounding only
        assert slope == pytest.approx(by_library.derivatives[measured[name]], rel=1e-12, abs=1e-300), name
        # central differences: h^2 truncation 1e-10, and rounding 1e-16/1e-5
        h = abs(value) * 1e-5 or 1e-9
        ahead, behind = (row.parsed.value(inputs | {name: value + turn * h}) for turn in (1, -1))
        assert slope == pytest.approx((ahead - behind) / (2 * h), rel=1e-7, abs=1e-9 * abs(row.answer)), name


@pytest.mark.parametrize("key", NUMBERS)
def test_pint_proves_every_number_pure(key):
    # an outside proof, from the SI units alone: our own dimensions take no part
    spelling = {"Pa.s": "Pa*s", "kg/m3": "kg/m**3", "m2/s": "m**2/s", "A.m2": "A*m**2", "N.m2": "N*m**2",
                "N.m.s": "N*m*s", "rad/s": "rad/s"}  # fmt: skip
    row = NUMBERS[key]
    measured = {
        name: UNIT.Quantity(
            float(row.example[name]), spelling.get(QUANTITIES[name].unit, QUANTITIES[name].unit)
        )
        for name in row.inputs
    }
    found = eval(row.formula, {"__builtins__": {}}, measured | {"pi": np.pi})
    assert found.dimensionless
    assert found.to_base_units().magnitude == pytest.approx(row.answer, rel=row.tolerance)


@pytest.mark.parametrize(("text", "left_over"), [
    ("rho * U / mu", "L^-1"),
    ("rho * U**2 * L_body / mu", "L T^-1"),
    ("f * A_tip", "L T^-1"),
    ("L_tail * (zeta_n * omega / EI)**0.5", "L^-1"),
    ("m_mag * B", "M L^2 T^-2"),
    ("T * lam", "T K"),
    ("mu / rho", "L^2 T^-1"),
    ("f * U / U * lam", "a pure number"),
])  # fmt: skip
def test_what_is_left_over(text, left_over):
    dimensions = {key: row.dimension for key, row in QUANTITIES.items()}
    assert written_dimension(parse(text, QUANTITIES).dimension(dimensions)) == left_over
    if left_over != "a pure number":
        assert dimension(left_over) == parse(text, QUANTITIES).dimension(dimensions)


@pytest.mark.parametrize("text", ["f + omega * mu", "1 + L_tail", "L_tail - d**2", "U + 0 * f"])
def test_a_sum_of_unlike_kinds_is_refused(text):
    with pytest.raises(Refusal, match="terms must agree"):
        parse(text, QUANTITIES).dimension({key: row.dimension for key, row in QUANTITIES.items()})


@pytest.mark.parametrize(("text", "reason"), [
    ("sin(f)", "calls are not allowed"),
    ("__import__('os').system('true')", "calls are not allowed"),
    ("f.real", "attributes are not allowed"),
    ("().__class__", "attributes are not allowed"),
    ("f[0]", "Subscript is not allowed"),
    ("[f for f in (1, 2)]", "ListComp is not allowed"),
    ("{f: 1}", "Dict is not allowed"),
    ("(f, mu)", "Tuple is not allowed"),
    ("lambda: f", "Lambda is not allowed"),
    ("(f := 2)", "NamedExpr is not allowed"),
    ("f if mu else rho", "IfExp is not allowed"),
    ("f and mu", "BoolOp is not allowed"),
    ("not f", "UnaryOp is not allowed"),
    ("~f", "UnaryOp is not allowed"),
    ("f < mu", "Compare is not allowed"),
    ("f // mu", "BinOp is not allowed"),
    ("f % mu", "BinOp is not allowed"),
    ("f @ mu", "BinOp is not allowed"),
    ("f << 2", "BinOp is not allowed"),
    ("'f'", "is no number"),
    ("b'f'", "is no number"),
    ("f'{mu}'", "JoinedStr is not allowed"),
    ("2j * f", "is no number"),
    ("True * f", "is no number"),
    ("None", "is no number"),
    ("...", "is no number"),
    ("1e999 * f", "too large"),
    ("speed * f", "'speed' is not a key of the vocabulary"),
    ("__builtins__", "is not a key of the vocabulary"),
    ("f**13", "beyond 12"),
    ("f**-13", "beyond 12"),
    ("f**99999999", "an exponent must be a plain number"),
    ("9**9**9", "an exponent must be a plain number"),
    ("f**mu", "an exponent must be a plain number"),
    ("f**(1+1)", "an exponent must be a plain number"),
    ("f**(1/0)", "an exponent must be a plain number"),
    ("f**True", "an exponent must be a plain number"),
    ("f = 2", "cannot be read"),
    ("import os", "cannot be read"),
    ("f +", "cannot be read"),
    ("f; mu", "cannot be read"),
    ("f\nmu", "cannot be read"),
    ("", "cannot be read"),
    ("f\x00", "cannot be read"),
    ("(" * 140 + "f" + ")" * 140, None),  # brackets alone are no parts: read or refused, never an overflow
    ("-" * 200 + "f", "more than 120 parts"),
    ("+".join(["f"] * 100), "more than 120 parts"),
    ("f" + " " * 300, "longer than 300"),
    ("f + " * 10_000, "longer than 300"),
])  # fmt: skip
def test_what_a_formula_may_not_hold(text, reason):
    if reason is None:
        assert parse(text, QUANTITIES).keys == ("f",)
        return
    with pytest.raises(Refusal) as refused:
        parse(text, QUANTITIES)
    assert reason in refused.value.reason


def test_a_deeply_nested_exponent_is_read_at_once():
    # each level read twice would take 2^38 steps, and this test would never end
    parsed = parse("f**(" + "1/(" * 36 + "1" + ")" * 37, QUANTITIES)
    assert parsed.value({"f": 3.0}) == 3.0


class Sentinel(dict):
    """A vocabulary whose every key would be touched if the text were executed against it."""

    def __init__(self):
        super().__init__(dict.fromkeys(QUANTITIES))
        self.touched = []

    def __getitem__(self, key):
        self.touched.append(key)
        return super().__getitem__(key)


PIECES = (
    "f", "mu", "rho", "+", "-", "*", "/", "**", "(", ")", " ", "2", "0.5", ",", ".", "[", "]", "{", "}", ":",
    ":=", "=", "lambda ", " for ", " in ", " if ", " else ", "'", '"', "f'", "\\", "\n", "#", "@", "~", "<",
    "__import__('os')", "touch()", "touch", ".__class__", "__builtins__", "exec", "eval", "open('x','w')",
    "await ", "yield ", "*f", "**f", "0x", "1e", "_", "j", "é", "\x00", "9" * 20,
)  # fmt: skip


@given(st.lists(st.sampled_from(PIECES), max_size=25).map("".join))
@settings(max_examples=4000, deadline=None)
@example("touch()")
@example("__import__('builtins').touch()")
@example("[touch() for f in (1,)]")
def test_any_text_is_a_formula_or_a_refusal_and_nothing_runs(text):
    import builtins

    ran = []
    vocabulary = Sentinel()
    builtins.touch = lambda *given: ran.append(given)
    formula.touch = builtins.touch
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # the tokenizer warns of texts such as 1if
            parsed = parse(text, vocabulary)
    except Refusal:
        parsed = None
    finally:
        del builtins.touch, formula.touch
    assert ran == [] and vocabulary.touched == []
    if parsed is not None:
        assert set(parsed.keys) <= set(QUANTITIES)
        assert "touch" not in text.partition("#")[0]


@given(st.text(max_size=320))
@settings(max_examples=1000, deadline=None)
def test_any_unicode_is_a_formula_or_a_refusal(text):
    try:
        parse(text, QUANTITIES)
    except Refusal:
        pass
