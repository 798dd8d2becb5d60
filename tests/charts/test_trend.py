"""The trend: what is drawn, what is left out and said, one legend, clipped marks, bytes."""

import json

import numpy as np
import pandas as pd
import pytest
import vl_convert

from labbook.charts import drawable, palette
from labbook.charts.trend import trend
from labbook.errors import Refusal
from labbook.registry.regimes import REGIMES, Band, Regime

AXES = dict(x="Sp", y="U_scaled")


def test_counts_of_drawn_and_left_out(samples):
    frame = samples.runs(100)
    frame.loc[:9, "Sp"] = np.nan
    frame.loc[10:14, "U_scaled"] *= -1
    frame.loc[15, "U_scaled"] = 0.0
    frame.loc[16:18, "state"] = "void"
    frame.loc[19, "U_scaled"] = np.nan
    frame.loc[20, "Sp"] = np.inf
    drawing = trend(frame, **AXES)
    assert drawing.left_out == {
        "void": 3,
        "without Sp": 11,
        "without U_scaled": 1,
        "U_scaled zero or negative on a log axis": 6,
    }
    assert drawing.drawn == 100 - 21
    assert len(samples.rows(drawing.chart.to_dict(), "runs")) == 79
    assert drawing.caption.startswith(
        "79 runs drawn; 21 not drawn: 3 void, 11 without Sp, 1 without U_scaled"
    )


def test_negative_values_are_drawn_on_a_linear_axis(samples):
    frame = samples.runs(50)
    frame.loc[:4, "U_scaled"] *= -1
    drawing = trend(frame, **AXES, log_y=False)
    assert drawing.drawn == 50 and drawing.left_out == {}
    low, _ = samples.layer(drawing.chart.to_dict(), "runs")["encoding"]["y"]["scale"]["domain"]
    assert low < frame["U_scaled"].min()


def test_a_run_that_stands_still_is_left_out_for_that_reason(samples):
    frame = samples.runs(10).assign(St=50.0, U=1e-3, u_U=1e-5)
    frame.loc[:2, ["U", "St"]] = [1e-5, np.nan]
    frame.loc[3, "St"] = np.nan
    drawing = trend(frame, x="Sp", y="St")
    assert drawing.left_out == {"with U consistent with 0, so without St": 3, "without St": 1}


def test_what_the_caller_left_out_is_counted_too(samples):
    drawing = trend(samples.runs(10), **AXES, left_out={"void": 1204})
    assert drawing.left_out == {"void": 1204}
    assert "1 204 not drawn: 1 204 void" in drawing.caption


@pytest.mark.parametrize(
    "options", [{}, dict(bars="none"), dict(bands=False), dict(picked="R-0003", log_x=False)]
)
def test_colour_and_shape_share_one_legend(samples, options):
    """Vega-Lite's own compiler, through vl_convert, must give one legend that holds fill and shape."""
    spec = trend(samples.runs(60, 5), **AXES, group="swimmer", **options).chart.to_dict()
    for version in ("5.20", "6.4"):
        legends = vl_convert.vegalite_to_vega(json.dumps(spec), vl_version=version)["legends"]
        assert len(legends) == 1
        assert {"fill", "shape"} <= legends[0].keys()
    encoding = samples.layer(spec, "runs")["encoding"]
    names = [f"reed-{i:02d}" for i in range(1, 6)]
    looks = palette.series(dark=False)
    assert encoding["fill"]["scale"] == {"domain": names, "range": [s.colour for s in looks[:5]]}
    assert encoding["shape"]["scale"] == {"domain": names, "range": [s.shape for s in looks[:5]]}
    # a channel used twice tore the legend apart in a browser although it compiled well
    for part in spec["layer"]:
        if part["name"] != "runs":
            assert not {"fill", "color", "stroke", "shape"} & part.get("encoding", {}).keys()


