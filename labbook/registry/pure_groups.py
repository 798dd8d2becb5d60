"""The pure numbers that a chosen set of quantities allows: Buckingham's theorem, put in plain formulas."""

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from itertools import combinations

import numpy as np

from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS, Number
from labbook.registry.formula import LARGEST_EXPONENT, Leaf, Power, Product, Sum, parse
from labbook.registry.quantities import QUANTITIES, quantity
from labbook.registry.units import pure_products

MOST_KEYS = 12  # twelve quantities have about 2,500 small subsets to look at: half a second

_ORDER = {key: i for i, key in enumerate(QUANTITIES)}

Powers = dict[str, Fraction]
Known = tuple[tuple[str, Powers], ...]

# where a key stands within a product: the fluid first, then what moves, the house's two lengths, the rest
_DYNAMIC, _LENGTHS, _REST = 2, 3, 4
_PLACES = {"fluid": 0, "material": 1}
_PLACES_OF_KEYS = {
    "zeta_n": 1, "zeta_t": 1, "EI": 1, "L_tail": _LENGTHS, "L_body": _LENGTHS,
    **dict.fromkeys(("f", "omega", "U", "B", "I_coil", "fps"), _DYNAMIC),
}  # fmt: skip


@dataclass(frozen=True)
class Group:
    """A pure product of powers over the vocabulary.

    formula: text that `parse` reads; exponents: (key, power) as in the formula; also: the catalogue's numbers
    that it equals up to a constant and a power; note: one sentence where the group is the same for all runs.
    """

    formula: str
    exponents: tuple[tuple[str, Fraction], ...]
    also: tuple[str, ...] = ()
    note: str = ""


def how_many(keys: Iterable[str]) -> int:
    """The number of independent pure groups: quantities less the rank of their dimensions."""
    return len(pure_products(keys))


def suggested(keys: Iterable[str], numbers: Mapping[str, Number] = NUMBERS) -> list[Group]:
    """Independent pure groups of the chosen quantities, as many as there can be, the telling ones first.

    numbers: the group's catalogue; its numbers come first, then groups of few quantities with small
    exponents, at last those that are the same for all runs (omega/f). A quantity that is in no group can be
    in no pure number of this choice. Errors: Refusal for an unknown key or more than 12 of them.
    """
    chosen = tuple(dict.fromkeys(keys))
    for key in chosen:
        quantity(key)
    if len(chosen) > MOST_KEYS:
        raise Refusal("quantities", len(chosen), f"more than {MOST_KEYS} are too many", "choose fewer")
    known = _products_of(numbers)
    ranked = sorted(_candidates(chosen, known), key=lambda p: _plainness(p, known))
    # a group that is constant is taken before all others, so that these differ in more than a constant
    ranked.sort(key=lambda p: bool(_expanded(p)))
    rows, kept = np.zeros((0, len(chosen))), []
    for powers in ranked:
        more = np.vstack([rows, [float(powers.get(key, 0)) for key in chosen]])
        if np.linalg.matrix_rank(more) > len(rows):
            rows, kept = more, [*kept, powers]
    kept.sort(key=lambda p: not _expanded(p))  # keeps the order among the others
    return [_group(powers, known) for powers in kept]


def _candidates(keys: tuple[str, ...], known: Known) -> list[Powers]:
    """The catalogue's own products of these keys, and every pure product that can spare none of its own."""
    found = [powers for powers in (_spoken(p, keys) for _, p in known) if set(powers) <= set(keys)]
    dimensions = {key: QUANTITIES[key].dimension for key in keys}
    rank = _rank(list(dimensions.values()))
    smallest: list[set[str]] = []
    for size in range(1, rank + 2):
        for some in combinations(keys, size):
            if any(done <= set(some) for done in smallest):
                continue
            if _rank([dimensions[key] for key in some]) == size - 1:
                smallest.append(set(some))
                found.append(_turned(_whole(pure_products(some)[0]), known))
    return found


def _spoken(powers: Powers, keys: tuple[str, ...]) -> Powers:
    """A product in which what is not chosen is written out where that helps: EI as E * I_area, f as omega."""
    out: Powers = {}
    for key, power in powers.items():
        inner = {key: Fraction(1)} if key in keys else _written_out(key)
        if key == "f" and key not in keys:
            inner = {"omega": Fraction(1)}
        for other, p in inner.items():
            out[other] = out.get(other, Fraction(0)) + power * p
    return {key: p for key, p in out.items() if p}


def _rank(dimensions) -> int:
    return int(np.linalg.matrix_rank(np.array(dimensions))) if dimensions else 0


