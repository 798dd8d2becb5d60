"""The picture of a predicted beat: to one scale, through the tips that were worked out and measured, turned in the browser."""

import json

import numpy as np
import pytest
import vl_convert

from labbook.charts.beat_chart import beat_chart
from labbook.charts.beat_frame import HIGHEST
from labbook.charts.beat_tips import BESIDE, Tip
from labbook.charts.drawings import scale_length
from labbook.charts.palette import paper
from labbook.errors import Refusal
from labbook.physics.tail_shapes import shape

# physics.md section 8, the worked case in SI: Sp 3.70806644, L 30 mm, b 2 mm, 0.3 rad, tip amplitude 1.00363402 mm
CASE = dict(drive="free_head_angle", Sp=3.70806644, head=2 / 30, head_drag=6 * np.pi * 2e-3 / (2.73518245 * 0.030))
SIZES = {"L_tail": 0.030, "b": 2e-3, "b_long": np.nan, "thickness": 1e-3}
UNIT, TIP = 0.030 * 0.3, 2 * 1.00363402e-3


@pytest.fixture
def spec():
    return beat_chart(shape(**CASE), SIZES, unit=UNIT, head=CASE["head"], predicted=Tip(TIP, "predicted 2.007 mm"),
                      measured=Tip(2.2e-3, "measured 2.20(10) mm", 0.1e-3)).to_dict()  # fmt: skip


def layer(spec, name):
    return next(part for part in spec["layer"] if part.get("name") == name)


def rows(spec, name):
    data = layer(spec, name)["data"]
    return data["values"] if "values" in data else spec["datasets"][data["name"]]


def per_metre(spec):
    """Pixels of a metre, as the scale bar says."""
    bar = rows(spec, "scale_bar")[0]
    return (bar["x2"] - bar["x"]) / scale_length(0.010)


def test_both_directions_have_one_scale_and_the_picture_holds_all(spec):
    domains = {axis: layer(spec, "envelope")["encoding"][axis]["scale"]["domain"] for axis in ("x", "y")}
    assert domains == {"x": [0, spec["width"]], "y": [0, spec["height"]]}  # a unit is a pixel either way
    assert len(spec["padding"]) == 4 and not any(spec["padding"].values()), "nor does the page take any of them"
    tail = rows(spec, "tail")
    assert tail[-1]["x"] - tail[0]["x"] == pytest.approx(0.030 * per_metre(spec), abs=0.02)
    for name in ("frames", "head"):
        for row in rows(spec, name):
            assert 0 <= row["x"] <= spec["width"] and 0 <= row["y"] <= spec["height"]
    texts = [row["text"] for row in rows(spec, "texts")]
    assert texts == ["10 mm", "predicted 2.007 mm", "measured 2.20(10) mm"]


def test_the_envelope_ends_at_the_worked_tip_and_so_does_the_bar_beside_it(spec):
    last = rows(spec, "envelope")[-1]
    assert (last["high"] - last["low"]) / per_metre(spec) == pytest.approx(TIP, rel=5e-3)  # drawn to a hundredth of a pixel
    bar = rows(spec, "predicted_tip")[0]
    assert (bar["high"] - bar["low"]) / per_metre(spec) == pytest.approx(TIP, rel=1e-9)
    heights = [row["y"] for row in rows(spec, "frames") if row["part"].startswith("t")]
    assert max(heights) <= max(row["high"] for row in rows(spec, "envelope")) + 0.02


def test_the_measured_tip_stands_beside_it_in_rust_with_its_uncertainty(spec):
    bar, ends = rows(spec, "measured_tip")[0], rows(spec, "measured_tip_u")
    scale = per_metre(spec)
    assert (bar["high"] - bar["low"]) / scale == pytest.approx(2.2e-3, rel=1e-9)
    assert layer(spec, "measured_tip")["mark"]["stroke"] == paper(False).rust
    # peak to peak with u 0.1 mm: each end may lie 0.05 mm further out or in
    assert [(row["high"] - row["low"]) / scale for row in ends] == pytest.approx([0.1e-3, 0.1e-3], rel=1e-9)
    assert bar["x"] - rows(spec, "predicted_tip")[0]["x"] == BESIDE


