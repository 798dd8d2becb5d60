"""Do stated 95 % intervals of a group's maximum hold its true place 90 to 98 times in a hundred? On simulated
groups, with binomial limits.

The whole table, 500 groups a row, is printed by `python tests/truth/simulated_groups.py`; here fewer groups
are made, and the limits are those that a method inside the promise passes with a probability of 0.9999 at its
very edge. The truth, Sp = 2.090123, is section 8 of physics.md.
"""

import runpy
from functools import cache
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from scipy.stats import binom

from labbook.physics import trend_points, trend_slope

# tests are collected without a path to their folder
simulated = SimpleNamespace(**runpy.run_path(str(Path(__file__).with_name("simulated_groups.py"))))

EDGE = 1e-4
GROUPS = 40
NAMES = (
    "3 swimmers, 1 batch",
    "3 swimmers, 3 batches",
    "5 swimmers, 2 batches",
    "8 swimmers, 1 batch",
    "8 swimmers, 4 batches",
    "12 swimmers, 2 batches",
)


def limits(n, low, high):
    """Counts out of n that a share between low and high stays within, but for 1 in 10,000 on either side."""
    return binom.ppf(EDGE, n, low), binom.ppf(1.0 - EDGE, n, high)


@cache
def groups(name):
    """(answers, naive answers) of one kind, (n, 6) each, NaN where no interval was given."""
    rng = np.random.default_rng(sum(map(ord, name)))
    kind = (simulated.KINDS | simulated.HARDER)[name]
    return tuple(
        np.array(a) for a in zip(*(simulated.answers(rng, kind) for _ in range(GROUPS)), strict=True)
    )


def told(rows):
    return rows[np.isfinite(rows[:, 1])]


@pytest.mark.parametrize("name", [*NAMES, "own u of y absolute, 10 % at the top", "uneven runs"])
@pytest.mark.parametrize("which", [0, 1])
def test_intervals_hold_the_true_place_and_height(name, which):
    held = simulated.held(told(groups(name)[0]))[which]
    low, high = limits(len(held), 0.90, 0.98)
    assert low <= held.sum() <= high, f"{held.sum():.0f} of {len(held)}"


@pytest.mark.parametrize("which", [0, 1])
def test_intervals_of_all_kinds_together(which):
    held = np.concatenate([simulated.held(told(groups(name)[0]))[which] for name in NAMES])
    low, high = limits(len(held), 0.935, 0.97)  # the mean of the whole table's rows lies between
    assert low <= held.sum() <= high, f"{held.sum():.0f} of {len(held)}"


def test_few_are_refused_although_the_top_is_inside():
    refused = sum(np.isnan(groups(name)[0][:, 1]).sum() for name in NAMES)
    assert refused <= binom.ppf(1.0 - EDGE, GROUPS * len(NAMES), 0.02)


def test_place_and_height_are_not_biased():
    rows = np.concatenate([told(groups(name)[0]) for name in NAMES])
    for at, true, allowed in ((0, simulated.SP_TOP, 0.001), (3, 1.0, 0.003)):
        off = np.log(rows[:, at] / true)
        # the bias of the polynomial on this curve (trend_maximum), and four standard errors of the mean
        assert abs(off.mean()) < allowed + 4.0 * off.std() / np.sqrt(len(off))


def test_a_fit_that_ignores_sharing_fails_the_same_limits():
    # so that the limits can fail, and to show what is gained
    rng, kind = np.random.default_rng(3), simulated.KINDS["12 swimmers, 1 batch"]
    rows = [simulated.naive(**simulated.simulate(rng, kind)) for _ in range(600)]
    place, height = simulated.held(rows)
    low, _ = limits(600, 0.90, 0.98)
    assert place.sum() < 0.5 * low and height.sum() < low


def test_runs_taken_for_swimmers_fail_them_too():
    # the same fit with every run its own swimmer, and no source stated: what a bootstrap over runs would see
    rng, held = np.random.default_rng(4), []
    for _ in range(GROUPS):
        given = simulated.simulate(rng, simulated.KINDS["8 swimmers, 2 batches"])
        given |= {"shared": [], "swimmer": np.arange(len(given["x"])) % 40}
        m = simulated.trend_maximum.maximum(points=trend_points.points(**given))
        held.append(m.x_low <= simulated.SP_TOP <= m.x_high)
    assert np.sum(held) < limits(GROUPS, 0.90, 0.98)[0] / 1.2


def test_intervals_of_a_power_law_hold_its_exponent():
    rng, held, bent = np.random.default_rng(5), [], []
    for name in ("3 swimmers, 1 batch", "5 swimmers, 2 batches", "12 swimmers, 2 batches"):
        for _ in range(GROUPS):
            given = simulated.simulate(rng, simulated.KINDS[name], curve=lambda x: x**-2.4)
            s = trend_slope.power_law(points=trend_points.points(**given), low=1.2, high=3.0)
            held.append(s.slope_low <= -2.4 <= s.slope_high)
            bent.append(s.p_bend < 0.05)
    low, high = limits(len(held), 0.92, 0.98)
    assert low <= np.sum(held) <= high
    assert np.sum(bent) <= limits(len(bent), 0.03, 0.07)[1]


def test_the_curve_itself_is_seen_to_bend():
    given = simulated.simulate(np.random.default_rng(6), simulated.KINDS["12 swimmers, 2 batches"])
    assert trend_slope.power_law(points=trend_points.points(**given), low=1.2, high=3.0).p_bend < 1e-3
