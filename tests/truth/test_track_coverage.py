"""Do stated 95 % intervals contain the true speed 95 times in a hundred? On simulated tracks, with binomial
limits.

The promise is 92 to 98 %, and 3 to 7 % of still swimmers called swimming. The whole table, 1,000 tracks a
cell, is printed by `python tests/truth/simulated_tracks.py`; here fewer tracks are made, and the limits are
those that a reduction inside the promise passes with a probability of 0.9999 at its very edge.
"""

import runpy
from functools import cache
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from scipy.stats import binom

from labbook.physics import tracks

# tests are collected without a path to their folder
simulated = SimpleNamespace(**runpy.run_path(str(Path(__file__).with_name("simulated_tracks.py"))))

EDGE = 1e-4
TRACKS = {5: 60, 10: 50, 30: 15}
STILL = 40
EX = (1.0, 0.0)


def limits(n, low, high):
    """Counts out of n that a share between low and high stays within, but for 1 in 10,000 on either side."""
    return binom.ppf(EDGE, n, low), binom.ppf(1.0 - EDGE, n, high)


@cache
def reductions(name):
    """[(true speed in the interval, (U - true)/u, p_zero of the same noise without speed)] of one kind."""
    rng = np.random.default_rng(sum(map(ord, name)))
    told = []
    for cycles, number in TRACKS.items():
        for _ in range(number):
            s = simulated.simulate(rng, simulated.KINDS[name], cycles)
            r = tracks.reduce(t=s.t, x=s.x, y=s.y, f=simulated.F, axis=EX, **s.known)
            told.append((r.U_low <= simulated.SPEED <= r.U_high, (r.U - simulated.SPEED) / r.u_U))
    return np.array(told, float)


@pytest.mark.parametrize("name", simulated.KINDS)
def test_intervals_contain_the_true_speed(name):
    covered = reductions(name)[:, 0]
    low, high = limits(len(covered), 0.92, 0.98)
    assert low <= covered.sum() <= high, f"{covered.sum():.0f} of {len(covered)}"


def test_intervals_of_all_kinds_together():
    covered = np.concatenate([reductions(name)[:, 0] for name in simulated.KINDS])
    low, high = limits(len(covered), 0.945, 0.97)  # the mean of the cells of the whole table lies between
    assert low <= covered.sum() <= high, f"{covered.sum():.0f} of {len(covered)}"


def test_speed_is_not_biased():
    z = np.concatenate([reductions(name)[:, 1] for name in simulated.KINDS])
    # 0.1 u is promised; the mean of n such ratios scatters by about 1/sqrt(n), and four of these are allowed
    assert abs(z.mean()) < 0.1 + 4.0 * z.std() / np.sqrt(len(z))


def test_todays_ways_fail_the_same_limits():
    # so that the limits can fail, and to show what is gained
    rng = np.random.default_rng(1)
    for how in (simulated.end_points, simulated.mean_of_size):
        covered = []
        for name in ("white, fractional cycle", "wobble, drift", "white, 3 % outliers"):
            for _ in range(100):
                _, low, high = how(simulated.simulate(rng, simulated.KINDS[name], 10))
                covered.append(low <= simulated.SPEED <= high)
        low, high = limits(len(covered), 0.92, 0.98)
        assert not low <= np.sum(covered) <= high


def test_least_squares_with_white_errors_fails_them_under_wobble():
    rng, covered = np.random.default_rng(2), []
    for _ in range(200):
        s = simulated.simulate(rng, simulated.KINDS["wobble, fractional cycle"], 10)
        turn = 2.0 * np.pi * simulated.F * s.t[:, None] * np.arange(1, 5)
        X = np.hstack([np.ones((len(s.t), 1)), s.t[:, None], np.cos(turn), np.sin(turn)])
        beta, rss, *_ = np.linalg.lstsq(X, s.x, rcond=None)
        u = np.sqrt(rss[0] / (len(s.t) - X.shape[1]) * np.linalg.inv(X.T @ X)[1, 1])
        covered.append(abs(beta[1] - simulated.SPEED) < 1.96 * u)
    assert np.sum(covered) < limits(200, 0.92, 0.98)[0] / 1.5


@pytest.mark.parametrize("name", ["white", "wobble, tau 0.3 beat", "wobble, drift"])
def test_still_swimmers_are_not_called_swimming_along_a_fitted_axis(name):
    rng, called, lengths = np.random.default_rng(3), 0, []
    for _ in range(STILL):
        s = simulated.simulate(rng, simulated.KINDS[name], 10, speed=0.0)
        r = tracks.reduce(t=s.t, x=s.x, y=s.y, f=simulated.F, **s.known)
        called += r.p_zero < 0.05
        lengths.append(r.U)
        assert r.U >= 0.0 and (r.U_low == 0.0 or r.p_zero < 0.05)
    assert called <= limits(STILL, 0.03, 0.07)[1]


def test_testing_a_fitted_direction_as_if_given_would_call_still_swimmers_swimming():
    rng, called = np.random.default_rng(4), 0
    for _ in range(60):
        s = simulated.simulate(rng, simulated.KINDS["white"], 10, speed=0.0)
        axis = tracks.reduce(t=s.t, x=s.x, y=s.y, f=simulated.F, **s.known).axis
        called += tracks.reduce(t=s.t, x=s.x, y=s.y, f=simulated.F, axis=axis).p_zero < 0.05
    assert called > 3  # 14 % expected: chi-square of two degrees of freedom against the limit of one


def test_a_steady_start_keeps_its_cycles():
    rng, trimmed = np.random.default_rng(5), 0
    for _ in range(80):
        s = simulated.simulate(rng, simulated.KINDS["wobble, tau 0.3 beat"], 10)
        trimmed += tracks.reduce(t=s.t, x=s.x, y=s.y, f=simulated.F, axis=EX).trimmed > 0.0
    assert trimmed <= binom.ppf(1.0 - EDGE, 80, 0.002)  # 0.1 % by the rule, doubled for its approximations
