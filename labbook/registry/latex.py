"""Formulas and symbols set as mathematics: the checked tree and the vocabulary's symbols as LaTeX text."""

import math
import re
from fractions import Fraction

from labbook.errors import Refusal
from labbook.registry.catalogue import Number
from labbook.registry.formula import Leaf, Power, Product, Sum
from labbook.registry.quantities import QUANTITIES

_GREEK = {
    "θ": r"\theta", "μ": r"\mu", "ν": r"\nu", "ρ": r"\rho", "λ": r"\lambda", "ω": r"\omega", "ζ": r"\zeta",
    "π": r"\pi", "α": r"\alpha", "β": r"\beta", "γ": r"\gamma", "δ": r"\delta", "η": r"\eta", "κ": r"\kappa",
    "σ": r"\sigma", "τ": r"\tau", "φ": r"\varphi", "ψ": r"\psi", "Ω": r"\Omega", "Δ": r"\Delta",
}  # fmt: skip
_LOWERED = str.maketrans("₀₁₂₃₄₅₆₇₈₉", "0123456789")


def symbol_latex(symbol: str) -> str:
    r"""A symbol as LaTeX: 'θ₀' is \theta_{0}, 'L_tail' has its subscript upright, 'Re' is one italic word.

    Characteristic numbers stand in italics, descriptive subscripts upright (ISO 80000-1, from memory).
    Errors: Refusal for what is not one symbol, such as 'U/(f L_body)'.
    """
    match = re.fullmatch(r"([^\W\d_₀-₉]+)([₀-₉]*)(?:_(\w+))?", symbol)
    if match is None:
        raise Refusal("symbol", symbol, "is not one symbol")
    stem, digits, word = match.groups()
    lowered = (digits or "").translate(_LOWERED) + (_subscript(word) if word else "")
    return _stem(stem) + (f"_{{{lowered}}}" if lowered else "")


def _stem(stem: str) -> str:
    if stem in _GREEK:
        return _GREEK[stem]
    return stem if len(stem) == 1 else rf"\mathit{{{stem}}}"


def _subscript(word: str) -> str:
    if word in _GREEK:
        return _GREEK[word]
    return word if len(word) == 1 else rf"\mathrm{{{word}}}"


def formula_latex(node) -> str:
    r"""A formula tree as LaTeX: quotients as \frac, square roots as \sqrt, other powers raised."""
    match node:
        case Leaf(key="", number=number):
            return _number(number)
        case Leaf(key=key):
            return symbol_latex(QUANTITIES[key].symbol)
        case Power(base=base, exponent=exponent):
            return _power(base, exponent)
        case Sum(left=left, right=right, sign=sign):
            lower = formula_latex(right)
            bare = lower.startswith("-") or (sign == "-" and isinstance(right, Sum))
            return f"{formula_latex(left)} {sign} {_round(lower) if bare else lower}"
        case Product(left=left, right=right, sign="/"):
            return rf"\frac{{{formula_latex(left)}}}{{{formula_latex(right)}}}"
        case Product(left=left, right=right):
            return _product(left, right)
    raise Refusal("formula", node, "not a formula tree")


def number_latex(number: Number) -> str:
    """A number's definition: symbol = formula, or the formula alone where the symbol is one itself."""
    formula = formula_latex(number.parsed.tree)
    try:
        return f"{symbol_latex(number.symbol)} = {formula}"
    except Refusal:
        return formula


def _number(number: float) -> str:
    if number == math.pi:
        return r"\pi"
    mantissa, _, exponent = f"{number:.12g}".partition("e")
    return mantissa if not exponent else rf"{mantissa} \cdot 10^{{{int(exponent)}}}"


def _power(base, exponent: Fraction) -> str:
    inner = formula_latex(base)
    if exponent == Fraction(1, 2):
        return rf"\sqrt{{{inner}}}"
    # a word such as EI raised bare would read as E times I squared
    if not isinstance(base, Leaf) or r"\mathit" in inner or r"\cdot" in inner or inner.startswith("-"):
        inner = _round(inner)
    return f"{inner}^{{{exponent}}}"


def _product(left, right) -> str:
    if isinstance(left, Leaf) and left.number == -1.0 and not left.key:
        lower = formula_latex(right)
        return f"-{_round(lower) if isinstance(right, Sum) or lower.startswith('-') else lower}"
    first, second = (
        _round(formula_latex(n)) if isinstance(n, Sum) else formula_latex(n) for n in (left, right)
    )
    if second.startswith("-"):
        second = _round(second)
    return first + (rf" \cdot {second}" if second[0].isdigit() else rf" \, {second}")


def _round(text: str) -> str:
    return rf"\left({text}\right)"
