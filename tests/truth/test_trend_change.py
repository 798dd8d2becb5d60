"""Change over time on simulated groups whose ageing is known, with binomial limits; Holm's rule."""

import runpy
from functools import cache
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from scipy.stats import binom

from labbook.errors import Refusal
from labbook.physics.trend_change import YEAR, changes
from labbook.physics.trend_points import SharedError, points

simulated = SimpleNamespace(**runpy.run_path(str(Path(__file__).with_name("simulated_groups.py"))))
EDGE = 1e-4
SWIMMERS, GROUPS = 8, 20


def aged(rng, y_rate=0.0, x_rate=0.0):
    """(points, days, batch): odd swimmers, the second batch, change by these a year in ln y and in ln x."""
    given = simulated.simulate(rng, simulated.KINDS["8 swimmers, 2 batches"])
    days = rng.uniform(0.0, 700.0, len(given["x"]))
    batch = given["swimmer"] % 2
    grown_x, grown_y = (np.exp(rate * batch * days / YEAR) for rate in (x_rate, y_rate))
    given["shared"] = [SharedError(s.name, s.owner, s.x * grown_x, s.y * grown_y) for s in given["shared"]]
    given |= {"x": given["x"] * grown_x, "y": given["y"] * grown_y}
    return points(**given), days, batch


@cache
def still():
    rng = np.random.default_rng(1)
    return [changes(points=p, days=days) for p, days, _ in (aged(rng) for _ in range(GROUPS))]


def test_unchanging_swimmers_are_called_changing_at_the_stated_rate():
    for reading in ("y", "x"):
        called = sum(getattr(c, reading).p < 0.05 for group in still() for c in group)
        assert (
            binom.ppf(EDGE, GROUPS * SWIMMERS, 0.03) <= called <= binom.ppf(1 - EDGE, GROUPS * SWIMMERS, 0.07)
        )


def test_a_group_is_called_changing_in_few_of_twenty():
    called = sum(min(min(c.y.p_all, c.x.p_all) for c in group) < 0.05 for group in still())
    assert called <= binom.ppf(1.0 - EDGE, GROUPS, 0.06)


def test_a_change_of_y_is_within_its_interval():
    rng, held, seen = np.random.default_rng(2), 0, 0
    for _ in range(GROUPS):
        p, days, _ = aged(rng, y_rate=-0.10)
        found = changes(points=p, days=days)
        held += sum(c.y.low <= -0.10 * (c.owner % 2) <= c.y.high for c in found)
        seen += sum(c.y.p < 0.05 and c.likelier == "y" for c in found if c.owner % 2)
    assert binom.ppf(EDGE, GROUPS * SWIMMERS, 0.92) <= held <= binom.ppf(1.0 - EDGE, GROUPS * SWIMMERS, 0.98)
    assert seen > 0.8 * GROUPS * SWIMMERS / 2  # 10 % a year is four times u of the slope


def test_an_ageing_batch_moves_along_x():
    # E falling by 8 % a year with Sp reckoned from the E of the start: Sp too low by 2 % a year (fourth root)
    rng, held, right = np.random.default_rng(3), 0, 0
    for _ in range(GROUPS):
        p, days, batch = aged(rng, x_rate=-0.02)
        first, second = sorted(changes(points=p, days=days, owner=batch), key=lambda c: c.owner)
        held += (first.x.low <= 0.0 <= first.x.high) + (second.x.low <= -0.02 <= second.x.high)
        right += second.likelier == "x" and second.x.p < 0.05
        assert (first.swimmers, second.swimmers) == (4, 4)
    assert binom.ppf(EDGE, 2 * GROUPS, 0.90) <= held
    assert right >= binom.ppf(EDGE, GROUPS, 0.9)


def test_a_year_has_365_days_and_a_quarter():
    x = np.tile(np.geomspace(1.0, 3.0, 15), 3)
    swimmer, days = np.repeat(np.arange(3), 15), np.random.default_rng(0).uniform(0.0, 1000.0, 45)
    y = 3.0 * x**-1.5 * np.exp(-0.2 * days / 365.25)
    p = points(x=x, y=y, u_own_x=0.0, u_own_y=1e-4 * y, swimmer=swimmer)
    for c in changes(points=p, days=days):
        assert c.y.per_year == pytest.approx(-0.2, rel=1e-6)
        # along x^-1.5 the same is x too low by 0.2/1.5; the linear step in x is made once
        assert c.x.per_year == pytest.approx(-0.2 / 1.5, rel=0.01)


def test_swimmers_of_a_batch_that_change_apart_are_told():
    rng = np.random.default_rng(4)
    p, days, _ = aged(rng, y_rate=-0.3)
    (batch,) = changes(points=p, days=days, owner=np.zeros(len(days), int))
    assert batch.y.p_differ < 1e-6


def test_time_that_goes_with_x_is_not_taken_for_ageing():
    rng, called = np.random.default_rng(5), 0
    for _ in range(GROUPS):
        given = simulated.simulate(rng, simulated.KINDS["5 swimmers, 2 batches"])
        days = 700.0 * (np.log(given["x"]) + 0.3) + rng.uniform(0.0, 60.0, len(given["x"]))
        called += any(c.y.p_all < 0.05 for c in changes(points=points(**given), days=days))
    assert called <= binom.ppf(1.0 - EDGE, GROUPS, 0.06)


def test_holms_adjustment_by_hand():
    # p (0.01, 0.04, 0.03) among three: 0.03, 0.06, 0.06 (Holm 1979: times 3, 2, 1 in order, never falling)
    found = still()[0]
    p = np.array([r.p for c in found for r in (c.y, c.x)])
    by_hand = np.empty_like(p)
    order = np.argsort(p)
    by_hand[order] = np.maximum.accumulate(np.minimum(1.0, p[order] * np.arange(len(p), 0, -1)))
    assert [r.p_all for c in found for r in (c.y, c.x)] == pytest.approx(by_hand.tolist())


def test_a_day_says_nothing_of_years():
    given = simulated.simulate(np.random.default_rng(6), simulated.KINDS["3 swimmers, 1 batch"])
    for c in changes(
        points=points(**given), days=np.random.default_rng(0).uniform(0.0, 0.9, len(given["x"]))
    ):
        assert "no change can be told" in c.verdict and np.isnan(c.y.per_year) and c.likelier == ""


def test_what_does_not_fit_together_is_refused():
    p, days, batch = aged(np.random.default_rng(7))
    for change in ({"days": days[:-1]}, {"days": np.where(days > 300.0, np.nan, days)},
                   {"days": days, "owner": np.arange(len(days))}):  # fmt: skip
        with pytest.raises(Refusal):
            changes(points=p, **change)
