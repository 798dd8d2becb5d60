"""Location and height of a group's maximum over x, with intervals over swimmers and shared errors.

Method. A polynomial of fourth order in ln x is fitted to ln y within a factor 1.4 of the top (trend_fit). On
the curve of a free head with b/L = 0.1 that puts the top 0.01 % too low and the height 0.2 % too low (window
off centre by 5 %: 0.03 % and 0.3 %). Two sources of error are drawn together, and the interval ends where
97.5 % of draws rise, and where 97.5 % fall (as Fieller's: a ratio whose denominator, the bend, is uncertain
as well):

- swimmers, not runs: the multiplier bootstrap of clusters. Each swimmer's leave-one-out change of the fit is
  given a random normal weight (Cameron, Gelbach & Miller, Rev. Econ. Stat. 90:414, 2008; Kline & Santos, J.
  Econometric Methods 1:23, 2012; the bootstrap in general: Davison & Hinkley 1997);
- stated errors that several swimmers share, which no resampling can see, by Monte Carlo (JCGM 101:2008).

Few clusters cover too little when resampled plainly (Cameron & al.): the draws are widened by Student's t
with the degrees of freedom that the swimmers give (Bell & McCaffrey 2002), joined to the stated errors by
Welch and Satterthwaite's formula (JCGM 100:2008, G.4). A sum of a Student's and a normal draw covered up to
98.4 % at three swimmers, simulated.
"""

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtri

from labbook.errors import Refusal
from labbook.physics.trend_basis import Polynomial
from labbook.physics.trend_curve import curve
from labbook.physics.trend_draws import DRAWS, SEED, SWIMMERS, TAILS, drawn, few
from labbook.physics.trend_fit import GroupFit, fit

WINDOW, ORDER = 1.4, 4
NORMAL = 1.959964  # 97.5 % in standard deviations
MOVES = 6  # of the window
STILL = 0.02  # of ln x: the window stays
GRID = 81
LEVEL = 0.02  # of ln x: closer values count as one
BESIDE, RUNS_BESIDE = 0.05, 3  # of ln x from the top; runs there on either side


@dataclass(frozen=True, eq=False)
class Maximum:
    """x, y: the top, NaN where there is none; low and high: 95 % intervals, NaN where none can be given.

    verdict: empty, or why there is no top or no interval; u_x_swimmers, u_x_shared and so on: standard
    uncertainties relative to x and y; dof_x, dof_y: of both together; window: (low, high) of x; n,
    swimmers: used in it; scatter: of the runs beyond their own u, relative; between_x, between_y: standard
    deviation between swimmers, relative; left_out: reason -> runs, those outside the window among them; fit:
    of the shape, None where the window holds too few runs.
    """

    x: float
    x_low: float
    x_high: float
    y: float
    y_low: float
    y_high: float
    verdict: str
    u_x_swimmers: float
    u_x_shared: float
    u_y_swimmers: float
    u_y_shared: float
    dof_x: float
    dof_y: float
    window: tuple[float, float]
    n: int
    swimmers: int
    scatter: float
    between_x: float
    between_y: float
    left_out: dict
    shape: Polynomial
    fit: GroupFit | None

    @property
    def found(self):
        """Whether a top lies inside the data."""
        return bool(np.isfinite(self.x))

    def at(self, *, x):
        """y of the fitted curve at x, NaN outside its window."""
        x = np.asarray(x, float)
        if self.fit is None:
            return np.full(x.shape, np.nan)
        inside = (x >= self.window[0]) & (x <= self.window[1])
        with np.errstate(all="ignore"):
            return np.where(inside, np.exp(self.shape.columns(x=np.log(x)) @ self.fit.coefficients), np.nan)


