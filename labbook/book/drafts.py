"""Drafts: one record as typed, read and checked as far as it can be without the book."""

import hashlib
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import NamedTuple

from labbook.book.clock import read_date, read_moment
from labbook.book.records import Kind, kind
from labbook.errors import LabbookError, Refusal, Refusals
from labbook.registry.quantities import QUANTITIES
from labbook.registry.typed import Typed, printed, printed_uncertainty, read, read_uncertainty
from labbook.registry.written import shown

LONGEST_TEXT = 4_000
LONGEST_CODE = 64


@dataclass(frozen=True)
class Draft:
    """A record read from cells.

    texts: column -> text (dates and moments as stored); typed: column -> Typed; said: column -> the typed
    quantity as a text that reads the same anywhere; warned: (column, sentence) pairs that want a confirmation;
    entries: each typed quantity in JSON; told: each cell's column and content, in any order.
    """

    kind: str
    texts: dict[str, str]
    typed: dict[str, Typed]
    said: dict[str, str] = field(default_factory=dict)
    warned: tuple[tuple[str, str], ...] = ()
    entries: Sequence[str] = ()
    told: Sequence[str] = ()

    def stored(self) -> str:
        """The typed quantities as the book stores them, in JSON."""
        return "{" + ", ".join(self.entries) + "}"

    def document(self) -> dict[str, Typed]:
        """The typed quantities as stored: five fields each."""
        return dict(self.typed)

    def content(self) -> dict[str, str]:
        """Column -> text that says the same wherever it is typed, for comparing records."""
        return self.texts | self.said

    def fingerprint(self) -> str:
        """Digest of the content: equal for equal rows."""
        return hashlib.blake2b("\x1f".join(sorted(self.told)).encode(), digest_size=16).hexdigest()


class _Cell(NamedTuple):
    """What one cell's text came to: a text, a Typed with its printed form and warning, or a refusal."""

    text: str | None = None
    typed: Typed | None = None
    said: str = ""
    warning: str = ""
    entry: str = ""
    told: str = ""
    refusal: Refusal | None = None


_EMPTY = _Cell()


class DraftReader:
    """Reads many records of one kind from the same columns; a text that comes again is not read again.

    columns: the keys in the order of the cells ('' is passed over); units: column -> the header's unit.
    """

    def __init__(
        self, name: str, columns: Sequence[str], units: Mapping[str, str] | None = None,
        decimal_comma: bool = False,
    ):  # fmt: skip
        self.kind = kind(name)
        self.units = units or {}
        self.decimal_comma = decimal_comma
        self.columns = [(i, c, {}) for i, c in enumerate(columns) if c]
        self.in_order = all(i == place for place, (i, _, _) in enumerate(self.columns))
        self.key_at = next((i for i, c in enumerate(columns) if c == "key"), None)

    def read(self, cells: Sequence[str | None]) -> tuple[Draft, list[Refusal]]:
        """A draft from one row's cells, and everything that is refused in it; empty cells are absent."""
        texts: dict[str, str] = {}
        typed: dict[str, Typed] = {}
        said: dict[str, str] = {}
        warned, entries, told, refused = [], [], [], {}
        has_key = self.key_at is not None and self.key_at < len(cells)
        row_key = str(cells[self.key_at] or "").strip() if has_key else ""
        given = cells if self.in_order else [cells[i] for i, _, _ in self.columns if i < len(cells)]
        for (_, column, cache), written in zip(self.columns, given, strict=False):  # a short row ends early
            known = written if column != "value" else (row_key, written)
            try:
                cell = cache[known]
            except KeyError:
                cell = cache[known] = self._cell(column, written, row_key)
            if cell is _EMPTY:
                continue
            text, one, printed_, warning, entry, content, refusal = cell
            if text is not None:
                texts[column] = text
                told.append(content)
            elif one is not None:
                told.append(content)
                typed[column] = one
                said[column] = printed_
                entries.append(entry)
                if warning:
                    warned.append((column, warning))
            elif refusal is not None:
                refused[column] = refusal
        findings = list(refused.values())
        for column in self.kind.required:
            if column not in texts and column not in typed and column not in refused:
                if column == "value" and "key" in refused:
                    continue  # what a value is follows from its key
                reason = f"is missing, and every {self.kind.name} needs it"
                findings.append(Refusal(column, None, reason, _hint(self.kind, column)))
        findings += _impossible(self.kind.name, texts, typed)
        return Draft(self.kind.name, texts, typed, said, tuple(warned), entries, told), findings

    def _cell(self, column: str, written: str | None, row_key: str) -> _Cell:
        row, text = self.kind, "" if written is None else str(written).strip()
        if not text:
            return _EMPTY
        try:
            if column in row.typed:
                key = row.typed[column] or row_key
                if key not in QUANTITIES:
                    return _EMPTY  # the unknown key is refused at its own column
                one = read(key, text, self.units.get(column), self.decimal_comma)
                said = printed(key, one)
                return _Cell(
                    None, one, said, _implausible(column, key, one), _entry(column, one), f"{column}\x1e{said}"
                )
            if column in row.spreads:
                one = read_uncertainty(row.spreads[column], text, self.units.get(column))
                said = printed_uncertainty(one)
                return _Cell(None, one, said, "", _entry(column, one), f"{column}\x1e{said}")
            if column in row.texts:
                content = _text(row, column, text)
                return _Cell(content, told=f"{column}\x1e{content}")
        except Refusal as refusal:
            return _Cell(refusal=Refusal(column, refusal.typed, refusal.reason, refusal.remedy))
        return _Cell(refusal=Refusal(column, None, f"a {row.name} has no such column", _columns(row)))


