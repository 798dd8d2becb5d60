"""The fit of a curve to runs of several swimmers, against meta-analysis, Student's test and dense algebra."""

import numpy as np
import pytest
from scipy.optimize import minimize_scalar
from scipy.stats import t as student
from scipy.stats import ttest_1samp

from labbook.errors import Refusal
from labbook.physics.trend_basis import NaturalSpline, Polynomial
from labbook.physics.trend_blocks import Blocks
from labbook.physics.trend_draws import drawn
from labbook.physics.trend_fit import OverSwimmers, excess, fit
from labbook.physics.trend_points import SharedError, points

# log relative risks and variances of the thirteen BCG trials (Colditz et al. 1994), as in metafor's dat.bcg;
# from memory
BCG_Y = np.array(
    [
        -0.8893,
        -1.5854,
        -1.3481,
        -1.4416,
        -0.2175,
        -0.7861,
        -1.6209,
        0.0120,
        -0.4694,
        -1.3713,
        -0.3394,
        0.4459,
        -0.0173,
    ]
)
BCG_V = np.array(
    [0.3256, 0.1946, 0.4154, 0.0200, 0.0512, 0.0069, 0.2230, 0.0040, 0.0564, 0.0730, 0.0124, 0.5325, 0.0714]
)


def group(rng, S=5, runs=20, shared=True, own_x=0.01, both=False):
    """Points about a parabola, two batches; both: a source more that shifts x and y."""
    swimmer = np.repeat(np.arange(S), runs)
    n = len(swimmer)
    x = np.exp(rng.uniform(-0.4, 0.4, n))
    y = np.exp(-5.0 * np.log(x) ** 2 + 0.05 * rng.normal(size=n))
    batch = swimmer % 2
    sources = [
        SharedError("E", batch, 0.02 * x, 0.0 * x),
        SharedError("camera", 0 * batch, 0.0 * x, 0.01 * y),
        SharedError("size", swimmer, 0.01 * x, 0.0 * x),
    ]
    if both:
        sources.append(SharedError("fluid", np.arange(n) % 3, 0.02 * x, -0.04 * y))
    return points(
        x=x, y=y, u_own_x=own_x * x, u_own_y=0.05 * y, swimmer=swimmer, shared=sources if shared else ()
    )


def test_excess_scatter_is_paule_and_mandels():
    s = 0.0
    for _ in range(80):
        mean = np.average(BCG_Y, weights=1.0 / (BCG_V + s * s))
        s = excess(residual=BCG_Y - mean, variance=BCG_V, dof=12.0)
    # 0.3180 by the definition of 1982: gradmeta.com, validation report against metafor, read; the trials are
    # given to four digits
    assert s**2 == pytest.approx(0.3180, abs=2e-4)


def test_differences_between_swimmers_are_the_restricted_likelihoods():
    blocks = Blocks(
        common=np.ones((13, 1)),
        own=np.column_stack([np.zeros(13), np.ones(13)]),
        y=BCG_Y,
        w=1.0 / BCG_V,
        rows=[np.array([k]) for k in range(13)],
        stated=0,
    )

    def unlikely(variance):
        return -blocks.solve(tau=(0.0, np.sqrt(variance))).likelihood

    best = minimize_scalar(unlikely, bounds=(0.0, 2.0), method="bounded", options={"xatol": 1e-9}).x
    found = blocks.solve(tau=(0.0, np.sqrt(best)))
    # metafor's rma with REML: tau^2 0.3132, estimate -0.7145, standard error 0.1798; from memory
    assert best == pytest.approx(0.3132, abs=1e-4)
    assert found.beta[0] == pytest.approx(-0.7145, abs=1e-4)
    assert found.total[0, 0] ** -0.5 == pytest.approx(0.1798, abs=1e-4)


def test_excess_is_none_where_the_bars_explain_the_scatter():
    assert excess(residual=np.array([0.1, -0.1, 0.05]), variance=np.full(3, 0.04), dof=2.0) == 0.0