def _whole(powers: Mapping[str, Fraction]) -> Powers:
    """The same product with the smallest whole exponents; roots where these pass what a formula may hold."""
    scale = math.lcm(*(p.denominator for p in powers.values()))
    whole = {key: int(p * scale) for key, p in powers.items() if p}
    divisor = math.gcd(*whole.values())
    largest = max(abs(p) // divisor for p in whole.values())
    root = largest if largest > LARGEST_EXPONENT else 1
    return {key: Fraction(p, divisor * root) for key, p in whole.items()}


def _turned(powers: Powers, known: Known) -> Powers:
    """The product or its inverse: as the catalogue has it, else rates, speeds and fields in the numerator."""
    for _, product in known:
        ratio = _ratio(_expanded(powers), _expanded(product))
        if ratio:
            return powers if ratio > 0 else {key: -p for key, p in powers.items()}
    signs = {key: 1 if powers[key] > 0 else -1 for key in sorted(powers, key=_place)}
    weights = (
        sum(sign for key, sign in signs.items() if not _expanded(powers) and QUANTITIES[key].formula),
        sum(sign for key, sign in signs.items() if _place(key)[0] == _DYNAMIC),
        sum(signs.values()),
        next(iter(signs.values())),
    )
    turn = next(w for w in weights if w)
    return powers if turn > 0 else {key: -p for key, p in powers.items()}


def _plainness(powers: Powers, known: Known) -> tuple:
    """Sorts plain products before involved ones."""
    return (
        not any(powers == product for _, product in known), not _also(powers, known), len(powers),
        sum(abs(p) for p in powers.values()), sorted(_place(key) for key in powers),
    )  # fmt: skip


def _place(key: str) -> tuple[int, int]:
    return _PLACES_OF_KEYS.get(key, _PLACES.get(QUANTITIES[key].of, _REST)), _ORDER[key]


def _group(powers: Powers, known: Known) -> Group:
    ordered = sorted(powers.items(), key=lambda row: _place(row[0]))
    above = " * ".join(_factor(key, p) for key, p in ordered if p > 0) or "1"
    below = [_factor(key, -p) for key, p in ordered if p < 0]
    text = f"{above} / ({' * '.join(below)})" if len(below) > 1 else " / ".join([above, *below])
    return Group(text, tuple(ordered), _also(powers, known), "" if _expanded(powers) else _steady(text))


def _factor(key: str, power: Fraction) -> str:
    if power == 1:
        return key
    return f"{key}**{power}" if power.denominator == 1 else f"{key}**({power})"


def _steady(text: str) -> str:
    """Why a group is the same for all runs, with its value."""
    group = parse(text, QUANTITIES)
    values = dict.fromkeys(QUANTITIES, 1.0)
    values |= {key: parse(q.formula, QUANTITIES).value(values) for key, q in QUANTITIES.items() if q.formula}
    why = " and ".join(f"{k} is {QUANTITIES[k].formula}" for k in group.keys if QUANTITIES[k].formula)
    return f"always {group.value(values):.6g}, since {why}"


def _also(powers: Powers, known: Known) -> tuple[str, ...]:
    mine = _expanded(powers)
    return tuple(key for key, product in known if mine and _ratio(mine, _expanded(product)))


def _ratio(one: Powers, two: Powers) -> Fraction:
    """The power to which `two` is raised in `one`; 0 where they differ in more than a power."""
    if set(one) != set(two):
        return Fraction(0)
    ratios = {one[key] / two[key] for key in one}
    return ratios.pop() if len(ratios) == 1 else Fraction(0)


def _expanded(powers: Mapping[str, Fraction]) -> Powers:
    """The product with omega, nu and EI written out, so that equal products have equal exponents."""
    out: Powers = {}
    for key, power in powers.items():
        for inner, p in _written_out(key).items():
            out[inner] = out.get(inner, Fraction(0)) + power * p
    return {key: p for key, p in out.items() if p}


@lru_cache(maxsize=len(QUANTITIES))
def _written_out(key: str) -> Powers:
    return _monomial(parse(QUANTITIES[key].formula or key, QUANTITIES).tree)


def _products_of(numbers: Mapping[str, Number]) -> Known:
    """(number, its exponents made whole) of those numbers that are products of powers."""
    rows = ((key, _monomial(number.parsed.tree)) for key, number in numbers.items())
    return tuple((key, _whole(powers)) for key, powers in rows if powers and any(powers.values()))


def _monomial(node) -> Powers | None:
    """The exponents of a tree without sums, constants left aside; None for a tree with a sum."""
    match node:
        case Leaf(key=""):
            return {}
        case Leaf(key=key):
            return {key: Fraction(1)}
        case Power(base=base, exponent=exponent):
            inner = _monomial(base)
            return None if inner is None else {key: p * exponent for key, p in inner.items()}
        case Product(left=left, right=right, sign=sign):
            one, two = _monomial(left), _monomial(right)
            if one is None or two is None:
                return None
            turn = 1 if sign == "*" else -1
            return {key: one.get(key, Fraction(0)) + turn * two.get(key, Fraction(0)) for key in one | two}
        case Sum():
            return None
    raise Refusal("formula", node, "not a formula tree")
