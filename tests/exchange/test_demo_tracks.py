"""The demo's tracks: kept as they are, runs' speeds come from them, and they say what their makers put in.

The truths are those of seeds_demo's own model, which wrote the positions and labbook never sees; they are
asked for in a process of their own, since seeds_demo is a folder of scripts and no package.
"""

import csv
import hashlib
import json
import math
import subprocess
import sys

import numpy as np
import pytest

from labbook import Book
from labbook.book.plausibility import run_warnings
from labbook.book.track_pages import file_content, tracks_of, tracks_table
from labbook.demo import demo_folder, make_demo
from labbook.exchange.track_files import read_track

FOLDER = demo_folder() / "tracks"
FILES = {path.stem: path for path in sorted(FOLDER.glob("R-*.csv"))}
RIGID, HINGED = "thorn", "clover"  # swimmers that beat and do not swim
TOLD = """
import hashlib, json, demo_tracks, demo_trials, make_demo, numpy
rows = demo_trials.runs(numpy.random.default_rng(make_demo.SEED + 1))
files = [demo_tracks.files(rows, make_demo.SEED) for _ in "ab"]
digests = [{name: hashlib.sha256(text.encode()).hexdigest() for name, text in one.items()} for one in files]
print(json.dumps({"truth": [row["truth"] for row in rows], "digests": digests}))
"""


@pytest.fixture(scope="module")
def demo(demo_book):
    with Book.open(demo_book) as book:
        yield book


@pytest.fixture(scope="module")
def runs(demo):
    return demo.runs(kept=False).set_index("code")


@pytest.fixture(scope="module")
def tracks(demo):
    return demo.ask(tracks_of, list(FILES))


@pytest.fixture(scope="module")
def told():
    """What the scripts say: truth, (U, A_tip, f) a run, and the digests of the files written twice."""
    call = [sys.executable, "-B", "-c", TOLD]  # -B: no __pycache__ beside scripts that travel in the wheel
    done = subprocess.run(call, cwd=demo_folder(), capture_output=True, text=True, check=True)
    return json.loads(done.stdout)


@pytest.fixture(scope="module")
def truth(told):
    return {f"R-{i:04d}": values for i, values in enumerate(told["truth"], start=1)}


# ---- the files


def test_forty_and_more_small_files(told):
    assert len(FILES) >= 40
    assert sum(path.stat().st_size for path in FOLDER.iterdir()) < 1.2e6
    assert {path.name for path in FOLDER.iterdir()} == set(told["digests"][0])


def test_the_script_writes_the_same_files_each_time(told):
    first, again = told["digests"]
    assert first == again


def test_they_are_as_long_as_promised_and_written_in_several_habits(runs):
    heads, asked = set(), _settings()
    for code, path in FILES.items():
        lines = path.read_text(encoding="utf-8").splitlines()
        heads.add(lines[0].split(",tip")[0].split(",X_end")[0])
        columns = dict(one.split("=") for one in asked[path.name]["columns"].split(",") if one)
        file = read_track(path, columns=columns, scale=None if "[mm]" in lines[0] else "20(1) um/px",
                          fps=None if "[s]" in lines[0] else _fps(runs.loc[code, "rig"]))  # fmt: skip
        t = np.sort(file.t)
        cycles = (t[-1] - t[0] + np.median(np.diff(t))) * runs.loc[code, "f"]
        assert 230 <= file.rows <= 500 and 6.0 <= cycles <= 12.45, code  # 3 % of the frames may be lost
    assert {"frame,x,y", "frame;x;y;tip_x;tip_y", "t [s],x [mm],y [mm]", "Slice,X_head,Y_head"} <= heads


def _settings():
    with open(FOLDER / "settings.csv", encoding="utf-8", newline="") as file:
        return {row["file"]: row for row in csv.DictReader(file)}


def _fps(rig):
    with open(demo_folder() / "rigs.csv", encoding="utf-8", newline="") as file:
        return next(row["fps [1/s]"] for row in csv.DictReader(file) if row["code"] == rig) + " 1/s"


# ---- the book


def test_each_is_kept_byte_for_byte_with_its_run_by_who_logged_it(demo, runs, tracks):
    assert list(tracks) and set(tracks) == set(FILES)
    table = demo.ask(tracks_table)
    assert len(table) == len(FILES) and set(table["state"]) == {"in use"}
    for code, sheet in tracks.items():
        content = FILES[code].read_bytes()
        assert sheet.run == code and sheet.file == FILES[code].name
        assert demo.ask(file_content, sheet.digest) == content
        assert sheet.digest == hashlib.sha256(content).hexdigest() and sheet.stale == []
        assert sheet.by == runs.loc[code, "by"] and runs.loc[code, "state"] == "kept"


def test_the_books_speed_is_the_tracks_and_says_so(demo, runs, tracks):
    for code, sheet in tracks.items():
        run, result = runs.loc[code], sheet.result
        # kept with three digits of u, so each is off by half a unit of the third at most: 0.5 % of u
        assert abs(run["U"] - result["U"]) <= 0.0051 * result["u_U"], code
        assert run["u_U"] == pytest.approx(result["u_U"], rel=0.006), code
        marks = demo.sheet(code).marks
        assert "U" in sheet.accepted and "reduced" in marks["U"]
        seen = result["A_tip"] is not None
        assert ("A_tip" in sheet.accepted) == ("reduced" in marks.get("A_tip", ())) == seen
        assert sheet.replaced["U"] is not None, "what was typed stays with the track"


