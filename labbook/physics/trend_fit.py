"""Fit of one curve to the runs of several swimmers whose errors are partly shared.

ln y = B(ln x) beta + errors, where B is a shape (trend_basis). What is known of the errors:

- of a run alone: own_y, own_x through the slope of the curve, and an excess scatter that is added when the
  runs of a swimmer scatter more than that (Paule & Mandel, J. Res. NBS 87:377, 1982);
- of a swimmer: stated sources of which each owner is one swimmer, and differences between swimmers in ln x
  and ln y that are estimated (restricted likelihood: Patterson & Thompson, Biometrika 58:545, 1971);
- shared by swimmers (one modulus for a batch): unknown shifts, one an owner, with the stated size. They are
  fitted along, each with its statement as one more datum; so swimmers of different batches weigh as they
  should, and no two of a batch count as two witnesses of its modulus.

Errors in ln x are linearised about the curve, second order by its curvature. Swimmers are blocks: whatever
is asked of a weighted or reduced set of swimmers is a small sum of their normal equations.
"""

from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal
from labbook.physics.trend_blocks import Blocks, Solved
from labbook.physics.trend_points import Points

ROUNDS = 4
TAU_X = (0.0, 0.003, 0.006, 0.012, 0.025, 0.05, 0.1)
TAU_Y = (0.0, 0.005, 0.01, 0.02, 0.04, 0.08, 0.16, 0.32, 0.64, 1.3)
LEAST = 1e-5  # of a value: no run is taken for better known
STEEP = 0.5  # of ln y: the weights follow the fit no further
LOCAL_OWNERS = 8  # of a source within one swimmer that enter the weights; resampling sees all of them


@dataclass(frozen=True, eq=False)
class OverSwimmers:
    """u of a direction from the swimmers' differences; expected: u where the fit's own variances hold; dof:
    of u; factor: on GroupFit.changes, so that they have this u."""

    u: float
    expected: float
    dof: float
    factor: float

    def dof_with(self, *, shared):
        """Degrees of freedom together with u of shared errors: Welch and Satterthwaite (JCGM 100:2008, G.4).

        Their ratio is reckoned with the mean of observed and expected variance: the observed one alone, small
        by chance, would claim more than few swimmers know.
        """
        variance = 0.5 * (self.u**2 + self.expected**2)
        return self.dof * ((variance + shared**2) / variance) ** 2 if variance else np.inf


@dataclass(frozen=True, eq=False)
class GroupFit:
    """What a fit knows; S swimmers, p coefficients, K shared shifts.

    coefficients: (p,), those of further columns last; shifts: (K,) in standard uncertainties; names: of their
    sources; changes: (S, p) of the coefficients when one swimmer is left out; by_shift: (p, K) of the
    coefficients when a statement is off by one standard uncertainty; solved: the normal equations; scatter:
    excess of the runs; tau_x, tau_y: between swimmers; fitted, slope, residual, u, leverage: (n,), the
    residual without what is shared or the swimmer's, u its size from own errors alone.
    """

    points: Points
    coefficients: np.ndarray
    shifts: np.ndarray
    names: tuple[str, ...]
    changes: np.ndarray
    by_shift: np.ndarray
    solved: Solved
    scatter: float
    tau_x: float
    tau_y: float
    fitted: np.ndarray
    slope: np.ndarray
    residual: np.ndarray
    u: np.ndarray
    leverage: np.ndarray

    def over_swimmers(self, *, direction):
        """What the swimmers' differences tell of direction . coefficients, as OverSwimmers.

        The sum of squared leave-one-swimmer-out changes, scaled to be unbiased where the fit's own variances
        hold, with the degrees of freedom that its scatter then has: Bell & McCaffrey, Survey Methodology
        28:169, 2002 (Imbens & Kolesar, Rev. Econ. Stat. 98:701, 2016), for few and unequal clusters.
        """
        total, blocks = self.solved.total, self.solved.blocks
        c = np.zeros(len(total))
        c[: len(direction)] = direction
        b = np.linalg.solve(_without_each(self.solved), np.tile(c[:, None], (len(blocks), 1, 1)))
        own = (blocks @ b)[..., 0]
        q = np.linalg.solve(total, own.T).T
        expected = np.diag(np.sum(b[..., 0] * own, axis=1)) - q @ total @ q.T
        a = np.linalg.solve(total, c)
        wanted = a @ blocks.sum(axis=0) @ a
        factor = np.sqrt(wanted / np.trace(expected))
        dof = np.trace(expected) ** 2 / np.sum(expected * expected)
        u = float(factor * np.linalg.norm(self.changes @ direction))
        return OverSwimmers(u, float(np.sqrt(wanted)), float(max(dof, 1.0)), float(factor))

    def over_shared(self, *, direction):
        """u of direction . coefficients from the shared statements."""
        return float(np.linalg.norm(direction @ self.by_shift))


