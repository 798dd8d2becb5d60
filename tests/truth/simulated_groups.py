"""Simulated groups of swimmers with a known maximum, and the table of what a fit makes of them.

`python tests/truth/simulated_groups.py [--groups 500] [--jobs 2]` prints how often the 95 % intervals of
`trend_maximum.maximum` hold the true location and height, for 3 to 12 swimmers of 1 to 4 batches, and how
often those of a fit that ignores sharing do. The truth is the linear speed of a free head with b/L = 0.1 and
R/(zeta_n L) = 0.766, highest at Sp = 2.090123.
"""

import argparse
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass

import numpy as np

from labbook.physics import tails, trend_maximum, trend_points

SP_TOP = 2.090123  # physics.md section 8
HEAD, HEAD_DRAG = 0.1, 0.766


def true_y(Sp):
    """Speed over its own maximum."""
    return _force(Sp) / _force(SP_TOP)


def _force(Sp):
    return tails.response(drive="free_head_angle", Sp=Sp, head=HEAD, head_drag=HEAD_DRAG).force


@dataclass(frozen=True)
class Kind:
    """A group: relative standard uncertainties in x and y. modulus: of a batch, in Sp (a quarter of that of
    E); fluid: of each of four fluids, in Sp; size: of a swimmer, in Sp; camera: of all, in y; build: what
    swimmers differ by in y and nobody states; own_x, own_y: of a run; unstated: own error of y over the
    stated; absolute: whether the own u of y is one for all runs; uneven: runs per swimmer differ up to
    tenfold."""

    swimmers: int
    batches: int
    modulus: float = 0.025
    fluid: float = 0.005
    size: float = 0.01
    camera: float = 0.01
    build: float = 0.02
    own_x: float = 0.005
    own_y: float = 0.05
    unstated: float = 1.0
    absolute: bool = False
    uneven: bool = False
    runs: int = 25


KINDS = {
    f"{S} swimmers, {B} batch{'es' * (B > 1)}": Kind(S, B)
    for S, B in (
        (3, 1),
        (3, 2),
        (3, 3),
        (4, 2),
        (5, 1),
        (5, 2),
        (6, 3),
        (8, 1),
        (8, 2),
        (8, 4),
        (12, 1),
        (12, 2),
        (12, 4),
    )
}
HARDER = {
    "uneven runs": Kind(8, 2, uneven=True),
    "own u half of what it should be": Kind(8, 2, unstated=2.0),
    "swimmers differ by 10 % in y": Kind(8, 2, build=0.10),
    "own u 2 % in x, 10 % in y": Kind(8, 2, own_x=0.02, own_y=0.10),
    "own u of y absolute, 10 % at the top": Kind(6, 2, own_y=0.10, absolute=True),
    "modulus 20 %": Kind(8, 4, modulus=0.05),
    "size 3 %": Kind(6, 2, size=0.03),
    "12 runs a swimmer": Kind(5, 2, runs=12),
    "80 runs a swimmer": Kind(12, 4, runs=80),
    "nothing shared but E": Kind(5, 2, fluid=0.0, size=0.0, camera=0.0, build=0.0),
}


def simulate(rng, kind, curve=true_y):
    """Arguments of trend_points.points; curve: true y of true x."""
    runs = np.full(kind.swimmers, kind.runs)
    if kind.uneven:
        runs = np.round(kind.runs * 10.0 ** rng.uniform(-0.5, 0.5, kind.swimmers)).astype(int)
    swimmer = np.repeat(np.arange(kind.swimmers), runs)
    n = len(swimmer)
    batch = (np.arange(kind.swimmers) % kind.batches)[swimmer]
    x = np.exp(rng.uniform(np.log(0.9), np.log(4.2), n))
    fluid = np.clip(((np.log(x) - np.log(0.9)) * 2.6 + rng.normal(0.0, 0.5, n)).astype(int), 0, 3)
    y = curve(x) * np.exp(kind.build * rng.normal(size=kind.swimmers))[swimmer]
    part_x = {"modulus": (batch, kind.modulus), "fluid": (fluid, kind.fluid), "size": (swimmer, kind.size)}
    shift_x = sum(u * rng.normal(size=owner.max() + 1)[owner] for owner, u in part_x.values())
    shift_y = kind.camera * rng.normal()
    u_y = kind.own_y * (np.full(n, 1.0) if kind.absolute else y)
    x_seen = x * np.exp(shift_x + kind.own_x * rng.normal(size=n))
    y_seen = y * np.exp(shift_y) + kind.unstated * u_y * rng.normal(size=n)
    stated = kind.own_y * (np.full(n, 1.0) if kind.absolute else np.abs(y_seen))
    shared = [
        trend_points.SharedError(name, owner, u * x_seen, np.zeros(n)) for name, (owner, u) in part_x.items()
    ]
    shared.append(trend_points.SharedError("camera", np.zeros(n, int), np.zeros(n), kind.camera * y_seen))
    return {
        "x": x_seen,
        "y": y_seen,
        "u_own_x": kind.own_x * x_seen,
        "u_own_y": stated,
        "swimmer": swimmer,
        "shared": shared,
    }


