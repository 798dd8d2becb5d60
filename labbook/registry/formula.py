"""Formula text parsed once into a checked tree, and the tree's readings: values, slopes and dimensions."""

import ast
import math
import operator
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from labbook.errors import Refusal
from labbook.registry.quantities import NONE, Dimension, written_dimension

MOST_CHARACTERS = 300
MOST_NODES = 120
LARGEST_EXPONENT = 12

CONSTANTS = {"pi": math.pi}

_OPERATORS = {
    ast.Add: ("+", operator.add),
    ast.Sub: ("-", operator.sub),
    ast.Mult: ("*", operator.mul),
    ast.Div: ("/", operator.truediv),
}


@dataclass(frozen=True)
class Leaf:
    """A key of the vocabulary, or a plain number where key is empty."""

    key: str = ""
    number: float = 1.0


@dataclass(frozen=True)
class Sum:
    left: object
    right: object
    sign: str  # '+' or '-'


@dataclass(frozen=True)
class Product:
    left: object
    right: object
    sign: str  # '*' or '/'


@dataclass(frozen=True)
class Power:
    base: object
    exponent: Fraction


@dataclass(frozen=True)
class Formula:
    """A checked tree with the text it came from; `keys` are the inputs in order of first appearance."""

    text: str
    tree: object
    keys: tuple[str, ...]

    def value(self, inputs: Mapping[str, np.ndarray | float | complex]):
        """The formula's value for SI inputs (scalars or arrays, real or complex)."""
        return _value(self.tree, inputs)

    def divisors(self) -> frozenset[str]:
        """The keys that it divides by: where one of them is zero, the formula has no value."""
        return frozenset(_divisors(self.tree, below=False))

    def dimension(self, dimensions: Mapping[str, Dimension]) -> Dimension:
        """The formula's dimension, from its inputs' dimensions; Refusal where a sum mixes kinds."""
        return _dimension(self.tree, dimensions, self.text)


def parse(text: str, vocabulary) -> Formula:
    """Read a formula over `vocabulary` (any container of keys): + - * / ** numbers, pi and brackets only.

    Errors: Refusal for calls, attributes, unknown keys, exponents that are not plain numbers or exceed 12,
    and texts that are too long. Nothing of the text is ever executed.
    """
    if len(text) > MOST_CHARACTERS:
        raise Refusal("formula", text[:40] + "...", f"longer than {MOST_CHARACTERS} characters", "shorten it")
    try:
        root = ast.parse(text.strip(), mode="eval").body
        nodes = sum(1 for _ in ast.walk(root))
    except (SyntaxError, ValueError, RecursionError, MemoryError):
        raise Refusal("formula", text, "cannot be read", "write e.g. rho * U * L_body / mu") from None
    if nodes > MOST_NODES:
        raise Refusal("formula", text, f"has more than {MOST_NODES} parts", "shorten it")
    keys: dict[str, None] = {}
    tree = _checked(root, vocabulary, text, keys)
    return Formula(text.strip(), tree, tuple(keys))


def _checked(node, vocabulary, text, keys):
    match node:
        case ast.Name(id=name):
            if name in CONSTANTS:
                return Leaf(number=CONSTANTS[name])
            if name not in vocabulary:
                raise Refusal("formula", text, f"{name!r} is not a key of the vocabulary")
            keys[name] = None
            return Leaf(key=name)
        case ast.Constant(value=value) if type(value) in (int, float) and abs(value) < 1e300:
            return Leaf(number=float(value))
        case ast.UnaryOp(op=ast.USub(), operand=operand):
            return Product(Leaf(number=-1.0), _checked(operand, vocabulary, text, keys), "*")
        case ast.UnaryOp(op=ast.UAdd(), operand=operand):
            return _checked(operand, vocabulary, text, keys)
        case ast.BinOp(left=base, op=ast.Pow(), right=exponent):
            return Power(_checked(base, vocabulary, text, keys), _exponent(exponent, text))
        case ast.BinOp(left=left, op=op, right=right) if type(op) in _OPERATORS:
            sign = _OPERATORS[type(op)][0]
            kind = Sum if sign in "+-" else Product
            return kind(_checked(left, vocabulary, text, keys), _checked(right, vocabulary, text, keys), sign)
        case ast.BinOp(op=ast.BitXor()):
            raise Refusal("formula", text, "^ is not allowed", "write ** for powers")
        case ast.Constant(value=value) if type(value) in (int, float):
            raise Refusal("formula", text, "holds a number that is too large")
        case ast.Constant(value=value):
            raise Refusal("formula", text, f"{value!r} is no number")
        case ast.Call():
            raise Refusal("formula", text, "calls are not allowed", "use + - * / ** and brackets")
        case ast.Attribute():
            raise Refusal("formula", text, "attributes are not allowed", "use + - * / ** and brackets")
    raise Refusal("formula", text, f"{type(node).__name__} is not allowed", "use + - * / ** and brackets")


