"""Tracks in (issue 4, item 1 and bad input): one track in many spellings gives one set of SI arrays; refusals.

Expected values are worked by hand from the rows below; SI prefixes as in the SI Brochure (BIPM, 9th ed., table 7).
"""

import io
import math
import os

import numpy as np
import pandas as pd
import pytest

from labbook.errors import Refusal
from labbook.exchange import track_files
from labbook.exchange.track_files import read_track
from labbook.exchange.track_words import axis_of, columns_of, velocity_of
from labbook.registry.typed import read

N = 40
K = np.arange(N)
# 50 frames a second; 3.2 um a pixel; the body points 30 degrees up, its head is 10 px ahead, its tip 5 px behind
T, PX, PY = K / 50.0, 100.0 + 2.5 * K, 240.0 - 1.5 * K
SCALE = "3.2(1) um/px"
EXACT = (
    1e-12  # decimal text to float, times a slope: three roundings of 1.1e-16 at most, so anything wrong shows
)


def rows(columns: dict, separator=",", decimal=".", end="\n", head="") -> bytes:
    """Text of columns {header: numbers or texts}, written with repr, as no library of ours does it."""
    lines = [head + separator.join(columns)]
    for cells in zip(*columns.values(), strict=True):
        lines.append(
            separator.join(c if isinstance(c, str) else repr(float(c)).replace(".", decimal) for c in cells)
        )
    return (end.join(lines) + end).encode()


def parquet(columns: dict) -> bytes:
    out = io.BytesIO()
    pd.DataFrame(columns).to_parquet(out)
    return out.getvalue()


UM = {"t": T, "x [um]": 3.2 * PX, "y [um]": 3.2 * PY}
MM = {"t [s]": T, "x (mm)": 0.0032 * PX, "y (mm)": 0.0032 * PY}
PIXELS = {"t": T, "x": PX, "y": PY}
FRAMES = {"frame": K, "x [px]": PX, "y [px]": PY}