def test_most_runs_are_as_they_were_typed(runs):
    assert len(runs) == 920  # the lines of seeds_demo/runs.csv without its header
    with open(demo_folder() / "runs.csv", encoding="utf-8", newline="") as file:
        states = [row["state"] or "kept" for row in csv.DictReader(file)]
    assert list(runs["state"]) == states


def test_check_finds_nothing_and_notices_a_file_that_was_changed(demo, demo_book, tmp_path):
    assert demo.check() == []
    changed = tmp_path / "changed.db"
    demo.copy(changed)
    with Book.open(changed) as book:
        with book.engine.begin() as connection:
            change = "UPDATE kept_file SET content = content || x'0a' WHERE name = 'R-0012.csv'"
            connection.exec_driver_sql(change)
        assert "R-0012.csv" in " ".join(book.check())


def test_a_rig_that_was_calibrated_long_ago_is_marked(demo, runs):
    old = [code for code in FILES if any("days before" in mark for mark in demo.sheet(code).marks["U"])]
    assert {runs.loc[code, "rig"] for code in old} >= {"bench-1"} and len(old) < len(FILES) / 4
    assert "R-0760" in old  # 2026-09-22, and bench-1 was calibrated on 2025-06-30


# ---- what they say


def test_they_find_the_speed_that_moved_the_swimmer(tracks, truth):
    pulls = []
    for code, sheet in tracks.items():
        U, _, f = truth[code]
        result, scale = sheet.result, sheet.settings.get("scale")
        # the positions were made with the stated scale exactly, so its part of u is no error here
        share = 0.0 if scale is None else _relative(scale) * result["U"]
        own = math.sqrt(max(result["u_U"] ** 2 - share**2, 0.0))
        pulls.append((result["U"] - U) / own)
        assert result["f_beat"] == pytest.approx(f, rel=1e-12)
    # Student's t of some ten degrees of freedom: beyond 4.5 once in a thousand, so once in 25 sets of 44
    assert np.max(np.abs(pulls)) < 4.5
    # the mean square of 44 such pulls is about 1.2 +- 0.35; a tenth of U off makes it over 100
    assert 0.4 < np.mean(np.square(pulls)) < 2.5


def _relative(scale):
    """'21.4(1) um/px' -> 0.1/21.4."""
    value, _, rest = scale.partition("(")
    digits = len(value.partition(".")[2])
    return int(rest.partition(")")[0]) * 10.0**-digits / float(value)


def test_they_find_the_tips_excursion(tracks, truth):
    seen = {code: sheet.result for code, sheet in tracks.items() if sheet.result["A_tip"] is not None}
    assert len(seen) >= 30
    for code, result in seen.items():
        # 0.3 px of noise in 250 frames moves the beat's extremes by 0.05 px each, of a sweep of 16 px or more
        assert result["A_tip"] == pytest.approx(truth[code][1], rel=0.01)


def test_what_was_typed_before_is_near(tracks):
    for code, sheet in tracks.items():
        _, _, typed, u, _ = sheet.replaced["U"]
        assert abs(sheet.result["U"] - typed) < u, code


def test_controls_do_not_swim(runs, tracks):
    rigid = [code for code in tracks if runs.loc[code, "swimmer"].startswith(RIGID)]
    hinged = [code for code in tracks if runs.loc[code, "swimmer"].startswith(HINGED)]
    assert len(rigid) == 4 and len(hinged) == 2
    for code in rigid + hinged:
        result = tracks[code].result
        assert result["p_zero"] > 0.01 and result["U_low"] < 0.0 < result["U_high"], code
        assert abs(runs.loc[code, "U"]) < 3.0 * runs.loc[code, "u_U"]
    swim = [sheet.result["p_zero"] for code, sheet in tracks.items() if code not in rigid + hinged]
    assert max(swim) < 1e-6


# ---- the rest of the notebook beside them


def test_no_run_looks_out_of_place_among_its_swimmers(demo, runs):
    ids, swimmers = demo.ask(_ids, "run"), demo.ask(_ids, "swimmer")
    for code in FILES:
        run = runs.loc[code]
        values = {key: float(run[key]) for key in ("Sp", "Re", "U", "u_U")}
        found = demo.ask(run_warnings, swimmers[run["swimmer"]], values, len(runs) + 1, leave_out=ids[code])
        assert found == [], code


def _ids(connection, table):
    return dict(connection.exec_driver_sql(f"SELECT code, id FROM {table}").fetchall())


def test_the_groups_plot_keeps_its_shape(runs):
    drawn = (runs["state"] == "kept") & (runs["Sp"] > 0.5) & runs["U_scaled"].notna()
    slow = runs[drawn & (runs["Re_omega"] <= 1.0)]
    edges = np.geomspace(0.5, 8.0, 17)
    medians = slow.groupby(np.digitize(slow["Sp"], edges))["U_scaled"].median()
    top = medians.idxmax()
    # a driven elastic tail swims fastest for its frequency near Sp = 2 (common practice, no source: what
    # groups look for); the bins are 19 % wide
    assert edges[top - 1] < 2.2 and edges[top] > 1.8


def test_making_it_tells_of_every_track(tmp_path):
    told = []
    make_demo(tmp_path / "demo.db", lambda what, n: told.append((what, n))).close()
    assert sum(n for what, n in told if what == "reducing tracks") == len(FILES)
    assert [path.name for path in tmp_path.iterdir()] == ["demo.db"]
