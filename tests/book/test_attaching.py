"""Tracks in the book: attached whole or not at all, typed and reduced both kept, the camera's scale shared by a rig's runs."""

import hashlib
import json
import math
import multiprocessing
import re
import sqlite3
from contextlib import closing
from dataclasses import replace
from datetime import date

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from labbook import Book, LabbookError
from labbook.book import attaching, opening
from labbook.book.asking import Question
from labbook.book.bench_queries import cells_again
from labbook.book.budgets import budgets, simulate
from labbook.book.derive import STALE_DAYS
from labbook.book.queries import ledger_lines
from labbook.book.reduced_cells import in_short
from labbook.book.track_pages import file_content, track_of, tracks_table
from labbook.errors import Unconfirmed
from labbook.exchange import track_reducing
from labbook.registry.typed import REDUCED, read, reduced

SCALE, U_SCALE = 3.2e-6, 0.1e-6  # the rig's '3.2(1) um/px'
RELATIVE = U_SCALE / SCALE
SPEED, BEAT, TIP = 51e-6, 0.4e-3, 1e-3  # of the made tracks: m/s, half the beat along the axis, half of A_tip
FPS, FRAMES = 20, 500


def columns(f=0.5, speed=SPEED, seed=1):
    """t, x, y, tip_x, tip_y of a swimmer in m: uniform motion, a beat at f and 5 um of white noise."""
    rng = np.random.default_rng(seed)
    t = np.arange(FRAMES) / FPS
    x, y = speed * t + BEAT * np.sin(2 * np.pi * f * t), np.zeros(FRAMES)
    tip = y + TIP * np.sin(2 * np.pi * f * t + 1)
    return t, *(one + rng.normal(0, 5e-6, FRAMES) for one in (x, y, x - 0.03, tip))


def track_file(unit="px", tip=True, **how) -> bytes:
    """The track as a tracker writes it: frame numbers, and pixels or um."""
    t, *lengths = columns(**how)
    names = ("x", "y", "tip_x", "tip_y")[: 4 if tip else 2]
    size = SCALE if unit == "px" else 1e-6
    head = ",".join(f"{name} [{unit}]" for name in names)
    rows = zip(np.rint(t * FPS).astype(int), *(one / size for one in lengths[: len(names)]), strict=True)
    return (f"frame,{head}\n" + "".join(",".join(f"{c:.4f}" for c in row) + "\n" for row in rows)).encode()


@pytest.fixture
def book(filled):
    """The ten runs, and a camera on their rig."""
    filled.stock("rig", code="coil-1", scale="3.2(1) um/px", fps="20 fps", why="camera calibrated")
    return filled


@pytest.fixture
def attached(book):
    """A track on R-0001: f 0.50 Hz, U 0.051(3) mm/s and A_tip 2.0(1) mm were typed."""
    book.attach_track("R-0001", track_file(), "cam/reed 1.csv", {"axis": "0"}, by="knot")
    return book


def rows_of(book) -> dict:
    with closing(sqlite3.connect(book.target)) as raw:
        tables = ("kept_file", "track", "ledger", "ledger_run", "run", "resolved")
        found = {t: raw.execute(f"select count(*) from {t}").fetchone()[0] for t in tables}
        return found | {"typed": raw.execute("select id, typed, confirmed from run order by id").fetchall()}


# ---- values and uncertainties


def test_a_track_brings_its_values_and_what_was_typed_is_kept(attached):
    sheet = attached.sheet("R-0001")
    track = sheet.track
    assert sheet.typed["U"][4] == sheet.typed["A_tip"][4] == REDUCED and sheet.typed["f"][0] == "0.50"
    # the slope of a straight line through N points over a time T: u = s sqrt(12/N)/T (text-book least squares); s is
    # known from 500 points to 3 %, and what serial correlation might hide is looked for: a quarter
    line = 5e-6 * math.sqrt(12 / FRAMES) / (FRAMES / FPS)
    assert sheet.u_own["U"] == pytest.approx(line, rel=0.25)
    assert abs(sheet.values["U"] - SPEED) < 4 * line
    assert sheet.values["A_tip"] == pytest.approx(2 * TIP, abs=4 * sheet.u_own["A_tip"] + 1e-5)
    assert sheet.marks["U"] == sheet.marks["A_tip"] == ["reduced"] and "f" not in sheet.marks
    assert track.code == "T-0001" and track.by == "knot" and track.file == "reed 1.csv"
    assert track.digest == hashlib.sha256(track_file()).hexdigest()
    assert track.replaced["U"] == ["0.051(3) mm/s", "mm/s", pytest.approx(5.1e-5), pytest.approx(3e-6), "stated"]
    assert track.accepted == ["U", "A_tip"] and track.stale == [] and "scale" not in sheet.typed
    assert attached.ask(file_content, track.digest) == track_file()
    assert attached.check() == []


