"""Free paths in the plane: mean-square displacement, active Brownian motion, curvature."""

from dataclasses import dataclass

import numpy as np
from scipy.optimize import least_squares
from scipy.stats import t as student

from labbook.errors import Refusal
from labbook.physics import track_fit
from labbook.physics.track_cleaning import clean
from labbook.physics.track_rows import averages

LAGS = 40
FEWEST_LAGS = 5  # with any displacement: fewer tell nothing of its growth
LONGEST_LAG = 0.1  # of the record
BLOCKS = 10  # of the jackknife
SURE = 2.0  # standard uncertainties that a fitted figure must stand clear of zero
STEPS = 20  # of which a path's turning is made
SHARP = 0.5  # rad, scatter of the turns between steps above which no curvature is told
WRONG = 3.0  # times the deviations that diffusion would give


@dataclass(frozen=True, eq=False)
class FreePath:
    """What a free path says of swimming and diffusing; None where the data do not allow it.

    lag: s, msd: m2; D: translational diffusivity, m2/s; v: propulsion speed, m/s, and tau: persistence
    time, s, both None where diffusion alone explains the path; D_r = 1/tau for turning in the plane; Pe = v
    sqrt(tau/D); noise: localisation, m, of one coordinate; curvature: 1/m, positive to the left. D, v and
    noise are None for a path that is no persistent random walk at all (circles).
    """

    lag: np.ndarray
    msd: np.ndarray
    D: float | None
    u_D: float | None
    noise: float | None
    v: float | None
    u_v: float | None
    tau: float | None
    u_tau: float | None
    Pe: float | None
    curvature: float | None
    u_curvature: float | None


def mean_square_displacement(*, t, x, y, lags=None):
    """(lag, msd): mean of the squared displacement in the plane over all pairs of frames a lag apart.

    t: s, even up to lost frames; x, y: m; lags: frames, by default 40 up to a tenth of the record. s and m2.
    """
    path, dt, lags = _on_grid(t, x, y, lags)
    return lags * dt, np.array([np.nanmean(np.abs(path[k:] - path[:-k]) ** 2) for k in lags])


def active_msd(*, lag, D, v, tau):
    """Mean-square displacement in the plane of a particle that swims at v and forgets its direction over tau.

    4 D t + 2 v^2 tau^2 (t/tau - 1 + exp(-t/tau)); lag, tau: s; D: m2/s; v: m/s; answer in m2. With tau =
    tau_R/2 it is the form printed by Howse et al., PRL 99:048102 (2007), whose particle turns in three
    dimensions; in the plane tau = 1/D_r.
    """
    s = np.asarray(lag, float) / tau
    return 4.0 * D * np.asarray(lag, float) + 2.0 * (v * tau) ** 2 * (s + np.expm1(-s))


def free_path(*, t, x, y, f=None) -> FreePath:
    """Diffusivity, propulsion, persistence and curvature of a path: t in s, x and y in m, f of a beat in Hz.

    The beat, where f says there is one, is taken off. active_msd plus 4 noise^2 is fitted to the
    mean-square displacement at up to a tenth of the record, relative deviations weighted with the root of
    the number of separate intervals; uncertainties are a jackknife's over ten stretches. Propulsion counts
    where v^2 stands two uncertainties clear of zero and persistence where it also lies within the lags;
    Peclet number: Bechinger et al., Rev. Mod. Phys. 88:045006 (2016). A path with a mean velocity has a v
    too: drift is taken off beforehand. Lags without any displacement (positions rounded to pixels) are left
    out. Refuses positions that hardly ever change.
    """
    frames = clean(t=t, x=x, y=y)
    t, (x, y) = frames.t, (frames.columns["x"], frames.columns["y"])
    if f is not None:
        x, y = track_fit.without_beat(t=t, dt=frames.dt, ys=np.stack([x, y]), f=float(f))
    path, dt, lags = _on_grid(t, x, y, None)
    sums, counts = _by_block(path, lags)
    lag, total, number = lags * dt, sums.sum(axis=0), counts.sum(axis=0)
    msd, remaining = total / number, (total - sums) / (number - counts)
    moves = np.minimum(msd, remaining.min(axis=0)) > 0.0
    if moves.sum() < FEWEST_LAGS:
        raise Refusal(
            "x", None, "the positions hardly ever change", "look whether the tracker followed a body"
        )
    lag, msd, remaining = lag[moves], msd[moves], remaining[:, moves]
    whole = _fitted(lag, msd, None)
    (D, v2, tau, noise2), (u_D, u_v2, u_tau, _) = (
        whole,
        _jackknife([_fitted(lag, one, whole) for one in remaining]),
    )
    swims = v2 > SURE * u_v2 and tau > 2.0 * dt
    if not swims:
        D, noise2 = _diffusive(lag, msd)
        u_D, v2 = _jackknife([_diffusive(lag, one) for one in remaining])[0], 0.0
    if (
        _misfit(lag, msd, active_msd(lag=lag, D=D, v=np.sqrt(v2), tau=tau) + 4.0 * noise2, t[-1] - t[0])
        > WRONG
    ):
        D = u_D = None
        swims = False
    known = swims and tau < lag[-1] and tau > SURE * u_tau
    v = float(np.sqrt(v2)) if swims else None
    Pe = float(v * np.sqrt(tau / D)) if known and D > SURE * u_D and D * lag[-1] > 1e-6 * msd[-1] else None
    kappa, u_kappa = _curvature(t, x, y, dt)
    return FreePath(
        lag, msd, *((None,) * 3 if D is None else (float(D), float(u_D), float(np.sqrt(noise2)))),
        v, float(u_v2 / (2.0 * v)) if swims else None,
        float(tau) if known else None, float(u_tau) if known else None, Pe, kappa, u_kappa,
    )  # fmt: skip


