"""Drafts: one record as typed, read and checked as far as it can be without the book."""

from collections.abc import Iterable, Iterator, Mapping, Sequence
from hashlib import blake2b
from itertools import groupby, repeat, zip_longest
from operator import attrgetter
from typing import NamedTuple

from labbook.book.cells import EMPTY, Cell, CellsRead
from labbook.book.records import Kind, kind
from labbook.errors import LabbookError, Refusal, Refusals
from labbook.registry.typed import Typed


class Layout:
    """The columns that the cells of some drafts stand in, in the order in which they were given."""

    def __init__(self, kind: str, columns: Iterable[str]):
        self.kind, self.columns = kind, tuple(columns)
        self.place = {c: i for i, c in enumerate(self.columns)}
        self.by_name = [self.place[c] for c in sorted(self.columns)]


class Draft(NamedTuple):
    """A record read from cells: one a column of its layout."""

    layout: Layout
    cells: tuple[Cell, ...]

    @property
    def kind(self) -> str:
        """The kind of record."""
        return self.layout.kind

    def text(self, column: str) -> str | None:
        """The text in a column, dates and moments as stored; None for an empty one and for a quantity."""
        place = self.layout.place.get(column)
        return None if place is None else self.cells[place].text

    def quantity(self, column: str) -> Typed | None:
        """The quantity in a column; None for an empty one and for a text."""
        place = self.layout.place.get(column)
        return None if place is None else self.cells[place].typed

    @property
    def texts(self) -> dict[str, str]:
        """Column -> text, dates and moments as stored."""
        return {c: cell.text for c, cell in self._pairs() if cell.text is not None}

    @property
    def typed(self) -> dict[str, Typed]:
        """Column -> quantity."""
        return {c: cell.typed for c, cell in self._pairs() if cell.typed is not None}

    @property
    def warned(self) -> list[tuple[str, str]]:
        """(column, sentence) pairs that want a confirmation."""
        return [(c, cell.warning) for c, cell in self._pairs() if cell.warning]

    def _pairs(self):
        return zip(self.layout.columns, self.cells, strict=True)

    def document(self) -> dict[str, Typed]:
        """The typed quantities as stored: five fields each."""
        return self.typed

    def content(self) -> dict[str, str]:
        """Column -> text that says the same wherever it is typed, for comparing records."""
        return self.texts | {c: cell.said for c, cell in self._pairs() if cell.typed is not None}

    def fingerprint(self) -> str:
        """Digest of the content: equal for equal rows, in whatever order their columns stand."""
        return fingerprints([self])[0]

    def filled(self, **texts: str) -> "Draft":
        """The draft with these texts in columns that hold none."""
        missing = {c: Cell(text) for c, text in texts.items() if self.text(c) is None}
        cells = dict(self._pairs()) | missing
        return Draft(Layout(self.kind, cells), tuple(cells.values()))


def _by_layout(drafts: Iterable[Draft]) -> Iterator[tuple[Layout, list[tuple[Cell, ...]]]]:
    """Each stretch of drafts alike in layout: the layout and, a column each, their cells."""
    for layout, alike in groupby(drafts, key=attrgetter("layout")):
        yield layout, list(zip(*(draft.cells for draft in alike), strict=True))


def in_columns(drafts: Iterable[Draft]) -> dict[str, list[Cell]]:
    """Column -> one cell a draft, for the columns that any of the drafts has."""
    found: dict[str, list[Cell]] = {}
    n = 0
    for layout, columns in _by_layout(drafts):
        for column, cells in zip(layout.columns, columns, strict=True):
            found.setdefault(column, [EMPTY] * n).extend(cells)
        n += len(columns[0])
        for cells in found.values():
            cells += [EMPTY] * (n - len(cells))
    return found


def fingerprints(drafts: Iterable[Draft]) -> list[str]:
    """Digest of each draft's content: equal for equal rows, in whatever order their columns stand."""
    found = []
    for layout, columns in _by_layout(drafts):
        told = [[cell.told for cell in columns[i]] for i in layout.by_name]
        lines = ["\x1f".join(filter(None, row)) for row in zip(*told, strict=True)]
        found += [blake2b(line.encode(), digest_size=16).hexdigest() for line in lines]
    return found