def test_equal_swimmers_give_students_interval_of_their_means():
    # a mean over swimmers with as many runs each is a one-sample t test of the swimmers' means (scipy.stats)
    rng = np.random.default_rng(1)
    swimmer = np.repeat(np.arange(6), 8)
    ln_y = 0.3 * rng.normal(size=6)[swimmer] + 0.01 * rng.normal(size=48)
    p = points(x=np.ones(48), y=np.exp(ln_y), u_own_x=0.0, u_own_y=0.01 * np.exp(ln_y), swimmer=swimmer)
    found = fit(points=p, shape=Polynomial(0.0, 0))
    means = p.y.reshape(6, 8).mean(axis=1) + 0.5 * 0.01**2  # ln of a mean, not mean of ln
    over = found.over_swimmers(direction=np.ones(1))
    assert found.coefficients[0] == pytest.approx(means.mean(), abs=1e-9)
    assert over.u == pytest.approx(means.std(ddof=1) / np.sqrt(6), rel=1e-6)
    assert over.dof == pytest.approx(5.0, abs=1e-6)
    draws = drawn(fit=found, direction=np.ones(1), draws=200_000, rng=rng).changes[0] + found.coefficients[0]
    low, high = ttest_1samp(means, 0.0).confidence_interval(0.95)
    # the quantile of 200,000 draws of t with 5 degrees of freedom scatters by 0.7 % of the half interval
    assert np.quantile(draws, (0.025, 0.975)) == pytest.approx((low, high), abs=0.03 * (high - low))


def test_unequal_swimmers_lose_degrees_of_freedom():
    rng = np.random.default_rng(2)
    runs = np.array([60, 4, 4, 4])
    swimmer = np.repeat(np.arange(4), runs)
    y = np.exp(0.01 * rng.normal(size=len(swimmer)))  # far within the bars: every run weighs the same
    p = points(x=np.ones(len(y)), y=y, u_own_x=0.0, u_own_y=0.3 * y, swimmer=swimmer)
    dof = fit(points=p, shape=Polynomial(0.0, 0)).over_swimmers(direction=np.ones(1)).dof
    assert 1.0 <= dof < 2.5


def test_leaving_a_swimmer_out_is_what_a_fit_without_it_gives():
    p = group(np.random.default_rng(3), own_x=0.0, shared=False)
    whole = fit(points=p, shape=Polynomial(0.0, 2))
    for s in range(5):
        keep = p.swimmer != s
        w = 1.0 / (whole.u[keep] ** 2 + whole.scatter**2)
        V = np.diag(1.0 / w) + whole.tau_y**2 * (p.swimmer[keep][:, None] == p.swimmer[keep])
        slopes = whole.slope[keep]
        V = V + whole.tau_x**2 * np.outer(slopes, slopes) * (p.swimmer[keep][:, None] == p.swimmer[keep])
        X = Polynomial(0.0, 2).columns(x=p.x[keep])
        X = X + 0.5 * whole.tau_x**2 * Polynomial(0.0, 2).columns(x=p.x[keep], derivative=2)
        y = p.y[keep] + 0.5 * whole.u[keep] ** 2
        beta = np.linalg.solve(X.T @ np.linalg.solve(V, X), X.T @ np.linalg.solve(V, y))
        assert whole.coefficients + whole.changes[s] == pytest.approx(beta, abs=1e-6)


