"""Trends in words: every number of a result stands in its paragraph, and what was left out."""

import runpy
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest

from labbook.physics.repeats import repeats
from labbook.physics.trend_causes import outliers
from labbook.physics.trend_change import YEAR, changes
from labbook.physics.trend_curve import curve
from labbook.physics.trend_maximum import maximum
from labbook.physics.trend_points import points
from labbook.physics.trend_slope import power_law
from labbook.physics.trend_text import rounded, told

simulated = SimpleNamespace(**runpy.run_path(str(Path(__file__).with_name("simulated_groups.py"))))


@pytest.fixture(scope="module")
def given():
    return simulated.simulate(np.random.default_rng(1), simulated.KINDS["8 swimmers, 2 batches"])


def test_a_maximum_is_told_with_interval_n_and_what_was_left_out(given):
    m = maximum(points=points(**given))
    text = told(maximum=m, x="Sp", y="U/(omega L)", excluded={"void": 3, "in a trial series": 1})
    half = 0.5 * (m.x_high - m.x_low)
    for part in (
        rounded(m.x, half),
        rounded(m.x_low, half),
        rounded(m.x_high, half),
        f"{m.n} runs of 8 swimmers",
        "farther than a factor 1.4",
        "3 runs void, 1 run in a trial series",
        "U/(omega L)",
    ):
        assert part in text
    assert "\n\n" in text and "nan" not in text


def test_no_maximum_is_told_without_numbers(given):
    p = points(**given)
    m = maximum(points=p.where(keep=p.x < np.log(1.8)))
    text = told(maximum=m)
    assert "no maximum inside the data" in text and "nan" not in text and "interval" not in text


def test_few_swimmers_are_told(given):
    p = points(**given)
    two = p.where(keep=p.swimmer < 2)
    for text in (told(maximum=maximum(points=two)), told(power_law=power_law(points=two, low=2.4))):
        assert "no interval: 2 swimmers" in text and "nan" not in text


def test_a_slope_is_told_with_its_bend(given):
    s = power_law(points=points(**given), low=1.2, high=3.5)
    text = told(power_law=s)
    assert f"{s.n} runs" in text and "bend away" in text and f"{s.low:.3g}" in text


def test_changes_are_told_apart_from_none(given):
    days = np.random.default_rng(2).uniform(0.0, 700.0, len(given["x"]))
    aged = given | {"y": given["y"] * np.exp(-0.4 * (given["swimmer"] == 2) * days / YEAR)}
    text = told(changes=changes(points=points(**aged), days=days))
    assert "2: U/(omega L_tail theta0^2) changes by -" in text and "% a year" in text
    assert "No change shown for 0, 1, 3" in text


def test_repeats_and_outliers_are_told(given):
    rng = np.random.default_rng(3)
    r = repeats(y=rng.normal(size=60), u_own=0.5, sets=np.repeat(np.arange(20), 3))
    odd = given | {"y": np.where(np.arange(len(given["y"])) == 4, 2.0, 1.0) * given["y"]}
    text = told(repeats=r, outliers=outliers(fit=curve(points=points(**odd)).fit))
    assert "20 groups of repeated runs (60 runs) scatter more than" in text
    assert "run 4: " in text and "outlier" in text
    assert (
        told(repeats=repeats(y=[1.0], u_own=0.1, sets=[0])) == "No run was repeated with the same settings."
    )


@pytest.mark.parametrize(
    ("value", "half", "written"),
    [
        (2.06612, 0.0753, "2.066"),
        (0.99719, 0.031, "0.997"),
        (1234.0, 56.0, "1234"),
        (123456.0, 5600.0, "123500"),
        (2.5, np.nan, "2.5"),
        (np.nan, 1.0, "unknown"),
    ],
)
def test_two_digits_of_the_interval_are_kept(value, half, written):
    # two digits of an uncertainty: JCGM 100:2008, 7.2.6
    assert rounded(value, half) == written