def family(count, shared=0.04, swimmer="reed-01", seed=3):
    """Runs of one family along a line, their y scattered by the run's own 10 %."""
    random = np.random.default_rng(seed)
    x = np.geomspace(1.0, 8.0, count)
    frame = pd.DataFrame({"code": [f"{swimmer}-{i}" for i in range(count)], "state": "kept", "Sp": x})
    frame["swimmer"] = swimmer
    frame["U_scaled"] = 0.01 * np.exp(random.normal(0, 0.1, count))
    for key, own, part in (("Sp", 0.0, 0.02), ("U_scaled", 0.1, shared)):
        frame[f"u_own_{key}"], frame[f"u_shared_{key}"] = own * frame[key], part * frame[key]
        frame[f"u_{key}"] = np.hypot(own, part) * frame[key]
    return frame


BANDED = dict(AXES, group="swimmer", bars="shared band")


def test_a_shared_band_lies_two_u_around_each_point_of_a_small_family(samples):
    frame = family(6).sample(frac=1, random_state=1)
    drawing = trend(frame, **BANDED)
    rows = samples.rows(drawing.chart.to_dict(), "shared_bands")
    for row, run in zip(rows, frame.sort_values("Sp").itertuples(), strict=True):
        # five digits are drawn
        assert row["x"] == pytest.approx(run.Sp, rel=1e-4)
        assert (row["low"], row["high"]) == pytest.approx((run.U_scaled * 0.92, run.U_scaled * 1.08), rel=1e-4)
    assert drawing.caption.endswith(
        "Bars: the run's own part of one standard uncertainty. Bands: what runs of one swimmer share at most "
        "(fluid, material, swimmer, rig), 2 u; more runs do not shrink it. Here 2 u is 8 % of U/(ω L_tail θ₀²); along x a family may "
        "move by 4 % of Sp."
    )


@pytest.mark.parametrize("count", [24, 240, 2400])
def test_a_shared_band_does_not_shrink_with_the_number_of_runs(samples, count):
    rows = samples.rows(trend(family(count), **BANDED).chart.to_dict(), "shared_bands")
    half = [(row["high"] - row["low"]) / (row["high"] + row["low"]) for row in rows]
    # u is 4 % of y; a stretch has the mean square of u around a median y, and y scatters by 10 %
    assert len(half) == 12 and half == pytest.approx([0.08] * 12, rel=0.15)
    middle = np.log([(row["high"] + row["low"]) / 0.02 for row in rows])
    # its middle settles: a median of n has 1.25 times the 10 %/sqrt(n) of a mean; 12 draws, so twice that
    assert np.sqrt(np.mean(middle**2)) < 2 * 0.125 / np.sqrt(count / 12)


def test_a_family_of_few_points_has_bars_of_the_bands_width(samples):
    families = [family(8), family(1, swimmer="reed-02"), family(2, swimmer="reed-03")]
    frame = pd.concat(families, ignore_index=True)
    spec = trend(frame, **BANDED).chart.to_dict()
    assert {row["family"] for row in samples.rows(spec, "shared_bands")} == {"reed-01"}
    bars = samples.rows(spec, "shared_bars")
    assert sorted(row["family"] for row in bars) == ["reed-02", "reed-03", "reed-03"]
    run = frame[frame["swimmer"] == "reed-02"].iloc[0]
    (bar,) = [row for row in bars if row["family"] == "reed-02"]
    assert (bar["low"], bar["high"]) == pytest.approx((run.U_scaled * 0.92, run.U_scaled * 1.08), rel=1e-4)


@pytest.mark.parametrize("dark", [True, False])
def test_shared_bands_lie_behind_the_marks_in_the_familys_hue_with_one_legend(samples, dark):
    frame = pd.concat([family(30), family(30, swimmer="reed-02", seed=4), family(1, swimmer="reed-03")])
    spec = trend(frame.reset_index(), **BANDED, dark=dark).chart.to_dict()
    names = [part["name"] for part in spec["layer"]]
    looks = palette.series(dark)
    for name in ("shared_bands", "shared_bars"):
        assert names.index("bands_x") < names.index(name) < names.index("bars_y") < names.index("runs")
        assert samples.layer(spec, name)["mark"]["clip"] is True
        for row in samples.rows(spec, name):
            assert row["hue"] == looks[int(row["family"][-1]) - 1].colour
        assert not {"fill", "color", "stroke", "shape"} & samples.layer(spec, name)["encoding"].keys()
    for version in ("5.20", "6.4"):
        assert len(vl_convert.vegalite_to_vega(json.dumps(spec), vl_version=version)["legends"]) == 1