def test_the_fit_is_generalised_least_squares():
    # dense algebra written here: Aitken's estimator with the whole covariance of the errors
    p = group(np.random.default_rng(4), both=True)
    found = fit(points=p, shape=Polynomial(0.0, 2))
    parts = {"E": (0.02, 0.0), "camera": (0.0, 0.01), "fluid": (0.02, -0.04)}
    owner = {s.name: s.owner for s in p.shared}
    z = {name: found.shifts[np.array(found.names) == name][owner[name]] for name in parts}
    shift = sum(part_x * z[name] for name, (part_x, _) in parts.items())
    slope, same = found.slope, p.swimmer[:, None] == p.swimmer
    V = np.diag(found.u**2 + found.scatter**2) + found.tau_y**2 * same
    V += np.outer(slope, slope) * (found.tau_x**2 + 0.01**2) * same
    for name, (part_x, part_y) in parts.items():
        effect = part_y - slope * part_x
        V += np.outer(effect, effect) * (owner[name][:, None] == owner[name])
    shape = Polynomial(0.0, 2)
    blur = p.own_x**2 + 0.01**2 + found.tau_x**2
    X = shape.columns(x=p.x - shift) + 0.5 * blur[:, None] * shape.columns(x=p.x - shift, derivative=2)
    y = p.y + 0.5 * (found.u**2 - (slope * p.own_x) ** 2) - slope * shift
    information = X.T @ np.linalg.solve(V, X)
    beta = np.linalg.solve(information, X.T @ np.linalg.solve(V, y))
    # the shifts and the slope are those of the last round but one: equal to the rounds' convergence
    assert found.coefficients == pytest.approx(beta, abs=2e-4)
    assert np.linalg.inv(found.solved.total)[:3, :3] == pytest.approx(
        np.linalg.inv(information), rel=1e-2, abs=1e-8
    )


def test_shifts_of_batches_are_found_with_their_sign():
    # x read too high by 4 % for one batch and too low for the other, stated as 4 %: plus and minus one
    rng = np.random.default_rng(11)
    swimmer = np.repeat(np.arange(8), 60)
    true = np.exp(rng.uniform(-0.4, 0.4, 480))
    x = true * np.exp(np.where(swimmer % 2, -0.04, 0.04))
    y = np.exp(-5.0 * np.log(true) ** 2 + 0.01 * rng.normal(size=480))
    p = points(
        x=x,
        y=y,
        u_own_x=0.0,
        u_own_y=0.01 * y,
        swimmer=swimmer,
        shared=[SharedError("E", swimmer % 2, 0.04 * x, 0.0 * x)],
    )
    found = fit(points=p, shape=Polynomial(0.0, 2))
    # a batch's slope tells its shift to 0.01/(10 x 0.23 x sqrt(240)) = 0.0003; their mean is not told
    assert found.shifts == pytest.approx([1.0, -1.0], abs=0.03)
    assert -found.coefficients[1] / (2.0 * found.coefficients[2]) == pytest.approx(0.0, abs=1e-3)
    assert found.scatter < 0.005 and np.std(found.residual) == pytest.approx(0.01, rel=0.15)


def test_leverages_sum_to_what_the_fit_takes():
    p = group(np.random.default_rng(5), shared=False, own_x=0.0)
    found = fit(points=p, shape=Polynomial(0.0, 2))
    assert np.all((found.leverage > 0.0) & (found.leverage < 1.0))
    assert (
        3.0 - 1e-6 <= found.leverage.sum() <= 3.0 + 2 * 5 + 1e-6
    )  # coefficients, and at most two shifts a swimmer


def test_one_source_for_all_passes_through_whole():
    p = group(np.random.default_rng(6))
    found = fit(points=p, shape=Polynomial(0.0, 2))
    camera = np.array([k == "camera" for k in found.names])
    change = found.by_shift[0, camera]
    # nothing in the runs tells the camera's scale: 1 % of it is 1 % of y, all of it
    assert np.abs(change) == pytest.approx(0.01, rel=1e-3)


def test_sources_within_swimmers_are_left_to_resampling():
    found = fit(points=group(np.random.default_rng(7)), shape=Polynomial(0.0, 2))
    assert sorted(set(found.names)) == ["E", "camera"]


def test_the_order_of_runs_does_not_matter():
    p = group(np.random.default_rng(8))
    shuffled = np.random.default_rng(0).permutation(len(p.x))
    q = points(
        x=np.exp(p.x)[shuffled],
        y=np.exp(p.y)[shuffled],
        u_own_x=(p.own_x * np.exp(p.x))[shuffled],
        u_own_y=(p.own_y * np.exp(p.y))[shuffled],
        swimmer=p.swimmer[shuffled],
        shared=[
            SharedError(
                s.name, s.owner[shuffled], (s.x * np.exp(p.x))[shuffled], (s.y * np.exp(p.y))[shuffled]
            )
            for s in p.shared
        ],
    )
    a, b = (fit(points=g, shape=Polynomial(0.0, 2)) for g in (p, q))
    assert a.coefficients == pytest.approx(b.coefficients, abs=1e-9)
    assert a.over_swimmers(direction=np.eye(3)[1]).u == pytest.approx(
        b.over_swimmers(direction=np.eye(3)[1]).u, rel=1e-6
    )


