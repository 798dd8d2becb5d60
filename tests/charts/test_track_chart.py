"""The charts of a track: what is drawn of a motion that is known, in which unit, thinned and marked.

Truth is the motion that the test makes: 60 um/s along 30 degrees, a beat at 0.5 Hz, so 120 um a cycle.
"""

import json
import math

import numpy as np
import pytest

from labbook.charts.palette import LIGHT
from labbook.charts.track_along import along_chart, residual_chart
from labbook.charts.track_chart import path_chart, steps_chart
from labbook.charts.track_points import length_unit, spread_out, trimmed_end, turning
from labbook.physics.tracks import reduce

U, F, FPS, ANGLE = 60e-6, 0.5, 30.0, math.radians(30)  # m/s, Hz, 1/s
NOISE = 2e-5  # m
WILD = (400, 700, 1100)  # frames set 3 mm aside


def made(frames=1200, wild=WILD, scale=1.0, **options):
    """A reduced track of that motion, with three outlying frames; scale makes all lengths smaller."""
    rng = np.random.default_rng(4)
    t = np.arange(frames) / FPS
    along = U * t + 2e-4 * np.sin(2 * np.pi * F * t) + rng.normal(0, NOISE, frames)
    across = 3e-4 * np.cos(2 * np.pi * F * t) + rng.normal(0, NOISE, frames)
    c, s = math.cos(ANGLE), math.sin(ANGLE)
    x, y = 0.01 + c * along - s * across, 0.02 + s * along + c * across
    x[list(wild)] += 3e-3
    return reduce(t=t, x=scale * x, y=scale * y, f=F, axis=(c, s), **options)


@pytest.fixture(scope="module")
def reduction():
    return made(trim=2)


def axis_of(spec, name, channel, samples):
    return samples.layer(spec, name)["encoding"][channel]


def domain(spec, name, channel, samples):
    low, high = axis_of(spec, name, channel, samples)["scale"]["domain"]
    return high - low


# ---- thinning


def test_a_thinned_beat_keeps_its_size_where_every_kth_frame_would_lose_it():
    beat = np.sin(2 * np.pi * np.arange(100_000) / 100)  # every hundredth frame stands at the same place
    chosen = spread_out(100_000, 1000)
    assert len(chosen) <= 1000 and chosen[0] == 0 and chosen[-1] == 99_999 and (np.diff(chosen) > 0).all()
    # of 1,000 places spread over the beat, one lies within a fiftieth of a beat of either end: 1 - cos(2 pi/50) < 0.01
    assert np.ptp(beat[::100]) < 1e-6 and np.ptp(beat[chosen]) > 1.98
    assert list(spread_out(5, 1000)) == [0, 1, 2, 3, 4]


def test_a_thinned_line_keeps_its_turning_points():
    values = np.zeros(50_001)
    values[[137, 33_333]] = 5.0, -7.0
    chosen = turning(values, 400)
    assert len(chosen) <= 400 and {137, 33_333, 0, 50_000} <= set(chosen)


def test_a_long_track_stays_small_and_its_counts_in_bounds(samples):
    long = made(60_000, wild=range(100, 60_000, 100))
    specs = [draw(long).to_dict() for draw in (path_chart, along_chart, residual_chart, steps_chart)]
    assert sum(len(json.dumps(spec)) for spec in specs) <= 200_000
    assert len(samples.rows(specs[0], "path")) == 2000
    assert len(samples.rows(specs[1], "along_frames")) == 1000
    assert len(samples.rows(specs[1], "along_outlying")) == 200
    # 1,000 cycles are no thousand bars: the axis says of how many a bar is the mean
    bars = samples.rows(specs[3], "steps")
    assert len(bars) <= 60 and axis_of(specs[3], "steps", "y", samples)["axis"]["title"] == ["step a cycle, mean of 17 (µm)"]
    # whatever is averaged, a cycle brings 120 um; 17 cycles of some 0.5 um of scatter each, and a sixtieth odd one
    assert [bar["step"] for bar in bars] == pytest.approx([120.0] * len(bars), abs=3.0)


# ---- path


def test_the_path_has_equal_scales_its_ends_and_the_axis(reduction, samples):
    spec = path_chart(reduction).to_dict()
    a_pixel = [domain(spec, "path", ch, samples) / spec[size] for ch, size in (("x", "width"), ("y", "height"))]
    assert a_pixel[0] == pytest.approx(a_pixel[1], rel=1e-9)
    assert spec["autosize"] == {"type": "pad"}  # the frame has that size, not the frame with its letters
    start, end = samples.rows(spec, "ends")
    assert (start["what"], start["x"], start["y"], end["what"]) == ("start", 0, 0, "end")
    # 40 s at 60 um/s, after whole cycles: 2.4 mm along 30 degrees; two frames of noise and a frame of beat, 0.1 mm
    assert (end["x"], end["y"]) == pytest.approx((2.4 * math.cos(ANGLE), 2.4 * math.sin(ANGLE)), abs=0.1)
    (line,) = samples.rows(spec, "axis")
    assert math.atan2(line["y2"] - line["y"], line["x2"] - line["x"]) == pytest.approx(ANGLE, abs=1e-3)
    # a wedge that points up is turned clockwise: 60 degrees for an axis of 30
    assert samples.layer(spec, "axis_head")["encoding"]["angle"]["value"] == pytest.approx(60.0)
    for ch in "xy":
        assert axis_of(spec, "path", ch, samples)["axis"]["title"].endswith("(mm)")


