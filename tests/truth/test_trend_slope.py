"""Power-law slopes against scipy's straight line, and where no interval is given."""

import numpy as np
import pytest
from scipy.stats import linregress

from labbook.errors import Refusal
from labbook.physics.trend_points import SharedError, points
from labbook.physics.trend_slope import power_law


def group(*, S=6, runs=12, noise=0.02, u=0.1, seed=0, shared=None):
    rng = np.random.default_rng(seed)
    swimmer = np.repeat(np.arange(S), runs)
    x = np.exp(rng.uniform(0.0, 1.0, len(swimmer)))
    y = 2.0 * x**-1.5 * np.exp(noise * rng.normal(size=len(x)))
    sources = [SharedError("drift", 0 * swimmer, 0.0 * x, shared(x) * y)] if shared else ()
    return points(x=x, y=y, u_own_x=0.0, u_own_y=u * y, swimmer=swimmer, shared=sources)


def test_where_bars_explain_all_it_is_the_ordinary_line():
    p = group()
    s = power_law(points=p)
    line = linregress(p.x, p.y)
    assert s.slope == pytest.approx(line.slope, abs=1e-9)
    # the mean of ln y is below the ln of the mean by half of 10 % squared
    assert np.log(s.scale) == pytest.approx(line.intercept + line.slope * np.log(s.centre) + 0.005, abs=1e-9)


def test_many_swimmers_scatter_as_many_runs():
    # with 40 equal swimmers of one noise, the spread over swimmers is that over runs: linregress's error
    p = group(S=60, runs=15, noise=0.1, u=0.1)
    s = power_law(points=p)
    # relative scatter of a standard deviation of 60 swimmers is 1/sqrt(2 x 59) = 9 %; three of these
    assert s.u_swimmers == pytest.approx(linregress(p.x, p.y).stderr, rel=0.27)
    assert 30.0 < s.dof < 60.0


def test_a_shared_error_that_goes_with_x_tilts_the_line():
    s = power_law(points=group(shared=lambda x: 0.05 * np.log(x)))
    assert s.u_shared == pytest.approx(0.05, rel=1e-6)  # d(slope) of y -> y x^0.05
    flat = power_law(points=group(shared=lambda x: 0.05 + 0.0 * x))
    assert flat.u_shared == pytest.approx(0.0, abs=1e-6)


def test_a_range_is_kept():
    p = group()
    s = power_law(points=p, low=1.3, high=2.2)
    inside = (np.exp(p.x) >= 1.3) & (np.exp(p.x) <= 2.2)
    assert s.n == inside.sum() and sum(s.left_out.values()) == (~inside).sum()
    assert 1.3 <= s.low < s.high <= 2.2
    assert np.isnan(s.at(x=1.0)) and s.at(x=s.centre) == pytest.approx(s.scale)


def test_two_swimmers_get_no_interval():
    s = power_law(points=group(S=2))
    assert np.isnan(s.slope_low) and "2 swimmers" in s.verdict and s.slope == pytest.approx(-1.5, abs=0.1)


@pytest.mark.parametrize("ends", [{"low": 2.0, "high": 1.0}, {"low": 50.0}, {"low": np.nan, "high": 2.0}])
def test_empty_ranges_are_refused(ends):
    with pytest.raises(Refusal):
        power_law(points=group(), **ends)


def test_one_x_has_no_slope():
    with pytest.raises(Refusal, match="different x"):
        power_law(points=points(x=np.ones(8), y=np.ones(8), u_own_x=0.0, u_own_y=0.1, swimmer=np.arange(8)))