def typed_in_json(drafts: Iterable[Draft]) -> list[str]:
    """The typed quantities of each draft as the book stores them."""
    found = []
    for _, columns in _by_layout(drafts):
        entries = [[cell.entry for cell in cells] for cells in columns]
        found += ["{" + ", ".join(filter(None, row)) + "}" for row in zip(*entries, strict=True)]
    return found


class DraftReader:
    """Reads many records of one kind from the same columns; a text that comes again is not read again.

    columns: the keys in the order of the cells ('' is passed over); units: column -> the header's unit.
    """

    def __init__(
        self, name: str, columns: Sequence[str], units: Mapping[str, str] | None = None,
        decimal_comma: bool = False,
    ):  # fmt: skip
        self.kind = kind(name)
        units = units or {}
        self.layout = Layout(name, [c for c in columns if c])
        self.width = len(columns)
        self.places = [i for i, c in enumerate(columns) if c]
        self.columns = [CellsRead(self.kind, c, units.get(c), decimal_comma) for c in self.layout.columns]
        self.doubts_all = name in ("swimmer", "reading") or not set(self.kind.required) <= set(columns)

    def read(self, rows: Sequence[Sequence[str | None]]) -> tuple[list[Draft], list[tuple[int, Refusal]]]:
        """Drafts of some rows' cells, and all that is refused in them with its row; empty cells are absent."""
        given = list(zip_longest(*rows))  # by column; what a short row lacks is absent
        nothing = [None] * len(rows)
        written = [given[i] if i < len(given) else nothing for i in self.places]
        read = []
        for column, texts in zip(self.columns, written, strict=True):
            if column.by_key:
                texts = zip(self._keys(written, nothing), texts, strict=True)
            read.append([column[text] for text in texts])
        cells = zip(*read, strict=True) if read else [()] * len(rows)
        drafts = list(map(Draft, repeat(self.layout), cells))
        return drafts, [(i, r) for i in self._doubtful(read, len(rows)) for r in self._findings(drafts[i])]

    def _keys(self, written, nothing) -> list[str]:
        """The text that each row has in its column `key`."""
        place = self.layout.place.get("key")
        return [str(text or "").strip() for text in (nothing if place is None else written[place])]

    def _doubtful(self, read: list[list[Cell]], n: int) -> Iterable[int]:
        """The rows in which something may be wrong: none in a clean sheet of runs."""
        if self.doubts_all:
            return range(n)
        doubted = [cells for column, cells in zip(self.columns, read, strict=True) if column.doubtful]
        return sorted({i for cells in doubted for i, cell in enumerate(cells) if cell.doubtful})

    def _findings(self, draft: Draft) -> list[Refusal]:
        """Everything that is refused in one row."""
        texts, typed = draft.texts, draft.typed
        cells = zip(self.layout.columns, draft.cells, strict=True)
        refused = {c: cell.refusal for c, cell in cells if cell.refusal is not None}
        findings = list(refused.values())
        for column in self.kind.required:
            if column not in texts and column not in typed and column not in refused:
                if column == "value" and "key" in refused:
                    continue  # what a value is follows from its key
                reason = f"is missing, and every {self.kind.name} needs it"
                findings.append(Refusal(column, None, reason, _hint(self.kind, column)))
        return findings + _impossible(self.kind.name, texts, typed)


def read_draft(
    name: str,
    cells: Mapping[str, str | None],
    units: Mapping[str, str] | None = None,
    decimal_comma: bool = False,
) -> tuple[Draft, list[Refusal]]:
    """A draft of a record of kind `name` from cells (column -> text), and everything that is refused in it.

    units: column -> the header's unit. Empty cells are absent.
    """
    (draft,), findings = DraftReader(name, list(cells), units, decimal_comma).read([list(cells.values())])
    return draft, [refusal for _, refusal in findings]


def whole(result: tuple[Draft, list[Refusal]]) -> Draft:
    """The draft if nothing in it is refused; else one LabbookError with every finding."""
    draft, findings = result
    if findings:
        raise all_of(findings)
    return draft


def all_of(findings: list[Refusal]) -> LabbookError:
    """One refusal as itself, several as one error."""
    return findings[0] if len(findings) == 1 else Refusals(findings)


def _hint(row: Kind, column: str) -> str:
    if column in row.words:
        return f"one of {', '.join(row.words[column])}"
    if column in row.moments:
        return "e.g. 2026-03-01T14:32"
    return ""


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