def test_own_and_shared_by_hand(attached):
    """U = scale * u_px, so the scale's part is U u(scale)/scale (JCGM 100:2008, 5.1.6); own and shared make up u."""
    sheet = attached.sheet("R-0001")
    result = sheet.track.result
    for key in ("U", "A_tip"):
        assert sheet.values[key] == pytest.approx(result[key], abs=0.005 * sheet.u_own[key])  # three digits of u
        assert sheet.u_shared[key] == pytest.approx(RELATIVE * sheet.values[key], rel=1e-12)
        assert sheet.u[key] == pytest.approx(result[f"u_{key}"], rel=1e-4)  # own is three digits, and the smaller
    # the same positions in um need no scale: all that is uncertain then is the run's own
    attached.attach_track("R-0002", track_file("um"), "um.csv", {"axis": 0, "f": "0.5 Hz"})
    plain = attached.sheet("R-0002")
    assert "scale" not in plain.track.settings and plain.u_shared["U"] == 0
    # 6 %: adding the scale's part raises the degrees of freedom, and the t's spread sinks towards the normal's
    assert plain.u_own["U"] == pytest.approx(sheet.u_own["U"], rel=0.06)
    assert plain.u_own["A_tip"] == pytest.approx(sheet.u_own["A_tip"], rel=0.06)
    assert attached.check() == []


def test_the_scale_is_one_source_for_speed_and_tip_and_for_all_runs_of_the_rig(attached):
    sheet = attached.sheet("R-0001")
    # St = f A_tip/U: the scale cancels, as it would not if U and A_tip had a source each (4 %)
    assert RELATIVE > 0.03 and sheet.u_shared["St"] < 1e-12 * sheet.values["St"]
    assert sheet.u_shared["U_scaled"] > RELATIVE * sheet.values["U_scaled"]
    attached.attach_track("R-0003", track_file(f=2.0, speed=80e-6, seed=2), "b.csv", {"axis": 0})
    runs = attached.runs(columns=("U", "Re")).set_index("code").loc[["R-0001", "R-0003"]]
    assert (runs["u_shared_U"] / runs["U"]).tolist() == pytest.approx([RELATIVE] * 2, rel=1e-12)
    budget = attached.ask(budgets, "R-0001")["stride"]
    part = next(c for c in budget.contributions if c.source == "scale")
    assert (part.name, part.belongs, part.own) == ("camera scale", "rig", False)
    assert part.part == pytest.approx(RELATIVE * budget.value, rel=1e-9)
    drawn = attached.ask(simulate, "R-0001", "stride", draws=20_000)
    # 20 000 draws know a standard deviation to 0.5 %: four of them
    assert drawn.sample.u == pytest.approx(budget.u, rel=0.02)
    tip = attached.ask(simulate, "R-0001", "St", draws=20_000)
    assert tip.sample.u == pytest.approx(attached.sheet("R-0001").u["St"], rel=0.02)


def test_a_typed_speed_beside_a_reduced_tip_has_no_part_from_the_scale(book):
    book.attach_track("R-0001", track_file(), "a.csv", {"axis": 0}, ("A_tip",))
    sheet = book.sheet("R-0001")
    assert sheet.u_shared["U"] == 0 and sheet.u["U"] == pytest.approx(3e-6) and sheet.typed["U"][4] == "stated"
    assert sheet.u_shared["A_tip"] > 0 and sheet.track.accepted == ["A_tip"]
    book.attach_track("R-0003", track_file(f=2.0, tip=False), "b.csv", {"axis": 0})
    assert book.check() == [], "derived together with a run whose speed is reduced, it still has none"


def test_the_trend_moves(book):
    question = Question(swimmers=("reed-1",))
    before = book.frame(question, keys=("stride", "U_scaled"), texts=("code",)).set_index("code")
    book.attach_track("R-0001", track_file(speed=80e-6), "a.csv", {"axis": 0})
    after = book.frame(question, keys=("stride", "U_scaled"), texts=("code",)).set_index("code")
    ratio = (after / before)[["stride", "U_scaled"]]
    assert ratio.loc["R-0001"].tolist() == pytest.approx([80 / 51] * 2, rel=1e-3)  # both go as U; own u is 0.04 %
    assert ratio.drop("R-0001").dropna().to_numpy().ravel() == pytest.approx(1.0, rel=0, abs=0)


