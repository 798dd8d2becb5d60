"""The ledger: a line for every act, a chain that shows tampering, runs that are amended and voided but never lost."""

import json
import shutil
import sqlite3
from contextlib import closing
from datetime import UTC, datetime, timedelta

import pytest
from sqlalchemy.exc import DatabaseError

from labbook import Book, Refusal
from labbook.book.ledger import young_enough_for_typo
from labbook.book.opening import writing
from labbook.book.queries import ledger_lines


def last(book) -> dict:
    with closing(sqlite3.connect(book.target)) as raw:
        raw.row_factory = sqlite3.Row
        line = dict(raw.execute("select * from ledger order by id desc limit 1").fetchone())
    for side in ("before", "after"):
        line[side] = json.loads(line[side]) if line[side] else None
    return line


def told(line) -> tuple:
    return line["by"], line["act"], line["kind"], line["subject"], line["why"], line["runs"]


# ---- what each act leaves


def test_log(stocked):
    code = stocked.record(swimmer="reed-1", fluid="syrup", f="0.50 Hz", U="1.2(1) mm/s", T="22,5 °C", by="knot",
                          at="2026-03-02T10:00+01:00", note="first")  # fmt: skip
    line = last(stocked)
    assert told(line) == ("knot", "log", "run", code, None, code)
    assert line["before"] is None
    assert line["after"] == {"swimmer": "reed-1", "fluid": "syrup", "at": "2026-03-02T09:00:00Z", "note": "first",
                             "f": "0.50 Hz", "U": "1.2(1) mm/s", "T": "22.5 °C"}  # fmt: skip
    assert abs(datetime.now(UTC) - datetime.fromisoformat(line["at"])) < timedelta(minutes=1)


def test_what_was_typed_is_kept_beside_what_it_means(stocked):
    code = stocked.record(swimmer="reed-1", fluid="syrup", f="30(1) rpm", T="22,5 °C")
    text, unit, value, u, origin = stocked.sheet(code).typed["f"]
    assert (text, unit, origin) == ("30(1) rpm", "rpm", "stated")
    assert (value, u) == (pytest.approx(0.5), pytest.approx(1 / 60))
    assert stocked.sheet(code).typed["T"][:3] == ["22,5 °C", "degC", pytest.approx(295.65)]


def test_amend(filled):
    filled.amend(
        "R-0001", why="read the display again", by="sable", f="0.51 Hz", note="dim light", A_tip=None
    )
    line = last(filled)
    assert told(line) == ("sable", "amend", "run", "R-0001", "read the display again", "R-0001")
    assert line["before"] == {"f": "0.50 Hz", "note": None, "A_tip": "2.0(1) mm"}
    assert line["after"] == {"f": "0.51 Hz", "note": "dim light", "A_tip": None}
    sheet = filled.sheet("R-0001")
    assert sheet.values["f"] == pytest.approx(0.51) and sheet.values["A_tip"] is None
    assert sheet.texts["note"] == "dim light" and sheet.texts["by"] == "wren"
    assert filled.check() == []


def test_amend_another_swimmer_day_and_person(filled):
    from labbook.book.ledger import amend

    amend(
        filled.engine,
        "R-0001",
        {"by": "knot", "swimmer": "pipe-1", "at": "2026-03-03T10:00Z", "rig": ""},
        "mixed up",
        "wren",
    )
    sheet = filled.sheet("R-0001")
    assert (sheet.texts["by"], sheet.texts["swimmer"], sheet.texts["rig"]) == ("knot", "pipe-1", None)
    assert sheet.values["E"] == pytest.approx(0.8e6)
    assert last(filled)["by"] == "wren"
    assert filled.check() == []


@pytest.mark.parametrize("same", [{"f": "0.50 Hz"}, {"f": " 0.50 Hz "}, {"U": "0.051(3) mm/s"}, {"note": ""},
                                  {"state": "kept"}, {"by": "wren"}, {"drive": ""}, {"series": "sweep"}])  # fmt: skip
def test_amending_to_the_same_is_refused(filled, counts, same):
    from labbook.book.ledger import amend

    before = counts(filled)
    with pytest.raises(Refusal, match="nothing would change"):
        amend(filled.engine, "R-0001", same, "because", "wren")
    assert counts(filled) == before


