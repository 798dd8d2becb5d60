"""Published points on the trend: their own mark, in the frame, named and cited, in words where they are not drawn."""

import json

import numpy as np
import pandas as pd
import pytest
import vl_convert

from labbook.charts import palette, trend_layers
from labbook.charts.files import svg_bytes
from labbook.charts.trend import trend
from labbook.charts.trend_published import MOST_POINTS, named_places
from labbook.errors import Refusal

AXES = dict(x="Sp", y="U_scaled")
CITED = {"pond-2019": "Pond & Weir (2019), invented", "fen-2021": "Fen (2021), invented"}


def points(*rows, lost=None):
    """Rows of (series, x, y), each with 5 % of u, as the book gives them."""
    frame = pd.DataFrame(rows, columns=["series", "Sp", "U_scaled"])
    frame = frame.assign(citation=frame["series"].map(CITED).fillna("somebody"), u_Sp=0.05 * frame["Sp"],
                         u_U_scaled=0.05 * frame["U_scaled"])  # fmt: skip
    frame.attrs["lost"] = lost or {}
    return frame


POND = [("pond-2019", 1.0, 0.002), ("pond-2019", 2.0, 0.01), ("pond-2019", 4.0, 0.005)]


def names(spec):
    return [part.get("name", "") for part in spec["layer"]]


@pytest.mark.parametrize("dark", [False, True])
def test_they_are_hollow_diamonds_in_ink_over_the_runs(samples, dark):
    spec = trend(
        samples.runs(30), **AXES, group="swimmer", dark=dark, published=points(*POND)
    ).chart.to_dict()
    mark = samples.layer(spec, "published")["mark"]
    assert (mark["shape"], mark["filled"], mark["stroke"]) == ("diamond", False, palette.paper(dark).ink)
    assert palette.paper(dark).rust not in json.dumps(
        [samples.layer(spec, n) for n in names(spec) if "published" in n]
    )
    order = names(spec)
    assert order.index("runs") < order.index("published_bars_y") < order.index("published")
    drawn = [(r["x"], r["y"]) for r in samples.rows(spec, "published")]
    assert drawn == [(x, y) for _, x, y in POND]


def test_the_open_run_and_the_run_in_hand_stay_on_top(samples):
    drawing = trend(
        samples.runs(20), **AXES, picked="R-0004", in_hand=dict(x=2.0, y=0.01), published=points(*POND)
    )
    order = names(drawing.chart.to_dict())
    assert order.index("published") < order.index("picked") < order.index("in_hand")


def test_everything_of_theirs_is_clipped_and_bars_end_in_the_frame(samples):
    wild = points(("pond-2019", 2.0, 0.01)).assign(u_Sp=500.0, u_U_scaled=3.0)
    spec = trend(samples.runs(5), **AXES, width=400, height=300, bands=False, published=wild).chart.to_dict()
    theirs = [part for part in spec["layer"] if part.get("name", "").startswith("published")]
    assert len(theirs) >= 4 and all(part["mark"]["clip"] is True for part in theirs)
    # the view that Vega itself computes: from edge to edge, and no further
    scene = vl_convert.vegalite_to_scenegraph(json.dumps(spec), vl_version="6.4")
    for name, length in (("published_bars_x_marks", 400), ("published_bars_y_marks", 300)):
        (bar,) = marks_named(scene, name)
        along = "x" if "_x_" in name else "y"
        ends = sorted((bar[along], bar.get(f"{along}2", 0)))
        assert ends == pytest.approx([0, length], abs=0.5)


def marks_named(node, name):
    if isinstance(node, dict):
        if node.get("name") == name:
            return node["items"]
        node = list(node.values())
    found = (marks_named(child, name) for child in node) if isinstance(node, list) else ()
    return next((one for one in found if one is not None), None)


def test_they_widen_the_frame(samples):
    far = points(("pond-2019", 500.0, 0.5))
    for log in (True, False):
        spec = trend(samples.runs(20), **AXES, log_x=log, log_y=log, published=far).chart.to_dict()
        for axis, value in (("x", 500.0), ("y", 0.5)):
            assert samples.layer(spec, "runs")["encoding"][axis]["scale"]["domain"][1] > value


