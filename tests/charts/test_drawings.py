"""Swimmers to scale."""

import numpy as np
import pytest

from labbook.charts.drawings import scale_length, swimmer_drawing, written_length
from labbook.charts.palette import paper
from labbook.errors import Refusal

REED = dict(form="flexible tail", section="rod", L_body=30e-3, L_tail=24e-3, d=2e-3, b=3e-3)


def parts(samples, spec, name):
    found = {}
    for row in samples.rows(spec, name):
        found.setdefault(row["part"], []).append((row["x"], row["y"]))
    return [np.array(points) for points in found.values()]


def span(points):
    return np.ptp(points[:, 0]), np.ptp(points[:, 1])


def test_head_and_tail_are_to_one_scale(samples):
    spec = swimmer_drawing(REED).to_dict()
    head, tail, section = parts(samples, spec, "shapes")
    # sizes in the ratio of the swimmer's own; 66 points on a circle miss its top by 0.1 %
    assert span(head)[0] == pytest.approx(span(head)[1], rel=5e-3)
    per_mm = span(tail)[0] / 24
    assert span(tail)[1] == pytest.approx(2 * per_mm, rel=5e-3)
    assert span(head)[0] == pytest.approx(6 * per_mm, rel=5e-3)
    assert tail[:, 0].min() == pytest.approx(head[:, 0].max(), abs=0.05)
    assert span(section)[1] > 3 * span(tail)[1]


def test_the_scale_bar_has_its_stated_length(samples):
    spec = swimmer_drawing(REED).to_dict()
    bars = [p for p in parts(samples, spec, samples_name(spec, "lines")) if np.ptp(p[:, 1]) == 0]
    tail = parts(samples, spec, "shapes")[1]
    texts = [r["text"] for r in samples.rows(spec, "texts_left")]
    assert "10 mm" in texts
    assert span(bars[0])[0] == pytest.approx(10 * span(tail)[0] / 24, rel=2e-3)


def samples_name(spec, start):
    return next(p["name"] for p in spec["layer"] if p["name"].startswith(start))


def test_both_scales_have_one_pixel_per_unit(samples):
    spec = swimmer_drawing(REED, width=500).to_dict()
    encoding = samples.layer(spec, "shapes")["encoding"]
    assert encoding["x"]["scale"]["domain"] == [0, spec["width"]] == [0, 500]
    assert encoding["y"]["scale"]["domain"] == [0, spec["height"]]
    # where none is stated Streamlit takes 20 pixels of the height, and the circle of a head is flat (seen in a browser)
    assert set(spec["padding"]) == {"left", "right", "top", "bottom"} and not any(spec["padding"].values())


def test_a_helix_keeps_radius_and_pitch(samples):
    helix = dict(
        form="helix",
        section="rod",
        L_body=150e-3,
        L_tail=130e-3,
        d=0.8e-3,
        b=10e-3,
        R_helix=6.3e-3,
        pitch=14e-3,
    )
    spec = swimmer_drawing(helix).to_dict()
    wave = max(
        (
            p
            for name in [q["name"] for q in spec["layer"] if q["name"].startswith("lines")]
            for p in parts(samples, spec, name)
        ),
        key=len,
    )
    per_mm = span(wave)[0] / 130
    # 24 points a turn miss a crest by under 1 %
    assert span(wave)[1] == pytest.approx(2 * 6.3 * per_mm, rel=0.01)
    crossings = np.sum(np.diff(np.sign(wave[2:, 1] - wave[0, 1])) != 0)
    assert crossings == pytest.approx(2 * 130 / 14, abs=1.5)


@pytest.mark.parametrize(
    ("swimmer", "label"),
    [
        (
            dict(form="rigid tail", section="strip", L_body=24e-3, L_tail=20e-3, w=2e-3, t=0.2e-3, b=2e-3),
            "2 mm × 0.2 mm",
        ),
        (
            dict(
                form="flexible tail",
                section="tube",
                L_body=60e-3,
                L_tail=48e-3,
                D=1e-3,
                d_in=0.6e-3,
                b=4e-3,
                b_long=6e-3,
            ),
            "D 1 mm, d_in 0.6 mm",
        ),
        (dict(form="flexible tail", section="rod", L_body=60e-6, L_tail=50e-6, d=0.5e-6, b=5e-6), "d 0.5 µm"),
    ],
)
def test_sections_are_dimensioned(samples, swimmer, label):
    spec = swimmer_drawing(swimmer, dark=True).to_dict()
    assert label in [r["text"] for r in samples.rows(spec, "texts_center")]
    if swimmer["section"] == "tube":
        assert samples.layer(spec, "holes")["mark"]["fill"] == paper(True).ground
    assert samples.addresses(spec) == []


@pytest.mark.parametrize("form", ["undulating", "hinged", "flexible tail", "rigid tail", "helix", ""])
def test_a_swimmer_of_which_little_is_known_is_still_drawn(form):
    swimmer_drawing(dict(form=form, section=None, L_body=0.3, b=float("nan"), L_tail=None)).to_dict()


def test_a_thin_tail_says_that_it_is_not_to_scale(samples):
    spec = swimmer_drawing(REED | dict(d=1e-5)).to_dict()
    assert "tail drawn thicker than to scale" in [r["text"] for r in samples.rows(spec, "texts_left")]


def test_no_length_is_refused():
    with pytest.raises(Refusal, match="overall length"):
        swimmer_drawing(dict(form="helix", section="rod"))


@pytest.mark.parametrize(
    ("metres", "text"),
    [
        (0.024, "24 mm"),
        (2e-4, "0.2 mm"),
        (5e-7, "0.5 µm"),
        (0.3, "300 mm"),
        (7.8e-6, "7.8 µm"),
        (1.234e-3, "1.23 mm"),
        (0.1, "100 mm"),
    ],
)
def test_written_lengths(metres, text):
    assert written_length(metres) == text


@pytest.mark.parametrize(
    ("metres", "length"), [(0.0101, 0.01), (0.01, 0.01), (0.0099, 0.005), (2.2e-6, 2e-6)]
)
def test_scale_lengths(metres, length):
    assert scale_length(metres) == pytest.approx(length)