def _entry(column: str, one: Typed) -> str:
    return f'"{column}": {json.dumps(one, ensure_ascii=False)}'


def read_draft(
    name: str,
    cells: Mapping[str, str | None],
    units: Mapping[str, str] | None = None,
    decimal_comma: bool = False,
) -> tuple[Draft, list[Refusal]]:
    """A draft of a record of kind `name` from cells (column -> text), and everything that is refused in it.

    units: column -> the header's unit. Empty cells are absent.
    """
    return DraftReader(name, list(cells), units, decimal_comma).read(list(cells.values()))


def whole(result: tuple[Draft, list[Refusal]]) -> Draft:
    """The draft if nothing in it is refused; else one LabbookError with every finding."""
    draft, findings = result
    if findings:
        raise all_of(findings)
    return draft


def all_of(findings: list[Refusal]) -> LabbookError:
    """One refusal as itself, several as one error."""
    return findings[0] if len(findings) == 1 else Refusals(findings)


def _columns(row: Kind) -> str:
    return f"it has {', '.join(row.columns)}"


def _hint(row: Kind, column: str) -> str:
    if column in row.words:
        return f"one of {', '.join(row.words[column])}"
    if column in row.moments:
        return "e.g. 2026-03-01T14:32"
    return ""


def _text(row: Kind, column: str, text: str) -> str:
    if column in row.words and text not in row.words[column]:
        raise Refusal(column, text, "is not known here", f"one of {', '.join(row.words[column])}")
    if column in row.dates:
        return read_date(column, text)
    if column in row.moments:
        return read_moment(column, text)
    named = column in ("code", "by", "series", "of") or column in row.refers
    if named and (len(text) > LONGEST_CODE or any(ord(c) < 32 for c in text)):
        raise Refusal(column, text[:40], f"must be one line of at most {LONGEST_CODE} characters")
    if len(text) > LONGEST_TEXT:
        raise Refusal(column, text[:40] + "...", f"is longer than {LONGEST_TEXT} characters")
    return text


def _impossible(name, texts, typed) -> list[Refusal]:
    """What no shelf or bench can hold, from the record alone."""

    def size(column):
        return typed[column].value if column in typed else None

    found = []
    if name == "swimmer":
        if size("L_tail") is not None and size("L_body") is not None and size("L_tail") > size("L_body"):
            found.append(Refusal("L_tail", typed["L_tail"].text, "the tail is longer than the body",
                                 "L_body is the overall length, head and tail together"))
        if size("d_in") is not None and size("D") is not None and size("d_in") >= size("D"):
            found.append(Refusal("d_in", typed["d_in"].text, "a tube's bore must be smaller than D"))
    if name == "reading" and "value" in typed:
        if typed["value"].u <= 0:
            found.append(Refusal("value", typed["value"].text, "a reading needs an uncertainty above zero"))
        if texts.get("key") in ("mu", "nu") and "T" not in typed:
            found.append(Refusal("T", None, "is missing: a viscosity without its temperature cannot be used"))
    if name == "run" and texts.get("state") == "void" and "why" not in texts:
        found.append(Refusal("why", None, "is missing: a void run says why"))
    if name == "run" and texts.get("state", "kept") == "kept" and "why" in texts:
        found.append(Refusal("why", texts["why"], "belongs to a void run", "put it into the note"))
    return found


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
