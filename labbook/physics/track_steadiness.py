"""Whether a swimmer was up to speed: start-up cycles, speed a cycle, trend."""

from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal
from labbook.physics.track_beat import FEWEST_CYCLES
from labbook.physics.track_rows import bin_starts

MOST_STARTING = 4  # cycles, and never more than a third of the record
LEAST_STEP = 1.0 / 400.0  # of the record
MISSING = 0.1  # of the last cycle, which counts all the same
NEEDLESS = 1e-3  # share of steady records that lose cycles to the rule


@dataclass(frozen=True, eq=False)
class Steadiness:
    """per_cycle: m/s, between neighbouring whole cycles; trend: of the speed, m/s2, with u and p of none."""

    per_cycle: np.ndarray
    trend: float
    u_trend: float
    p_trend: float


def rows(*, start, end, f):
    """Callables t -> row for a steady change of speed and for 1, 2, ... leading steps at a speed of
    their own.

    start, end: s; f: Hz. The first is (t - middle)^2; the others are min(t - end of the leading steps, 0).
    """
    middle, cycles = 0.5 * (start + end), (end - start) * f
    step = cycles_a_step(cycles=cycles)
    leading = range(1, 1 + min(MOST_STARTING, int(cycles / 3.0 + 1e-6)))
    return (lambda t: (t - middle) ** 2, *(_hinge(start + m * step / f) for m in leading))


def cycles_a_step(*, cycles):
    """Whole cycles that are dropped together: one, or in a long record a quarter of a per cent of it."""
    return max(1, int(np.ceil(cycles * LEAST_STEP - 1e-6)))


def _hinge(end):
    return lambda t: np.minimum(t - end, 0.0)


def starting_cycles(*, extra, cycles):
    """How many leading cycles to drop, from the fitted `rows`: a stated rule.

    cycles: of the record. Of 1 to 4 leading cycles (a third of the record at most; `cycles_a_step` at a
    time in a long one) the number is taken whose common speed differs most from that of the rest, if chance
    alone makes such a difference in less than one steady record in a thousand (0.001 shared among the
    numbers tried) and if a steady change of speed does not explain the record better.
    """
    leading = extra[1:]
    if not leading:
        return 0
    from_trend, *distance = (_distance(one) for one in extra)
    most = int(np.argmax(distance))
    if leading[most].p_zero() < NEEDLESS / len(leading) and distance[most] > from_trend:
        return (most + 1) * cycles_a_step(cycles=cycles)
    return 0


def _distance(one):
    """From zero in standard uncertainties; of what is zero without any, none."""
    if one.u > 0.0:
        return abs(one.mean) / one.u
    return np.inf if one.mean else 0.0


def asked_cycles(*, trim, t, dt, f):
    """Leading cycles to drop as asked for: a number from 0 that leaves three; None where the rule is to say.

    trim: 'auto' or a number; t: s; f: Hz, or None without a beat, when no cycle can be dropped.
    """
    if isinstance(trim, str) and trim == "auto":
        return 0.0 if f is None else None
    try:
        asked = float(trim)
    except (TypeError, ValueError):
        raise Refusal("trim", trim, "'auto' or a number of cycles is needed") from None
    cycles = 0.0 if f is None else (t[-1] - t[0] + dt) * f
    if asked and not 0.0 < asked <= cycles - FEWEST_CYCLES:
        raise Refusal("trim", trim, f"the record has {cycles:.3g} cycles and must keep three")
    return asked


def steadiness(*, t, dt, off, speed, f, trend, u) -> Steadiness:
    """Speed a cycle and trend: off, distance from the fit in m at t (s), frame interval dt; speed: of the
    fit, m/s; f: Hz; trend: of `rows`; u: relative, of what scales it.

    A cycle's place is the mean of its frames' distance from the fit, so that lost frames do not shift it.
    The last counts if a tenth of it is missing at most: a fitted f may make ten cycles look like 9.99.
    """
    starts = bin_starts(t=t, width=1.0 / f)
    means = np.add.reduceat(off, starts) / np.diff(np.append(starts, len(t)))
    cycle = np.floor((t[starts] - t[0]) * f + 1e-6).astype(np.int64)
    whole = int((t[-1] - t[0] + dt) * f + MISSING)
    places, inside = np.full(whole, np.nan), cycle < whole
    places[cycle[inside]] = means[inside]
    change = trend.times(2.0)
    u_trend = float(np.hypot(change.u, u * change.mean))
    return Steadiness(speed + np.diff(places) * f, change.mean, u_trend, change.p_zero())
