"""Charts as files: complete, captioned, and made without asking anybody."""

import socket
import xml.etree.ElementTree as ET

import altair as alt
import pytest

from labbook.charts.files import png_bytes, save, svg_bytes
from labbook.charts.palette import DARK, LIGHT
from labbook.charts.trend import trend
from labbook.errors import Refusal


@pytest.fixture
def drawing(samples):
    return trend(samples.runs(60, 3), x="Sp", y="U_scaled", group="swimmer", width=500)


def text_of(svg: bytes) -> list[str]:
    return [node.text for node in ET.fromstring(svg).iter("{http://www.w3.org/2000/svg}text") if node.text]


def test_an_svg_holds_titles_legend_bands_and_caption(drawing):
    svg = svg_bytes(drawing.chart, drawing.caption)
    words = text_of(svg)
    assert "Sp = L_tail (ζ_n ω/EI)^(1/4), house dialect" in words
    assert {"reed-01", "reed-02", "reed-03", "working tail"} <= set(words)
    assert drawing.caption in " ".join(words)
    assert b"NaN" not in svg


def test_nothing_in_a_file_points_outside(drawing):
    svg = svg_bytes(drawing.chart, drawing.caption).decode()
    # the two namespaces are names, not addresses that are fetched
    rest = svg.replace("http://www.w3.org/2000/svg", "").replace("http://www.w3.org/1999/xlink", "")
    assert "://" not in rest and "@import" not in rest and "@font-face" not in rest


def test_a_chart_that_asks_for_an_address_is_not_made():
    chart = alt.Chart(alt.UrlData(url="http://127.0.0.1:9/none.csv")).mark_point().encode(x="a:Q")
    with pytest.raises(ValueError):
        svg_bytes(chart)


def test_no_socket_is_opened_from_python(drawing, monkeypatch):
    def refuse(*args, **kwargs):
        raise AssertionError("a socket was opened")

    monkeypatch.setattr(socket.socket, "connect", refuse)
    assert svg_bytes(drawing.chart).startswith(b"<svg")


@pytest.mark.parametrize(("dark", "ground"), [(False, LIGHT.ground), (True, DARK.ground)])
def test_a_file_has_its_own_ground(samples, dark, ground):
    chart = trend(samples.runs(5), x="Sp", y="U_scaled", dark=dark).chart
    assert chart.to_dict()["config"]["background"] == "transparent"
    assert ground.encode() in svg_bytes(chart, dark=dark)


def test_a_png_has_the_pixels_asked_for(drawing):
    one, two = (png_bytes(drawing.chart, scale=scale) for scale in (1, 2))
    assert one[:8] == two[:8] == b"\x89PNG\r\n\x1a\n"  # PNG signature, ISO/IEC 15948
    sizes = [(int.from_bytes(p[16:20], "big"), int.from_bytes(p[20:24], "big")) for p in (one, two)]
    assert sizes[1][0] == pytest.approx(2 * sizes[0][0], abs=2) and sizes[0][0] > 500


def test_save_writes_by_ending_and_refuses_others(drawing, tmp_path):
    assert save(drawing.chart, tmp_path / "a.SVG").read_bytes().startswith(b"<svg")
    assert save(drawing.chart, tmp_path / "a.png").stat().st_size > 10_000
    for name in ("a.pdf", "a", "a.svg.gz"):
        with pytest.raises(Refusal, match=r"\.svg or \.png"):
            save(drawing.chart, tmp_path / name)
        assert not (tmp_path / name).exists()