def _exponent(node, text) -> Fraction:
    def number(part):
        match part:
            case ast.Constant(value=value) if type(value) in (int, float) and abs(value) <= 1e6:
                return Fraction(str(value))
            case ast.UnaryOp(op=ast.USub(), operand=operand):
                return -number(operand)
            case ast.BinOp(left=left, op=ast.Div(), right=right):
                below = number(right)
                if below != 0:
                    return number(left) / below
        raise Refusal("formula", text, "an exponent must be a plain number", "write e.g. **2 or **(1/4)")

    exponent = number(node)
    if abs(exponent) > LARGEST_EXPONENT:
        raise Refusal("formula", text, f"the exponent {float(exponent):g} is beyond {LARGEST_EXPONENT}")
    return exponent


_ARITHMETIC = {sign: function for sign, function in _OPERATORS.values()}


def _value(node, inputs):
    match node:
        case Leaf(key="", number=number):
            return number
        case Leaf(key=key):
            return inputs[key]
        case Power(base=base, exponent=exponent):
            return _power(_value(base, inputs), exponent)
        case Sum(left=left, right=right, sign=sign) | Product(left=left, right=right, sign=sign):
            return _ARITHMETIC[sign](_value(left, inputs), _value(right, inputs))


def _divisors(node, below: bool):
    """The keys below a fraction bar; a bar below a bar lifts them up again."""
    match node:
        case Leaf(key=key):
            if below and key:
                yield key
        case Power(base=base, exponent=exponent):
            yield from _divisors(base, below != (exponent < 0))
        case Product(left=left, right=right, sign=sign):
            yield from _divisors(left, below)
            yield from _divisors(right, below != (sign == "/"))
        case Sum(left=left, right=right):
            yield from _divisors(left, below)
            yield from _divisors(right, below)


def _power(base, exponent: Fraction):
    """base**exponent; roots of two and four by square roots, which are several times faster on arrays."""
    if exponent == 2:
        return base * base
    if exponent == Fraction(1, 2):
        return np.sqrt(base)
    if exponent == Fraction(1, 4):
        return np.sqrt(np.sqrt(base))
    if exponent.denominator == 1:
        return base ** int(exponent)
    return base ** float(exponent)


def _dimension(node, dimensions, text) -> Dimension:
    match node:
        case Leaf(key=""):
            return NONE
        case Leaf(key=key):
            return dimensions[key]
        case Power(base=base, exponent=exponent):
            return tuple(float(exponent) * e for e in _dimension(base, dimensions, text))
        case Product(left=left, right=right, sign=sign):
            one, two = _dimension(left, dimensions, text), _dimension(right, dimensions, text)
            turn = 1 if sign == "*" else -1
            return tuple(e + turn * g for e, g in zip(one, two, strict=True))
        case Sum(left=left, right=right):
            one, two = _dimension(left, dimensions, text), _dimension(right, dimensions, text)
            if not pure(tuple(e - g for e, g in zip(one, two, strict=True))):
                raise Refusal(
                    "formula", text,
                    f"adds {written_dimension(one)} to {written_dimension(two)}", "terms must agree",
                )
            return one


def pure(exponents: Dimension) -> bool:
    """Whether the exponents are those of a pure number."""
    return all(abs(e) < 1e-9 for e in exponents)