@pytest.mark.parametrize("shape", [Polynomial(0.3, 4), NaturalSpline(np.array([-1.0, -0.2, 0.1, 0.6, 1.4]))])
def test_derivatives_of_shapes_agree_with_differences(shape):
    x, h = np.linspace(-0.95, 1.35, 12), 1e-5  # none at a knot, where the third derivative jumps
    for k in (0, 1):
        step = shape.columns(x=x + h, derivative=k) - shape.columns(x=x - h, derivative=k)
        assert step / (2.0 * h) == pytest.approx(shape.columns(x=x, derivative=k + 1), abs=1e-7)


def test_what_cannot_be_used_is_counted():
    x = np.array([1.0, 2.0, np.nan, 3.0, 4.0, 5.0])
    y = np.array([1.0, -1.0, 1.0, 1.0, 1.0, 0.1])
    u = np.array([0.1, 0.1, 0.1, np.nan, 0.1, 0.1])
    p = points(x=x, y=y, u_own_x=0.01, u_own_y=u, swimmer=list("aabbcc"))
    assert p.index.tolist() == [0, 4]
    assert sum(p.left_out.values()) == 4 and len(p.left_out) == 4
    assert p.swimmers == ("a", "c")


def test_how_u_goes_with_y_is_seen():
    y = np.geomspace(0.5, 2.0, 30)
    for u, power in ((0.05 * y, 1.0), (0.05 + 0.0 * y, 0.0)):
        p = points(x=y, y=y, u_own_x=0.0, u_own_y=u, swimmer=np.zeros(30))
        assert p.power == pytest.approx(power, abs=1e-9)


@pytest.mark.parametrize(
    ("change", "field"),
    [
        ({"y": np.ones(3)}, "y"),
        ({"u_own_y": -0.1}, "u_own_y"),
        ({"swimmer": ["a"]}, "swimmer"),
        ({"u_own_x": np.ones(3)}, "u_own_x"),
        ({"shared": [SharedError("E", np.zeros(3), np.zeros(2), np.zeros(2))]}, "E"),
    ],
)
def test_what_does_not_fit_together_is_refused(change, field):
    given = {"x": np.ones(2), "y": np.ones(2), "u_own_x": 0.1, "u_own_y": 0.1, "swimmer": ["a", "b"]}
    with pytest.raises(Refusal) as refused:
        points(**given | change)
    assert refused.value.field == field


def test_too_few_runs_for_a_curve_are_refused():
    p = points(x=[1.0, 2.0, 3.0], y=[1.0, 2.0, 1.0], u_own_x=0.0, u_own_y=0.1, swimmer=[1, 2, 3])
    with pytest.raises(Refusal, match="runs '3'"):
        fit(points=p, shape=Polynomial(0.0, 2))


def test_students_factor_is_in_the_draws():
    p = group(np.random.default_rng(9), S=3, shared=False)
    found = fit(points=p, shape=Polynomial(0.0, 2))
    direction = np.array([1.0, 0.0, 0.0])
    d = drawn(fit=found, direction=direction, draws=200_000, rng=np.random.default_rng(0))
    half = 0.5 * np.subtract(*np.quantile(d.changes[0], (0.975, 0.025)))
    assert half == pytest.approx(d.u_swimmers * student.ppf(0.975, d.dof), rel=0.03)  # four times its scatter


def test_welch_and_satterthwaites_degrees_of_freedom():
    # JCGM 100:2008 G.4.2 with one part of infinitely many: nu (u_c/u)^4
    part = OverSwimmers(u=3.0, expected=3.0, dof=2.0, factor=1.0)
    assert part.dof_with(shared=4.0) == pytest.approx(2.0 * (5.0 / 3.0) ** 4)
    assert part.dof_with(shared=0.0) == pytest.approx(2.0)