SAME = {
    "comma, um": (rows(UM), {}),
    "comma, mm in brackets": (rows(MM), {}),
    "m": (rows({"t": T, "x [m]": 3.2e-6 * PX, "y [m]": 3.2e-6 * PY}), {}),
    "x in mm, y in um": (rows({"t": T, "x [mm]": 0.0032 * PX, "y [um]": 3.2 * PY}), {}),
    "semicolon, decimal comma": (rows(UM, ";", ","), {}),
    "semicolon, decimal point": (rows(UM, ";"), {}),
    "tab": (rows(UM, "\t"), {}),
    "byte order mark": (b"\xef\xbb\xbf" + rows(UM), {}),
    "Windows ends of line": (rows(UM, end="\r\n"), {}),
    "old Macintosh ends of line": (rows(UM, end="\r"), {}),
    "micro sign in UTF-8": (rows({"t": T, "x [µm]": 3.2 * PX, "y [μm]": 3.2 * PY}), {}),
    "micro sign in Latin-1": (rows(UM).replace(b"[um]", b"[\xb5m]"), {}),
    "ms": (rows({"t [ms]": 20.0 * K, "x [um]": 3.2 * PX, "y [um]": 3.2 * PY}), {}),
    "time": (rows({"time": T, "x [um]": 3.2 * PX, "y [um]": 3.2 * PY}), {}),
    "capitals": (rows({"Time (ms)": 20.0 * K, "X (um)": 3.2 * PX, "Y (um)": 3.2 * PY}), {}),
    "columns in another order, more of them, text among them": (
        rows({"note": ["é, kept".replace(",", "")] * N, "y [um]": 3.2 * PY, "area": K, "x [um]": 3.2 * PX, "t": T}), {}),
    "quoted": (rows({f'"{k}"': [f'"{v!r}"' for v in column.tolist()] for k, column in UM.items()}), {}),
    "a separator at each end": (rows(UM | {"": [""] * N}), {}),
    "comment lines, then a header": (rows(UM, head="# camera 3\n#\n"), {}),
    "a header behind a #": (rows(UM, head="# camera 3\n# "), {}),
    "empty lines": (b"\n\n" + rows(UM, end="\n\n"), {}),
    "pixels and scale": (rows(PIXELS), {"scale": SCALE}),
    "pixels and scale as read": (rows(PIXELS), {"scale": read("scale", SCALE)}),
    "pixels and the rig's scale": (rows(PIXELS), {"rig": {"scale": SCALE, "fps": None}}),
    "units, and a rig's scale that is not needed": (rows(UM), {"rig": {"scale": "99 um/px"}}),
    "the rig's scale, overruled": (rows(PIXELS), {"scale": SCALE, "rig": {"scale": "99 um/px"}}),
    "frames": (rows(FRAMES), {"scale": SCALE, "fps": 50}),
    "frames and a rate as text": (rows(FRAMES), {"scale": SCALE, "fps": "50 fps"}),
    "frames and a bare rate": (rows(FRAMES), {"scale": SCALE, "fps": "50"}),
    "frames and the rig's rate": (rows(FRAMES), {"scale": SCALE, "rig": {"fps": "50 1/s"}}),
    "frames beside times": (rows({"frame": 7 * K} | UM), {}),
    "columns of other names": (rows({"sec": T, "X_pos": PX, "Y_pos": PY, "x": K}), {
        "scale": SCALE, "columns": {"t": "sec", "x": "X_pos", "y": "Y_pos"}}),
    "columns of other names, with their units": (rows({"clock [ms]": 20.0 * K, "X_pos [um]": 3.2 * PX, "Y_pos [um]": 3.2 * PY}), {
        "columns": {"t": "clock", "x": "X_pos [um]", "y": "Y_pos"}}),
    "units said where the header has none": (rows({"t": 20.0 * K, "x": 3.2 * PX, "y": 3.2 * PY}), {
        "columns": {"t": "t [ms]", "x": "x [um]", "y": "y [um]"}}),
    "frames asked for beside times": (rows({"t": 7.0 * K, "frame": K, "x": PX, "y": PY}), {
        "scale": SCALE, "fps": 50, "columns": {"frame": "frame"}}),
    "Parquet": (parquet(UM), {}),
    "Parquet, frames as integers": (parquet(FRAMES), {"scale": SCALE, "fps": 50}),
    "Parquet, numbers as text": (parquet({k: [repr(v) for v in c.tolist()] for k, c in UM.items()}), {}),
    "Parquet, more columns and an index": (parquet(pd.DataFrame(UM | {"note": ["a"] * N}).set_index("note")), {}),
}  # fmt: skip


@pytest.mark.parametrize("name", SAME)
@pytest.mark.parametrize("from_file", [False, True])
def test_the_same_track_in_many_spellings(tmp_path, name, from_file):
    content, options = SAME[name]
    if from_file:
        (tmp_path / "swim.dat").write_bytes(content)
    track = read_track(tmp_path / "swim.dat" if from_file else content, **options)
    assert track.name == ("swim.dat" if from_file else "track")
    assert track.rows == N and track.unreadable == {}
    np.testing.assert_allclose(track.t, 0.02 * K, rtol=EXACT)
    np.testing.assert_allclose(track.x, 3.2e-6 * (100.0 + 2.5 * K), rtol=EXACT)
    np.testing.assert_allclose(track.y, 3.2e-6 * (240.0 - 1.5 * K), rtol=EXACT)
    assert all(a.dtype == np.float64 for a in (track.t, track.x, track.y))
    assert (track.heading, track.head_x, track.tip_x) == (None, None, None)
    assert sorted(track.keywords()) == ["scale_u", "t", "time_u", "x", "y"]
    in_pixels = track.scale is not None
    assert track.scale_u == (pytest.approx(0.1 / 3.2, rel=EXACT) if in_pixels else 0.0)


