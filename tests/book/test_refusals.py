"""Refusals and warnings: every row of design section 6, in Python and on the command line, with nothing written."""

import json
import os
import re

import pytest
from click.testing import CliRunner
from sqlalchemy import event

from labbook import Book, BookProblem, LabbookError, Refusal, Refusals, Unconfirmed
from labbook.cli import main
from labbook.registry.catalogue import Number
from labbook.registry.formula import parse
from labbook.registry.quantities import QUANTITIES

RUN = {"swimmer": "reed-1", "fluid": "syrup", "f": "0.50 Hz", "T": "22.0(1) degC", "U": "0.051(3) mm/s"}


def command(*words) -> tuple[int, list[str], str]:
    """(exit code, lines on stderr, stdout) of a command; a traceback would show as an exception."""
    done = CliRunner().invoke(main, [str(w) for w in words])
    assert done.exception is None or isinstance(done.exception, SystemExit), done.exception
    return done.exit_code, done.stderr.splitlines(), done.stdout


def pairs(cells):
    return [f"{k}={v}" for k, v in cells.items() if v is not None]


@pytest.fixture
def unwritten(stocked, counts):
    """A function that tries an act both ways and returns its findings: (Refusals, lines on stderr)."""

    def attempt(act, *words):
        before, size = counts(stocked), os.path.getsize(stocked.target)
        with pytest.raises(LabbookError) as found:
            act()
        code, lines, out = command(words[0], stocked.target, *words[1:])
        assert (code, out) == (1, "")
        assert lines == str(found.value).splitlines() + (
            ["Nothing was written. Repeat with --confirm if this is right."]
            if found.type is Unconfirmed
            else []
        )
        assert counts(stocked) == before and os.path.getsize(stocked.target) == size
        if found.type is Unconfirmed:
            return found.value
        return found.value.findings if isinstance(found.value, Refusals) else [found.value]

    return attempt


# ---- row 1 and 2: what cannot be read, what cannot be


@pytest.mark.parametrize(("column", "typed", "said"), [
    ("U", "1.0 kg", "U '1.0 kg': kg is a mass, and a speed is needed; type it in m/s, mm/s, um/s"),
    ("U", "1.0 Hz", "is a frequency, and a speed is needed"),
    ("f", "2 rad/s", "is an angular frequency, and f counts cycles: divide by 2 pi"),
    ("T", "22 Pa", "is a pressure or modulus, and a temperature is needed"),
    ("U", "fast", "cannot be read as a speed; write e.g. 12.4(3) mm/s"),
    ("U", "1.2.3 mm/s", "cannot be read as a speed"),
    ("f", "0.5 Hzz", "is no unit that labbook knows; a frequency is needed; type it in Hz, mHz, kHz, rpm"),
    ("f", "0.5", "has no unit; add one of Hz, mHz, kHz, rpm"),
    ("U", "1,000 mm/s", "may mean a thousand or a decimal comma"),
    ("f", "-0.5 Hz", "a frequency must be greater than zero"),
    ("f", "0 Hz", "a frequency must be greater than zero"),
    ("h_wall", "-3 mm", "a length must be greater than zero"),
    ("T", "-300 degC", "a temperature must be greater than zero"),
    ("I_coil", "-1 A", "a current cannot be negative"),
    ("U", "nan mm/s", "is not a finite number"),
    ("U", "inf mm/s", "is not a finite number"),
    ("U", "1e999 mm/s", "is not a finite number"),
    ("drive", "pedals", "is not known here; one of free_head_angle"),
    ("at", "yesterday", "is not a date and time; write e.g. 2026-03-01T14:32"),
    ("at", "0990-01-01T00:00", "lies outside the calendar"),
    ("swimmer", "reed-9", "no swimmer has this code; the book has"),
    ("fluid", "honey", "no fluid has this code; the book has"),
    ("rig", "coil-9", "no rig has this code; the book has"),
    ("series", "x" * 70, "must be one line of at most 64 characters"),
    ("state", "lost", "is not known here; one of kept, void"),
])  # fmt: skip
def test_a_bad_cell_of_a_run(unwritten, stocked, column, typed, said):
    cells = {**RUN, column: typed}
    (refusal,) = unwritten(lambda: stocked.record(**cells), "log", *pairs(cells))
    assert refusal.field == column and typed.startswith(str(refusal.typed).removesuffix("..."))
    assert refusal.reason and said in str(refusal)
    assert re.fullmatch(r"[^\n]+\.", str(refusal)), "one sentence"


