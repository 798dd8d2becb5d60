"""Formulas as LaTeX: read back by a small reader and compared with the tree, and a few set by hand."""

import math
import re

import pytest

from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS
from labbook.registry.dialects import DIALECTS
from labbook.registry.formula import parse
from labbook.registry.latex import formula_latex, number_latex, symbol_latex
from labbook.registry.quantities import QUANTITIES

SYMBOLS = {symbol_latex(q.symbol): key for key, q in QUANTITIES.items()}


def read_back(text, inputs):
    """The value of LaTeX as mathematics reads it, by Python's grammar once its commands are spelled out."""
    names = {}
    for latex in sorted(SYMBOLS, key=len, reverse=True):
        mark = f"@{len(names)}@"
        # a symbol ends where neither letter nor subscript goes on
        text = re.sub(r"(?<![A-Za-z\\])" + re.escape(latex) + r"(?![A-Za-z_])", mark, text)
        names[mark] = inputs.get(SYMBOLS[latex], 1.0)
    text = re.sub(r"\\pi(?![A-Za-z])", repr(math.pi), text)
    text = text.replace(r"\left", "").replace(r"\right", "").replace(r"\cdot", "*").replace(r"\,", "*")
    while r"\frac" in text or r"\sqrt" in text:
        text = re.sub(r"\\frac\{([^{}]*)\}\{([^{}]*)\}", r"((\1)/(\2))", text)
        text = re.sub(r"\\sqrt\{([^{}]*)\}", r"((\1)**0.5)", text)
        text = re.sub(r"\^\{([^{}]*)\}", r"**(\1)", text)
    text = re.sub(r"\^\{([^{}]*)\}", r"**(\1)", text)
    for mark, value in names.items():
        text = text.replace(mark, repr(value))
    return eval(text, {"__builtins__": {}})  # our own text, in a test


TEXTS = [*(n.formula for n in NUMBERS.values()), *(d.formula for d in DIALECTS)]
HARD = [
    "L_tail - (L_body - d)", "-L_tail * (f - omega)", "f * -omega", "(f + omega) / (f - omega)",
    "f / (omega / U)", "2 * 3 * f", "EI**2", "(f * omega)**-1", "f**-0.5", "L_tail - -d", "-(f + omega)",
    "theta0 / omega * f",
    "1e-7 * f", "f**(2/3)", "(-f)**2", "(2 * f)**3 / 4**2",
]  # fmt: skip


@pytest.mark.parametrize("text", TEXTS + HARD)
def test_it_reads_back_as_the_same_number(text):
    formula = parse(text, QUANTITIES)
    # values without simple ratios, so that a lost bracket or exponent shows
    inputs = {key: 1.1 + 0.37 * i for i, key in enumerate(formula.keys)}
    # both are double precision; only the order of a few operations differs
    assert read_back(formula_latex(formula.tree), inputs) == pytest.approx(formula.value(inputs), rel=1e-12)


@pytest.mark.parametrize(("text", "latex"), [
    # set by hand as textbooks set them
    ("rho * U * L_body / mu", r"\frac{\rho \, U \, L_{\mathrm{body}}}{\mu}"),
    ("L_tail * (zeta_n * omega / EI)**0.25",
     r"L_{\mathrm{tail}} \, \left(\frac{\zeta_{n} \, \omega}{\mathit{EI}}\right)^{1/4}"),
    ("L_tail * (omega / nu)**0.5", r"L_{\mathrm{tail}} \, \sqrt{\frac{\omega}{\nu}}"),
    ("U / theta0**2", r"\frac{U}{\theta_{0}^{2}}"),
])  # fmt: skip
def test_it_is_set_as_one_would_by_hand(text, latex):
    assert formula_latex(parse(text, QUANTITIES).tree) == latex


@pytest.mark.parametrize(("symbol", "latex"), [
    ("Re_ω", r"\mathit{Re}_{\omega}"), ("ν₂₅", r"\nu_{25}"), ("ζ_n", r"\zeta_{n}"), ("A₂₂", "A_{22}"),
    ("L_tail", r"L_{\mathrm{tail}}"), ("f", "f"),
])  # fmt: skip
def test_a_symbol_is_set(symbol, latex):
    assert symbol_latex(symbol) == latex


def test_an_expression_is_no_symbol():
    with pytest.raises(Refusal, match="not one symbol"):
        symbol_latex("U/(f L_body)")
    assert "=" not in number_latex(NUMBERS["stride"])
    assert number_latex(NUMBERS["Re"]).startswith(r"\mathit{Re} = \frac")


def test_every_quantity_and_number_can_be_set():
    for q in QUANTITIES.values():
        assert symbol_latex(q.symbol).count("{") == symbol_latex(q.symbol).count("}")