@pytest.mark.parametrize("name", SAME)
def test_the_columns_in_use_lead_to_the_same_arrays_again(name):
    content, options = SAME[name]
    first = read_track(content, **options)
    again = read_track(content, **options | {"columns": first.columns})
    assert all(np.array_equal(getattr(first, k), getattr(again, k)) for k in ("t", "x", "y"))


BODY = PIXELS | {
    "heading [deg]": [30.0] * N, "head_x": PX + 10.0, "head_y": PY + 5.0, "tip_x": PX - 5.0, "tip_y": PY - 2.0,
}  # fmt: skip


def test_body_axis_and_tip_come_along():
    track = read_track(rows(BODY), scale=SCALE)
    np.testing.assert_allclose(track.heading, math.pi / 6.0, rtol=EXACT)
    np.testing.assert_allclose(track.head_x, 3.2e-6 * (110.0 + 2.5 * K), rtol=EXACT)
    np.testing.assert_allclose(track.head_y, 3.2e-6 * (245.0 - 1.5 * K), rtol=EXACT)
    np.testing.assert_allclose(track.tip_x, 3.2e-6 * (95.0 + 2.5 * K), rtol=EXACT)
    np.testing.assert_allclose(track.tip_y, 3.2e-6 * (238.0 - 1.5 * K), rtol=EXACT)
    assert sorted(track.keywords()) == [
        "head_x",
        "head_y",
        "scale_u",
        "t",
        "time_u",
        "tip_x",
        "tip_y",
        "x",
        "y",
    ]
    assert sorted(track.positions()) == ["t", "x", "y"]
    assert track.columns["heading"] == "heading [deg]"


@pytest.mark.parametrize(("header", "number"), [("heading [rad]", math.pi / 6), ("heading (mrad)", 1e3 * math.pi / 6),
                                               ("heading [°]", 30.0)])  # fmt: skip
def test_a_heading_in_its_unit(header, number):
    track = read_track(rows(PIXELS | {header: [number] * N}), scale=SCALE)
    np.testing.assert_allclose(track.keywords()["heading"], math.pi / 6.0, rtol=EXACT)


def test_a_column_that_a_film_has_no_use_for_is_left_out():
    empty = {"tip_x": [""] * N, "tip_y": PY, "heading [deg]": [""] * N}
    track = read_track(rows(PIXELS | empty), scale=SCALE)
    assert (track.tip_x, track.tip_y, track.heading) == (None, None, None)
    assert track.unreadable == {"tip_x": N, "heading": N} and sorted(track.columns) == ["t", "x", "y"]
    with pytest.raises(Refusal, match="tip_x 'tip_x': no cell of this column holds a number"):
        read_track(rows(PIXELS | empty), scale=SCALE, columns={"tip_x": "tip_x"})


# ---- uncertainty of the scale (JCGM 100:2008, 4.3.7: half-width over root three where only digits are known)


@pytest.mark.parametrize(("options", "of_lengths", "of_times"), [
    ({"scale": "3.2(1) um/px"}, 0.03125, 0.0), ({"scale": "3.2 um/px"}, 0.05 / math.sqrt(3.0) / 3.2, 0.0), ({"scale": "3.2 +- 0.4 um/px"}, 0.125, 0.0),
    ({"scale": "3.2(0) um/px", "fps": "50(2) fps"}, 0.0, 0.04), ({"scale": "3.2(0) um/px", "fps": "50 fps"}, 0.0, 0.0),
    ({"scale": "3.20 +- 0.096 um/px", "fps": "50(2) fps"}, 0.03, 0.04),
])  # fmt: skip
def test_relative_uncertainties_of_scale_and_frame_rate(options, of_lengths, of_times):
    track = read_track(rows(FRAMES), **{"fps": 50} | options)
    assert track.scale_u == pytest.approx(of_lengths, rel=EXACT, abs=1e-15)
    assert track.time_u == pytest.approx(of_times, rel=EXACT, abs=1e-15)
    assert {"scale_u": track.scale_u, "time_u": track.time_u}.items() <= track.keywords().items()