@pytest.mark.parametrize(("cells", "field", "said"), [
    ({"state": "void"}, "why", "a void run says why"),
    ({"why": "bubble"}, "why", "belongs to a void run; put it into the note"),
    ({"colour": "red"}, "colour", "a run has no such column; it has code, swimmer"),
    ({"swimmer": ""}, "swimmer", "is missing, and every run needs it"),
    ({"f": ""}, "f", "is missing, and every run needs it"),
    ({"h_wall": "2.0 mm"}, "h_wall", "the wall would be closer than the head radius of reed-1"),
    ({"h_wall": "1 mm"}, "h_wall", "the wall would be closer than the head radius of reed-1"),
])  # fmt: skip
def test_a_run_that_cannot_be(unwritten, stocked, cells, field, said):
    cells = {**RUN, **cells}
    (refusal,) = unwritten(lambda: stocked.record(**cells), "log", *pairs(cells))
    assert refusal.field == field and said in str(refusal)


def test_every_finding_has_its_own_line(unwritten, stocked):
    cells = {**RUN, "f": "-1 Hz", "U": "5 kg", "colour": "red"}
    found = unwritten(lambda: stocked.record(**cells), "log", *pairs(cells))
    assert {r.field for r in found} == {"colour", "f", "U"} and len(found) == 3


@pytest.mark.parametrize(("kind", "cells", "field", "said"), [
    ("swimmer", dict(code="n", form="flexible tail", L_body="30 mm", L_tail="31 mm"), "L_tail", "the tail is longer than the body"),
    ("swimmer", dict(code="n", form="flexible tail", L_body="0 mm"), "L_body", "a length must be greater than zero"),
    ("swimmer", dict(code="n", form="rope", L_body="30 mm"), "form", "is not known here; one of flexible tail"),
    ("swimmer", dict(code="n", form="hinged", L_body="30 mm", D="1 mm", d_in="1 mm"), "d_in", "a tube's bore must be smaller than D"),
    ("swimmer", dict(code="n", form="hinged", L_body="30 mm", material="wood"), "material", "no material has this code"),
    ("swimmer", dict(code="n", form="hinged", L_body="30 mm", parent="eve"), "parent", "no swimmer has this code"),
    ("fluid", dict(code="n", kind="honey"), "kind", "one of water, glycerol-water, silicone-oil, measured"),
    ("fluid", dict(kind="water"), "code", "is missing, and every fluid needs it"),
    ("fluid", dict(code="n", kind="glycerol-water", glycerol="110 wt%"), "glycerol", "cannot exceed 100 wt%"),
    ("fluid", dict(code="n", kind="water", made="March"), "made", "is not a date; write e.g. 2026-03-01"),
    ("fluid", dict(code="syrup", rho="1.3 g/cm3"), "fluid", "differs from the book in rho; give a reason (--why)"),
    ("material", dict(code="n", rho_s="-1 g/cm3"), "rho_s", "a density must be greater than zero"),
    ("rig", dict(code="n", u_f="-1 %"), "u_f", "an uncertainty cannot be negative"),
    ("rig", dict(code="n", u_T="3 mm"), "u_T", "a temperature is needed"),
    ("reading", dict(of="syrup", key="mu", value="1.0 Pa", T="20 degC"), "value", "a viscosity is needed"),
    ("reading", dict(of="syrup", key="mu", value="0 Pa.s", T="20 degC"), "value", "must be greater than zero"),
    ("reading", dict(of="syrup", key="mu", value="-1 Pa.s", T="20 degC"), "value", "must be greater than zero"),
    ("reading", dict(of="sil-1", key="E", value="0 MPa"), "value", "must be greater than zero"),
    ("reading", dict(of="syrup", key="mu", value="1.0(0) Pa.s", T="20 degC"), "value", "needs an uncertainty above zero"),
    ("reading", dict(of="syrup", key="mu", value="1.0 Pa.s"), "T", "a viscosity without its temperature cannot be used"),
    ("reading", dict(of="syrup", key="f", value="1 Hz"), "key", "one of mu, nu, rho, lam, E"),
    ("reading", dict(of="honey", key="mu", value="1.0 Pa.s", T="20 degC"), "of", "no fluid has this code"),
    ("reading", dict(of="syrup", key="E", value="1 MPa"), "of", "no material has this code"),
])  # fmt: skip
def test_a_bad_shelf_record(unwritten, stocked, kind, cells, field, said):
    (refusal,) = unwritten(lambda: stocked.stock(kind, **cells), kind, *pairs(cells))
    assert refusal.field == field and said in str(refusal)


