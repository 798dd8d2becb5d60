"""Crosses at maxima and means of repeats on the trend: on its axes, in its colours, and none where none can be."""

import numpy as np
import pandas as pd
import pytest

from labbook.charts.files import svg_bytes
from labbook.charts.palette import paper
from labbook.charts.trend import trend
from labbook.charts.trend_fit_marks import CROSS, MEANS, FitMarks, with_marks
from labbook.charts.trend_published import NO_RUN

ALL = {"name": "", "x": 2.0, "x_low": 1.9, "x_high": 2.2, "y": 0.014, "y_low": 0.013, "y_high": 0.015}
OF_A = {**ALL, "name": "mid-a", "x": 2.5, "x_low": 2.4, "x_high": 2.7}


def drawn(log=True, group="material"):
    x = np.geomspace(0.5, 5.0, 40)
    frame = pd.DataFrame({"code": [f"R-{i}" for i in range(40)], "state": "kept", "Sp": x,
                          "U_scaled": 0.014 / (1 + np.log(x / 2) ** 2), "material": ["mid-a", "firm-b"] * 20})
    return trend(frame, x="Sp", y="U_scaled", group=group, log_x=log, log_y=log, bands=False, bars="none",
                 width=600, height=400)  # fmt: skip


def means(**more):
    rows = {"x": [1.0, 3.0], "y": [0.009, 0.012], "scatter": [0.001, 0.002], "n": [2, 5], "name": ["a in b", "c"]}
    return pd.DataFrame(rows | more)


def named(done):
    spec = done.chart.to_dict()
    return {part["name"]: part for part in spec["layer"] if "name" in part}


def rows(done, name):
    data = named(done)[name]["data"]
    return data["values"] if "values" in data else done.chart.to_dict()["datasets"][data["name"]]


def test_without_marks_the_trend_stays_as_it_is():
    before = drawn()
    assert with_marks(before, None, dark=False) is before
    assert with_marks(before, FitMarks([]), dark=False) is before
    empty = trend(pd.DataFrame({"code": [], "state": [], "Sp": [], "U_scaled": []}), x="Sp", y="U_scaled", bars="none")
    assert with_marks(empty, FitMarks([ALL]), dark=False).drawn == 0


@pytest.mark.parametrize("log", [True, False])
def test_marks_share_the_axes_of_the_runs(log):
    before = drawn(log)
    done = with_marks(before, FitMarks([ALL], means()), dark=False)
    layers = named(done)
    for name in ("maximum", "maximum_across", "maximum_up", "repeats", "repeat_bars"):
        for channel in ("x", "y"):
            for part in ("scale", "axis"):
                assert layers[name]["encoding"][channel][part] == layers["runs"]["encoding"][channel][part]
    # two axes that differ would print their titles one after the other, or twice
    svg = svg_bytes(done.chart, "").decode()
    assert svg.count("scaled speed") == svg_bytes(before.chart, "").decode().count("scaled speed") > 0
    assert "named" not in before.caption and "maximum" not in named(before), "the trend given is not changed"


def test_a_cross_has_the_ends_of_its_intervals_and_opens_no_run():
    done = with_marks(drawn(), FitMarks([ALL]), dark=False)
    (row,) = rows(done, "maximum")
    assert [row[k] for k in ("x", "x_low", "x_high", "y", "y_low", "y_high")] == [2.0, 1.9, 2.2, 0.014, 0.013, 0.015]
    across, up = (named(done)[f"maximum_{way}"]["encoding"] for way in ("across", "up"))
    assert (across["x"]["field"], across["x2"]["field"], across["y"]["field"]) == ("x_low", "x_high", "y")
    assert (up["y"]["field"], up["y2"]["field"], up["x"]["field"]) == ("y_low", "y_high", "x")
    assert row["code"] == NO_RUN and row["hue"] == paper(False).ink
    assert done.caption.endswith(f"{CROSS}.") and done.drawn == drawn().drawn


def test_a_maximum_without_interval_is_a_cross_without_thick_part():
    bare = {**ALL, "x_low": np.nan, "x_high": np.nan, "y_low": np.nan, "y_high": np.nan}
    (row,) = rows(with_marks(drawn(), FitMarks([bare]), dark=False), "maximum")
    assert row["x_low"] == row["x_high"] == row["x"] and row["y_low"] == row["y"]
    assert row["x_text"] == "2, no interval"
    none = {**ALL, "x": np.nan}
    assert "maximum" not in named(with_marks(drawn(), FitMarks([none]), dark=False))


def test_a_familys_cross_has_its_colour_and_the_groups_lies_on_top():
    done = with_marks(drawn(), FitMarks([ALL, OF_A, {**OF_A, "name": "steel"}]), dark=True)
    family, group = rows(done, "maximum")
    fill = named(done)["runs"]["encoding"]["fill"]["scale"]
    assert family["hue"] == dict(zip(fill["domain"], fill["range"], strict=True))["mid-a"]
    assert group["hue"] == paper(True).ink and "in colour: of a family" in done.caption
    plain = with_marks(drawn(group=None), FitMarks([ALL, OF_A]), dark=False)
    assert [r["name"] for r in rows(plain, "maximum")] == ["all runs"], "no legend, no colour to tell it by"


def test_means_stand_with_their_scatter_inside_the_frame():
    done = with_marks(drawn(), FitMarks([], means(scatter=[0.001, 1.0])), dark=False)
    first, second = rows(done, "repeats")
    assert (first["low"], first["high"], first["n"]) == pytest.approx((0.008, 0.010, 2))
    floor, top = named(done)["runs"]["encoding"]["y"]["scale"]["domain"]
    assert (second["low"], second["high"]) == pytest.approx((floor, top), rel=1e-4)
    assert MEANS in done.caption and CROSS not in done.caption


def test_a_mean_without_a_place_is_left_out():
    low = means(y=[-0.001, 0.012])
    assert len(rows(with_marks(drawn(True), FitMarks([], low), dark=False), "repeats")) == 1
    assert len(rows(with_marks(drawn(False), FitMarks([], low), dark=False), "repeats")) == 2
    nowhere = means(x=[np.nan, np.nan])
    assert with_marks(drawn(), FitMarks([], nowhere), dark=False).caption == drawn().caption
