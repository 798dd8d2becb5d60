"""One property of a batch for a block of runs: values, parts by source, sentences, extrapolation marks."""

from dataclasses import dataclass, field

import numpy as np

from labbook.book.shelf import Item


@dataclass
class Resolved:
    """One property for a block of runs: values, their parts by source, sentences, extrapolation marks.

    value: SI array, NaN where absent; parts: source -> array; said: sentence of each run; beyond: bool array.
    """

    value: np.ndarray
    parts: dict[str, np.ndarray] = field(default_factory=dict)
    said: np.ndarray | None = None
    beyond: np.ndarray | None = None

    @classmethod
    def empty(cls, n: int, why: str) -> "Resolved":
        said = np.empty(n, dtype=object)
        said[:] = f"absent: {why}"  # one text for all; np.full would make a new one for each run
        return cls(np.full(n, np.nan), {}, said, np.zeros(n, bool))

    def put(self, rows, value, parts, said, beyond) -> None:
        """Write a group of rows; sources that the group lacks stay zero there."""
        self.value[rows] = value
        for source, part in parts.items():
            if source not in self.parts:
                self.parts[source] = np.zeros(len(self.value))
            self.parts[source][rows] = part
        self.said[rows] = said
        self.beyond[rows] = beyond


def kind(item: Item) -> str:
    """The fluid's kind as a sentence needs it."""
    return {"measured": "a measured fluid"}.get(item.texts["kind"], str(item.texts["kind"]))