@given(st.floats(-1, 1), st.floats(1e-3, 3e3), st.integers(-9, 0))
def test_a_reduced_text_reads_as_its_value(value, ratio, power):
    value, u = value * 10.0**power, ratio * 10.0 ** (power - 3)
    one = reduced("U", value, u)
    again = read("U", one.text)
    assert (again.value, again.u, one.origin) == (one.value, one.u, REDUCED)
    # half of the last of three digits is at most 0.5 % of u
    assert abs(one.value - value) <= 0.00501 * u and abs(one.u - u) <= 0.00501 * u


# ---- f, a second track, and back to what was typed


def test_f_enters_only_where_the_track_tells_it(book):
    book.attach_track("R-0001", track_file(f=0.49), "a.csv", {"axis": 0, "f": "fit"})
    sheet = book.sheet("R-0001")
    assert sheet.marks["f"] == ["reduced"] and sheet.track.replaced["f"][0] == "0.50"
    assert abs(sheet.values["f"] - 0.49) < 4 * sheet.u["f"] < 1e-3
    assert book.ask(cells_again, "R-0001")["f"] == "0.50 Hz", "the next run starts from what was set"
    # the next track is reduced with what was typed, not with what the first one found
    book.attach_track("R-0001", track_file(f=0.5), "b.csv", {"axis": 0})
    sheet = book.sheet("R-0001")
    assert sheet.typed["f"][0] == "0.50" and "f" not in sheet.marks
    assert sheet.track.settings["taken"] == {"scale": "rig", "fps": "rig", "f": "run"}
    assert sheet.track.settings["f"] == "0.50 Hz" and sheet.track.result["u_f_beat"] == 0
    assert book.check() == []


def test_a_second_track_takes_the_place_of_the_first(attached):
    attached.attach_track("R-0001", track_file(speed=80e-6, tip=False), "b.csv", {"axis": 0}, why="better light")
    sheet = attached.sheet("R-0001")
    assert sheet.values["U"] == pytest.approx(80e-6, rel=1e-2) and sheet.track.code == "T-0002"
    assert sheet.typed["A_tip"][0] == "2.0(1) mm" and sheet.u_shared["A_tip"] == 0, "only the first track told it"
    assert sheet.track.replaced["U"][0] == "0.051(3) mm/s", "what was typed, not what the first track brought"
    tracks = attached.ask(tracks_table)
    assert tracks["code"].tolist() == ["T-0002", "T-0001"] and tracks["state"].tolist() == ["in use", "replaced"]
    assert tracks["why"].tolist()[1] == "better light" and tracks["U"].tolist() == pytest.approx([80e-6, 51e-6], rel=1e-2)
    line = attached.ask(ledger_lines, newest=1).iloc[0]
    assert (line["act"], line["kind"], line["subject"], line["runs"]) == ("reduce", "run", "R-0001", "R-0001")
    assert line["before"]["track"] == "T-0001" and line["after"]["track"] == "T-0002"
    assert line["after"]["digest"] == sheet.track.digest and line["after"]["A_tip"] == "2.0(1) mm"
    assert attached.check() == []


def test_amending_returns_to_what_is_typed(attached):
    attached.amend("R-0001", why="a remark", note="dim light")
    sheet = attached.sheet("R-0001")
    assert sheet.typed["U"][4] == REDUCED and sheet.u_shared["U"] > 0, "other cells leave the track's alone"
    attached.amend("R-0001", why="the stopwatch was right", U="0.051(3) mm/s")
    sheet = attached.sheet("R-0001")
    assert sheet.typed["U"][4] == "stated" and sheet.u_shared["U"] == 0 and "U" not in sheet.marks
    assert sheet.u_shared["A_tip"] > 0 and sheet.track.accepted == ["A_tip"] and attached.check() == []
    attached.amend("R-0001", why="no tip seen", A_tip=None)
    assert attached.sheet("R-0001").track is None and attached.check() == []
    (typed,) = (json.loads(t) for i, t, _ in rows_of(attached)["typed"] if i == 1)
    assert "scale" not in typed and {entry[4] for entry in typed.values()} <= {"stated", "digits"}
    (state, why), = attached.ask(tracks_table)[["state", "why"]].to_numpy().tolist()
    assert (state, why) == ("replaced", "no tip seen")


