"""Which set of readings serves a day: the nearest in time, before or after, the earlier on a tie."""

from dataclasses import dataclass
from datetime import date

import numpy as np

from labbook.book.shelf import Reading

ANY_TIME = 10**9  # the distance of a set that nothing dates: it serves only where no dated set does


@dataclass(frozen=True)
class ReadingSet:
    """All readings of one batch with the same date (None: undated) that answer the same question."""

    on: str | None
    readings: tuple[Reading, ...]

    @property
    def day(self) -> str:
        return f"of {self.on}" if self.on else "without date"


def sets_of(readings, keys: tuple[str, ...], made: str | None) -> list[ReadingSet]:
    """The sets of the readings with these keys, oldest first; an undated reading takes the batch's date."""
    groups: dict[str | None, list[Reading]] = {}
    for reading in readings:
        if reading.key in keys:
            groups.setdefault(reading.on or made, []).append(reading)
    ordered = sorted(groups, key=lambda on: on or "")
    return [ReadingSet(on, tuple(groups[on])) for on in ordered]


def nearest(sets: list[ReadingSet], days: np.ndarray) -> np.ndarray:
    """Index of the set that serves each day (ordinals of local dates); -1 where there is none."""
    if not sets:
        return np.full(len(days), -1)
    dates = np.array([date.fromisoformat(s.on).toordinal() if s.on else -ANY_TIME for s in sets])
    # a day halfway goes to the earlier of its neighbours
    return np.searchsorted((dates[1:] + dates[:-1]) / 2, days, side="left")