def test_a_cleared_drive_is_the_default_one_again(filled):
    filled.amend("R-0001", why="clamped it", drive="clamped_heave")
    assert filled.sheet("R-0001").texts["drive"] == "clamped_heave"
    filled.amend("R-0001", why="it was free after all", drive="")
    assert filled.sheet("R-0001").texts["drive"] == "free_head_angle"
    assert last(filled)["after"] == {"drive": "free_head_angle"}


def test_a_run_keeps_its_code_and_its_person(filled):
    from labbook.book.ledger import amend

    for changes, field in (
        ({"code": "R-9"}, "code"),
        ({"by": ""}, "by"),
        ({"at": ""}, "at"),
        ({"f": ""}, "f"),
    ):
        with pytest.raises(Refusal) as found:
            amend(filled.engine, "R-0001", changes, "because", "wren")
        assert found.value.field == field


def test_void_and_back(filled):
    filled.void("R-0002", why="magnet slipped", by="knot")
    line = last(filled)
    assert told(line) == ("knot", "void", "run", "R-0002", "magnet slipped", "R-0002")
    assert (line["before"], line["after"]) == ({"state": "kept"}, {"state": "void"})
    assert "R-0002" not in set(filled.runs()["code"]) and "R-0002" in set(filled.runs(kept=False)["code"])
    assert filled.sheet("R-0002").texts["why"] == "magnet slipped"
    with pytest.raises(Refusal, match="is void already: magnet slipped"):
        filled.void("R-0002", why="again")
    filled.amend("R-0002", why="the video shows it did not", state="kept")
    assert filled.sheet("R-0002").texts["state"] == "kept" and filled.sheet("R-0002").texts["why"] is None
    assert last(filled)["before"] == {"state": "void", "why": "magnet slipped"}
    assert "R-0002" in set(filled.runs()["code"])
    assert filled.check() == []


def test_void_by_amending_takes_the_reason(filled):
    filled.amend("R-0002", why="magnet slipped", state="void")
    assert (filled.sheet("R-0002").texts["state"], filled.sheet("R-0002").texts["why"]) == (
        "void",
        "magnet slipped",
    )
    assert filled.check() == []


def test_void_a_reading(filled):
    filled.void("M-0002", why="bubble in the tube")
    assert told(last(filled))[1:] == (
        "void",
        "reading",
        "M-0002",
        "bubble in the tube",
        "R-0001..R-0003, R-0010",
    )
    with pytest.raises(Refusal, match="is void already"):
        filled.void("M-0002", why="again")


def test_the_shelf_add_amend_retire(stocked):
    stocked.stock("fluid", code="oil-1k", kind="silicone-oil", grade="1000 cSt", by="wren")
    assert told(last(stocked)) == ("wren", "add", "fluid", "oil-1k", None, None)
    assert last(stocked)["after"] == {"code": "oil-1k", "kind": "silicone-oil", "grade": "1000 cSt"}
    stocked.stock("fluid", code="oil-1k", kind="silicone-oil", grade="1000 cSt")
    assert last(stocked)["act"] == "add", "the same again changes nothing"
    with pytest.raises(Refusal, match="differs from the book in grade; give a reason"):
        stocked.stock("fluid", code="oil-1k", grade="2000 cSt")
    stocked.stock("fluid", code="oil-1k", grade="2000 cSt", why="label misread", by="knot")
    assert told(last(stocked)) == ("knot", "amend", "fluid", "oil-1k", "label misread", None)
    assert (last(stocked)["before"], last(stocked)["after"]) == ({"grade": "1000 cSt"}, {"grade": "2000 cSt"})
    stocked.retire("fluid", "oil-1k", why="used up")
    assert told(last(stocked))[1:5] == ("retire", "fluid", "oil-1k", "used up")
    assert last(stocked)["after"] == {"retired": True}
    with pytest.raises(Refusal, match="is retired already"):
        stocked.retire("fluid", "oil-1k", why="again")
    stocked.retire("fluid", "oil-1k", why="found a rest", back=True)
    assert last(stocked)["after"] == {"retired": False}
    with pytest.raises(Refusal, match="is in use already"):
        stocked.retire("fluid", "oil-1k", why="again", back=True)