def test_what_a_track_was_reduced_with_and_is_no_more_is_said(attached):
    attached.amend("R-0001", why="misread the dial", f="0.55 Hz")
    attached.stock("rig", code="coil-1", scale="3.3(1) um/px", why="measured again")
    said = attached.sheet("R-0001").track.stale
    assert len(said) == 2 and "f = 0.5 Hz, and the run says 0.55 Hz" in said[0] and "3.3(1) um/px" in said[1]


# ---- files


def test_a_file_is_kept_once_and_goes_with_a_copy(attached, tmp_path):
    attached.attach_track("R-0003", track_file(), "again.csv", {"axis": 0, "f": "0.5 Hz"})
    before = rows_of(attached)
    assert before["kept_file"] == 1 and before["track"] == 2
    attached.attach_track("R-0001", track_file(), "reed 1.csv", {"axis": "0"})
    assert rows_of(attached) == before, "the same track once more changes nothing"
    assert attached.sheet("R-0003").track.file == "again.csv"
    attached.copy(tmp_path / "copy.db")
    with Book.open(tmp_path / "copy.db") as copy:
        assert copy.ask(file_content, attached.sheet("R-0001").track.digest) == track_file()
        assert copy.sheet("R-0001") == attached.sheet("R-0001") and copy.check() == []
    with pytest.raises(LabbookError, match="keeps no file"):
        attached.ask(file_content, "0" * 64)


def test_check_finds_a_flipped_byte_in_a_kept_file(attached, by_hand):
    content = bytearray(track_file())
    content[-40] ^= 1
    by_hand(attached, "UPDATE kept_file SET content = ?", bytes(content))
    said = attached.check()
    assert len(said) == 1 and "file reed 1.csv: its content was changed" in said[0]


@pytest.mark.parametrize(("change", "said"), [
    ("UPDATE track SET result = json_set(result, '$.U', 9e-5)", "R-0001: U is not what track T-0001 says"),
    ("UPDATE track SET settings = json_set(settings, '$.scale', '3.3(1) um/px')", "scale is not what track"),
    ("UPDATE track SET settings = json_set(settings, '$.scale', 'dear')", "changed by hand and cannot be read"),
    ("UPDATE track SET replaced = '{}'", "R-0001: U, A_tip is not what track"),
    ("UPDATE track SET state = 'replaced'", "R-0001: U, A_tip should come from a track, and it has none"),
    ("UPDATE track SET run_id = 4", "R-0004: track T-0001 is said to be in use, and nothing comes from it"),
    ("UPDATE run SET typed = json_set(typed, '$.U[2]', 5.2e-5)", "R-0001: U is not what track T-0001 says"),
    ("INSERT INTO track SELECT 2, 'T-0002', run_id, file_id, settings, result, replaced, at, by, state, why FROM track",
     "R-0001: has more than one track in use"),
])  # fmt: skip
def test_check_finds_a_track_and_a_run_that_disagree(attached, by_hand, change, said):
    by_hand(attached, change)
    assert any(said in sentence for sentence in attached.check())


# every kind of figure that a result has; 'changed by hand' is a change well outside what another machine makes of it
STORED = [("p_zero", "0.5"), ("drift", "json('[1e-5, 0.0]')"), ("U", "5.11e-5"), ("u_U", "2e-6"), ("U_low", "4e-5"),
          ("net_per_cycle", "1e-5"), ("amplitude", "3e-4"), ("u_amplitude", "2e-5"), ("cycles", "11.5"), ("frames", "499"),
          ("lost", "3"), ("axis", "json('[0.0, 1.0]')"), ("axis_from", "'body'"), ("excursion", "9e-4"), ("u_A_tip", "null"),
          ("steadiness", "null"), ("steadiness.p_trend", "1e-3"), ("steadiness.per_cycle[2]", "6e-5"),
          ("colour", "'red'")]  # fmt: skip


@pytest.mark.parametrize(("figure", "value"), STORED)
def test_check_reduces_again_and_finds_any_figure_that_was_changed(attached, by_hand, figure, value):
    by_hand(attached, f"UPDATE track SET result = json_set(result, '$.{figure}', {value})")
    said = [sentence for sentence in attached.check() if "reduces to" in sentence]
    name = figure.split(".")[0]
    assert said == [f"R-0001: {name} of track T-0001 is not what its file reduces to: changed by hand, or reduced by "
                    "another labbook"]  # fmt: skip