def test_vega_fills_each_familys_band_in_its_own_hue(samples):
    frame = pd.concat([family(30), family(30, swimmer="reed-02", seed=4)]).reset_index()
    spec = trend(frame, **BANDED, width=400, height=300).chart.to_dict()
    scene = vl_convert.vegalite_to_scenegraph(json.dumps(spec), vl_version="6.4")
    fills = [area["fill"] for area in _every_mark_named(scene, "shared_bands_marks")]
    assert set(fills) == {s.colour for s in palette.series(False)[:2]}


def _every_mark_named(node, name):
    if isinstance(node, list):
        return [mark for part in node for mark in _every_mark_named(part, name)]
    if not isinstance(node, dict):
        return []
    return node["items"] if node.get("name") == name else _every_mark_named(list(node.values()), name)


def test_runs_of_several_swimmers_have_no_shared_band_and_other_has_none(samples):
    drawn = trend(samples.runs(300), **AXES, bars="shared band")
    assert "need the colour 'swimmer'" in drawn.caption and "shared_bands" not in str(drawn.chart.to_dict())
    spec = trend(samples.runs(400, 12), **BANDED).chart.to_dict()
    assert "other" not in {row["family"] for row in samples.rows(spec, "shared_bands")}


def test_a_shared_band_that_reaches_zero_ends_below_the_frame(samples):
    spec = trend(family(6, shared=0.8), **BANDED).chart.to_dict()
    floor = samples.layer(spec, "runs")["encoding"]["y"]["scale"]["domain"][0]
    assert all(0 < row["low"] < floor for row in samples.rows(spec, "shared_bands"))
    level = trend(family(6, shared=0.8), **BANDED, log_y=False).chart.to_dict()
    assert all(row["low"] < 0 for row in samples.rows(level, "shared_bands"))


def test_where_nothing_is_shared_or_runs_are_counted_on_a_grid_that_is_said(samples):
    bare = trend(family(6, shared=0.0), **BANDED)
    assert "nothing of U/(ω L_tail θ₀²) is shared" in bare.caption
    grid = trend(binned(samples, 1000, 10), **AXES, bars="shared band")
    assert "No shared bands on a grid of many runs" in grid.caption
    for drawing in (bare, grid):
        assert not [p["name"] for p in drawing.chart.to_dict()["layer"] if p["name"].startswith("shared")]


def test_more_than_seven_groups(samples):
    frame = samples.runs(400, 12)
    counts = frame["swimmer"].value_counts()
    drawing = trend(frame, **AXES, group="swimmer")
    scale = samples.layer(drawing.chart.to_dict(), "runs")["encoding"]["fill"]["scale"]
    assert scale["domain"][-1] == "other" and len(scale["domain"]) == 7
    assert scale["domain"][:-1] == sorted(scale["domain"][:-1])
    assert min(counts[n] for n in scale["domain"][:-1]) >= max(counts.drop(scale["domain"][:-1]))
    assert scale["range"][-1] == palette.paper(False).grey
    assert "the rest are 'other'" in drawing.caption
    seven = trend(samples.runs(400, 7), **AXES, group="swimmer").chart.to_dict()
    assert "other" not in samples.layer(seven, "runs")["encoding"]["fill"]["scale"]["domain"]


def test_series_colours_are_okabe_and_ito_without_vermilion():
    # Okabe & Ito, Color Universal Design (2002/2008), their eight as hex; black is the ink here
    okabe_ito = {"#E69F00", "#56B4E9", "#009E73", "#F0E442", "#0072B2", "#CC79A7"}
    for dark in (False, True):
        looks = palette.series(dark)
        assert {s.colour for s in looks} == okabe_ito | {palette.paper(dark).ink}
        assert len({s.shape for s in looks}) == len(looks) == 7