def test_without_a_measured_tip_or_its_u_nothing_is_made_up():
    beat = shape(**CASE)
    bare = beat_chart(beat, SIZES, unit=UNIT, head=CASE["head"], predicted=Tip(TIP, "predicted")).to_dict()
    names = {part["name"] for part in bare["layer"]}
    assert "predicted_tip" in names and not [name for name in names if name.startswith("measured")]
    plain = beat_chart(beat, SIZES, unit=UNIT, head=CASE["head"], measured=Tip(2.2e-3, "measured")).to_dict()
    names = {part["name"] for part in plain["layer"]}
    assert "measured_tip" in names and "measured_tip_u" not in names and "predicted_tip" not in names


def drawn_at(spec, phase):
    """{layer: heights in pixels from the bottom} as Vega draws them at a phase of the slider."""
    turned = json.loads(json.dumps(spec))
    turned["params"] = [p | {"value": phase} if p["name"] == "phase" else p for p in turned["params"]]
    scene = vl_convert.vegalite_to_scenegraph(json.dumps(turned), vl_version="6.4")
    found = {}

    def walk(node):
        if isinstance(node, dict):
            if node.get("marktype") == "line" and node.get("name", "").endswith("_marks"):
                found[node["name"].removesuffix("_marks")] = [spec["height"] - item["y"] for item in node["items"]]
            for value in node.values():
                walk(value)
        elif isinstance(node, list):
            for value in node:
                walk(value)

    walk(scene)
    return found


@pytest.mark.parametrize("phase", [0, 90, 215])
def test_the_slider_turns_tail_and_head_as_the_beat_does(spec, phase):
    beat = shape(**CASE)
    turn = np.exp(1j * np.radians(phase))
    drawn, scale = drawn_at(spec, phase), per_metre(spec)
    middle = (spec["height"] + 34) / 2
    expected = np.real(beat.amplitude * turn) * UNIT
    assert (np.array(drawn["tail"]) - middle) / scale == pytest.approx(expected, abs=0.03 / scale)  # hundredths of a pixel
    centre = np.real((beat.amplitude[0] - CASE["head"] * beat.angle) * turn) * UNIT
    top, bottom = max(drawn["head"]), min(drawn["head"])
    assert ((top + bottom) / 2 - middle) / scale == pytest.approx(centre, abs=0.03 / scale)
    assert (top - bottom) / scale == pytest.approx(2 * 2e-3, abs=0.05 / scale)  # the head is round, to scale


def test_a_held_base_has_no_head_and_a_long_head_is_long():
    held = beat_chart(shape(drive="clamped_heave", Sp=2.0), {"L_tail": 0.03, "b": 2e-3}, unit=2e-3).to_dict()
    assert "head" not in {part["name"] for part in held["layer"]}
    assert not [row for row in rows(held, "frames") if row["part"].startswith("h")]
    long = beat_chart(shape(**CASE | {"head": 5 / 30}), SIZES | {"b_long": 5e-3}, unit=UNIT, head=5 / 30).to_dict()
    across = [row["x"] for row in rows(long, "head")]
    assert (max(across) - min(across)) / per_metre(long) == pytest.approx(2 * 5e-3, rel=2e-3)


def test_a_tip_far_outside_keeps_the_picture_on_the_page_and_to_scale():
    far = beat_chart(shape(**CASE), SIZES, unit=UNIT, head=CASE["head"], predicted=Tip(TIP, "predicted"),
                     measured=Tip(0.1, "measured 100 mm")).to_dict()  # fmt: skip
    assert far["height"] <= HIGHEST
    bar, tail = rows(far, "measured_tip")[0], rows(far, "tail")
    assert 0 <= bar["low"] and bar["high"] <= far["height"]
    assert (bar["high"] - bar["low"]) / (tail[-1]["x"] - tail[0]["x"]) == pytest.approx(0.1 / 0.030, rel=1e-3)


def test_earlier_frames_are_fainter(spec):
    shades = [row["shade"] for row in rows(spec, "frames") if row["part"].startswith("t")]
    assert shades == sorted(shades) and shades[0] < 0.2 < shades[-1]


def test_what_cannot_be_drawn_is_refused():
    with pytest.raises(Refusal, match="L_tail"):
        beat_chart(shape(**CASE), {"b": 2e-3}, unit=UNIT)