def test_a_frame_rate_beside_times_changes_nothing():
    track = read_track(rows(UM), fps="50(2) fps")
    assert track.fps is None and (track.scale_u, track.time_u) == (0.0, 0.0)
    np.testing.assert_allclose(track.t, 0.02 * K, rtol=EXACT)


def test_a_long_file_reads_as_a_short_one():
    # 60,000 rows go by another count of separators and other parts of the file than 40; the first and last cells
    # are worked by hand, one word far down makes the whole column be read as text
    count = 60_000
    lines = [f"{k / 50!r},{100.0 + 2.5 * k!r},{240.0 - 1.5 * k!r}" for k in range(count)]
    for word in (None, "lost"):
        if word:
            lines[50_000] = f"{50_000 / 50!r},{word},{word}"
        track = read_track(("t,x [um],y [um]\n" + "\n".join(lines)).encode())
        assert track.rows == count and track.unreadable == ({"x": 1, "y": 1} if word else {})
        good = np.isfinite(track.x)
        np.testing.assert_allclose(track.x[good], ((100.0 + 2.5 * np.arange(count)) * 1e-6)[good], rtol=EXACT)
        np.testing.assert_allclose(track.t, np.arange(count) / 50.0, rtol=EXACT)
    with pytest.raises(Refusal, match="line 60002 has 4 cells for 3 columns"):
        read_track(("t,x [um],y [um]\n" + "\n".join([*lines, "1,2,3,4"])).encode())


# ---- what cannot be read is missing, and told


def test_cells_without_a_number_are_missing_and_counted():
    text = b"t,x [um],y [um]\n0,1,2\n0.1,,2\n0.2,lost,2\n0.3,NaN,inf\n0.4,-Infinity,2\nx,5,2\n0.6,6\n0.7, 7 , 2\n"
    track = read_track(text)
    nan = math.nan
    assert track.unreadable == {"t": 1, "x": 4, "y": 2} and track.rows == 8
    np.testing.assert_allclose(track.t, [0, 0.1, 0.2, 0.3, 0.4, nan, 0.6, 0.7], rtol=EXACT)
    np.testing.assert_allclose(track.x, np.array([1, nan, nan, nan, nan, 5, 6, 7]) * 1e-6, rtol=EXACT)
    np.testing.assert_allclose(track.y, np.array([2, 2, 2, nan, 2, 2, nan, 2]) * 1e-6, rtol=EXACT)
    assert "4 cells of x hold no number" in track.report()


def test_decimal_signs_may_be_mixed_where_semicolons_separate():
    track = read_track(b"t;x [um];y [um]\n0,5;1,25;2\n1.5;2.25;3\n2;-;4\n")
    np.testing.assert_allclose(track.t, [0.5, 1.5, 2.0], rtol=EXACT)
    np.testing.assert_allclose(track.x, [1.25e-6, 2.25e-6, math.nan], rtol=EXACT)


def test_the_report_says_what_was_read():
    said = read_track(rows(FRAMES), scale="3.2 um/px", fps=50).report()
    assert said == ["40 frames read: frame, x from 'x [px]', y from 'y [px]'", "scale 3.2 um/px, u from its digits",
                    "50 frames a second"]  # fmt: skip


# ---- refusals: one sentence each