def test_every_mark_and_bar_is_clipped(samples):
    curve = pd.DataFrame(
        dict(x=[0.1, 1, 100], y=[1e-9, 1e-2, 1.0], low=[0, 1e-3, 0.5], high=[1e-8, 2e-2, 2.0])
    )
    drawing = trend(
        samples.runs(40),
        **AXES,
        group="swimmer",
        picked="R-0007",
        curve=curve,
        bars="total",
        in_hand=dict(x=2.0, y=0.01, u_x=0.1, u_y=0.02),
    )
    spec = drawing.chart.to_dict()
    names = {part["name"] for part in spec["layer"]}
    assert {"runs", "bars_x", "bars_y", "curve", "curve_band", "picked", "in_hand", "bands_x"} <= names
    for part in spec["layer"]:
        assert part["mark"]["clip"] is True, part["name"]
    # a curve may run out of the frame but does not stretch it
    assert samples.layer(spec, "runs")["encoding"]["x"]["scale"]["domain"][1] < 20


def test_a_bar_that_reaches_zero_is_cut_at_the_frame_not_lost(samples):
    """The compiled view, evaluated by Vega, holds a bar whose lower end is the bottom of the frame."""
    frame = samples.runs(5)
    frame.loc[0, "u_own_U_scaled"] = 2 * frame.loc[0, "U_scaled"]
    spec = trend(frame, **AXES, width=400, height=300, bands=False).chart.to_dict()
    scene = vl_convert.vegalite_to_scenegraph(json.dumps(spec), vl_version="6.4")
    bars = _marks_named(scene, "bars_y_marks")
    assert len(bars) == 5
    ends = [max(bar["y"], bar["y2"]) for bar in bars if "y2" in bar] + [
        bar["y"] for bar in bars if "y2" not in bar
    ]
    assert max(ends) == pytest.approx(300, abs=0.5)
    assert all(np.isfinite(end) for end in ends)


def _marks_named(node, name):
    if isinstance(node, dict):
        if node.get("name") == name:
            return node["items"]
        for value in node.values():
            found = _marks_named(value, name)
            if found:
                return found
    elif isinstance(node, list):
        for value in node:
            found = _marks_named(value, name)
            if found:
                return found
    return None


def test_bars_take_the_part_that_was_asked_for(samples):
    frame = samples.runs(3)
    for bars, column in (("own", "u_own_Sp"), ("shared", "u_shared_Sp"), ("total", "u_Sp")):
        found = samples.rows(trend(frame, **AXES, bars=bars).chart.to_dict(), "bars_x")
        assert [r["u_x"] for r in found] == pytest.approx(frame[column].tolist(), rel=5e-3)  # three digits
    spec = trend(frame, **AXES, bars="none").chart.to_dict()
    assert not any(part["name"].startswith("bars") for part in spec["layer"])
    assert "u_x" not in samples.rows(spec, "runs")[0]


def test_thousands_of_rows_are_thinned_and_all_are_counted(samples):
    frame = samples.runs(20_000)
    drawing = trend(frame, **AXES, group="swimmer", width=600)
    found = samples.rows(drawing.chart.to_dict(), "runs")
    assert len(found) <= drawable.MOST_MARKS
    assert sum(r["n"] for r in found) == drawing.drawn == 20_000
    largest = max(r["n"] for r in found)
    assert f"One mark stands for up to {largest} runs" in drawing.caption
    for name, count in frame["swimmer"].value_counts().items():
        assert sum(r["n"] for r in found if r["group"] == name) == count


def test_five_thousand_rows_are_drawn_one_by_one(samples):
    drawing = trend(samples.runs(5000), **AXES)
    assert len(samples.rows(drawing.chart.to_dict(), "runs")) == 5000
    assert "One mark" not in drawing.caption


def test_thinned_marks_stand_where_their_runs_are():
    frame = pd.DataFrame(
        dict(Sp=[1.0, 1.0001, 100.0], U_scaled=[1.0, 1.0, 1e4], n=[1, 3, 5], code=["a", "b", "c"])
    )
    result = drawable.thinned(frame, x="Sp", y="U_scaled", group=None, log_x=True, log_y=True, most=2)
    result = result.sort_values("Sp")
    assert result["n"].tolist() == [4, 5]
    # the weighted geometric mean of 1 once and 1.0001 three times
    assert result["Sp"].tolist() == pytest.approx([1.0001**0.75, 100.0], rel=1e-12)


