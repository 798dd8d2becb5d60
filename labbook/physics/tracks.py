"""From a tracked video to a speed: reduction of positions in time to speed, beat and steadiness."""

from dataclasses import dataclass
from math import ceil, floor, hypot, log, log10, sqrt

import numpy as np

from labbook.errors import Refusal
from labbook.physics import track_axis, track_beat, track_drift, track_steadiness
from labbook.physics.track_cleaning import clean, gaps_and_lost
from labbook.physics.track_motion import Tail, Track, frequency
from labbook.physics.track_search import beat_and_outliers

OF_THE_BEAT = ("f_beat", "u_f_beat", "amplitude", "u_amplitude", "net_per_cycle", "u_net_per_cycle", "A_tip",
               "u_A_tip", "cycles", "excursion", "steadiness")  # fmt: skip


LENGTH_SEEN = sqrt(-2.0 * log(0.05))  # u: the root of chi-square with two degrees of freedom at 5 %
MOST_DECIMALS = 12


@dataclass(frozen=True, eq=False)
class Trace:
    """All readable frames, drift taken off: t in s, the rest in m; used: mask of those that were fitted."""

    t: np.ndarray
    x: np.ndarray
    y: np.ndarray
    along: np.ndarray
    lateral: np.ndarray
    fit: np.ndarray
    used: np.ndarray


@dataclass(frozen=True, eq=False)
class Reduction:
    """What a track says, SI; None where it does not: the beat's figures without a beat, A_tip without a tip.

    U_low, U_high: 95 % interval; u_: standard uncertainties; p_zero: two-sided, of no net motion;
    amplitude: half the beat along the axis, peak to peak; A_tip: peak to peak; cycles, frames: used; gaps:
    intervals longer than 1.5 frames, lost: frames they would have held; axis_from: 'given', 'body' or
    'velocity'; trimmed: leading cycles dropped; rejected: outlying frames; duplicates, unreadable: rows
    left out; excursion: greatest width of the path of one beat.
    """

    U: float
    u_U: float
    U_low: float
    U_high: float
    f_beat: float | None
    u_f_beat: float | None
    amplitude: float | None
    u_amplitude: float | None
    net_per_cycle: float | None
    u_net_per_cycle: float | None
    p_zero: float
    A_tip: float | None
    u_A_tip: float | None
    cycles: float | None
    frames: int
    gaps: int
    axis: tuple[float, float]
    drift: tuple[float, float]
    u_drift: tuple[float, float]
    axis_from: str
    trimmed: float
    rejected: int
    lost: int
    duplicates: int
    unreadable: int
    excursion: float | None
    steadiness: track_steadiness.Steadiness | None
    trace: Trace


def reduce(
    *, t, x, y, f=None, drift=None, axis=None, u_drift=None, still=None, heading=None,
    head_x=None, head_y=None, tip_x=None, tip_y=None, scale_u=0.0, time_u=0.0, trim="auto",
) -> Reduction:  # fmt: skip
    """Signed speed along the swimming axis, and the beat, from positions in time.

    t: s, in any order; x, y: m, one value a frame, NaN where lost. f: drive frequency, Hz, fitted where not
    given. drift: (vx, vy) in m/s with u_drift (ux, uy), or a Drift of track_drift; still: (t0, t1) at either
    end of the track in which the swimmer stood still, for the drift. axis: vector (x, y) towards the head;
    else the mean of heading (rad from x towards y), or of head_x, head_y (m, a point ahead of x, y); else
    the fitted velocity, with U >= 0 and p_zero that of the vector. tip_x, tip_y: tail tip, m. scale_u:
    relative standard uncertainty of the length scale, which joins every u of a length but not p_zero;
    time_u: that of the clock, which joins every u of a speed or fitted frequency. Both are taken to have
    served for the drift too. trim: 'auto' or leading cycles to drop.

    Uniform motion and four harmonics of the beat are fitted jointly, so a fractional cycle does no harm;
    outlying frames are left out; uncertainties allow for serial correlation (track_noise says how and why).
    Refuses what track_cleaning and track_search refuse: among it fewer than three cycles.
    """
    ahead = (
        {} if axis is not None else track_axis.ahead(x=x, y=y, heading=heading, head_x=head_x, head_y=head_y)
    )
    tip = {} if tip_x is None and tip_y is None else {"tip_x": tip_x, "tip_y": tip_y}
    scale_u, time_u = _share("scale_u", scale_u), _share("time_u", time_u)
    frames = clean(t=t, may_miss=(*tip, *ahead), x=x, y=y, **tip, **ahead)
    frames, moved = track_drift.apart(frames=frames, drift=drift, u_drift=u_drift, still=still)
    t, dt, columns = frames.t, frames.dt, frames.columns
    places = np.stack([columns["x"], columns["y"]])
    if any(moved.velocity):
        places -= np.outer(moved.velocity, t - t[0])
    tail = Tail(*(columns[k] - columns[k[-1]] for k in tip)) if tip else None
    found = beat_and_outliers(t=t, dt=dt, signals=np.stack([*places, *(tail.filled(t) if tail else ())]), f=f)
    body = {k: columns[k] for k in ahead}
    track = Track(t, dt, places, found.beat, axis, body, moved.u)
    trimmed = track_steadiness.asked_cycles(trim=trim, t=t, dt=dt, f=found.beat.f)
    motion = track.motion(found.kept & track.after(trimmed or 0.0))
    if trimmed is None:
        trimmed = track_steadiness.starting_cycles(
            extra=motion.line.extra, cycles=(t[-1] - t[0] + dt) * found.beat.f
        )
        if trimmed:
            motion = track.motion(found.kept & track.after(trimmed))
    return _told(frames, track, motion, found, tail, moved, trimmed, scale_u, time_u)