def test_check_reduces_replaced_tracks_too_and_bears_what_another_machine_makes_of_a_figure(attached, by_hand):
    attached.attach_track("R-0001", track_file(speed=80e-6), "b.csv", {"axis": 0})
    (u,), = by_hand(attached, "SELECT json_extract(result, '$.u_U') FROM track WHERE id = 1")
    for change, n in ((1e-4 * u, 0), (0.01 * u, 1)):  # of the speed: where a fit may end, a hundredth of its u
        by_hand(attached, "UPDATE track SET result = json_set(result, '$.U', json_extract(result, '$.U') + ?) WHERE id = 1", change)
        assert ["U of track T-0001" in sentence for sentence in attached.check()] == [True] * n


@pytest.mark.parametrize("change", [
    "UPDATE track SET settings = json_set(settings, '$.axis', 'north')", "UPDATE track SET settings = json_set(settings, '$.columns.y', 'tip_y [px]')",
    "UPDATE track SET settings = json_set(settings, '$.trim', '1')", "UPDATE track SET settings = json_set(settings, '$.drift', 'none')",
])  # fmt: skip
def test_check_finds_settings_that_give_something_else(attached, by_hand, change):
    by_hand(attached, change)
    assert any("T-0001" in sentence and ("reduces to" in sentence or "reduced again" in sentence) for sentence in attached.check())


# ---- a reduction that is made already


@pytest.fixture
def reductions(monkeypatch):
    """How often a track was reduced."""
    made, real = [], track_reducing.reduction

    def counted(*a, **k):
        made.append(1)
        return real(*a, **k)

    monkeypatch.setattr(track_reducing, "reduction", counted)
    return made


def test_a_reduction_that_was_looked_at_is_not_made_again(book, reductions):
    settings = {"axis": "0", "drift": ((1e-6, 0.0), (1e-7, 1e-7))}
    made = track_reducing.reduce_track(track_file(), "a.csv", settings, attaching.conditions(book.engine, "R-0001"))
    assert book.attach_track("R-0001", track_file(), "a.csv", settings, made=made) is made.reduction
    assert len(reductions) == 1
    assert book.check() == [] and len(reductions) == 2, "the check reduces anew"


@pytest.mark.parametrize("other", [
    {"content": track_file(speed=60e-6)}, {"settings": {"axis": "10"}}, {"settings": {"axis": "0", "trim": "1"}},
    {"code": "R-0002"}, {"rig": "3.3(1) um/px"}, {"f": "0.51 Hz"},
])  # fmt: skip
def test_a_reduction_of_anything_else_is_not_taken(book, reductions, other):
    told = {"content": track_file(), "settings": {"axis": "0", "f": "0.5 Hz"}, "code": "R-0001"}
    made = track_reducing.reduce_track(told["content"], "a.csv", told["settings"], attaching.conditions(book.engine, "R-0001"))
    if "rig" in other:
        book.stock("rig", code="coil-1", scale=other["rig"], why="measured again")
    if "f" in other:
        book.amend("R-0001", f=other["f"], why="misread")
    told |= {k: v for k, v in other.items() if k in told}
    found = book.attach_track(told["code"], told["content"], "a.csv", told["settings"], made=made, confirm=True)
    assert found is not made.reduction and len(reductions) == 2
    assert book.sheet(told["code"]).track.result["U"] == found.U and book.check() == []


# ---- far from the swimmer's other runs


def test_a_track_that_is_far_off_is_warned_about_as_a_typed_speed_is(book):
    """Both ask book/plausibility.py: five times outside what this swimmer's kept runs span, as amend says it."""
    for at in range(3):  # with R-0002 and R-0003 enough to compare with
        book.record(swimmer="reed-1", fluid="syrup", f="0.50 Hz", theta0="0.30 rad", U="0.05 mm/s", T="22.0 degC",
                    at=f"2026-03-07T10:0{at}")  # fmt: skip
    before = rows_of(book)
    with pytest.raises(Unconfirmed) as typed:
        book.amend("R-0001", U="5.10(1) mm/s", why="a try")
    with pytest.raises(Unconfirmed) as found:
        book.attach_track("R-0001", track_file(speed=5.1e-3), "a.csv", {"axis": 0})
    assert found.value.fields == typed.value.fields == ["U", "U"]
    said = "times the largest of this swimmer's runs: another run's track, or a wrong scale or frame rate?"
    assert all(said in sentence for sentence in found.value.warnings) and rows_of(book) == before
    book.attach_track("R-0001", track_file(speed=5.1e-3), "a.csv", {"axis": 0}, confirm=True)
    sheet = book.sheet("R-0001")
    assert sheet.values["U"] == pytest.approx(5.1e-3, rel=1e-3) and sheet.marks["U"] == ["reduced", "confirmed"]
    # the next track does away with the doubt, and its own speed is no surprise
    book.attach_track("R-0001", track_file(), "b.csv", {"axis": 0})
    assert book.sheet("R-0001").marks["U"] == ["reduced"] and book.check() == []