def maximum(*, points, window=WINDOW, order=ORDER, draws=DRAWS, seed=SEED) -> Maximum:
    """The maximum of points (trend_points.points): one family, or a whole group.

    window: factor about the top that is fitted; order: of the polynomial in ln x, 2 to 6; draws, seed: of the
    interval. Refuses too few runs for a curve, a window not above 1 and another order.
    """
    if not window > 1.0:
        raise Refusal(
            "window", window, "is the factor about the top that is fitted", "a number above 1, as 1.4"
        )
    if order not in (2, 3, 4, 5, 6):
        raise Refusal("order", order, "is the order of the polynomial", "2 to 6")
    shape, chosen, fitted = _local(points, np.log(window), order)
    grid = _inside(chosen.x, shape.centre, np.log(window))
    facts = {
        "window": (float(np.exp(grid[0])), float(np.exp(grid[-1]))),
        "n": len(chosen.x),
        "swimmers": len(chosen.swimmers),
        "scatter": fitted.scatter if fitted else np.nan,
        "between_x": fitted.tau_x if fitted else np.nan,
        "between_y": fitted.tau_y if fitted else np.nan,
        "left_out": _left_out(points, chosen, window),
        "shape": shape,
        "fit": fitted,
    }
    if fitted is None:
        return _without(verdict=_too_few(chosen.x, shape), **facts)
    top = float(_tops(fitted.coefficients[:, None], shape, grid)[0])
    wrong = _one_sided(chosen.x, top, grid)
    if wrong:
        return _without(verdict=wrong, **facts)
    at_top = shape.columns(x=top)
    with np.errstate(over="ignore"):
        place = {"x": float(np.exp(top)), "y": float(np.exp(at_top @ fitted.coefficients))}
    if len(chosen.swimmers) < SWIMMERS:
        verdict = few(swimmers=len(chosen.swimmers), where="near the top")
        return _without(verdict=verdict, **place, **facts)
    rng = np.random.default_rng(seed)
    sideways = drawn(fit=fitted, direction=_direction_of_top(shape, fitted, top), draws=draws, rng=rng)
    x_low, x_high = _ends(fitted.coefficients[:, None] + sideways.changes, shape, grid, top)
    if np.isnan(x_low) or np.isnan(x_high):
        return _without(verdict=_unbounded(x_low, x_high, grid), **facts)
    upwards = drawn(fit=fitted, direction=at_top, draws=draws, rng=rng)
    y_low, y_high = place["y"] * np.exp(np.quantile(at_top @ upwards.changes, TAILS))
    return Maximum(
        **place,
        x_low=x_low,
        x_high=x_high,
        y_low=float(y_low),
        y_high=float(y_high),
        verdict="",
        u_x_swimmers=sideways.u_swimmers,
        u_x_shared=sideways.u_shared,
        u_y_swimmers=upwards.u_swimmers,
        u_y_shared=upwards.u_shared,
        dof_x=sideways.dof,
        dof_y=upwards.dof,
        **facts,
    )


def _local(points, half, order):
    """(shape, points, fit) of the window that is centred on its own top; no fit to too few runs."""
    first = curve(points=points)
    grid = np.linspace(first.low, first.high, 4 * GRID)
    centre = float(grid[np.argmax(first.shape.columns(x=grid) @ first.fit.coefficients)])
    for _ in range(MOVES):
        chosen = points.where(keep=np.abs(points.x - centre) <= half)
        shape = Polynomial(centre, order)
        if len(chosen.x) < shape.size + 2 or _levels(chosen.x) < shape.size:
            return shape, chosen, None
        fitted = fit(points=chosen, shape=shape)
        grid = _inside(chosen.x, centre, half)
        top = float(_tops(fitted.coefficients[:, None], shape, grid)[0])
        if abs(top - centre) <= STILL:
            break
        centre = 0.5 * (centre + top) if abs(top - centre) > half / 2.0 else top
    return shape, chosen, fitted


def _levels(x):
    return len(np.unique(np.round(x / LEVEL)))