def test_outlying_frames_are_not_in_the_path(reduction, samples):
    rows = samples.rows(path_chart(reduction).to_dict(), "path")
    assert max(row["x"] for row in rows) < 3.0  # they lie 3 mm aside


# ---- along the axis


def test_frames_fit_outliers_and_trim_stand_where_they_were_made(reduction, samples):
    spec = along_chart(reduction).to_dict()
    assert [row["t"] for row in samples.rows(spec, "along_outlying")] == pytest.approx([i / FPS for i in WILD], abs=0.03)
    (shade,) = samples.rows(spec, "along_trimmed")
    assert shade["to"] == pytest.approx(2 / F) == trimmed_end(reduction.trace, 2, F)
    fit = samples.rows(spec, "along_fit")
    whole = [row["v"] for row in fit if row["t"] in (pytest.approx(10.0, abs=0.02), pytest.approx(30.0, abs=0.02))]
    assert whole[-1] - whole[0] == pytest.approx(20 * 0.06, abs=0.02)  # mm in ten cycles
    assert axis_of(spec, "along_fit", "y", samples)["axis"]["title"] == "along the axis (mm)"
    assert axis_of(spec, "along_fit", "x", samples)["axis"]["title"] == "t (s)"
    assert LIGHT.rust not in json.dumps(spec)  # no frame is the run in hand


def test_residuals_are_the_noise_and_their_time_axis_stands_below_the_other(reduction, samples):
    spec = residual_chart(reduction).to_dict()
    values = np.array([row["v"] for row in samples.rows(spec, "residual_frames")])
    # 20 um of white noise over 1,000 frames: its deviation is known to 1/sqrt(2000), 2.2 %, within four of them
    assert values.std() == pytest.approx(20.0, rel=0.09)
    assert axis_of(spec, "residual_frames", "y", samples)["axis"]["title"] == "residual (µm)"
    above = along_chart(reduction).to_dict()
    for extent in ("minExtent", "maxExtent"):
        assert (axis_of(spec, "residual_frames", "y", samples)["axis"][extent]
                == axis_of(above, "along_fit", "y", samples)["axis"][extent])  # fmt: skip
    assert (axis_of(spec, "residual_frames", "x", samples)["scale"]["domain"]
            == axis_of(above, "along_fit", "x", samples)["scale"]["domain"])  # fmt: skip
    # a frame beyond the frame is drawn at its edge
    low, high = axis_of(spec, "residual_frames", "y", samples)["scale"]["domain"]
    pixel = (high - low) / 100
    assert all(low - pixel < row["v"] < high + pixel for row in samples.rows(spec, "residual_outlying"))


def test_a_track_without_outliers_or_trim_has_no_such_marks():
    names = [part["name"] for part in along_chart(made(wild=())).to_dict()["layer"]]
    assert names == ["along_frames", "along_fit"]


# ---- steps


def test_steps_are_bars_with_mean_band_and_zero(reduction, samples):
    spec = steps_chart(reduction).to_dict()
    bars = samples.rows(spec, "steps")
    # 120 um a cycle; the mean of 60 frames of 20 um noise is known to 2.6 um, a difference of two to 3.7
    assert [bar["step"] for bar in bars] == pytest.approx([120.0] * len(bars), abs=15.0)
    assert len(bars) in (16, 17)  # 18 whole cycles are left of 20, and a step lies between two
    (band,) = samples.rows(spec, "band")
    assert band["low"] < band["step"] < band["high"] and band["step"] == pytest.approx(120.0, abs=1.5)
    assert (band["low"], band["high"]) == pytest.approx(
        (1e6 * reduction.U_low / F, 1e6 * reduction.U_high / F), rel=1e-4
    )
    low, high = axis_of(spec, "steps", "y", samples)["scale"]["domain"]
    assert low < 0 < high and samples.rows(spec, "zero")[0]["zero"] == 0


def test_without_a_beat_there_are_no_steps(reduction):
    rng = np.random.default_rng(2)
    t = np.arange(600) / FPS
    still = reduce(t=t, x=rng.normal(0, NOISE, 600), y=rng.normal(0, NOISE, 600))
    assert still.f_beat is None and steps_chart(still) is None
    assert {part["name"] for part in along_chart(still).to_dict()["layer"]} == {"along_frames", "along_fit"}


# ---- looks


@pytest.mark.parametrize(("span", "unit"), [(2.0, "m"), (3e-3, "mm"), (0.6e-3, "mm"), (0.4e-3, "µm"), (2e-6, "µm")])
def test_the_unit_follows_the_size(span, unit):
    factor, chosen = length_unit(span)
    assert chosen == unit and factor == {"m": 1.0, "mm": 1e3, "µm": 1e6}[unit]


def test_a_hundred_times_smaller_swimmer_is_drawn_in_micrometres(samples):
    small = made(scale=0.01)
    assert axis_of(path_chart(small).to_dict(), "path", "x", samples)["axis"]["title"] == "x from the start (µm)"
    assert axis_of(along_chart(small).to_dict(), "along_fit", "y", samples)["axis"]["title"] == "along the axis (µm)"


@pytest.mark.parametrize("draw", [path_chart, along_chart, residual_chart, steps_chart])
def test_both_themes_and_no_outside_address(reduction, draw, samples):
    light, dark = draw(reduction).to_dict(), draw(reduction, True).to_dict()
    assert light["config"] != dark["config"]
    assert samples.addresses(light) == []