def test_a_value_outside_its_usual_range_is_warned_about_too(book):
    from_far = track_file(speed=40.0)  # m/s: nothing that swims does so
    with pytest.raises(Unconfirmed, match=r"U: 4\d\d\d\d?\d?.* mm/s lies outside the usual"):
        book.attach_track("R-0004", from_far, "a.csv", {"axis": 0, "scale": "3.2(1) um/px", "fps": "20 fps", "f": "0.5 Hz"})


def test_only_what_the_track_moves_is_doubted(book):
    """R-0001's Sp is made odd and confirmed; its speed says nothing of that."""
    with pytest.raises(Unconfirmed, match="Sp = .* times the largest"):
        book.amend("R-0001", f="2 kHz", why="so it was")
    book.amend("R-0001", f="2 kHz", why="so it was", confirm=True)
    book.attach_track("R-0001", track_file("um"), "a.csv", {"axis": 0, "f": "0.5 Hz"}, ("U",))
    assert book.sheet("R-0001").track.accepted == ["U"] and "confirmed" in book.sheet("R-0001").marks["f"]


# ---- what the ledger says


def test_the_ledger_says_what_a_track_brought_as_people_write_it(attached):
    attached.attach_track("R-0001", track_file(speed=80e-6, tip=False), "b.csv", {"axis": 0})
    lines = attached.ask(ledger_lines, newest=2)
    first, second = lines.iloc[1], lines.iloc[0]
    # u = 51 um/s 0.1/3.2 = 1.6 um/s and 80 um/s 0.1/3.2 = 2.5 um/s: the camera's scale, beside which the noise is nothing
    assert first["before"]["U"] == "0.051(3) mm/s" and re.fullmatch(r"5[01]\.\d\(16\) um/s", first["after"]["U"])
    assert second["before"]["U"] == first["after"]["U"]
    assert second["after"]["U"].startswith(("80(3)", "80.0(25)")) and second["before"]["A_tip"] == "2.00(6) mm"
    attached.amend("R-0001", why="the stopwatch was right", U="0.051(3) mm/s")
    was = attached.ask(ledger_lines, newest=1).iloc[0]["before"]["U"]
    # the book's own text has the run's part of u alone, and would say more digits than are known
    assert re.fullmatch(r"(79\.9\d|80(\.0\d)?) um/s", in_short("U", was)) and was.endswith("e-5 m/s")


@pytest.mark.parametrize(("key", "text"), [("U", "0.051(3) mm/s"), ("U", "5.10(12)e-5 m/s"), ("note", "1.23(4)e-5 m/s"),
                                           ("U", "fast"), ("T", "2.345(123)e1 K")])  # fmt: skip
def test_what_a_person_typed_is_not_shortened(key, text):
    assert in_short(key, text) == text


def test_a_digest_is_shown_in_short():
    assert in_short("digest", "0123456789abcdef" * 4) == "0123456789ab"


# ---- refused: nothing is attached


@pytest.mark.parametrize(("code", "content", "settings", "accept", "said"), [
    ("R-0417", track_file(), {}, ("U",), "has no such run"),
    ("R-0010", track_file(), {}, ("U",), "is void: bubble on the tail"),
    ("R-0001", track_file(), {"axis": 0}, (), "nothing is accepted"),
    ("R-0001", track_file(), {"axis": 0}, ("T",), "does not come from a track"),
    ("R-0001", track_file(tip=False), {"axis": 0}, ("A_tip",), "says nothing of A_tip"),
    ("R-0001", track_file(), {"axis": 0}, ("f",), "says nothing of f"),
    ("R-0001", track_file(), {"colour": "red"}, ("U",), "no setting of a track"),
    ("R-0001", track_file(), {"columns": {"x": "X_pos"}}, ("U",), "no such column"),
    ("R-0001", track_file(), {"scale": "3.2"}, ("U",), "has no unit"),
    ("R-0001", track_file(), {"drift": "fast"}, ("U",), "cannot be read as a velocity"),
    ("R-0001", track_file(), {"drift": (1.0,)}, ("U",), "is no velocity"),
    ("R-0001", track_file(), {"trim": "some"}, ("U",), "neither auto nor a number"),
    ("R-0001", track_file(), {"f": "0.05 Hz"}, ("U",), "at least three cycles"),
    ("R-0004", track_file(), {}, ("U",), "give a scale"),  # it names no rig
    ("R-0001", b"", {}, ("U",), "is empty"),
    ("R-0001", bytes(range(256)) * 40, {}, ("U",), "neither text nor Parquet"),
])  # fmt: skip
def test_what_is_refused_leaves_nothing(book, code, content, settings, accept, said):
    before = rows_of(book)
    with pytest.raises(LabbookError, match=said) as found:
        book.attach_track(code, content, "a.csv", settings, accept)
    assert "\n" not in str(found.value)
    assert rows_of(book) == before and book.check() == []