def test_they_are_never_counted_as_runs(samples):
    frame = samples.runs(30)
    bare, beside = trend(frame, **AXES), trend(frame, **AXES, published=points(*POND, lost={"no Sp": 4}))
    assert (beside.drawn, beside.left_out) == (bare.drawn, bare.left_out) == (30, {})
    assert beside.caption.startswith("30 runs drawn. ") and (bare.published, beside.published) == (0, 3)
    spec = beside.chart.to_dict()
    assert len(samples.rows(spec, "runs")) == 30
    assert samples.rows(spec, "runs") == samples.rows(bare.chart.to_dict(), "runs")


def test_the_caption_names_every_series_with_its_citation(samples):
    both = points(*POND, ("fen-2021", 3.0, 0.004))
    caption = trend(samples.runs(10), **AXES, published=both).caption
    assert caption.endswith(
        "Hollow diamonds, with bars of their u, are published, not runs: pond-2019 (Pond & Weir (2019), invented), "
        "3 points; fen-2021 (Fen (2021), invented), 1 point."
    )
    assert "not drawn" not in caption
    assert (
        "Hollow diamonds are published"
        in trend(samples.runs(10), **AXES, bars="none", published=both).caption
    )


def test_points_without_a_place_are_counted_in_words(samples):
    lost = {"no Sp in this dialect (needs L_body)": 2}
    assert trend(samples.runs(10), **AXES, published=points(*POND, lost=lost)).caption.endswith(
        "2 published points not drawn: no Sp in this dialect (needs L_body)."
    )
    bad = points(
        *POND, ("pond-2019", 3.0, -0.004), ("fen-2021", 3.0, 0.0), ("fen-2021", np.nan, 0.004), lost=lost
    )
    drawing = trend(samples.runs(10), **AXES, published=bad)
    assert drawing.published == 3 and "fen-2021 (" not in drawing.caption
    assert drawing.caption.endswith(
        "5 published points not drawn: 2 no Sp in this dialect (needs L_body), 1 without Sp, "
        "2 U_scaled zero or negative on a log axis."
    )
    assert trend(samples.runs(10), **AXES, log_y=False, published=bad).published == 5
    one = points(("pond-2019", 3.0, -0.004))
    assert (
        "1 published point not drawn: U_scaled zero" in trend(samples.runs(10), **AXES, published=one).caption
    )
    assert bad.attrs["lost"] == {"no Sp in this dialect (needs L_body)": 2}, "the caller's frame is as it was"


def test_their_bars_are_their_own_u_and_go_with_the_others(samples):
    frame = points(*POND)
    frame.loc[0, ["u_Sp", "u_U_scaled"]] = [0.0, np.nan]
    spec = trend(samples.runs(10), **AXES, bars="total", published=frame).chart.to_dict()
    rows = samples.rows(spec, "published_bars_x")
    assert [r["u_x"] for r in rows] == [None, 0.1, 0.2] and rows[0]["u_y"] is None
    assert [r["x_text"] for r in rows] == ["1", "2.00(10)", "4.0(2)"]
    none = trend(samples.runs(10), **AXES, bars="none", published=frame).chart.to_dict()
    assert not [n for n in names(none) if n.startswith("published_bars")]


def test_a_touch_on_one_answers_with_no_run(samples):
    spec = trend(samples.runs(10), **AXES, published=points(*POND)).chart.to_dict()
    (pick,) = spec["params"]
    assert pick["views"] == ["runs"] and {r["code"] for r in samples.rows(spec, "published")} == {""}
    # a layer with a tooltip takes the touch; without one it would fall through to the nearest run
    assert samples.layer(spec, "published")["encoding"]["tooltip"][0]["title"] == "published, not a run"


def test_colour_and_shape_keep_their_one_legend(samples):
    spec = trend(samples.runs(60, 5), **AXES, group="swimmer", published=points(*POND)).chart.to_dict()
    legends = vl_convert.vegalite_to_vega(json.dumps(spec), vl_version="6.4")["legends"]
    assert len(legends) == 1 and {"fill", "shape"} <= legends[0].keys()