def test_kinds_that_do_not_stand_on_the_shelf(stocked, counts):
    before = counts(stocked)
    for act in (lambda: stocked.stock("run", **RUN), lambda: stocked.stock("cake", code="x"),
                lambda: stocked.retire("reading", "M-0001", why="x"), lambda: stocked.retire("cake", "x", why="x")):  # fmt: skip
        with pytest.raises(
            Refusal, match="does not stand on the shelf; one of fluid, material, swimmer, rig"
        ):
            act()
    code, lines, _ = command("reading", stocked.target, "code=M-0001", "--retire", "--why", "old")
    assert code == 1 and len(lines) == 1
    assert counts(stocked) == before


@pytest.mark.parametrize("by", ["", "  ", "x" * 65, "two\nlines"])
def test_a_handle_is_needed(stocked, counts, monkeypatch, by):
    before = counts(stocked)
    monkeypatch.delenv("LABBOOK_BY")
    monkeypatch.setattr("labbook.places.getpass.getuser", lambda: "")
    with pytest.raises(Refusal, match="a handle of 1 to 64 characters is needed"):
        stocked.record(**RUN, by=by)
    assert counts(stocked) == before


def test_a_user_without_a_name_is_asked_who(stocked, monkeypatch):
    def nobody():
        raise KeyError("getpwuid(): uid not found: 12345")

    monkeypatch.delenv("LABBOOK_BY")
    monkeypatch.setattr("labbook.places.getpass.getuser", nobody)
    with pytest.raises(Refusal, match="say who you are with --by"):
        stocked.record(**RUN)


@pytest.mark.parametrize("words", [
    ("amend", "R-0001", "f=2 Hz", "--why", " "), ("amend", "R-0099", "f=2 Hz", "--why", "x"),
    ("amend", "R-0001", "f=2 kg", "--why", "x"), ("amend", "R-0001", "colour=red", "--why", "x"),
    ("amend", "R-0001", "why=x", "--why", "x"), ("amend", "R-0001", "confirm=yes", "--why", "x"),
    ("amend", "R-0001", "code=R-2", "--why", "x"), ("amend", "R-0001", "h_wall=1 mm", "--why", "x"),
    ("amend", "R-0001", "swimmer=reed-9", "--why", "x"), ("amend", "R-0001", "by=", "--why", "x"),
    ("void", "R-0099", "--why", "x"), ("void", "R-0010", "--why", "x"), ("void", "R-0001", "--why", ""),
    ("log", "confirm=yes", "swimmer=reed-1", "fluid=syrup", "f=1 Hz"),
    ("log", "token=t", "swimmer=reed-1", "fluid=syrup", "f=1 Hz"),
    ("fluid", "code=syrup", "by=wren"), ("fluid", "code=new", "kind=water", "confirm=yes"),
    ("fluid", "code=syrup", "--retire"), ("fluid", "code=honey", "--retire", "--why", "x"),
    ("draw", "Sp", "nonsense", "-o", "x.svg"),
])  # fmt: skip
def test_other_refusals_of_the_command_line(filled, counts, words):
    before = counts(filled)
    code, lines, out = command(words[0], filled.target, *words[1:])
    assert (code, len(lines), out) == (1, 1, "") and lines[0].endswith(".")
    assert counts(filled) == before


# ---- row 4: warnings


def warned(act, *words, path, counts, book):
    before = counts(book)
    with pytest.raises(Unconfirmed) as found:
        act()
    code, lines, out = command(words[0], path, *words[1:])
    assert (code, out) == (1, "")
    assert lines[:-1] == found.value.warnings and "--confirm" in lines[-1]
    assert counts(book) == before
    return found.value