BARE = b"t,x,y\n0,1,2\n0.1,2,3\n"
REFUSED = {
    "no such column": (b"t,X_pos,Y_pos\n0,1,2\n", {"scale": SCALE}, "x: the track has no column x; it has 't', 'X_pos', 'Y_pos'; say which one it is."),
    "no time": (b"x,y\n0,1\n", {"scale": SCALE}, "t: the track has no column t or frame; it has 'x', 'y'; say which one it is."),
    "asked column missing": (BARE, {"scale": SCALE, "columns": {"x": "X_pos"}}, "x 'X_pos': the track has no such column; it has 't', 'x', 'y'."),
    "no such role": (BARE, {"scale": SCALE, "columns": {"z": "x"}}, "columns 'z': is no column that a track has; one of t, frame, x, y, heading, head_x, head_y, tip_x, tip_y."),
    "column twice": (b"t,x,x,y\n0,1,2,3\n", {"scale": SCALE}, "x 'x': stands twice in the header; the file has 't', 'x', 'x', 'y'."),
    "half a head": (b"t,x,y,head_x\n0,1,2,3\n", {"scale": SCALE}, "head_y: is missing beside head_x; the file has 't', 'x', 'y', 'head_x'."),
    "half a tip": (b"t,x,y,tip_y\n0,1,2,3\n", {"scale": SCALE}, "tip_x: is missing beside tip_y; the file has 't', 'x', 'y', 'tip_y'."),
    "heading without unit": (b"t,x,y,heading\n0,1,2,3\n", {"scale": SCALE}, "heading 'heading': degrees or radians?; head it heading [deg] or heading [rad]."),
    "unit of the wrong kind": (b"t,x [kg],y [um]\n0,1,2\n", {}, "x 'x [kg]': kg is a mass, and a length is needed; type it in m, mm, cm, um, nm."),
    "time of the wrong kind": (b"t [mm],x [um],y [um]\n0,1,2\n", {}, "t 't [mm]': mm is a length, and a time is needed; type it in s, ms, us."),
    "units on one only": (b"t,x [um],y\n0,1,2\n", {}, "y 'y': has no length unit, but x has one; head all lengths with a unit, or none."),
    "no scale": (BARE, {}, "scale: x and y carry no length unit; give a scale, e.g. 3.2(1) um/px, or head them x [um], y [um]."),
    "two scales": (rows(UM), {"scale": SCALE}, "scale '3.2(1) um/px': x is in um already; leave the scale out."),
    "scale without unit": (BARE, {"scale": "3.2(1)"}, "scale '3.2(1)': has no unit; add one of m/px, mm/px, um/px, nm/px."),
    "scale of the wrong kind": (BARE, {"scale": "3.2 um"}, "scale '3.2 um': um is a length, and a scale is needed; type it in m/px, mm/px, um/px, nm/px."),
    "scale of nothing": (BARE, {"scale": "0 um/px"}, "scale '0 um/px': a scale must be greater than zero."),
    "no rate": (b"frame,x,y\n0,1,2\n", {"scale": SCALE}, "fps: the track counts frames and has no times; give the frame rate, e.g. 30 fps."),
    "rate of the wrong kind": (b"frame,x,y\n0,1,2\n", {"scale": SCALE, "fps": "30 s"}, "fps '30 s': s is a time, and a frame rate is needed; type it in 1/s, fps, Hz."),
    "milliseconds without unit": (rows(PIXELS | {"t": 20.0 * K}), {"scale": SCALE, "fps": 50}, "t 't': a step of 20 is too long for seconds at 50 frames a second; say its unit, e.g. t [ms]."),
    "empty": (b"", {}, "track 'track': is empty."),
    "blank": (b"\xef\xbb\xbf\n \n", {}, "track 'track': is empty."),
    "comments only": (b"# t,x,y\n", {}, "track 'track': is empty."),
    "header only": (b"t,x [um],y [um]\n", {}, "track 'track': has a header and no rows."),
    "numbers only": (b"0,1,2\n1,2,3\n", {}, "track 'track': starts with numbers; name the columns in the first line, e.g. t [s],x [px],y [px]."),
    "all NaN": (b"t,x [um],y [um]\n0,NaN,2\n1,NaN,3\n", {}, "x 'x [um]': no cell of this column holds a number; the file has 't', 'x [um]', 'y [um]'."),
    "decimal commas among commas": (b"t,x [um],y [um]\n0,5,1,5,2,5\n1,5,2,5,3,5\n", {}, "track 'track': line 2 has 6 cells for 3 columns; where commas are decimal, separate by semicolons."),
    "one long row far down": (b"t,x [um],y [um]\n" + b"0,1,2\n" * 500 + b"0,5,1,2\n", {}, "track 'track': line 502 has 4 cells for 3 columns; where commas are decimal, separate by semicolons."),
    "a film": (b"\x00\x00\x00\x20ftypisom\x00\x00\x02\x00isomiso2" * 9, {}, "track 'track': is neither text nor Parquet; export it as CSV, UTF-8."),
    "bytes without a zero": (bytes(range(1, 256)) * 20, {}, "track 'track': is neither text nor Parquet; export it as CSV, UTF-8."),
    "UTF-16": ("t,x,y\n1,2,3\n".encode("utf-16"), {}, "track 'track': is neither text nor Parquet; export it as CSV, UTF-8."),
    "an open quote": (b't,x [um],y [um]\n0,"1,2\n1,2,3\n', {}, "track 'track': cannot be read as a table; export it as CSV, UTF-8."),
    "Parquet cut short": (parquet(UM)[:-30], {}, "track 'track': is a damaged Parquet file; export it again."),
    "Parquet with a hole": (parquet(UM)[:200] + bytes(200) + parquet(UM)[400:], {}, "track 'track': is a damaged Parquet file; export it again."),
    "Parquet without rows": (parquet({k: [] for k in UM}), {}, "track 'track': has 0 rows; 1 to 20000000 are read."),
    "Parquet with dates": (parquet(UM | {"t": pd.Timestamp("2026-03-01") + pd.to_timedelta(T, "s")}), {}, "t 't': holds dates or durations, and numbers are needed; export seconds."),
}  # fmt: skip


