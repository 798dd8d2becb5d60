"""The strips: bands, ticks, the new value, and labels that never touch."""

import numpy as np
import pytest

from labbook.charts.bands import bands_of
from labbook.charts.palette import SMALL_SIZE, paper, text_width
from labbook.charts.strips import strip_domain, strip_labels, strips


def row(key="Sp", earlier=(1.5, 2.0, 3.0), value=2.31, u=0.03, written="2.31(3)"):
    return dict(key=key, earlier=np.array(earlier, dtype=float), value=value, u=u, written=written)


def test_a_strip_has_bands_ticks_dot_bar_and_text(samples):
    spec = strips([row(), row("Re", [1e-4, 2e-4], 3e-4, 1e-5, "3.0(1)e-4")], dark=False).to_dict()
    assert len(samples.rows(spec, "strip_dots")) == len(samples.rows(spec, "strip_bars")) == 2
    assert len(samples.rows(spec, "strip_ticks")) == 5
    assert [r["written"] for r in samples.rows(spec, "strip_texts")] == ["2.31(3)", "3.0(1)e-4"]
    assert [r["text"] for r in samples.rows(spec, "strip_names")] == [
        "stiff tail",
        "working tail",
        "floppy tail",
    ]
    assert [r["symbol"] for r in samples.rows(spec, "strip_symbols")] == ["Sp", "Re"]
    assert samples.addresses(spec) == []


def test_places_are_logarithmic():
    low, high = strip_domain("Re", np.array([1e-4, 1e-2]))
    spec = strips([row("Re", [1e-4, 1e-2], 1e-3, 1e-4, "")]).to_dict()
    layers = {p["name"]: p for p in spec["layer"]}
    (dot,) = spec["datasets"][layers["strip_dots"]["data"]["name"]]
    (bar,) = spec["datasets"][layers["strip_bars"]["data"]["name"]]
    assert low * high == pytest.approx(1e-6)  # symmetric about 1e-3, so the dot stands in the middle
    assert dot["place"] == pytest.approx(0.5, abs=1e-4)  # places keep four digits
    # 95 % is 2 u either side (JCGM 100:2008, 6.2.1 and G.6.6)
    decades = np.log10(high / low)
    assert bar["high"] - 0.5 == pytest.approx(np.log10(1.2) / decades, abs=1e-4)
    assert 0.5 - bar["low"] == pytest.approx(-np.log10(0.8) / decades, abs=1e-4)


@pytest.mark.parametrize(
    ("value", "note", "dots"), [(-4.8e-4, "by size", 1), (4.8e-4, "", 1), (0.0, "zero: not drawn", 0)]
)
def test_signed_values_stand_by_size_and_say_so(samples, value, note, dots):
    spec = strips([row("Re", [-1e-4, 2e-4], value, 1e-5, "x")]).to_dict()
    assert samples.rows(spec, "strip_texts")[0]["note"] == note
    assert len(samples.rows(spec, "strip_dots")) == dots
    assert len(samples.rows(spec, "strip_ticks")) == 2


@pytest.mark.parametrize("value", [None, np.nan])
def test_an_absent_value_has_no_dot_but_its_text(samples, value):
    spec = strips([row(value=value, u=None, written="not defined (U consistent with 0)")]).to_dict()
    assert samples.rows(spec, "strip_dots") == [] and samples.rows(spec, "strip_bars") == []
    (text,) = samples.rows(spec, "strip_absent")
    assert text["written"].replace("\n", " ") == "not defined (U consistent with 0)"


def test_a_bar_that_reaches_zero_is_cut_at_the_strip(samples):
    spec = strips([row(u=2.0)]).to_dict()
    (bar,) = samples.rows(spec, "strip_bars")
    assert bar["low"] == 0.0 and 0 < bar["high"] <= 1.0


def test_many_earlier_runs_weigh_little(samples):
    few = strips([row(earlier=np.geomspace(1, 4, 300))]).to_json(indent=None)
    many = strips([row(earlier=np.geomspace(1, 4, 100_000))]).to_json(indent=None)
    assert len(many) <= 1.5 * len(few)


CASES = [
    ("Sp", 2.31, 0.3, 20),
    ("Re_omega", 0.53, 0.02, 9),
    ("Re_omega", 0.1, 0.02, 9),
    ("Re_omega", 30, 1e-3, 2e3),
    ("Re_omega", 900, 1e-3, 2e3),
    ("St", 0.3, 0.1, 0.9),
    ("St", 55, 20, 90),
    ("Sp", None, 0.5, 6),
]


@pytest.mark.parametrize(("key", "value", "least", "most"), CASES)
@pytest.mark.parametrize("width", [150, 240, 280, 330, 460, 900])
def test_labels_never_touch_and_the_value_s_band_is_named(key, value, least, most, width):
    low, high = strip_domain(key, np.array([least, most]))
    bands = bands_of(key, low, high)
    names, limits = strip_labels(
        bands, value, low, high, lambda v: float(np.log(v / low) / np.log(high / low))
    )
    shown = [entry for entry in (*names, *limits) if width > entry["wide"]]
    for i, one in enumerate(shown):
        for other in shown[i + 1 :]:
            need = (text_width(one["text"], SMALL_SIZE) + text_width(other["text"], SMALL_SIZE)) / 2
            assert abs(one["place"] - other["place"]) * width >= need, (one, other)
    held = [b.name for b in bands if value is not None and b.regime.holds(value)]
    assert set(held) <= {entry["text"] for entry in shown}


def test_a_name_wider_than_its_band_is_dropped():
    low, high = strip_domain("Re_omega", np.array([0.01, 90.0]))
    names, _ = strip_labels(
        bands_of("Re_omega", low, high),
        None,
        low,
        high,
        lambda v: float(np.log(v / low) / np.log(high / low)),
    )
    shown = {entry["text"] for entry in names if 120 > entry["wide"]}
    # one decade of five on 120 pixels is about 24 pixels: no room for these letters
    assert "nearly creeping" not in shown


def test_the_nearest_limits_are_in_sight_and_no_far_ones():
    low, high = strip_domain("Re_omega", np.array([0.3, 0.6]))
    # design.md section 2: limits at 0.1, 1 and 1000
    assert low < 0.1 and 1 < high < 100
    low, high = strip_domain("St", np.array([50.0, 60.0]))
    assert low < 0.2 and high < 200  # cruising 0.2 to 0.4 is shown whole


def test_rust_is_for_the_value_in_both_themes(samples):
    for dark in (False, True):
        spec = strips([row()], dark).to_dict()
        assert samples.layer(spec, "strip_dots")["mark"]["fill"] == paper(dark).rust
        assert samples.layer(spec, "strip_texts")["mark"]["color"] == paper(dark).rust