def binned(samples, total, cells):
    """A frame as the book bins it: no codes, n runs a row."""
    frame = samples.runs(cells)[["Sp", "U_scaled", "swimmer"]].copy()
    frame["n"] = total // cells
    frame.loc[0, "n"] += total - int(frame["n"].sum())
    return frame


@pytest.mark.parametrize("cells", [900, 1800, 6000])
def test_a_million_binned_runs_weigh_at_most_three_times_a_thousand(samples, cells):
    thousand = trend(samples.runs(1000), **AXES, group="swimmer")
    million = trend(binned(samples, 10**6, cells), **AXES, group="swimmer")
    assert million.drawn == 10**6
    assert "1 000 000 runs drawn" in million.caption
    found = samples.rows(million.chart.to_dict(), "runs")
    assert sum(r["n"] for r in found) == 10**6
    # design.md section 8 allows a factor of 3
    assert len(million.chart.to_json(indent=None)) <= 3 * len(thousand.chart.to_json(indent=None))


def test_left_out_counts_the_runs_of_a_binned_row(samples):
    frame = binned(samples, 1000, 10)
    frame.loc[3, "U_scaled"] = -1.0
    drawing = trend(frame, **AXES)
    assert drawing.left_out == {"U_scaled zero or negative on a log axis": 100}
    assert drawing.drawn == 900


def test_only_needed_columns_travel(samples):
    spec = trend(samples.runs(30), **AXES, group="swimmer").chart.to_dict()
    assert set(samples.rows(spec, "runs")[0]) == {"x", "y", "u_x", "u_y", "x_text", "y_text", "code", "group"}
    assert "never drawn" not in json.dumps(spec)
    assert len(spec["datasets"]) <= 3  # the runs are embedded once, whatever the number of layers


def test_bands_of_the_registry_stand_at_their_limits(samples):
    spec = trend(samples.runs(200), x="Sp", y="Re_omega").chart.to_dict()
    found = {r["name"]: (r["low"], r["high"]) for r in samples.rows(spec, "bands_x")}
    low, high = samples.layer(spec, "runs")["encoding"]["x"]["scale"]["domain"]
    # design.md section 2: stiff tail Sp < 1; working tail 1 to 4; floppy tail > 4
    assert found == {"stiff tail": (low, 1.0), "working tail": (1.0, 4.0), "floppy tail": (4.0, high)}
    level = {r["name"]: (r["low"], r["high"]) for r in samples.rows(spec, "bands_y")}
    # creeping Re_omega < 0.1; nearly creeping 0.1 to 1; transitional 1 to 1000; the runs end at 100
    assert (
        level["nearly creeping"] == (0.1, 1.0)
        and level["creeping"][1] == 0.1
        and level["transitional"][0] == 1.0
    )
    assert "inertial" not in level
    assert samples.layer(spec, "bands_x")["mark"]["opacity"] == palette.BAND_OPACITY == 0.20


def test_bands_follow_the_rows_given(samples):
    own = [Regime("ours", (Band("Sp", 2.0, 3.0),), "common practice, no source"), REGIMES["cruising"]]
    spec = trend(samples.runs(50), **AXES, regimes=own).chart.to_dict()
    assert [(r["name"], r["low"], r["high"]) for r in samples.rows(spec, "bands_x")] == [("ours", 2.0, 3.0)]
    bare = trend(samples.runs(50), **AXES, bands=False).chart.to_dict()
    assert not any(part["name"].startswith("band") for part in bare["layer"])


def test_a_point_returns_its_code(samples):
    spec = trend(samples.runs(20), **AXES).chart.to_dict()
    (pick,) = spec["params"]
    assert (
        pick["name"] == "pick" and pick["select"]["type"] == "point" and pick["select"]["fields"] == ["code"]
    )
    assert "on" not in pick["select"]  # the default is a click or a touch: nothing needs hover
    assert samples.rows(spec, "runs")[0]["code"] == "R-0000"