def test_a_shelf_amendment_keeps_what_was_typed(stocked):
    stocked.stock("swimmer", code="reed-1", note="a nick near the tip", why="looked")
    row = stocked.sheet(stocked.record(swimmer="reed-1", fluid="syrup", f="1 Hz"))
    assert row.values["d"] == pytest.approx(1e-3) and row.u_shared["d"] == pytest.approx(1e-5)


def test_load_leaves_one_line(stocked, folder):
    stocked.load(folder, by="sable")
    line = last(stocked)
    assert told(line) == ("sable", "load", "sheet", "sheets", None, "R-0001..R-0010")
    assert line["after"] == {"added": {"run": 10}, "confirmed": []}
    stocked.load(folder)
    assert last(stocked)["id"] == line["id"], "a load that adds nothing leaves no line"


def test_a_refused_act_leaves_no_line(filled, counts):
    before = counts(filled)
    for act in (lambda: filled.record(swimmer="nobody", fluid="syrup", f="1 Hz"),
                lambda: filled.amend("R-0001", why="", f="2 Hz"),
                lambda: filled.amend("R-0099", why="x", f="2 Hz"),
                lambda: filled.void("R-0001", why=" "),
                lambda: filled.stock("reading", of="syrup", key="mu", value="1 Pa.s")):  # fmt: skip
        with pytest.raises(Refusal):
            act()
    assert counts(filled) == before


def test_lines_of_one_run(filled):
    filled.amend("R-0001", why="typo", f="0.52 Hz")
    filled.stock("fluid", code="syrup", rho="1390(2) kg/m3", why="weighed")
    filled.stock("fluid", code="gly85", note="clear", why="looked")
    lines = filled.ask(ledger_lines, code="R-0001")
    assert lines["act"].tolist() == ["amend", "amend", "load"]
    assert filled.ask(ledger_lines, code="R-0004")["act"].tolist() == ["load"]


def test_typo_is_reason_enough_for_ten_minutes():
    def ago(**span):
        return (datetime.now(UTC) - timedelta(**span)).strftime("%Y-%m-%dT%H:%M:%SZ")

    assert young_enough_for_typo(ago(minutes=1)) and young_enough_for_typo(ago(minutes=9, seconds=55))
    assert not young_enough_for_typo(ago(minutes=10, seconds=5)) and not young_enough_for_typo(ago(days=1))


def test_one_token_one_run(stocked, counts):
    cells = dict(swimmer="reed-1", fluid="syrup", f="1 Hz")
    code = stocked.record(**cells, token="form-1")
    assert stocked.record(**cells, token="form-1") == code
    assert counts(stocked)["run"] == 1
    assert stocked.record(**cells, token="form-2") != code
    assert stocked.record(**cells) != stocked.record(**cells), "without a token each call is a run"
    assert counts(stocked)["run"] == 4


def test_codes_go_on_after_the_highest(stocked):
    cells = dict(swimmer="reed-1", fluid="syrup", f="1 Hz")
    assert stocked.record(**cells) == "R-0001"
    assert stocked.record(**cells, code="R-0041") == "R-0041"
    assert stocked.record(**cells) == "R-0042"
    assert stocked.record(**cells, code="old-7") == "old-7"
    assert stocked.record(**cells) == "R-0043"
    with pytest.raises(Refusal, match="this run is logged already"):
        stocked.record(**cells, code="old-7")
    stocked.record(**cells, code="R-999999999")  # a code that would use up the numbers does not count
    assert [stocked.record(**cells) for _ in range(2)] == ["R-0044", "R-0045"]


# ---- tampering


@pytest.mark.parametrize("statement", [
    "UPDATE ledger SET why='nothing' WHERE id=1", "UPDATE ledger SET by='x'", "DELETE FROM ledger",
    "DELETE FROM ledger WHERE id=1", "REPLACE INTO ledger SELECT * FROM ledger WHERE id=1",
])  # fmt: skip
def test_the_ledger_only_grows(filled, statement):
    with closing(sqlite3.connect(filled.target)) as raw:
        if statement.startswith("REPLACE"):
            raw.execute("PRAGMA recursive_triggers=ON")
        with pytest.raises(sqlite3.DatabaseError, match="the ledger only grows"):
            raw.execute(statement)
    if not statement.startswith("REPLACE"):
        with (
            pytest.raises(DatabaseError, match="the ledger only grows"),
            writing(filled.engine) as connection,
        ):
            connection.exec_driver_sql(statement)
    assert filled.check() == []