@pytest.mark.parametrize(("cells", "field"), [
    (dict(f="5000 Hz"), "f"), (dict(T="150 degC"), "T"), (dict(U="8 m/s"), "U"), (dict(B="0.5 T"), "B"),
    (dict(theta0="100 deg"), "theta0"), (dict(A_tip="0.9 m"), "A_tip"),
])  # fmt: skip
def test_an_implausible_value_wants_a_confirmation(stocked, counts, cells, field):
    cells = {**RUN, **cells}
    found = warned(
        lambda: stocked.record(**cells),
        "log",
        *pairs(cells),
        path=stocked.target,
        counts=counts,
        book=stocked,
    )
    assert found.fields == [field]
    assert found.warnings[0].startswith(f"{field}: {cells[field]} lies outside the usual ")
    code, _, out = command("log", stocked.target, *pairs(cells), "--confirm")
    assert (code, out) == (0, "R-0001\n")
    assert "confirmed" in stocked.sheet("R-0001").marks[field]
    assert stocked.record(**cells, confirm=True) == "R-0002"
    assert "confirmed" in stocked.sheet("R-0002").marks[field]


def test_a_reading_a_thousand_times_off(stocked, counts):
    cells = dict(of="syrup", key="mu", value="4.10(4) mPa.s", T="22.0 degC", on="2026-03-05")
    found = warned(lambda: stocked.stock("reading", **cells), "reading", *pairs(cells), path=stocked.target, counts=counts,
                   book=stocked)  # fmt: skip
    assert found.fields == ["value"]
    assert found.warnings[0].startswith(
        "syrup: 1000 times below this batch's last reading (of 2026-03-01): mPa.s typed as Pa.s"
    )
    cells["value"] = "4100(40) Pa.s"
    found = warned(lambda: stocked.stock("reading", **cells), "reading", *pairs(cells), path=stocked.target, counts=counts,
                   book=stocked)  # fmt: skip
    assert any("1000 times this batch's last reading" in w for w in found.warnings)
    assert command("reading", stocked.target, *pairs(cells), "--confirm")[0] == 0


@pytest.mark.parametrize(("key", "of", "value", "T", "warns"), [
    ("mu", "syrup", "35.0(5) Pa.s", "22.0 degC", False),  # 8.5 times
    ("mu", "syrup", "45.0(5) Pa.s", "22.0 degC", True),  # 11 times 4.10
    ("mu", "syrup", "0.48(1) Pa.s", "22.0 degC", False),
    ("mu", "syrup", "0.38(1) Pa.s", "22.0 degC", True),
    ("nu", "syrup", "31(1) St", "22.0 degC", False),  # with rho 1380: 4.3 Pa.s
    ("nu", "syrup", "0.031(1) St", "22.0 degC", True),
    ("E", "sil-1", "1.6(1) MPa", None, False), ("E", "sil-1", "1.6(1) kPa", None, True),
    ("E", "sil-1", "16(1) MPa", None, True), ("E", "sil-1", "14(1) MPa", None, False),
    ("mu", "oil-5k", "5(1) mPa.s", "22.0 degC", False),  # a batch's first reading has nothing to be off from
])  # fmt: skip
def test_ten_times_off_is_where_a_reading_is_warned_about(stocked, key, of, value, T, warns):
    def act():
        return stocked.stock("reading", of=of, key=key, value=value, T=T, on="2026-03-05")

    if warns:
        with pytest.raises(Unconfirmed):
            act()
    else:
        assert act() == "M-0006"


@pytest.mark.parametrize("rho", [{}, {"rho": "1200 kg/m3"}])
def test_nu_against_nu_needs_no_density(stocked, rho):
    stocked.stock("fluid", code="gel", kind="measured", **rho)
    stocked.stock("reading", of="gel", key="nu", value="10.0(1) St", T="20 degC", on="2026-03-01")
    with pytest.raises(Unconfirmed, match="cSt typed as m2/s"):
        stocked.stock("reading", of="gel", key="nu", value="10.0(1) cSt", T="20 degC", on="2026-03-05")


def test_nu_against_mu_by_a_density_reading(stocked):
    stocked.stock("fluid", code="gel", kind="measured")
    stocked.stock("reading", of="gel", key="rho", value="1200(1) kg/m3", on="2026-03-01")
    stocked.stock("reading", of="gel", key="mu", value="1.20(1) Pa.s", T="20 degC", on="2026-03-01")
    with pytest.raises(Unconfirmed):
        stocked.stock("reading", of="gel", key="nu", value="10.0(1) cSt", T="20 degC", on="2026-03-05")
    assert stocked.stock("reading", of="gel", key="nu", value="10.0(1) St", T="20 degC", on="2026-03-05")


