"""Simulated tracks with a known speed, and the table of what a reduction makes of them.

`python tests/truth/simulated_tracks.py [--tracks 1000] [--fitted 1000] [--jobs 2]` prints coverage, bias
and false alarms of `tracks.reduce` for every kind of noise at 5, 10 and 30 cycles, and the same for end
points over time and for the mean of |v|. Units: mm, s; the beat is 2 Hz at 30 frames a cycle, 1 mm along
the axis and 2 mm across it.
"""

import argparse
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass, field

import numpy as np
from scipy.signal import lfilter

from labbook.physics import tracks

F = 2.0  # Hz
PER_CYCLE = 30  # frames
SIGMA = 0.1  # mm
ALONG, ACROSS = 1.0, 2.0  # mm, amplitudes of the beat
SPEED = 0.4  # mm/s
CYCLES = (5, 10, 30)


@dataclass(frozen=True)
class Kind:
    """One kind of noise: white: mm; wobble: mm; tau: beats (inf: a random walk of that size a beat);
    fraction: whether the record ends within a cycle; lost, outliers: shares of the frames; drift: u of it,
    mm/s."""

    white: float = 0.0
    wobble: float = 0.0
    tau: float = 0.3
    fraction: bool = False
    lost: float = 0.0
    outliers: float = 0.0
    drift: float = 0.0


KINDS = {
    "white": Kind(white=SIGMA),
    "wobble, tau 0.1 beat": Kind(wobble=SIGMA, tau=0.1),
    "wobble, tau 0.3 beat": Kind(wobble=SIGMA, tau=0.3),
    "wobble, tau 1 beat": Kind(wobble=SIGMA, tau=1.0),
    "wobble and white": Kind(white=0.3 * SIGMA, wobble=SIGMA, tau=0.3),
    "white, fractional cycle": Kind(white=SIGMA, fraction=True),
    "wobble, fractional cycle": Kind(wobble=SIGMA, fraction=True),
    "white, 5 % lost": Kind(white=SIGMA, lost=0.05),
    "wobble, 5 % lost": Kind(wobble=SIGMA, lost=0.05, fraction=True),
    "white, 3 % outliers": Kind(white=SIGMA, outliers=0.03),
    "wobble, 3 % outliers": Kind(wobble=SIGMA, outliers=0.03, fraction=True),
    "white, drift": Kind(white=SIGMA, drift=0.02),
    "wobble, drift": Kind(wobble=SIGMA, drift=0.02, fraction=True),
}
HARDER = {
    "white and weak wobble": Kind(white=SIGMA, wobble=0.4 * SIGMA, tau=0.15, fraction=True),
    "white as large as wobble": Kind(white=SIGMA, wobble=SIGMA, tau=0.3, fraction=True),
    "random walk": Kind(wobble=SIGMA, tau=np.inf, fraction=True),
    "random walk and white": Kind(white=0.5 * SIGMA, wobble=SIGMA, tau=np.inf, fraction=True),
}


@dataclass(frozen=True, eq=False)
class Simulated:
    """t in s, x and y in mm; known: what the experimenter knows, as arguments of reduce."""

    t: np.ndarray
    x: np.ndarray
    y: np.ndarray
    known: dict = field(default_factory=dict)


def noise(rng, kind, n, per_cycle=PER_CYCLE):
    """One component's noise on n frames, mm."""
    e = kind.white * rng.normal(size=n)
    if not kind.wobble:
        return e
    if np.isinf(kind.tau):
        return e + kind.wobble / np.sqrt(per_cycle) * np.cumsum(rng.normal(size=n))
    phi = np.exp(-1.0 / (kind.tau * per_cycle))
    warm = int(12.0 * kind.tau * per_cycle) + 2
    shocks = kind.wobble * np.sqrt(1.0 - phi**2) * rng.normal(size=n + warm)
    return e + lfilter([1.0], [1.0, -phi], shocks)[warm:]


def simulate(rng, kind, cycles, speed=SPEED, per_cycle=PER_CYCLE) -> Simulated:
    """A swimmer along +x with a beat of two harmonics along and one across, random phases, and a kind of
    noise."""
    cycles = cycles + (rng.uniform(0.1, 0.9) if kind.fraction else 0.0)
    n = round(cycles * per_cycle)
    t = np.arange(n) / (F * per_cycle)
    phase = 2.0 * np.pi * (F * t + rng.uniform())
    x = (
        speed * t
        + ALONG * np.cos(phase)
        + 0.3 * ALONG * np.cos(2.0 * phase + 1.0)
        + noise(rng, kind, n, per_cycle)
    )
    y = ACROSS * np.sin(phase) + noise(rng, kind, n, per_cycle)
    known = {}
    if kind.drift:
        stated = rng.normal(0.0, 0.5, 2)
        true = stated + kind.drift * rng.normal(size=2)
        x, y = x + true[0] * t, y + true[1] * t
        known = {"drift": tuple(stated), "u_drift": (kind.drift, kind.drift)}
    if kind.outliers:
        out = rng.random(n) < kind.outliers
        x[out] += rng.choice([-1.0, 1.0], out.sum()) * rng.uniform(0.5, 20.0, out.sum())
        y[out] += rng.choice([-1.0, 1.0], out.sum()) * rng.uniform(0.5, 20.0, out.sum())
    if kind.lost:
        kept = rng.random(n) >= kind.lost
        t, x, y = t[kept], x[kept], y[kept]
    return Simulated(t, x, y, known)