@pytest.fixture
def told_story(filled):
    for i in range(6):
        filled.amend("R-0001", why=f"reason {i}", note=f"note {i}")
    return filled


UNLOCK = ("DROP TRIGGER ledger_no_update", "DROP TRIGGER ledger_no_delete")


@pytest.mark.parametrize(("statement", "line"), [
    ("UPDATE ledger SET why='another' WHERE id=4", 4),
    ("UPDATE ledger SET by='somebody' WHERE id=2", 2),
    ("UPDATE ledger SET at='2020-01-01T00:00:00Z' WHERE id=7", 7),
    ("UPDATE ledger SET runs='R-0002' WHERE id=3", 3),
    ("UPDATE ledger SET after=NULL WHERE id=1", 1),
    ("UPDATE ledger SET before=replace(before, 'note', 'nota') WHERE id in (5, 3)", 3),
    ("DELETE FROM ledger WHERE id=3", 3),
    ("DELETE FROM ledger WHERE id<3", 3),
    ("UPDATE ledger SET id=id+10 WHERE id=4", 4),
    ("UPDATE ledger SET digest=substr(digest,2) || 'f' WHERE id=2", 2),
])  # fmt: skip
def test_check_names_the_first_line_that_was_tampered_with(told_story, by_hand, statement, line):
    for unlock in UNLOCK:
        by_hand(told_story, unlock)
    by_hand(told_story, statement)
    assert f"ledger line {line} was changed or removed after it was written" in told_story.check()


def test_a_line_cut_from_the_end_is_missed_by_its_runs(told_story, by_hand):
    """The chain cannot see it; the runs that the line spoke of can."""
    for unlock in UNLOCK:
        by_hand(told_story, unlock)
    by_hand(told_story, "DELETE FROM ledger WHERE id=7")
    assert any("ledger_run" in said and "not there" in said for said in told_story.check())


def test_a_forged_line_with_a_fresh_digest_breaks_the_next(told_story, by_hand):
    from labbook.book.chain import digest_of

    for unlock in UNLOCK:
        by_hand(told_story, unlock)
    with closing(sqlite3.connect(told_story.target)) as raw:
        raw.row_factory = sqlite3.Row
        line = dict(raw.execute("select * from ledger where id=4").fetchone())
    line["why"] = "a better reason"
    by_hand(told_story, "UPDATE ledger SET why=?, digest=? WHERE id=4", line["why"], digest_of(line))
    assert told_story.check() == ["ledger line 5 was changed or removed after it was written"]


@pytest.mark.parametrize(("column", "key"), [
    ("Sp", "Sp"), ("U_cap", "U"), ("u_own_Re", "u_own_Re"), ("u_shared_mu", "u_shared_mu"), ("T_cap", "T"), ("stride", "stride"),
])  # fmt: skip
def test_a_stored_number_changed_in_its_last_digit_is_named(filled, by_hand, column, key):
    ((value,),) = by_hand(filled, f"select {column} from resolved where run_id=3")
    by_hand(filled, f"UPDATE resolved SET {column}=? WHERE run_id=3", value * (1 + 2e-6))
    assert filled.check() == [f"R-0003: a stored number or what was typed was changed by hand ({key})"]


def test_one_bit_is_enough(filled, by_hand):
    import math

    ((value,),) = by_hand(filled, "select Sp from resolved where run_id=3")
    by_hand(filled, "UPDATE resolved SET Sp=? WHERE run_id=3", math.nextafter(value, 10))
    assert filled.check() == ["R-0003: a stored number or what was typed was changed by hand"]


@pytest.mark.parametrize(("statement", "said"), [
    ("UPDATE resolved SET Sp='large' WHERE run_id=2", "R-0002: a stored number or what was typed was changed by hand (Sp)"),
    ("UPDATE resolved SET Sp=NULL WHERE run_id=2", "R-0002: a stored number or what was typed was changed by hand (Sp)"),
    ("UPDATE resolved SET St=0.3 WHERE run_id=9", "R-0009: a stored number or what was typed was changed by hand (St)"),
    ("UPDATE resolved SET mu_from='measured' WHERE run_id=2", "R-0002: a stored number or what was typed was changed by hand"),
    ("UPDATE resolved SET marks='{}' WHERE run_id=4", "R-0004: a stored number or what was typed was changed by hand"),
    ("UPDATE resolved SET state='void' WHERE run_id=2", "R-0002: a stored number or what was typed was changed by hand"),
    ("UPDATE resolved SET material_id=2 WHERE run_id=2",
     "R-0002: the stored view holds another time, state, swimmer, fluid or material than the run"),
    ("DELETE FROM resolved WHERE run_id=2", "R-0002: has no stored numbers"),
])  # fmt: skip
def test_other_changes_of_the_stored_view(filled, by_hand, statement, said):
    by_hand(filled, statement)
    assert filled.check() == [said]


