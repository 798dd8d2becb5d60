"""A group's own number as the texts of a form: what reading these cells would make again, to the last bit."""

from collections.abc import Iterator

from labbook.errors import Refusal
from labbook.registry.catalogue import Number
from labbook.registry.own_numbers import read_answer
from labbook.registry.quantities import QUANTITIES


def cells_of(number: Number) -> dict[str, str]:
    """The form's fields for a number, key to answer, as one would type them."""
    return {
        "key": number.key, "symbol": "" if number.symbol == number.key else number.symbol,
        "name": number.name, "formula": number.formula, "compares": number.compares, "source": number.source,
        "example": _example(number), "answer": _answer(number),
    }  # fmt: skip


def _example(number: Number) -> str:
    """'mu = 1.0 Pa.s, f = 2.0 Hz'; what follows from the others is left out, as it follows again."""
    kept = [k for k in number.example if not _follows(k, number)]
    return ", ".join(f"{k} = {number.example[k]!r} {QUANTITIES[k].unit}".removesuffix(" 1") for k in kept)


def _follows(key: str, number: Number) -> bool:
    row = QUANTITIES[key]
    words = row.formula.replace("(", " ").replace(")", " ").split()
    needed = [word for word in words if word in QUANTITIES]
    return bool(needed) and all(k in number.example for k in needed)


def _answer(number: Number) -> str:
    """The shortest text that reads as this answer, known as well as it was written."""
    for text in _writings(number.answer):
        try:
            if read_answer(text) == (number.answer, number.tolerance):
                return text
        except Refusal:  # too few digits yet
            continue
    return repr(number.answer)


def _writings(value: float) -> Iterator[str]:
    yield from (f"{value:.{digits}f}" for digits in range(18))
    yield from (f"{value:.{digits}e}" for digits in range(18))