@pytest.mark.parametrize("name", REFUSED)
def test_refused_in_one_sentence(name):
    content, options, sentence = REFUSED[name]
    with pytest.raises(Refusal) as refused:
        read_track(content, **options)
    assert str(refused.value) == sentence


def test_a_file_of_two_gigabytes_is_refused_before_it_is_read(tmp_path, monkeypatch):
    path = tmp_path / "film.csv"
    with path.open("wb") as file:
        file.truncate(2 * 2**30)  # sparse: it takes no room
    monkeypatch.setattr(track_files.Path, "read_bytes", lambda self: pytest.fail("it was read"))
    with pytest.raises(Refusal) as refused:
        read_track(path)
    assert str(refused.value) == ("track 'film.csv': has 2048 MB, and at most 256 MB are read; "
                                  "export time and positions alone, or cut it.")  # fmt: skip


def test_the_limit_is_on_bytes_as_well_and_lies_where_it_says(tmp_path, monkeypatch):
    monkeypatch.setattr(track_files, "LARGEST_FILE", len(rows(UM)))
    assert read_track(rows(UM)).rows == N
    with pytest.raises(Refusal, match="are read"):
        read_track(rows(UM) + b"\n")


def test_a_small_parquet_file_of_very_many_rows_is_refused(monkeypatch):
    monkeypatch.setattr(track_files, "MOST_ROWS", N - 1)
    with pytest.raises(Refusal, match="has 40 rows"):
        read_track(parquet(UM))


@pytest.mark.parametrize(("make", "said"), [
    (lambda p: None, "there is no such file"), (lambda p: p.mkdir(), "is not a file"), (os.mkfifo, "is not a file"),
])  # fmt: skip
def test_what_is_no_file_is_refused(tmp_path, make, said):
    make(tmp_path / "swim.csv")
    with pytest.raises(Refusal, match=f"track 'swim.csv': {said}"):
        read_track(tmp_path / "swim.csv")


def test_many_columns_are_named_in_part():
    header = ",".join(f"c{i}" for i in range(60))
    with pytest.raises(Refusal, match="'c23' and 36 more; say which"):
        read_track(f"{header}\n".encode() + b"0" + b",0" * 59 + b"\n")


