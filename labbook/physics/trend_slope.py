"""Power law of a group in a range of x: its exponent with an interval over swimmers and shared errors.

ln y is fitted by a line in ln x (trend_fit); the interval is drawn as that of a maximum (trend_maximum). An
own error of x as large as a share s of the range's spread in ln x flattens the slope by about s squared.
"""

from dataclasses import dataclass

import numpy as np
from scipy.stats import t as student

from labbook.errors import Refusal
from labbook.physics.trend_basis import Polynomial
from labbook.physics.trend_draws import DRAWS, SEED, SWIMMERS, TAILS, drawn, few
from labbook.physics.trend_fit import GroupFit, fit


@dataclass(frozen=True, eq=False)
class PowerLaw:
    """y = scale (x/centre)^slope between low and high of x.

    slope_low, slope_high: 95 % interval, NaN with a verdict that says why; u_swimmers, u_shared: standard
    uncertainties of the slope; dof: of both together; p_bend: two-sided probability of as much bend in ln x
    if there were none, NaN where it cannot be told; n, swimmers: in the range; scatter, left_out: as in
    Maximum.
    """

    slope: float
    slope_low: float
    slope_high: float
    verdict: str
    u_swimmers: float
    u_shared: float
    dof: float
    p_bend: float
    scale: float
    centre: float
    low: float
    high: float
    n: int
    swimmers: int
    scatter: float
    left_out: dict
    fit: GroupFit

    def at(self, *, x):
        """y of the power law at x, NaN outside its range."""
        x = np.asarray(x, float)
        with np.errstate(all="ignore"):
            y = self.scale * (x / self.centre) ** self.slope
        return np.where((x >= self.low) & (x <= self.high), y, np.nan)


def power_law(*, points, low=0.0, high=np.inf, draws=DRAWS, seed=SEED) -> PowerLaw:
    """The slope of ln y against ln x where low <= x <= high. Refuses a range with too few runs, or one x."""
    if not low < high:
        raise Refusal("high", high, f"is not above the low end of the range, {low}", "give the ends in order")
    with np.errstate(divide="ignore"):
        inside = (points.x >= np.log(low) - 1e-12) & (points.x <= np.log(high) + 1e-12)
    chosen = points.where(keep=inside)
    if len(chosen.x) < 4 or np.ptp(chosen.x) < 1e-6:
        raise Refusal(
            "range",
            f"{low:g} to {high:g}",
            f"{len(chosen.x)} usable runs lie in it, a slope needs 4 of different x",
            "widen the range",
        )
    centre = float(chosen.x.mean())
    line = fit(points=chosen, shape=Polynomial(centre, 1))
    direction = np.array([0.0, 1.0])
    slope = float(line.coefficients[1])
    left_out = points.left_out | ({"outside the range": int(np.sum(~inside))} if np.any(~inside) else {})
    facts = {
        "slope": slope,
        "scale": float(np.exp(line.coefficients[0])),
        "centre": float(np.exp(centre)),
        "low": float(np.exp(chosen.x.min())),
        "high": float(np.exp(chosen.x.max())),
        "n": len(chosen.x),
        "swimmers": len(chosen.swimmers),
        "scatter": line.scatter,
        "left_out": left_out,
        "fit": line,
    }
    if len(chosen.swimmers) < SWIMMERS:
        verdict = few(swimmers=len(chosen.swimmers), where="in the range")
        return PowerLaw(
            slope_low=np.nan,
            slope_high=np.nan,
            verdict=verdict,
            u_swimmers=np.nan,
            u_shared=line.over_shared(direction=direction),
            dof=np.nan,
            p_bend=np.nan,
            **facts,
        )
    found = drawn(fit=line, direction=direction, draws=draws, rng=np.random.default_rng(seed))
    slope_low, slope_high = slope + np.quantile(found.changes[1], TAILS)
    return PowerLaw(
        slope_low=float(slope_low),
        slope_high=float(slope_high),
        verdict="",
        u_swimmers=found.u_swimmers,
        u_shared=found.u_shared,
        dof=found.dof,
        p_bend=_bend(chosen, centre),
        **facts,
    )


def _bend(points, centre):
    """Two-sided probability of as much bend if there were none."""
    if len(points.x) < 5:
        return np.nan
    curved = fit(points=points, shape=Polynomial(centre, 2))
    direction = np.array([0.0, 0.0, 1.0])
    over, shared = curved.over_swimmers(direction=direction), curved.over_shared(direction=direction)
    size = abs(curved.coefficients[2]) / np.hypot(over.u, shared)
    return float(2.0 * student.sf(size, over.dof_with(shared=shared)))