@pytest.fixture
def parts(book):
    """What attaching.attach takes, and the book."""
    found = book.attach_track("R-0003", track_file(f=2.0), "a.csv", {"axis": 0})
    settings = book.sheet("R-0003").track.settings
    return {"engine": book.engine, "code": "R-0001", "content": b"t,x,y\n", "name": "a.csv", "reduction": found,
            "settings": {"scale": settings["scale"]}, "accept": ("U",), "by": "wren"}  # fmt: skip


@pytest.mark.parametrize(("change", "said"), [
    ({"by": " "}, "a handle"), ({"name": "cam/"}, "a file name"), ({"name": "a\n.csv"}, "a file name"),
    ({"why": ""}, "say in a few words"), ({"content": b"x" * 101}, "has at most"),
    ({"settings": {"scale": "3.2 um/px", "taken": {"scale": "rig"}}}, "has changed on the rig meanwhile"),
    ({"settings": {"f": "0.51 Hz", "taken": {"f": "run"}}}, "has changed on the run meanwhile"),
])  # fmt: skip
def test_what_attach_itself_refuses(book, parts, monkeypatch, change, said):
    monkeypatch.setattr(attaching, "LARGEST_FILE", 100)
    before = rows_of(book)
    with pytest.raises(LabbookError, match=said):
        attaching.attach(**parts | change)
    assert rows_of(book) == before


@pytest.mark.parametrize("nothing", [{"U": math.nan}, {"u_U": math.nan}, {"u_U": math.inf}, {"u_U": 0.0}])
def test_a_speed_that_is_not_measured_is_refused(book, parts, nothing):
    before = rows_of(book)
    with pytest.raises(LabbookError, match="U: is not measured by this track"):
        attaching.attach(**parts | {"reduction": replace(parts["reduction"], **nothing)})
    assert rows_of(book) == before


def test_a_write_that_fails_half_way_leaves_nothing(book, parts, monkeypatch):
    before = rows_of(book)

    def fails(*_, **__):
        raise KeyboardInterrupt

    monkeypatch.setattr(attaching.chain, "append", fails)
    with pytest.raises(KeyboardInterrupt):
        attaching.attach(**parts)
    assert rows_of(book) == before


# ---- sheets, JSON, calibration


def test_a_sheet_of_runs_loaded_again_knows_a_run_with_a_track(book, tmp_path):
    head = "code,swimmer,fluid,rig,at,f [Hz],U [mm/s],note\n"

    def sheet(U, note="dim light"):
        path = tmp_path / "runs.csv"
        path.write_text(f"{head}K-1,reed-1,syrup,coil-1,2026-03-07T10:00,0.50,{U},{note}\n", encoding="utf-8")
        return path

    book.load(sheet("0.051(3)", note=""))
    book.attach_track("K-1", track_file(), "a.csv", {"axis": 0})
    reduced_text = book.sheet("K-1").typed["U"][0]
    book.amend("K-1", why="seen late", note="dim light")  # so that the rows below are not known by their digest
    for known in ("0.051(3)", reduced_text):
        assert book.load(sheet(known)).known == 1
    with pytest.raises(LabbookError, match="differs from the book in U"):
        book.load(sheet("0.061(3)"))
    assert book.sheet("K-1").typed["U"][0] == reduced_text and book.check() == []


def test_json_tells_the_track(attached):
    rows = {s.texts["code"]: s.row() for s in attached.sheets(Question())}
    told = json.loads(json.dumps(rows["R-0001"]["track"], allow_nan=False))
    assert told["code"] == "T-0001" and len(told["digest"]) == 64
    assert told["replaced"] == {"U": "0.051(3) mm/s", "A_tip": "2.0(1) mm"}
    assert told["result"]["cycles"] == pytest.approx(FRAMES / FPS * 0.5)
    assert rows["R-0002"]["track"] is None and "track" in rows["R-0002"]
    assert attached.ask(track_of, "R-0002") is None