# ---- axis, drift and columns as typed


@pytest.mark.parametrize(("text", "vector"), [
    ("0", (1.0, 0.0)), ("90", (0.0, 1.0)), ("-90", (0.0, -1.0)), ("30", (math.sqrt(0.75), 0.5)), ("180 deg", (-1.0, 0.0)),
    ("30°", (math.sqrt(0.75), 0.5)), ("1.0471975511965976 rad", (0.5, math.sqrt(0.75))), (" 60. ", (0.5, math.sqrt(0.75))),
])  # fmt: skip
def test_an_axis_in_degrees_from_x_towards_y(text, vector):
    assert axis_of(text) == pytest.approx(vector, abs=1e-15)


def test_an_axis_from_the_track():
    assert axis_of("auto") is None


@pytest.mark.parametrize("text", ["", "north", "30 mm", "nan", "1,5", "3 0"])
def test_an_axis_that_cannot_be_read(text):
    with pytest.raises(Refusal, match="type degrees from x towards y, e.g. 30, or auto"):
        axis_of(text)


DIGIT = 0.05e-6 / math.sqrt(3.0)  # half the last digit of 0.1 um/s


@pytest.mark.parametrize(("text", "velocity", "u"), [
    ("0.1(1),-0.2(1) um/s", (1e-7, -2e-7), (1e-7, 1e-7)), ("0.1 , -0.2 um/s", (1e-7, -2e-7), (DIGIT, DIGIT)),
    ("0,1(1); -0,2(1) um/s", (1e-7, -2e-7), (1e-7, 1e-7)),
    ("1,250(1);-2,500(2) um/s", (1.25e-6, -2.5e-6), (1e-9, 2e-9)), ("0.1(1) um/s,-0.2(1) um/s", (1e-7, -2e-7), (1e-7, 1e-7)),
    ("0.10(2) mm/s,-60(6) um/min", (1e-4, -1e-6), (2e-5, 1e-7)), ("1(0)e-1,-2(0)e-1 um/s", (1e-7, -2e-7), (0.0, 0.0)),
    ("0.1 +- 0.3, -0.2 +- 0.4 µm/s", (1e-7, -2e-7), (3e-7, 4e-7)),
])  # fmt: skip
def test_a_drift_as_typed(text, velocity, u):
    found = velocity_of(text)
    assert found.velocity == pytest.approx(velocity, rel=EXACT)
    assert found.u == pytest.approx(u, rel=EXACT, abs=1e-20)


@pytest.mark.parametrize(("text", "said"), [
    ("0.1,0.2", "drift '0.1,0.2': has no unit; add one of m/s"), ("0.1 um/s", "drift '0.1 um/s': cannot be read as a velocity"),
    ("1,2,3 um/s", "cannot be read as a velocity"), ("0.1,0.2 um", "um is a length, and a speed is needed"),
    ("x,y um/s", "y um/s is no unit that labbook knows; a speed is needed"), ("", "cannot be read as a velocity"),
    ("0.1, um/s", "cannot be read as a speed"), ("0.1 um,0.2 um/s", "um is a length, and a speed is needed"),
])  # fmt: skip
def test_a_drift_that_cannot_be_read(text, said):
    with pytest.raises(Refusal) as refused:
        velocity_of(text)
    assert said in str(refused.value)


def test_columns_as_typed():
    assert columns_of(["x=X_pos,y=Y_pos", "t=time [ms]"]) == {"x": "X_pos", "y": "Y_pos", "t": "time [ms]"}
    assert columns_of(["x=pos, x, y=pos, z=2"]) == {"x": "pos, x", "y": "pos, z=2"}
    assert columns_of([]) == {}
    for text, said in (
        ("x", "is not role=column"),
        ("x=", "is not role=column"),
        ("x=a,x=b", "x is chosen twice"),
    ):
        with pytest.raises(Refusal, match=said):
            columns_of([text])