def end_points(s):
    """(speed, low, high) from the first and last frame, with the 95 % interval that the scatter suggests."""
    T = s.t[-1] - s.t[0]
    U = (s.x[-1] - s.x[0]) / T
    scatter = np.std(s.x - np.polyval(np.polyfit(s.t, s.x, 1), s.t))
    return U, U - 1.96 * np.sqrt(2.0) * scatter / T, U + 1.96 * np.sqrt(2.0) * scatter / T


def mean_of_size(s):
    """(speed, low, high) as the mean of |v| from frame to frame, with its standard error."""
    v = np.abs(np.diff(s.x) / np.diff(s.t))
    half = 1.96 * v.std() / np.sqrt(len(v))
    return v.mean(), v.mean() - half, v.mean() + half


@dataclass(frozen=True)
class Cell:
    """covered: share of 95 % intervals that hold the true speed; bias: over mean u; error: root mean square over
    the true speed; given, fitted: shares called swimming without speed, by where the axis is from."""

    covered: float
    bias: float
    u_over_scatter: float
    error: float
    given: float
    fitted: float


def cell(kind, cycles, number, seed, fitted):
    """The Cell of one kind and number of cycles: `number` tracks with speed and without, `fitted` by fitted
    axis."""
    rng = np.random.default_rng(seed)
    U, u, covered, given, axis_fitted = [], [], [], [], []
    for k in range(number):
        s = simulate(rng, kind, cycles)
        r = tracks.reduce(t=s.t, x=s.x, y=s.y, f=F, axis=(1.0, 0.0), **s.known)
        U.append(r.U)
        u.append(r.u_U)
        covered.append(r.U_low <= SPEED <= r.U_high)
        still = simulate(rng, kind, cycles, speed=0.0)
        common = {"t": still.t, "x": still.x, "y": still.y, "f": F, **still.known}
        given.append(tracks.reduce(axis=(1.0, 0.0), **common).p_zero < 0.05)
        if k < fitted:
            axis_fitted.append(tracks.reduce(**common).p_zero < 0.05)
    bias = (np.mean(U) - SPEED) / np.mean(u)
    return Cell(float(np.mean(covered)), float(bias), float(np.mean(u) / np.std(U)), _error(U),
                float(np.mean(given)), float(np.mean(axis_fitted)))  # fmt: skip


def _error(speeds):
    return float(np.sqrt(np.mean((np.array(speeds) / SPEED - 1.0) ** 2)))


def today(kind, cycles, how, tracks_a_cell, seed):
    """(covered, root mean square error over true speed, called swimming without speed) of one of today's ways."""
    rng = np.random.default_rng(seed)
    moving = [how(simulate(rng, kind, cycles)) for _ in range(tracks_a_cell)]
    still = [how(simulate(rng, kind, cycles, speed=0.0)) for _ in range(tracks_a_cell)]
    covered = np.mean([low <= SPEED <= high for _, low, high in moving])
    called = np.mean([not low <= 0.0 <= high for _, low, high in still])
    return covered, _error([U for U, _, _ in moving]), called


def _row(job):
    name, kind, cycles, number, fitted = job
    c = cell(kind, cycles, number, [cycles, len(name), sum(map(ord, name))], fitted)
    line = f"| {name} | {cycles} | {100 * c.covered:.1f} | {c.bias:+.3f} | {c.u_over_scatter:.2f} "
    line += f"| {100 * c.error:.1f} | {100 * c.given:.1f} | {100 * c.fitted:.1f} |"
    for how in (end_points, mean_of_size):
        covered, error, called = today(kind, cycles, how, number, seed=cycles)
        line += f" {100 * covered:.0f}, {100 * error:.0f}, {100 * called:.0f} |"
    return line


def main():
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--tracks", type=int, default=1000, help="tracks a cell")
    parser.add_argument(
        "--fitted", type=int, default=1000, help="of these, tracks with the axis fitted as well"
    )
    parser.add_argument("--jobs", type=int, default=1, help="processes")
    parser.add_argument("--harder", action="store_true", help="the kinds that are not promised")
    parser.add_argument("--only", default="", help="kinds that contain this text")
    parser.add_argument("--cycles", type=int, nargs="*", default=CYCLES, help="cycles to a record")
    given = parser.parse_args()
    kinds = HARDER if given.harder else KINDS
    jobs = [
        (name, kind, cycles, given.tracks, given.fitted)
        for name, kind in kinds.items()
        if given.only in name
        for cycles in given.cycles
    ]
    print("| noise | cycles | covered % | bias/u | u/scatter | error % | still called swimming %: axis given "
          "| axis fitted | end points: covered, error, called swimming % | mean of size of v: the same |")  # fmt: skip
    print("|---" * 10 + "|")
    with ProcessPoolExecutor(given.jobs) as pool:
        for line in pool.map(_row, jobs):
            print(line, flush=True)


if __name__ == "__main__":
    main()