def fit(*, points, shape, more=None) -> GroupFit:
    """The curve of a shape (trend_basis) through points; more: (n, m) further columns, fitted along with it.

    Refuses fewer runs than two more than coefficients.
    """
    more = np.zeros((len(points.x), 0)) if more is None else np.asarray(more, float)
    n, S, p = len(points.x), len(points.swimmers), shape.size + more.shape[1]
    if n < p + 2:
        raise Refusal(
            "runs", n, f"a curve of {p} coefficients needs {p + 2} at least", "log more, or widen the range"
        )
    rows = np.split(
        np.argsort(points.swimmer, kind="stable"), np.cumsum(np.bincount(points.swimmer, minlength=S))[:-1]
    )
    names, part_x, part_y = _shared_parts(points)
    local_x, local_y = _local_parts(points, rows)
    own_y, K = np.maximum(points.own_y, LEAST), len(names)
    beta, z, residual = np.zeros(p), np.zeros(K), np.zeros(n)
    scatter, tau = 0.0, (0.0, 0.1)
    for turn in range(ROUNDS):
        at = points.x - part_x @ z
        blur = points.own_x**2 + np.sum(local_x**2, axis=1) + tau[0] ** 2
        X = shape.columns(x=at) + 0.5 * blur[:, None] * shape.columns(x=at, derivative=2)
        slope = shape.columns(x=at, derivative=1) @ beta[: shape.size]
        noisy = own_y * np.exp((1.0 - points.power) * np.clip(residual, -STEEP, STEEP))
        noise = noisy**2 + (slope * points.own_x) ** 2
        blocks = Blocks(
            common=np.hstack([X, more, part_y - slope[:, None] * part_x]),
            own=np.column_stack([local_y - slope[:, None] * local_x, -slope, np.ones(n)]),
            # the mean of ln y is below the ln of the mean by half the relative variance
            y=points.y + 0.5 * noisy**2 - slope * (part_x @ z),
            w=1.0 / (noise + scatter**2),
            rows=rows,
            stated=K,
        )
        if turn:
            tau = blocks.likeliest(tau_x=TAU_X, tau_y=TAU_Y, start=tau)
        solved = blocks.solve(tau=tau)
        beta, z = solved.beta[:p], solved.beta[p:]
        residual, leverage = blocks.residuals(solved), blocks.leverage(solved)
        if turn < ROUNDS - 1:
            scatter = excess(residual=residual, variance=noise, dof=n - leverage.sum())
    scores = solved.rights - solved.blocks @ solved.beta
    changes = np.zeros((S, p))
    if S > 1:
        changes = -np.linalg.solve(_without_each(solved), scores[..., None])[:, :p, 0]
    return GroupFit(
        points,
        beta,
        z,
        names,
        changes,
        np.linalg.inv(solved.total)[:p, p:],
        solved,
        scatter,
        *tau,
        points.y - residual,
        slope,
        residual,
        np.sqrt(noise),
        leverage,
    )


def excess(*, residual, variance, dof):
    """Standard deviation that, added to each variance, makes the weighted squares of residuals their dof; 0
    where they are less already. Source: Paule & Mandel 1982."""
    square = residual * residual
    if dof <= 0.0 or np.sum(square / variance) <= dof:
        return 0.0
    low, high = 0.0, square.sum() / dof
    for _ in range(50):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if np.sum(square / (variance + middle)) > dof else (low, middle)
    return float(np.sqrt(high))


def _without_each(solved):
    """(S, P, P) information without each swimmer; a trace of it left, so that what only one tells is singular
    no more but as good as unknown."""
    return solved.total - solved.blocks + 1e-9 * np.diag(np.diag(solved.total))


def _shared_parts(points):
    """(names, part_x, part_y): a column for each owner of each source with an owner of several swimmers."""
    names, xs, ys = [], [np.zeros((len(points.x), 0))], [np.zeros((len(points.x), 0))]
    for source in points.shared:
        if not points.spans(source=source):
            continue
        is_owner = source.owner[:, None] == np.arange(source.owner.max() + 1)
        names += [source.name] * is_owner.shape[1]
        xs.append(is_owner * source.x[:, None])
        ys.append(is_owner * source.y[:, None])
    return tuple(names), np.hstack(xs), np.hstack(ys)


def _local_parts(points, rows):
    """(part_x, part_y) of sources within swimmers: a column for the k-th owner that a swimmer has."""
    xs, ys = [np.zeros((len(points.x), 0))], [np.zeros((len(points.x), 0))]
    for source in points.shared:
        if points.spans(source=source):
            continue
        place = np.empty(len(points.x), np.intp)
        for r in rows:
            place[r] = np.unique(source.owner[r], return_inverse=True)[1]
        is_owner = place[:, None] == np.arange(min(place.max() + 1, LOCAL_OWNERS))
        xs.append(is_owner * source.x[:, None])
        ys.append(is_owner * source.y[:, None])
    return np.hstack(xs), np.hstack(ys)
