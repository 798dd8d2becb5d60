"""Drafts: one record as typed, read and checked as far as it can be without the book."""

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass, field

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

    texts: column -> text (dates and moments as stored); typed: column -> Typed; warned: (column, sentence)
    pairs that want a confirmation.
    """

    kind: str
    texts: dict[str, str]
    typed: dict[str, Typed]
    warned: tuple[tuple[str, str], ...] = field(default=())

    def document(self) -> dict[str, list]:
        """The typed quantities as stored."""
        return {k: t.row() for k, t in self.typed.items()}

    def content(self) -> dict[str, str]:
        """Column -> text that says the same wherever it is typed, for comparing records."""
        keys = kind(self.kind).typed
        of_key = self.texts.get("key", "")
        cells = dict(self.texts)
        for column, typed in self.typed.items():
            key = keys.get(column) or of_key
            stated = column not in keys
            cells[column] = printed_uncertainty(typed) if stated else printed(key, typed)
        return cells

    def fingerprint(self) -> str:
        """Digest of the content: equal for equal rows."""
        told = "\x1f".join(f"{k}\x1e{v}" for k, v in sorted(self.content().items()))
        return hashlib.blake2b(told.encode(), digest_size=16).hexdigest()


def read_draft(
    name: str,
    cells: Mapping[str, str | None],
    units: Mapping[str, str] | None = None,
    decimal_comma: bool = False,
) -> tuple[Draft, list[Refusal]]:
    """A draft of a record of kind `name` from cells (column -> text), and everything that is refused in it.

    units: column -> the header's unit. Empty cells are absent.
    """
    row, findings = kind(name), []
    texts: dict[str, str] = {}
    typed: dict[str, Typed] = {}
    units = units or {}
    given = {c: str(v).strip() for c, v in cells.items() if v is not None and str(v).strip()}
    for column in given:
        if column not in row.columns:
            findings.append(Refusal(column, None, f"a {name} has no such column", _columns(row)))
    for column in row.required:
        if column not in given:
            findings.append(Refusal(column, None, f"is missing, and every {name} needs it", _hint(row, column)))
    for column, text in given.items():
        try:
            if column in row.typed:
                key = row.typed[column] or given.get("key", "")
                if key in QUANTITIES:
                    typed[column] = read(key, text, units.get(column), decimal_comma)
            elif column in row.spreads:
                typed[column] = read_uncertainty(row.spreads[column], text, units.get(column))
            elif column in row.texts:
                texts[column] = _text(row, column, text)
        except Refusal as refusal:
            reason = Refusal(column, refusal.typed, refusal.reason, refusal.remedy)
            findings.append(reason)
    findings += _impossible(name, texts, typed)
    return Draft(name, texts, typed, tuple(_implausible(row, texts, typed))), findings


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


def _implausible(row: Kind, texts, typed):
    """(column, sentence) for each value outside its quantity's plausible range."""
    for column, one in typed.items():
        key = row.typed.get(column, "") or texts.get("key", "")
        if column in row.spreads or key not in QUANTITIES:
            continue
        quantity = QUANTITIES[key]
        if not quantity.low <= one.value <= quantity.high:
            low, high = (shown(key, v, None, one.unit) for v in (quantity.low, quantity.high))
            yield (
                column,
                f"{column}: {one.text} lies outside the usual {low} to {high} for a "
                f"{quantity.kind or quantity.name}: is the unit right?",
            )