def test_tooltips_carry_code_and_written_values(samples):
    frame = samples.runs(1).assign(Sp=2.31, u_Sp=0.03, U_scaled=4.0e-4, u_U_scaled=3e-5)
    spec = trend(frame, **AXES).chart.to_dict()
    (row,) = samples.rows(spec, "runs")
    assert (row["x_text"], row["y_text"]) == ("2.31(3)", "4.0(3)e-4")
    titles = [tip["title"] for tip in samples.layer(spec, "runs")["encoding"]["tooltip"]]
    assert titles[:3] == ["run", "Sp", "U/(ω L_tail θ₀²)"]


def test_the_run_in_hand_and_the_open_run_are_rust(samples):
    for dark in (False, True):
        spec = trend(
            samples.runs(20), **AXES, picked="R-0004", in_hand=dict(x=30.0, y=0.01, u_x=1.0), dark=dark
        ).chart
        spec = spec.to_dict()
        rust = palette.paper(dark).rust
        assert samples.layer(spec, "picked")["mark"]["stroke"] == rust
        assert samples.layer(spec, "in_hand")["mark"]["fill"] == rust
        # it widens the frame rather than fall outside
        assert samples.layer(spec, "runs")["encoding"]["x"]["scale"]["domain"][1] > 30.0


def test_what_has_no_place_is_said(samples):
    drawing = trend(samples.runs(20), **AXES, picked="R-9999", in_hand=dict(x=2.0, y=-0.01))
    assert "The run in hand has no place on these axes" in drawing.caption
    assert "The open run is not among the runs drawn" in drawing.caption


def test_the_open_run_is_ringed_even_where_runs_are_thinned(samples):
    frame = samples.runs(8000)
    spec = trend(frame, **AXES, picked="R-4321").chart.to_dict()
    (row,) = samples.rows(spec, "picked")
    assert (row["x"], row["y"]) == pytest.approx(
        (frame.loc[4321, "Sp"], frame.loc[4321, "U_scaled"]), rel=1e-12
    )


@pytest.mark.parametrize("options", [dict(x="nope"), dict(group="nope"), dict(bars="some")])
def test_unknown_columns_and_bars_are_refused(samples, options):
    with pytest.raises(Refusal):
        trend(samples.runs(5), **(AXES | options))


def test_an_empty_frame_draws_an_empty_chart(samples):
    drawing = trend(samples.runs(5).iloc[:0], **AXES, group="swimmer")
    assert (drawing.drawn, drawing.left_out, drawing.caption) == (0, {}, "0 runs drawn.")
    drawing.chart.to_dict()


def test_names_with_quotes_and_markup_stay_text(samples):
    frame = samples.runs(4)
    frame["swimmer"] = ['say "hi"', "it's; alert(1)", "</script>", None]
    spec = trend(frame, **AXES, group="swimmer").chart.to_dict()
    assert samples.layer(spec, "runs")["encoding"]["fill"]["scale"]["domain"] == sorted(
        ['say "hi"', "it's; alert(1)", "</script>", "none given"]
    )


def test_no_outside_address_in_any_specification(samples):
    spec = trend(samples.runs(50), **AXES, group="swimmer").chart.to_dict()
    assert samples.addresses(spec) == []


def test_a_shared_band_does_not_cross_a_wide_gap(samples):
    frame = family(24)
    frame.loc[frame.index[12:], "Sp"] *= 50
    rows = samples.rows(trend(frame, **BANDED).chart.to_dict(), "shared_bands")
    pieces = {row["piece"]: sorted(r["x"] for r in rows if r["piece"] == row["piece"]) for row in rows}
    assert len(pieces) == 2 and max(pieces[0]) * 10 < min(pieces[1])


def test_a_regime_on_both_axes_is_a_box_with_its_name(samples):
    corner = Regime("corner", (Band("Sp", 1.0, 3.0), Band("U_scaled", 0.002)), "own", "sky")
    spec = trend(samples.runs(60), **AXES, regimes=[corner]).chart.to_dict()
    (box,) = samples.rows(spec, "regime_boxes")
    assert (box["left"], box["right"], box["bottom"]) == (1.0, 3.0, 0.002) and box["hue"] == "#56B4E9"
    assert [row["name"] for row in samples.rows(spec, "regime_box_names")] == ["corner"]
