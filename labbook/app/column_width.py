"""How wide a column of the table of runs must be, so that nothing in it is cut."""

import math
from collections.abc import Iterable

# pixels in the table's font, a little more than it takes: a narrow, a wide and any other letter, a cell's edges
NARROW, WIDE, LETTER, EDGES = 4.5, 12, 7, 18
NARROW_LETTERS, WIDE_LETTERS = frozenset(" .,()-/il"), frozenset("mwMW%")


def wide_enough(label: str, cells: Iterable[str]) -> int:
    """Pixels of a column in which neither its heading nor its longest written cell is cut."""
    return math.ceil(EDGES + max(map(_pixels, (label, *cells))))


def _pixels(text: str) -> float:
    narrow, wide = sum(c in NARROW_LETTERS for c in text), sum(c in WIDE_LETTERS for c in text)
    return NARROW * narrow + WIDE * wide + LETTER * (len(text) - narrow - wide)
