"""Cells: what one text in one column comes to, read once however often it comes again."""

import json
from collections.abc import Callable
from functools import lru_cache
from math import nan

from labbook.book.clock import read_date, read_moment
from labbook.book.records import Kind
from labbook.errors import Refusal
from labbook.registry.quantities import QUANTITIES
from labbook.registry.typed import DIGITS, Typed, printed, printed_uncertainty, read, read_uncertainty
from labbook.registry.written import shown

LONGEST_TEXT = 4_000
LONGEST_CODE = 64
JUDGED_TOGETHER = ("state", "why")  # whether one of them stands depends on the other


class Cell:
    """What one cell's text came to: a text, a quantity, a refusal, or nothing at all.

    text: as stored (dates and moments too); typed: the quantity, said: as a text that reads the same
    anywhere, entry: in JSON; told: column and content; warning: a sentence that wants a confirmation;
    doubtful: the row that holds it has to be looked at as a whole;
    value, u, digits: the quantity as columns of facts take it (NaN absent; digits: no uncertainty was typed).
    """

    __slots__ = (
        "digits", "doubtful", "entry", "refusal", "said", "text", "told", "typed", "u", "value", "warning",
    )  # fmt: skip

    def __init__(
        self, text: str | None = None, typed: Typed | None = None, said: str = "", told: str = "",
        entry: str = "", warning: str = "", refusal: Refusal | None = None, doubtful: bool = False,
    ):  # fmt: skip
        self.text, self.typed, self.said, self.told = text, typed, said, told
        self.entry, self.warning, self.refusal, self.doubtful = entry, warning, refusal, doubtful
        if typed is None:
            self.value, self.u, self.digits = nan, 0.0, False
        else:
            self.value, self.u, self.digits = typed.value, typed.u, typed.origin == DIGITS


EMPTY = Cell()
MISSING = Cell(doubtful=True)  # empty in a column that every record of its kind needs


class CellsRead(dict):
    """The cells of one column by what is written there: `cells[text]` reads a text the first time it is met.

    Where a row's own key tells the quantity (`value` of a reading), it is asked for as cells[key, text].
    doubtful: whether a doubtful cell was met.
    """

    def __init__(self, row: Kind, column: str, unit: str | None = None, decimal_comma: bool = False):
        super().__init__()
        self.column = column
        self.by_key = row.typed.get(column) == ""
        self.doubtful = False
        self._empty = MISSING if column in row.required else EMPTY
        self._read = _reader(row, column, unit, decimal_comma)

    def __missing__(self, written) -> Cell:
        key, text = written if self.by_key else (None, written)
        text = "" if text is None else str(text).strip()
        try:
            if not text or (self.by_key and key not in QUANTITIES):
                cell = self._empty  # an unknown key is refused at its own column
            else:
                cell = self._read(text, key) if self.by_key else self._read(text)
        except Refusal as found:
            refusal = Refusal(self.column, found.typed, found.reason, found.remedy)
            cell = Cell(refusal=refusal, doubtful=True)
        self.doubtful = self.doubtful or cell.doubtful
        self[written] = cell
        return cell


def _reader(row: Kind, column: str, unit: str | None, decimal_comma: bool) -> Callable[..., Cell]:
    """What makes a cell of a text in this column, or refuses it."""
    if column in row.typed:

        def quantity(text: str, key: str = row.typed[column]) -> Cell:
            one = read(key, text, unit, decimal_comma)
            return _cell(column, one, printed(key, one), _implausible(column, key, one))

        return quantity
    if column in row.spreads:

        def spread(text: str) -> Cell:
            one = read_uncertainty(row.spreads[column], text, unit)
            return _cell(column, one, printed_uncertainty(one))

        return spread
    if column in row.texts:
        content, doubtful = _text_reader(row, column), column in JUDGED_TOGETHER

        def plain(text: str) -> Cell:
            text = content(text)
            return Cell(text, told=f"{column}\x1e{text}", doubtful=doubtful)

        return plain

    def nothing(text: str) -> Cell:
        raise Refusal(column, None, f"a {row.name} has no such column", f"it has {', '.join(row.columns)}")

    return nothing


def _cell(column: str, one: Typed, said: str, warning: str = "") -> Cell:
    # what json.dumps gives for the five, in a fifth of the time: a column may hold 100 000 of them
    entry = f'"{column}": [{_in_json()(one.text)}, "{one.unit}", {one.value!r}, {one.u!r}, "{one.origin}"]'
    return Cell(None, one, said, f"{column}\x1e{said}", entry, warning)


@lru_cache(maxsize=1)
def _in_json() -> Callable[[str], str]:
    return json.JSONEncoder(ensure_ascii=False).encode


def _text_reader(row: Kind, column: str) -> Callable[[str], str]:
    """What reads a text of this column as stored, or refuses it."""
    if column in row.words:
        return lambda text: _word(row, column, text)
    if column in row.dates:
        return lambda text: read_date(column, text)
    if column in row.moments:
        return lambda text: read_moment(column, text)
    if column in ("code", "by", "series", "of") or column in row.refers:
        return lambda text: _line(column, text)
    return lambda text: _short_enough(column, text)


def _word(row: Kind, column: str, text: str) -> str:
    if text not in row.words[column]:
        raise Refusal(column, text, "is not known here", f"one of {', '.join(row.words[column])}")
    return text


def _line(column: str, text: str) -> str:
    if len(text) > LONGEST_CODE or any(ord(c) < 32 for c in text):
        raise Refusal(column, text[:40], f"must be one line of at most {LONGEST_CODE} characters")
    return text


def _short_enough(column: str, text: str) -> str:
    if len(text) > LONGEST_TEXT:
        raise Refusal(column, text[:40] + "...", f"is longer than {LONGEST_TEXT} characters")
    return text


def _implausible(column: str, key: str, one: Typed) -> str:
    """The sentence for a value outside its quantity's plausible range, '' inside it."""
    quantity = QUANTITIES[key]
    if quantity.low <= one.value <= quantity.high:
        return ""
    low, high = (shown(key, v, None, one.unit) for v in (quantity.low, quantity.high))
    return (
        f"{column}: {one.text} lies outside the usual {low} to {high} for a "
        f"{quantity.kind or quantity.name}: is the unit right?"
    )