@pytest.mark.parametrize(("statement", "said"), [
    ("UPDATE run SET typed=replace(typed, '5.1e-05', '5.2e-05') WHERE id=1", "R-0001: a stored number or what was typed was changed by hand (U)"),
    ("UPDATE run SET at='2026-03-02T10:00:01Z' WHERE id=1", "R-0001: the stored view holds another time"),
    ("UPDATE run SET fluid_id=1 WHERE id=1", "R-0001: mu is stale"),
    ("UPDATE swimmer SET typed=replace(typed, '0.03,', '0.031,') WHERE code='pipe-1'", "R-0005: L_tail is stale"),
    ("UPDATE reading SET typed=replace(typed, '5.2,', '5.3,') WHERE id=1", "R-0001: mu is stale"),
    ("UPDATE material SET typed=replace(typed, '1070', '1080') WHERE code='sil-1'", "R-0001: rho_s is stale"),
    ("UPDATE rig SET typed=replace(typed, '0.001,', '0.002,') WHERE code='coil-1'", "R-0001: u_own_f is stale"),
    ("UPDATE reading SET \"on\"='2026-02-21' WHERE key='E' AND material_id=2", "R-0005: what it was resolved from is stale"),
])  # fmt: skip
def test_a_fact_changed_by_hand_is_named_as_stale(filled, by_hand, statement, said):
    before = by_hand(filled, "select typed, at, fluid_id from run where id=1")
    by_hand(filled, statement)
    found = filled.check()
    assert found and found[0].startswith(said), (found, before)


def test_check_after_everything(filled, folder, tmp_path):
    filled.record(swimmer="reed-1", fluid="syrup", f="1 Hz", T="22 degC")
    filled.void("R-0001", why="bubble")
    filled.amend("R-0002", why="typo", f="1.1 Hz")
    filled.load(folder)
    filled.copy(tmp_path / "copy.db")
    with Book.open(tmp_path / "copy.db") as copy:
        assert copy.check() == []
    assert filled.check() == []


HAND_EDITS = {
    "typed text": "UPDATE run SET typed = json_set(typed, '$.f[0]', '9.99 Hz') WHERE id = 1",
    "note": "UPDATE run SET note = 'nothing odd' WHERE id = 1",
    "who": "UPDATE run SET by = 'somebody' WHERE id = 1",
    "a cell that is no cell": "UPDATE run SET typed = json_set(typed, '$.f', '9.9 Hz') WHERE id = 1",
    "a reading that is no reading": "UPDATE reading SET typed = 'garbage' WHERE id = 1",
}


@pytest.mark.parametrize("statement", HAND_EDITS.values(), ids=HAND_EDITS.keys())
def test_check_names_what_was_edited_by_hand(demo_book, tmp_path, statement):
    path = tmp_path / "edited.db"
    shutil.copy(demo_book, path)
    with closing(sqlite3.connect(path)) as raw:
        raw.execute(statement)
        raw.commit()
    with Book.open(path) as book:
        found = book.check()
    assert len(found) == 1
    assert ("M-0001" if "reading" in statement else "R-0001") in found[0]


def test_check_misses_no_run_that_the_ledger_names(demo_book, tmp_path):
    path = tmp_path / "shorter.db"
    shutil.copy(demo_book, path)
    with closing(sqlite3.connect(path)) as raw:
        for table, column in (("ledger_run", "run_id"), ("resolved", "run_id"), ("run", "id")):
            raw.execute(f"DELETE FROM {table} WHERE {column} = 7")
        raw.commit()
    with Book.open(path) as book:
        assert book.check() == ["ledger line 1 names 920 runs, and 919 of them are there"]