@dataclass(frozen=True)
class Closure:
    """Whether a control's path closes. net: return error a cycle, m; excursion: m; the rest as shares of it.

    ratio: of the net motion; bound: largest that the 95 % interval leaves possible; detection_limit: the
    least net motion that would have been seen, half that interval, or for an axis along the velocity, when a
    length is tested, the root of chi-square (two degrees of freedom, 5 %) times u; closes: whether none is
    seen at the 5 % level.
    """

    net: float
    excursion: float
    ratio: float
    bound: float
    detection_limit: float
    closes: bool
    sentence: str


def closure(*, reduction, excursion=None) -> Closure:
    """Return error of each cycle against the excursion, from a Reduction of a rigid, hinged or passive body.

    excursion: m, to compare with where the body itself does not beat; by default the width of its own
    beat's path. Purcell 1977: a reciprocal stroke without inertia closes, whatever its rates.
    """
    f = reduction.f_beat
    width = reduction.excursion if excursion is None else float(excursion)
    if f is None or width is None or not width > 0.0:
        raise Refusal(
            "excursion", excursion, "a closing path needs a beat and an excursion", "give f and excursion"
        )
    low, high = (U / f / width for U in (reduction.U_low, reduction.U_high))
    bound, closes, limit = max(abs(low), abs(high)), reduction.p_zero >= 0.05, 0.5 * (high - low)
    if reduction.axis_from == "velocity":
        limit = LENGTH_SEEN * reduction.u_U / f / width
    if closes:
        sentence = f"no net motion larger than {_up(100.0 * bound):.3g} % of the excursion at 95 %"
    else:
        digits = _decimals(100.0 * (high - low))
        motion, low, high = (f"{100.0 * one:.{digits}f}" for one in (reduction.U / f / width, low, high))
        sentence = f"net motion of {motion} % of the excursion a cycle, {low} to {high} % at 95 %"
    net = reduction.U / f
    return Closure(net, width, net / width, bound, limit, closes, sentence)


def _up(value):
    """value rounded up to two figures, so that the sentence stays true."""
    if value <= 0.0:
        return 0.0
    unit = 10.0 ** (floor(log10(value)) - 1)
    return ceil(value / unit - 1e-9) * unit


def _decimals(width):
    """As many as show two figures of an interval's width, so that its ends differ."""
    return min(MOST_DECIMALS, max(0, 1 - floor(log10(width)))) if width > 0.0 else 1


def _told(frames, track, motion, found, tail, moved, trimmed, scale_u, time_u):
    """The Reduction that the fits add up to."""
    e, line, f, used = motion.axis.direction, motion.line, track.beat.f, motion.used
    speed = line.speed.joined(hypot(e[0] * moved.u[0], e[1] * moved.u[1]))
    U = speed.mean
    scaled = speed.joined(hypot(scale_u, time_u) * abs(U))
    if motion.p_zero is None:
        p_zero, (low, high) = speed.p_zero(), (scaled.quantile(0.025), scaled.quantile(0.975))
    else:
        p_zero, (low, high) = motion.p_zero, track_axis.length_interval(speed=scaled)
        low = low if p_zero < 0.05 else 0.0
    beat = dict.fromkeys(OF_THE_BEAT)
    fit = motion.plane.at(t=track.t, line=line)
    if f is not None:
        tip = tail.fit(track, motion, found.signal is not None and found.signal >= 2) if tail else None
        f, u_f = frequency(track=track, motion=motion, tip=tip)
        span = float(track.t[used][-1] - track.t[used][0] + track.dt) * f
        size = line.swing.peak_to_peak
        # the clock that U and a fitted f are told by cancels in U/f
        of_net = speed.joined(scale_u * abs(U)).u if track.beat.fitted else scaled.u
        across = motion.plane.plain_beat(motion.across)
        beat |= {
            "f_beat": f, "u_f_beat": hypot(u_f, time_u * f) if track.beat.fitted else 0.0, "cycles": span,
            "amplitude": 0.5 * size.mean, "u_amplitude": 0.5 * hypot(size.u, scale_u * size.mean),
            "net_per_cycle": U / f, "u_net_per_cycle": hypot(of_net / f, U * u_f / f**2),
            "excursion": track_beat.widest(x=line.swing.coefficients, y=across),
            "steadiness": track_steadiness.steadiness(
                t=track.t[used], dt=track.dt, off=(motion.along - fit)[used], speed=U, f=f,
                trend=line.extra[0], u=hypot(scale_u, 2.0 * time_u),
            ),
        }  # fmt: skip
        if tip:
            beat |= {"A_tip": tip.peak_to_peak.mean,
                     "u_A_tip": hypot(tip.peak_to_peak.u, scale_u * tip.peak_to_peak.mean)}  # fmt: skip
    gaps, lost = gaps_and_lost(t=track.t[track.after(trimmed)], dt=track.dt)
    return Reduction(
        U=U, u_U=scaled.u, U_low=float(low), U_high=float(high), p_zero=p_zero, **beat,
        frames=int(used.sum()), gaps=gaps, axis=e, drift=moved.velocity, u_drift=moved.u,
        axis_from=motion.axis.source, trimmed=float(trimmed), rejected=int((~found.kept).sum()),
        lost=lost, duplicates=frames.duplicates,
        unreadable=frames.unreadable,
        trace=Trace(track.t, *track.places, motion.along, motion.lateral, fit, used),
    )  # fmt: skip


def _share(field, given):
    try:
        value = float(given)
    except (TypeError, ValueError):
        value = -1.0
    if not 0.0 <= value < 1.0:
        raise Refusal(field, given, "a relative standard uncertainty from 0 to 1 is needed")
    return value