def plane(width=460, height=380, **options):
    given = dict(x="Sp", y="U_scaled", x_domain=(1.0, 100.0), y_domain=(0.01, 1.0), log_x=True, log_y=True,
                 x_title="", y_title="", x_label="", y_label="", dark=False, width=width, height=height)  # fmt: skip
    return trend_layers.Plane(**given | options)


NO_RUNS = pd.DataFrame({"Sp": [], "U_scaled": []})


def test_a_name_stands_beside_its_rightmost_point_where_it_fits():
    (place,) = named_places(plane(), points(("pond-2019", 2.0, 0.1), ("pond-2019", 5.0, 0.1)), NO_RUNS)
    assert (place["name"], place["x"], place["side"]) == ("pond-2019", 5.0, "right")
    # at the right edge there is no room beside it
    (place,) = named_places(plane(), points(("pond-2019", 99.0, 0.1)), NO_RUNS)
    assert place["side"] == "left"
    assert (
        named_places(
            plane(),
            points(("a series with a name far too long for this small frame " * 2, 5.0, 0.1)),
            NO_RUNS,
        )
        == []
    )


def test_names_lie_on_no_other_point_and_on_no_other_name():
    close = points(("pond-2019", 5.0, 0.100), ("fen-2021", 5.6, 0.100), ("mere-2022", 5.3, 0.105))
    found = named_places(plane(), close, NO_RUNS)
    assert len(found) == 3 and len({p["side"] for p in found}) > 1
    by_name = {p["name"]: p for p in found}
    assert by_name["pond-2019"]["side"] != "right"  # fen-2021 stands there, 10 pixels away


def test_a_name_keeps_off_the_runs_where_it_can():
    right_of_it = pd.DataFrame({"Sp": np.geomspace(5.4, 9.0, 20), "U_scaled": 0.1})
    one = points(("pond-2019", 5.0, 0.1))
    assert named_places(plane(), one, NO_RUNS)[0]["side"] == "right"
    assert named_places(plane(), one, right_of_it)[0]["side"] == "above"


def test_names_and_citations_stand_in_a_saved_figure(samples):
    drawing = trend(samples.runs(30), **AXES, width=600, published=points(*POND))
    svg = svg_bytes(drawing.chart, drawing.caption).decode()
    assert ">pond-2019</text>" in svg and "Weir (2019)" in svg
    assert samples.addresses(drawing.chart.to_dict()) == []


def test_without_runs_they_stand_alone(samples):
    drawing = trend(samples.runs(5).iloc[:0], **AXES, group="swimmer", published=points(*POND))
    assert (drawing.drawn, drawing.published) == (0, 3)
    low, high = samples.layer(drawing.chart.to_dict(), "runs")["encoding"]["x"]["scale"]["domain"]
    assert low < 1.0 and high > 4.0
    svg_bytes(drawing.chart, drawing.caption)


@pytest.mark.parametrize("nothing", [None, points()])
def test_none_at_all_changes_nothing(samples, nothing):
    frame = samples.runs(10)
    bare, beside = trend(frame, **AXES), trend(frame, **AXES, published=nothing)
    assert (bare.caption, bare.chart.to_dict()) == (beside.caption, beside.chart.to_dict())


def test_very_many_are_drawn_one_in_so_many_and_that_is_said(samples):
    many = points(*[("pond-2019", 1.0 + i / 1000, 0.01) for i in range(2 * MOST_POINTS + 1)])
    drawing = trend(samples.runs(10), **AXES, published=many)
    assert drawing.published == 667
    assert "1334 published points not drawn: only one in 3 is" in drawing.caption


def test_quotes_and_markup_stay_text(samples):
    odd = points(('</script>"it\'s"', 2.0, 0.01))
    svg = svg_bytes(trend(samples.runs(10), **AXES, width=600, published=odd).chart).decode()
    assert "</script>" not in svg and "&lt;/script" in svg


def test_a_frame_without_their_columns_is_refused(samples):
    with pytest.raises(Refusal):
        trend(samples.runs(5), **AXES, published=points(*POND).drop(columns="citation"))