def log(book, **cells):
    return book.record(**{**RUN, **cells})


@pytest.mark.parametrize(("earlier", "cells", "key"), [
    # Re is proportional to U here, and Sp to the fourth root of f
    (3, dict(U="0.26(1) mm/s"), "Re"),  # 5.1 times the largest
    (3, dict(U="0.25(1) mm/s"), None),  # 4.9 times
    (3, dict(U="-0.26(1) mm/s"), "Re"),  # its size counts
    (3, dict(U="0.0102(1) mm/s"), None), (3, dict(U="0.0100(1) mm/s"), "Re"),  # the smallest is 0.051
    (3, dict(U="0.001(3) mm/s"), None),  # consistent with zero: that is a result, not a slip
    (3, dict(f="320 Hz"), "Sp"),  # 640^(1/4) = 5.03
    (3, dict(f="300 Hz"), None),  # 600^(1/4) = 4.95
    (3, dict(f="0.00078 Hz"), "Sp"), (3, dict(f="0.00082 Hz"), None),  # 641^(1/4) and 610^(1/4) below
    (2, dict(U="9.0(1) mm/s"), None), (2, dict(f="400 Hz"), None),
    (0, dict(U="9.0(1) mm/s"), None),
])  # fmt: skip
def test_a_factor_five_outside_three_kept_runs(stocked, counts, earlier, cells, key):
    for _ in range(earlier):
        log(stocked)
    cells = {**RUN, **cells}
    if key is None:
        assert stocked.record(**cells) == f"R-{earlier + 1:04d}"
        return
    found = warned(
        lambda: stocked.record(**cells),
        "log",
        *pairs(cells),
        path=stocked.target,
        counts=counts,
        book=stocked,
    )
    assert any(w.startswith(f"{key} = ") for w in found.warnings), found.warnings
    code = stocked.record(**cells, confirm=True)
    assert "confirmed" in stocked.sheet(code).marks[found.fields[0]]


def test_void_runs_and_other_swimmers_do_not_count(stocked):
    for _ in range(3):
        log(stocked)
    stocked.void("R-0001", why="bubble")
    assert log(stocked, U="9.0(1) mm/s") == "R-0004"  # two kept runs
    assert log(stocked, swimmer="ribbon-1", U="900(1) mm/s") == "R-0005"
    assert stocked.record(**{**RUN, "U": "99(1) mm/s"}, state="void", why="test of the camera") == "R-0006"


def test_u_is_compared_with_runs_of_similar_sp(stocked):
    """Two kept runs near this Sp are too few, three are enough; within 20 % of Sp is a factor 2.07 in f."""
    for f in ("0.50 Hz", "0.60 Hz"):
        log(stocked, f=f, U="0.050(3) mm/s")
    for _ in range(3):
        log(stocked, f="8.0 Hz", U="2.0(1) mm/s")  # Sp twice as large; wide span of Re
    assert log(stocked, f="0.55 Hz", U="1.0(1) mm/s") == "R-0006"
    log(stocked, f="0.45 Hz", U="0.050(3) mm/s")
    log(stocked, f="0.45 Hz", U="0.050(3) mm/s")
    with pytest.raises(Unconfirmed) as found:
        log(stocked, f="0.10 Hz", U="5.5(1) mm/s")  # nothing near this Sp, and Re within 5 times its span
        log(stocked, f="0.55 Hz", U="5.5(1) mm/s")
    assert found.value.warnings[0].startswith("U = 5.5 mm/s is 5.5 times the largest")
    assert len(found.value.warnings) == 1


def test_a_sheets_runs_are_compared_with_the_book_not_with_each_other(stocked, tmp_path):
    (tmp_path / "runs.csv").write_text(
        "swimmer,fluid,at,f [Hz],T [degC],U [mm/s]\n"
        + "".join(
            f"reed-1,syrup,2026-03-02T10:0{i},0.50,22.0(1),{u}\n"
            for i, u in enumerate(("0.05", "0.05", "0.05", "9.0"))
        )
    )
    assert stocked.load(tmp_path / "runs.csv").added["run"] == 4
    (tmp_path / "more.csv").write_text(
        "swimmer,fluid,at,f [Hz],T [degC],U [mm/s]\nreed-1,syrup,2026-03-03T10:00,0.50,22.0(1),99\n"
        "reed-1,syrup,2026-03-03T10:01,0.50,22.0(1),0.05\n"
    )
    with pytest.raises(Unconfirmed) as found:
        stocked.load(tmp_path / "more.csv")
    assert all(w.startswith("more.csv line 2, ") for w in found.value.warnings)
    loaded = stocked.load(tmp_path / "more.csv", confirm=True)
    assert loaded.added["run"] == 2 and loaded.warned == tuple(found.value.warnings)
    assert "confirmed" in stocked.sheet("R-0005").marks["U"] and "confirmed" not in str(
        stocked.sheet("R-0006").marks
    )