def _jackknife(parts):
    parts = np.array(parts)
    return np.sqrt((BLOCKS - 1.0) * np.mean((parts - parts.mean(axis=0)) ** 2, axis=0))


def _diffusive(lag, msd):
    """(D, noise^2) of diffusion alone, by least squares on relative deviations."""
    weight = np.sqrt(lag[0] / lag) / msd
    X = np.column_stack([4.0 * lag, np.full(len(lag), 4.0)]) * weight[:, None]
    D, noise2 = np.linalg.lstsq(X, weight * msd, rcond=None)[0]
    if noise2 < 0.0:
        return float(X[:, 0] @ (weight * msd) / (X[:, 0] @ X[:, 0])), 0.0
    return max(float(D), 0.0), float(noise2)


def _misfit(lag, msd, model, T):
    """Root mean square of relative deviations over what diffusion would give them, sqrt(4 lag/(3 T))."""
    return np.sqrt(np.mean((model / msd - 1.0) ** 2 / (4.0 * lag / (3.0 * T))))


def _on_grid(t, x, y, lags):
    """(complex positions on an even grid, NaN where lost; dt; lags in frames)."""
    t = np.asarray(t, float)
    dt = float(np.median(np.diff(t)))
    at = np.rint((t - t[0]) / dt).astype(np.int64)
    path = np.full(at[-1] + 1, np.nan + 0j)
    path[at] = (np.asarray(x, float) - np.mean(x)) + 1j * (np.asarray(y, float) - np.mean(y))
    if lags is None:
        lags = np.unique(np.rint(np.geomspace(1, max(2, int(LONGEST_LAG * len(path))), LAGS)).astype(int))
    lags = np.asarray(lags, int)
    if lags.min() < 1 or lags.max() >= len(path):
        raise Refusal(
            "lags", f"{lags.min()} to {lags.max()}", f"whole frames from 1 to {len(path) - 1} are needed"
        )
    return path, dt, lags


def _by_block(path, lags):
    """(sums of squared displacements, their numbers), shape (blocks, lags), by where a displacement
    starts."""
    edges = np.linspace(0, len(path), BLOCKS + 1).astype(int)[:-1]
    sums, counts = np.empty((2, BLOCKS, len(lags)))
    for column, k in enumerate(lags):
        square = np.zeros(len(path))
        square[:-k] = np.abs(path[k:] - path[:-k]) ** 2
        seen = np.zeros(len(path))
        seen[:-k] = np.isfinite(square[:-k])
        sums[:, column] = np.add.reduceat(np.nan_to_num(square), edges)
        counts[:, column] = np.add.reduceat(seen, edges)
    return sums, counts


def _fitted(lag, msd, start):
    """(D, v^2, tau, noise^2) by bounded least squares on relative deviations."""
    unit_t, unit_m = lag[-1], msd[-1]
    weight = np.sqrt(lag[0] / lag) / msd

    def deviation(p):
        D, v2, ln_tau, noise2 = p
        model = active_msd(lag=lag / unit_t, D=D, v=np.sqrt(v2), tau=np.exp(ln_tau)) + 4.0 * noise2
        return weight * (model * unit_m - msd)

    low, high = [0.0, 0.0, np.log(lag[0] / unit_t) - 1.0, 0.0], [np.inf, np.inf, np.log(30.0), np.inf]
    if start is None:
        first = msd[0] / unit_m
        starts = [
            [0.5 * first * unit_t / lag[0] / 4.0, 1.0, np.log(share), 0.1 * first]
            for share in (0.03, 0.3, 3.0)
        ]
    else:
        D, v2, tau, noise2 = start
        starts = [[D * unit_t / unit_m, v2 * unit_t**2 / unit_m, np.log(tau / unit_t), noise2 / unit_m]]
    inside = [np.clip(one, np.array(low) + 1e-12, np.minimum(high, 1e12)) for one in starts]
    fits = [
        least_squares(deviation, one, bounds=(low, high), x_scale=np.maximum(np.abs(one), 1e-6))
        for one in inside
    ]
    D, v2, ln_tau, noise2 = min(fits, key=lambda fit: fit.cost).x
    return D * unit_m / unit_t, v2 * unit_m / unit_t**2, np.exp(ln_tau) * unit_t, noise2 * unit_m


def _curvature(t, x, y, dt):
    """(curvature, u) in 1/m of the path through means of twenty stretches, or (None, None) where it wanders.

    The mean turn and its standard error hold for a direction that diffuses; for one that is merely noisy
    they err on the safe side.
    """
    _, places, _ = averages(t=t, rows=np.stack([x, y]), width=(t[-1] - t[0] + dt) / (STEPS + 1))
    step = np.diff(places[0] + 1j * places[1])
    if len(step) < STEPS // 2 or np.any(step == 0.0):
        return None, None
    turn = np.angle(step[1:] / step[:-1])
    if turn.std() > SHARP:
        return None, None
    length = np.mean(np.abs(step))
    widened = student.ppf(0.975, len(turn) - 1) / 1.959964
    return float(turn.mean() / length), float(widened * turn.std(ddof=1) / np.sqrt(len(turn)) / length)