def test_an_old_calibration_marks_what_came_from_the_rig(attached):
    assert STALE_DAYS == 365
    run_day = date(2026, 3, 2)  # R-0001 to R-0003; R-0001: f from digits, rig states u_f; R-0002: B from I_coil

    attached.amend("R-0003", why="read late", I_coil="1.8(1) A")  # beside a typed B it brings nothing

    def marks(on):
        attached.stock("rig", code="coil-1", calibrated=on, why="the date was wrong")
        assert attached.check() == []
        return {s.texts["code"]: s.marks for s in attached.sheets(Question(state="all"))}

    assert (run_day - date(2025, 3, 2)).days == 365 and (run_day - date(2025, 3, 1)).days == 366
    assert not any("calibrated" in str(m) for code, m in marks("2025-03-02").items() if code <= "R-0003")
    old = marks("2025-03-01")
    said = "rig calibrated 366 days before"
    assert old["R-0001"] == {"f": [said], "U": ["reduced", said], "A_tip": ["reduced", said]}
    assert old["R-0002"] == {"f": [said], "B": [said]}, "B was not typed: it is the coil's constant times the current"
    assert old["R-0003"] == {"f": [said]}, "its B has an uncertainty of its own"
    assert old["R-0008"]["f"] == ["rig calibrated 369 days before"], "2026-03-05"
    assert "calibrated" not in str(old["R-0004"]), "it names no rig"
    assert not any("calibrated" in str(m) for m in marks("2026-12-24").values()), "calibrated after the runs"


# ---- migration, processes


def test_down_to_before_tracks_and_up_again(attached, counts, by_hand):
    before, was = counts(attached), attached.sheet("R-0001")
    ((registry,),) = by_hand(attached, "SELECT registry FROM book")
    opening.upgrade_to(attached.engine, "0002")
    with closing(sqlite3.connect(attached.target)) as raw:
        (typed,) = raw.execute("select typed from run where id = 1").fetchone()
        tables = {t for (t,) in raw.execute("select name from sqlite_master where type='table'")}
    assert not {"track", "kept_file"} & tables
    typed = json.loads(typed)
    assert "scale" not in typed and typed["U"][4] == "stated"
    for key in ("U", "A_tip"):  # an older labbook reads the whole uncertainty from the text
        assert read(key, typed[key][0])[2:4] == tuple(typed[key][2:4])
        assert typed[key][3] == pytest.approx(was.u[key], rel=1e-12)
    assert by_hand(attached, "SELECT registry FROM book") != [(registry,)], "an older labbook derives its runs again"
    by_hand(attached, "UPDATE book SET registry = ?", registry)  # as it has done here
    attached.close()
    with Book.open(attached.target) as book:  # opening migrates, and derives again
        sheet = book.sheet("R-0001")
        assert sheet.values["U"] == was.values["U"] and sheet.u["U"] == pytest.approx(was.u["U"], rel=1e-12)
        assert sheet.u_shared["U"] == 0 and sheet.track is None and "U" not in sheet.marks
        after = counts(book)
        assert {t: after[t] - before[t] for t in before} == {**dict.fromkeys(before, 0), "ledger": 1}, "the rebuild"
        assert book.check() == []
        book.attach_track("R-0001", track_file(), "a.csv", {"axis": 0})
        assert book.check() == []


SYSTEM = multiprocessing.get_context("fork")


def attach_some(path, who, go) -> None:
    with Book.open(path) as book:
        files = [track_file(speed=(50 + i) * 1e-6, seed=i) for i in range(3)]
        go.wait()
        for i, content in enumerate(files):  # both the same files, in the same order
            book.attach_track("R-0001", content, f"{i}.csv", {"axis": 0, "trim": 0 if who == "wren" else 1}, by=who)


def test_two_processes_attach_at_once(book):
    book.close()
    go = SYSTEM.Event()
    both = [SYSTEM.Process(target=attach_some, args=(book.target, who, go)) for who in ("wren", "knot")]
    for one in both:
        one.start()
    go.set()
    for one in both:
        one.join(100)
    assert [one.exitcode for one in both] == [0, 0]
    with Book.open(book.target) as again:
        tracks = again.ask(tracks_table)
        assert sorted(tracks["code"]) == [f"T-{i:04d}" for i in range(1, 7)]
        assert tracks["state"].tolist() == ["in use"] + ["replaced"] * 5
        assert rows_of(again)["kept_file"] == 3
        assert again.sheet("R-0001").values["U"] == pytest.approx(tracks["U"].iloc[0], rel=1e-3)
        assert (again.ask(ledger_lines)["act"] == "reduce").sum() == 6
        assert again.check() == []