def test_a_sheet_is_compared_as_single_runs_are(stocked, tmp_path):
    """Above twenty rows a swimmer's runs are read once; the findings are those of a query each."""
    header = "swimmer,fluid,at,f [Hz],T [degC],U [mm/s]\n"
    for i in range(40):
        log(
            stocked,
            f=f"{0.2 + 0.1 * (i % 20):.1f} Hz",
            U=f"{0.02 + 0.01 * (i % 7):.2f}(1) mm/s",
            confirm=True,
        )
    log(stocked, f="1 Hz", T=None)  # no Sp
    new = [(f, U) for f in ("0.01", "0.5", "3", "90", "3000")
           for U in ("0.0005(1)", "0.003(1)", "0.05(1)", "0.4(1)", "7(1)", "-9(1)")]  # fmt: skip
    rows = [f"reed-1,syrup,2026-03-03T10:{i:02d},{f},22.0(1),{U}\n" for i, (f, U) in enumerate(new)]
    (tmp_path / "many.csv").write_text(header + "".join(rows))
    with pytest.raises(Unconfirmed) as together:
        stocked.load(tmp_path / "many.csv")
    one_by_one = [
        f"many.csv line {line}, {sentence}"
        for line, (f, U) in enumerate(new, start=2)
        for _, sentence in stocked.preview(
            swimmer="reed-1", fluid="syrup", f=f"{f} Hz", T="22.0(1) degC", U=f"{U} mm/s"
        ).warned
        if not sentence.startswith("f: ")
    ]
    told = [w for w in together.value.warnings if ", f: " not in w]
    assert told == one_by_one and len(told) > 15
    assert {w.split(", ")[1].split(" = ")[0] for w in told} >= {"Sp", "Re", "U"}


def test_a_second_sheet_asks_no_query_a_row(stocked, tmp_path):
    def sheet(month, n):
        path = tmp_path / f"{month}.csv"
        path.write_text(
            "swimmer,fluid,at,f [Hz],T [degC],U [mm/s]\n"
            + "".join(
                f"reed-1,syrup,2026-{month:02d}-01T{i // 60:02d}:{i % 60:02d},0.50,22.0(1),0.05(1)\n"
                for i in range(n)
            )
        )
        return path

    stocked.load(sheet(3, 100))
    statements = []
    for month, n in ((4, 50), (5, 500)):
        count = []
        listener = lambda *_, count=count: count.append(1)  # noqa: E731
        event.listen(stocked.engine, "before_cursor_execute", listener)
        stocked.load(sheet(month, n))
        event.remove(stocked.engine, "before_cursor_execute", listener)
        statements.append(len(count))
    assert statements[0] == statements[1] < 60


def test_an_amendment_is_compared_with_the_other_runs(filled):
    with pytest.raises(Unconfirmed, match="Sp = "):
        filled.amend("R-0001", why="rpm", f="2000 Hz")
    filled.amend("R-0001", why="rpm", f="2000 Hz", confirm=True)
    assert "confirmed" in filled.sheet("R-0001").marks["f"]
    filled.amend("R-0001", why="a note keeps the mark", note="odd")
    assert "confirmed" in filled.sheet("R-0001").marks["f"]
    filled.amend("R-0001", why="it was Hz", f="0.50 Hz")
    assert "confirmed" not in str(filled.sheet("R-0001").marks), (
        "the mark goes with the value that was confirmed"
    )


# ---- rows 5 to 8: saved, and said


def test_extrapolated_is_saved_and_marked(filled):
    code = filled.record(**{**RUN, "T": "35.0(1) degC"})
    sheet = filled.sheet(code)
    assert sheet.values["Sp"] is not None and sheet.marks["mu"] == ["extrapolated"] == sheet.marks["Sp"]
    rows = json.loads(command("runs", filled.target, "--as", "json", "--text", code)[2])
    assert rows[0]["marks"]["Re"] == ["extrapolated"]


