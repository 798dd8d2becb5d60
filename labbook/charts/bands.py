"""The regime bands that overlap an axis, with limits cut to it."""

import math
from collections.abc import Iterable
from dataclasses import dataclass

from labbook.charts.palette import band_hue
from labbook.registry.regimes import REGIMES, Regime


@dataclass(frozen=True)
class Band:
    """A regime as drawn: from low to high within the axis, in its hue; own_*: its limit lies inside."""

    name: str
    low: float
    high: float
    hue: str
    own_low: bool
    own_high: bool
    regime: Regime


def bands_of(key: str, low: float, high: float, regimes: Iterable[Regime] | None = None) -> list[Band]:
    """The bands of a number that overlap low to high, in ascending order; a key without regimes has none."""
    rows = sorted(_on(key, regimes), key=lambda r: (r.low, r.high))
    return [
        Band(r.name, max(r.low, low), min(r.high, high), band_hue(r, i), r.low > low, r.high < high, r)
        for i, r in enumerate(rows)
        if r.low < high and r.high > low
    ]


def limits_of(key: str, regimes: Iterable[Regime] | None = None) -> list[float]:
    """The finite limits of a number's regimes, ascending."""
    return sorted({v for r in _on(key, regimes) for v in (r.low, r.high) if math.isfinite(v)})


def _on(key: str, regimes: Iterable[Regime] | None) -> list[Regime]:
    """The regimes on this number alone: one on two numbers has no place on a single axis."""
    chosen = REGIMES.values() if regimes is None else regimes
    return [r for r in chosen if r.numbers == (key,)]