def naive(x, y, u_own_x, u_own_y, **_):
    """(location, low, high, height, low, high): a weighted polynomial through all runs, each taken as
    independent; the first-order interval of its coefficients, widened by the Birge ratio."""
    ok = y > 0.0
    lx, ly, rx, ry = np.log(x[ok]), np.log(y[ok]), (u_own_x / x)[ok], (u_own_y / y)[ok]
    centre = np.log(SP_TOP)
    near = np.abs(lx - centre) <= np.log(1.4)
    u, ly, rx, ry = lx[near] - centre, ly[near], rx[near], ry[near]
    X, slope = np.vander(u, 5, increasing=True), np.zeros(len(u))
    for _ in range(3):
        w = 1.0 / np.hypot(ry, slope * rx)
        covariance = np.linalg.inv((X * w[:, None]).T @ (X * w[:, None]))
        beta = covariance @ (X.T @ (w * w * ly))
        slope = np.polynomial.polynomial.polyval(u, np.polynomial.polynomial.polyder(beta))
    covariance = covariance * max(1.0, np.sum((w * (ly - X @ beta)) ** 2) / (len(u) - 5))
    fine = np.linspace(-0.3, 0.3, 1201)
    top = fine[np.argmax(np.polynomial.polynomial.polyval(fine, beta))]
    k = np.arange(5)
    bend = (k * (k - 1))[2:] @ (beta[2:] * top ** (k[2:] - 2))
    along = np.where(k > 0, k * top ** np.maximum(k - 1, 0), 0.0) / bend
    half_x, half_y = (1.96 * np.sqrt(c @ covariance @ c) for c in (along, top**k))
    x_top, y_top = np.exp(centre + top), np.exp(beta @ top**k)
    return (
        x_top,
        x_top * np.exp(-half_x),
        x_top * np.exp(half_x),
        y_top,
        y_top * np.exp(-half_y),
        y_top * np.exp(half_y),
    )


def answers(rng, kind):
    """One group: (answer or None where refused, naive answer), each as in `naive`."""
    given = simulate(rng, kind)
    m = trend_maximum.maximum(points=trend_points.points(**given))
    return (m.x, m.x_low, m.x_high, m.y, m.y_low, m.y_high), naive(**given)


def held(rows):
    """(location held, height held) of answers (n, 6); the true height is 1."""
    rows = np.asarray(rows)
    return ((rows[:, 1] <= SP_TOP) & (SP_TOP <= rows[:, 2])), ((rows[:, 4] <= 1.0) & (1.0 <= rows[:, 5]))


def _row(job):
    name, kind, groups = job
    rng = np.random.default_rng([groups, sum(map(ord, name))])
    ours, plain = (np.array(a) for a in zip(*(answers(rng, kind) for _ in range(groups)), strict=True))
    told = np.isfinite(ours[:, 1])
    ours_told = ours[told]
    cells = [f"{100 * np.mean(~told):.1f}", *(f"{100 * h.mean():.1f}" for h in held(ours_told))]
    for at, true in ((0, SP_TOP), (3, 1.0)):
        ln = np.log(ours_told[:, at : at + 3] / true)
        cells += [
            f"{100 * ln[:, 0].mean():+.2f}",
            f"{100 * ln[:, 0].std():.2f}",
            f"{50 * np.median(ln[:, 2] - ln[:, 1]):.2f}",
        ]
    cells += [f"{100 * h.mean():.1f}" for h in held(plain)]
    return f"| {name} | " + " | ".join(cells) + " |"


def main():
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--groups", type=int, default=500, help="groups a row")
    parser.add_argument("--jobs", type=int, default=1, help="processes")
    parser.add_argument("--harder", action="store_true", help="the kinds with more of one error")
    parser.add_argument("--only", default="", help="kinds that contain this text")
    given = parser.parse_args()
    kinds = HARDER if given.harder else KINDS
    print(
        "| group | refused % | location held % | height held % | location: bias % | scatter % "
        "| half interval % | height: bias % | scatter % | half interval % | naive: location held % "
        "| height held % |"
    )
    print("|---" * 12 + "|")
    with ProcessPoolExecutor(given.jobs) as pool:
        jobs = [(name, kind, given.groups) for name, kind in kinds.items() if given.only in name]
        for line in pool.map(_row, jobs):
            print(line, flush=True)


if __name__ == "__main__":
    main()