def test_a_missing_input_makes_its_numbers_absent_and_nothing_else(stocked):
    sheet = stocked.sheet(stocked.record(swimmer="reed-1", fluid="syrup", f="0.5 Hz", T="22 degC"))
    lost = ("Re", "St", "Sw", "stride", "U_scaled", "Mn", "wall", "f_ratio", "U_model", "U_ratio", "F_scaled")
    assert set(lost) == set(sheet.why_absent)
    assert sheet.why_absent["Re"] == "needs U: it was not typed"
    assert sheet.why_absent["St"] == "needs A_tip: it was not typed; needs U: it was not typed"
    assert sheet.why_absent["Mn"] == "needs B: neither B nor a coil current with the rig's constant was typed"
    assert sheet.values["Sp"] > 0


def test_u_consistent_with_zero_is_saved(filled):
    assert filled.sheet("R-0009").why_absent["St"] == "not defined (U consistent with 0)"


# ---- row 9: the same run twice


def test_the_same_run_twice(filled, folder, counts):
    before = counts(filled)
    assert str(filled.load(folder)) == "nothing new; 28 rows stood in the book already"
    assert counts(filled) == before
    (folder / "coded.csv").write_text(
        "code,swimmer,fluid,at,f [Hz]\nR-0001,reed-1,syrup,2026-03-02T10:00,0.51\n"
    )
    code, lines, _ = command("load", filled.target, folder / "coded.csv")
    assert code == 1 and len(lines) == 1
    assert lines[0].startswith("coded.csv line 2, run 'R-0001': differs from the book in ") and lines[
        0
    ].endswith("amend it.")
    assert counts(filled) == before


# ---- row 11: formulas


@pytest.mark.parametrize(("formula", "said"), [
    ("abs(U) / f", "calls are not allowed"), ("__import__('os').system('x')", "calls are not allowed"),
    ("U.real / f", "attributes are not allowed"), ("U**99 / f", "exponent 99 is beyond 12"), ("U**U", "must be a plain number"),
    ("U if f else mu", "IfExp is not allowed"), ("U[0]", "Subscript is not allowed"), ("q * U", "'q' is not a key"),
    ("U + f", "adds L T^-1 to T^-1"), ("U *", "cannot be read"), ("U" + "*U" * 200, "longer than 300 characters"),
])  # fmt: skip
def test_formulas_that_are_refused(formula, said):
    with pytest.raises(Refusal, match=re.escape(said)) as found:
        parse(formula, QUANTITIES).dimension({k: q.dimension for k, q in QUANTITIES.items()})
    assert found.value.field == "formula" and str(found.value).endswith(".")


def test_a_number_that_is_not_pure_says_what_is_left_over():
    with pytest.raises(Refusal, match=r"not a pure number: L T\^-1 is left over"):
        Number("speed", "v", "speed", "U", "nothing", "common practice, no source", {"U": 1.0}, 1.0)


# ---- row 12: books


def test_what_is_no_book(tmp_path, filled, monkeypatch):
    (tmp_path / "notes.db").write_text("hello")
    for name in ("none.db", "notes.db", "."):
        with pytest.raises(BookProblem) as found:
            Book.open(tmp_path / name)
        for words in (("runs",), ("check",), ("numbers",)):
            assert command(*words, tmp_path / name) == (1, [str(found.value)], "")
        assert command("log", tmp_path / name, "f=1 Hz")[:2] == (1, [str(found.value)])
    assert command("new", filled.target)[0] == 1
    assert command("copy", filled.target, filled.target)[:2] == (
        1,
        [f"{filled.target} exists already: choose another name."],
    )
    assert command("copy", filled.target, tmp_path / "no" / "x.db")[0] == 1
    assert command("load", filled.target, tmp_path / "none.csv")[0] == 1
    assert not (tmp_path / "none.db").exists()


def test_a_copy_that_cannot_be_written_leaves_nothing(filled, tmp_path, monkeypatch):
    def full(*_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("labbook.book.copying.os.replace", full)
    before = {p.name for p in tmp_path.iterdir()}
    with pytest.raises(BookProblem, match="No space left on device"):
        filled.copy(tmp_path / "copy.db")
    assert {p.name for p in tmp_path.iterdir()} - before <= {"filled.db-wal", "filled.db-shm"}
