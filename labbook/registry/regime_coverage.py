"""What a number's regimes cover together: stretches covered twice or not at all, as intervals and words."""

from collections.abc import Iterable
from dataclasses import dataclass

from labbook.registry.regimes import INF, Band, Regime, interval_words


@dataclass(frozen=True)
class Stretch:
    """An interval of a number, or one point (low = high), and the regimes that cover it."""

    number: str
    low: float
    high: float
    low_closed: bool
    high_closed: bool
    regimes: tuple[str, ...]

    @property
    def words(self) -> str:
        """'0.1 <= Sp < 1', or 'Sp = 1' for a point."""
        return interval_words(self.number, self.low, self.high, self.low_closed, self.high_closed)

    @property
    def sentence(self) -> str:
        """Which regimes cover the interval, as a page says it."""
        if not self.regimes:
            return f"no regime covers {self.words}"
        *first, last = (repr(name) for name in self.regimes)
        if not first:
            return f"{last} covers {self.words}"
        return f"{', '.join(first)} and {last} {'both' if len(first) == 1 else 'all'} cover {self.words}"


def overlaps(regimes: Iterable[Regime], number: str) -> list[Stretch]:
    """The stretches that more than one regime covers, ascending.

    Only regimes on this number alone count: one on two numbers is meant to lie across the others.
    """
    return [s for s in _stretches(regimes, number) if len(s.regimes) > 1]


def gaps(regimes: Iterable[Regime], number: str) -> list[Stretch]:
    """The stretches between the lowest and the highest limit that no regime covers, ascending."""
    return [s for s in _stretches(regimes, number) if not s.regimes]


def covered(regimes: Iterable[Regime], number: str) -> str:
    """From where to where the number's regimes reach: '0.2 <= St <= 0.4', 'every Sp', '' where it has none.

    Gaps between them are left aside.
    """
    bands = [band for _, band in _alone(regimes, number)]
    if not bands:
        return ""
    low, high = min(b.low for b in bands), max(b.high for b in bands)
    low_closed = any(b.low_closed for b in bands if b.low == low)
    high_closed = any(b.high_closed for b in bands if b.high == high)
    return interval_words(number, low, high, low_closed, high_closed)


def _alone(regimes: Iterable[Regime], number: str) -> list[tuple[str, Band]]:
    return [(r.name, r.bands[0]) for r in regimes if r.numbers == (number,)]


def _stretches(regimes: Iterable[Regime], number: str) -> list[Stretch]:
    """The number's axis from the lowest to the highest limit, cut wherever the covering regimes change."""
    rows = _alone(regimes, number)
    if not rows:
        return []
    low, high = min(b.low for _, b in rows), max(b.high for _, b in rows)
    limits = sorted({v for _, b in rows for v in (b.low, b.high)} - {-INF, INF})
    ends = [-INF, *limits, INF]
    found: list[Stretch] = []
    for i, end in enumerate(ends):
        # the point at each limit, then the open interval up to the next
        pieces = [(end, end)] if i and end < INF else []
        pieces += [(end, ends[i + 1])] if end < INF else []
        for left, right in pieces:
            point = left == right
            names = tuple(
                name for name, b in rows if (b.holds(left) if point else b.low <= left and right <= b.high)
            )
            outside = right <= low or left >= high
            if outside and not names:
                continue
            if found and found[-1].regimes == names and found[-1].high == left:
                start = found.pop()
                found.append(Stretch(number, start.low, right, start.low_closed, point, names))
            else:
                found.append(Stretch(number, left, right, point, point, names))
    return found