def _too_few(x, shape):
    near, needed = f"{len(x)} runs at {_levels(x)} values of x", f"{shape.size + 2} at {shape.size}"
    return f"no maximum can be told: {near} lie near x = {np.exp(shape.centre):.3g}, it takes {needed}"


def _inside(x, centre, half):
    """Grid of ln x within window and data."""
    return np.linspace(max(centre - half, x.min()), min(centre + half, x.max()), GRID)


def _tops(coefficients, shape, grid):
    """ln x of the highest point on the grid of each column of coefficients, by a parabola through three
    points."""
    values = shape.columns(x=grid) @ coefficients
    at = np.argmax(values, axis=0)
    middle, draw = np.clip(at, 1, len(grid) - 2), np.arange(values.shape[1])
    left, top, right = (values[middle + k, draw] for k in (-1, 0, 1))
    bend = left - 2.0 * top + right
    move = np.where(bend < 0.0, 0.5 * (left - right) / np.where(bend < 0.0, bend, -1.0), 0.0)
    inside = grid[middle] + np.clip(move, -1.0, 1.0) * (grid[1] - grid[0])
    return np.where(at == middle, inside, grid[at])


def _direction_of_top(shape, fitted, top):
    """d(ln x of the top)/d(coefficients)."""
    bend = shape.columns(x=top, derivative=2) @ fitted.coefficients
    return -shape.columns(x=top, derivative=1) / bend


def _one_sided(x, top, grid):
    low, high = np.sum(x <= top - BESIDE), np.sum(x >= top + BESIDE)
    if min(low, high) >= RUNS_BESIDE and grid[0] < top < grid[-1]:
        return ""
    side, there = ("low", low) if low < high else ("high", high)
    runs = "1 run lies" if there == 1 else f"{there} runs lie"
    at = f"the {side} end, near x = {np.exp(top):.3g}"
    return f"no maximum inside the data: y is highest at {at}, and {runs} beyond"


def _ends(coefficients, shape, grid, top):
    """x at the two ends of the interval: where the curve rises, or falls, in all but 2.5 % of draws; NaN
    where it does nowhere. The nearest such places count."""
    falls = np.mean(shape.columns(x=grid, derivative=1) @ coefficients < 0.0, axis=1)
    score = ndtri(np.clip(falls, 1e-9, 1.0 - 1e-9))
    ends = []
    for side, sign in (((grid <= top).nonzero()[0][::-1], -1.0), ((grid >= top).nonzero()[0], 1.0)):
        z = sign * score[side]
        past = np.flatnonzero(z >= NORMAL)
        if not len(past):
            ends.append(np.nan)
        elif past[0] == 0:
            ends.append(np.exp(grid[side[0]]))
        else:
            k = past[0]
            share = (NORMAL - z[k - 1]) / (z[k] - z[k - 1])
            ends.append(np.exp(grid[side[k - 1]] + share * (grid[side[k]] - grid[side[k - 1]])))
    return tuple(float(end) for end in ends)


def _unbounded(x_low, x_high, grid):
    said = []
    if np.isnan(x_low):
        said.append(f"a rise before the top, from x = {np.exp(grid[0]):.3g} on")
    if np.isnan(x_high):
        said.append(f"a fall behind the top, up to x = {np.exp(grid[-1]):.3g}")
    return f"no maximum inside the data: the runs do not show {' nor '.join(said)}, with 97.5 % confidence"


def _left_out(points, chosen, window):
    outside = len(points.x) - len(chosen.x)
    if not outside:
        return points.left_out
    return points.left_out | {f"farther than a factor {window:g} from the top": outside}


def _without(*, verdict, x=np.nan, y=np.nan, **facts):
    fields = "x_low x_high y_low y_high u_x_swimmers u_x_shared u_y_swimmers u_y_shared dof_x dof_y".split()
    return Maximum(x=x, y=y, verdict=verdict, **dict.fromkeys(fields, np.nan), **facts)
