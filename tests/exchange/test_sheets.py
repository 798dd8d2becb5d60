"""Sheets in (design 5): header and cell grammar, folders and workbooks, all or nothing, the same sheet twice, the demo."""

import sqlite3
from contextlib import closing
from datetime import date, datetime

import openpyxl
import pytest

from labbook import Book, LabbookError, Refusal, Refusals
from labbook.demo import demo_folder
from labbook.exchange.sheets import counted, read_tables

HEADER = "swimmer,fluid,at,f [Hz],T [degC],U [mm/s]\n"
ROW = "reed-1,syrup,2026-03-02T10:00,0.50,22.0,0.051(3)\n"


def tables(book):
    names = ("fluid", "material", "swimmer", "rig", "reading", "run", "ledger", "resolved")
    with closing(sqlite3.connect(book.target)) as raw:
        return {t: raw.execute(f"select count(*) from {t}").fetchone()[0] for t in names}


def findings(book, path) -> list[str]:
    """What a load is refused for, one sentence each; nothing may have been written."""
    before = tables(book)
    with pytest.raises(LabbookError) as found:
        book.load(path)
    assert tables(book) == before
    assert isinstance(found.value, Refusal | Refusals)
    return str(found.value).splitlines()


# ---- header and cells


@pytest.mark.parametrize(("header", "cell", "U"), [
    ("U [mm/s]", "0.051(3)", 5.1e-5), ("U (mm/s)", "0.051(3)", 5.1e-5), ("U[um/s]", "51(3)", 5.1e-5), (" U  [ mm/s ] ", " 0.051(3) ", 5.1e-5),
    ("U", "0.051(3) mm/s", 5.1e-5), ("U [m/s]", "0.051(3) mm/s", 5.1e-5),  # the cell's own unit wins
    ("U [mm/s]", "3.06(18) mm/min", 5.1e-5), ("U [mm/s]", "0.051 +- 0.003", 5.1e-5), ("U [mm/s]", "0.051 ± 0.003", 5.1e-5),
    ("U [mm/s]", "5.1(3)e-2", 5.1e-5), ("U [m/s]", "-5.1(3)e-5", -5.1e-5), ("U [mm/s]", "", None),
])  # fmt: skip
def test_a_quantitys_header_and_cell(book, write, header, cell, U):
    book.load(
        write("runs.csv", f'swimmer,fluid,at,f [Hz],"{header}"\nreed-1,syrup,2026-03-02T10:00,0.50,{cell}\n')
    )
    sheet = book.sheet("R-0001")
    assert sheet.values["U"] == (None if U is None else pytest.approx(U, rel=1e-12))
    if U is not None:
        assert sheet.u["U"] == pytest.approx(3e-6, rel=1e-9)


def test_a_temperature_column_in_celsius(book, write):
    book.load(write("runs.csv", "swimmer,fluid,at,f [Hz],T [°C]\nreed-1,syrup,2026-03-02T10:00,0.5,22.0(1)\n"
                                "reed-1,syrup,2026-03-02T10:01,0.5,295.2(1) K\n"))  # fmt: skip
    assert book.runs()["T"].tolist() == pytest.approx([295.15, 295.2])
    assert book.runs()["u_T"].tolist() == pytest.approx([0.1, 0.1])


@pytest.mark.parametrize(("header", "said"), [
    ("speed [mm/s]", "runs has no such column; it has code, swimmer"), ("U [mm/s", "cannot be read; write key [unit]"),
    ("U mm/s", "cannot be read"), ("note [mm]", "a text column has no unit"), ("f [Hz]", "stands twice"), ("f (rpm)", "stands twice"),
])  # fmt: skip
def test_a_bad_header(book, write, header, said):
    (line,) = findings(book, write("runs.csv", HEADER.strip() + f",{header}\n" + ROW.strip() + ",1\n"))
    assert line.startswith(f"runs.csv, header {header!r}: ") and said in line


def test_a_missing_column(book, write):
    (line,) = findings(book, write("runs.csv", "swimmer,at\nreed-1,2026-03-02\n"))
    assert line == "runs.csv, header: lacks fluid, f; every run needs them."


def test_a_unit_in_the_header_that_does_not_fit(book, write):
    (line,) = findings(book, write("runs.csv", HEADER.replace("mm/s", "kg") + ROW))
    assert line.startswith("runs.csv line 2, U '0.051(3)': kg is a mass, and a speed is needed")


@pytest.mark.parametrize("text", [
    HEADER + ROW, "\ufeff" + HEADER + ROW, (HEADER + ROW).replace("\n", "\r\n"), HEADER + "\n,,,,,\n" + ROW + "\n\n",
    (HEADER + ROW).replace(",", ";"), (HEADER + ROW).replace(",", ";").replace("0.", "0,").replace("22.0", "22,0"),
    "\ufeff" + (HEADER + ROW).replace(",", ";").replace("0.", "0,"), (HEADER + ROW).replace(",", "\t"),
    (HEADER + ROW).replace("reed-1", '"reed-1"'), HEADER + ROW.strip(), HEADER + ROW.strip() + ",,,\n",
])  # fmt: skip
def test_separators_marks_and_line_ends(book, write, text):
    book.load(write("runs.csv", text))
    sheet = book.sheet("R-0001")
    assert (
        sheet.values["f"] == 0.5
        and sheet.values["T"] == pytest.approx(295.15)
        and sheet.values["U"] == pytest.approx(5.1e-5)
    )
    assert (sheet.u["f"], sheet.u["U"]) == (pytest.approx(0.005 / 3**0.5), pytest.approx(3e-6))


def test_a_decimal_comma_needs_the_semicolon(book, write):
    (line,) = findings(book, write("runs.csv", HEADER + 'reed-1,syrup,2026-03-02T10:00,"1,000",22.0,0.051\n'))
    assert "may mean a thousand or a decimal comma" in line
    book.load(
        write("semi.csv", HEADER.replace(",", ";") + "reed-1;syrup;2026-03-02T10:00;1,000;22,0;0,051\n")
    )
    assert book.sheet("R-0001").values["f"] == 1.0


def test_the_same_cells_in_either_separator_are_one_run(book, write):
    book.load(write("runs.csv", HEADER + ROW))
    again = book.load(
        write("more.csv", (HEADER + ROW).replace(",", ";").replace("0.", "0,").replace("22.0", "22,0"))
    )
    assert again.added["run"] == 0 and again.known == 1


# ---- files


def test_a_single_file_is_known_by_name_or_by_columns(book, write):
    assert book.load(write("spring.csv", HEADER + ROW)).added["run"] == 1
    assert (
        book.load(write("viscometer.csv", "of,key,value,T\nsyrup,mu,4.1(1) Pa.s,22 degC\n")).added["reading"]
        == 1
    )
    assert book.load(write("Fluids.CSV", "code,kind\nw,water\n")).added["fluid"] == 1
    (line,) = findings(book, write("what.csv", "code,note\nx,y\n"))
    assert line.startswith("sheet 'what.csv': does not tell what it holds; name it fluids, materials")


def test_a_folder_in_any_case(book, write, tmp_path):
    write("season/Fluids.csv", "code,kind\nw,water\n")
    write("season/RUNS.CSV", HEADER + ROW.replace("syrup", "w"))
    write("season/notes.txt", "not a sheet")
    added = book.load(tmp_path / "season").added
    assert (added["fluid"], added["run"]) == (1, 1)


@pytest.mark.parametrize(("name", "content", "said"), [
    ("runs.csv", "", "is empty"), ("runs.csv", "\n \n,,\n", "is empty"),
    ("runs.csv", bytes(range(256)) * 8, "is not UTF-8 text"), ("runs.csv", b"a,b\n\x00\x00\n", "is not a text file"),
    ("runs.csv", HEADER.encode("utf-16"), "is not UTF-8 text"), ("runs.csv", HEADER + "x" * 200_000, "cannot be read as CSV"),
    ("runs.xlsx", b"PK\x03\x04 not a workbook", "is not a workbook that can be read"), ("runs.xlsx", b"", "is not a workbook"),
    ("runs.xlsx", HEADER + ROW, "is not a workbook that can be read"),
])  # fmt: skip
def test_files_that_cannot_be_read(book, write, name, content, said):
    (line,) = findings(book, write(name, content))
    assert line.startswith(f"sheet '{name}': ") and said in line


def test_no_such_file_and_a_folder_without_sheets(book, tmp_path):
    assert "there is no such file or folder" in findings(book, tmp_path / "none.csv")[0]
    (tmp_path / "void").mkdir()
    assert "this folder holds no sheet; name them fluids, materials" in findings(book, tmp_path / "void")[0]


def test_a_header_alone_adds_nothing(book, write):
    assert str(book.load(write("runs.csv", HEADER))) == "nothing new"


def test_a_workbook(book, tmp_path):
    workbook = openpyxl.Workbook()
    fluids = workbook.active
    fluids.title = "Fluids"
    for row in (("code", "kind", "made", "rho [g/cm3]"), ("wb", "measured", date(2026, 3, 1), 1.38)):
        fluids.append(row)
    readings = workbook.create_sheet("readings")
    for row in (("of", "key", "value [Pa.s]", "T [degC]", "on"), ("wb", "mu", 4.1, 22, datetime(2026, 3, 1)),
                (None, None, None, None, None), ("wb", "mu", "3.25(3)", 26.5, date(2026, 3, 1))):  # fmt: skip
        readings.append(row)
    runs = workbook.create_sheet("runs")
    for row in (("swimmer", "fluid", "at", "f [Hz]", "T [degC]", "note"),
                ("reed-1", "wb", datetime(2026, 3, 2, 10, 5), 0.5, 22, None), ("reed-1", "wb", "2026-03-02T10:10", 1, 22.5, 7)):  # fmt: skip
        runs.append(row)
    workbook.create_sheet("scratch").append(("anything", 1))
    workbook.save(tmp_path / "season.xlsx")
    loaded = book.load(tmp_path / "season.xlsx")
    assert {k: n for k, n in loaded.added.items() if n} == {"fluid": 1, "reading": 2, "run": 2}
    found = book.runs()
    assert found["f"].tolist() == [0.5, 1.0] and found["rho"].tolist() == pytest.approx([1380, 1380])
    assert found["at"].iloc[0].strftime("%Y-%m-%d %H:%M") == "2026-03-02 10:05"
    assert "fit of 2 readings of 2026-03-01 (Andrade)" in book.sheet("R-0001").sentences["mu_from"]
    assert found["u_f"].tolist() == pytest.approx([0.05 / 3**0.5, 0.5 / 3**0.5])  # 0.5 and 1 as written
    assert book.load(tmp_path / "season.xlsx").known == 5
    runs["D3"] = "fast"
    workbook.save(tmp_path / "season.xlsx")
    (line,) = findings(book, tmp_path / "season.xlsx")
    assert line.startswith("season.xlsx runs line 3, f 'fast': cannot be read as a frequency")
    only = openpyxl.Workbook()
    only.save(tmp_path / "other.xlsx")
    assert "holds no sheet of a known name" in findings(book, tmp_path / "other.xlsx")[0]


# ---- all or nothing


def test_every_bad_row_is_listed_with_line_column_and_reason(book, write):
    lines = findings(book, write("runs.csv", HEADER + ROW
        + "reed-1,syrup,2026-03-02T10:01,-1,22.0,0.05\n"  # 3
        + "reed-9,syrup,2026-03-02T10:02,1,22.0,0.05\n"  # 4
        + ",syrup,2026-03-02T10:03,1,22.0,0.05\n"  # 5
        + "reed-1,syrup,sometime,1,22.0 Pa,0.05\n"  # 6: two findings
        + "reed-1,syrup,2026-03-02T10:05,1,22.0,0.05,7\n"  # 7
        + "reed-1,honey,2026-03-02T10:06,1,22.0,0.05\n"  # 8
        + 'reed-1,syrup,2026-03-02T10:07,"two\nlines",22.0,0.05\n'  # 9 and 10
        + ROW))  # fmt: skip
    places = [line.split(":")[0].split(" '")[0] for line in lines]
    assert sorted(places) == [
        "runs.csv line 10, f", "runs.csv line 3, f", "runs.csv line 4, swimmer", "runs.csv line 5, swimmer",
        "runs.csv line 6, T", "runs.csv line 6, at", "runs.csv line 7", "runs.csv line 8, fluid",
    ]  # fmt: skip
    assert "runs.csv line 7: has 7 cells for 6 columns." in lines
    assert all(line.endswith(".") for line in lines)


def test_a_bad_shelf_row_is_listed_and_does_not_drag_others_along(book, write, tmp_path):
    write("new/fluids.csv", "code,kind\nw1,honey\n,water\nw2,water\nw2,water\nsyrup,water\n")
    write("new/materials.csv", "code,rho_s\nm1,1.07 kg\n")
    write(
        "new/swimmers.csv",
        "code,form,L_body [mm],L_tail [mm],material\ns1,rope,30,25,m1\ns2,helix,30,31,m9\n",
    )
    write(
        "new/readings.csv",
        "of,key,value,T\nw1,mu,1 Pa.s,\nw1,mu,1.1(0) Pa.s,20 degC\nw1,mu,1.2 Pa.s,20 degC\nw2,f,1 Hz,\nm1,E,1 MPa,\n",
    )
    write("new/runs.csv", "swimmer,fluid,at,f [Hz],h_wall [mm],state,why\ns1,w1,2026-03-02,1,,,\nreed-1,w2,2026-03-02,1,2.0,,\n"
                          "reed-1,w2,2026-03-02,1,,void,\n")  # fmt: skip
    lines = findings(book, tmp_path / "new")
    places = {line.split(":")[0].split(" '")[0] for line in lines}
    assert places == {
        "fluids.csv line 2, kind", "fluids.csv line 3, code", "fluids.csv line 5, code", "fluids.csv line 6, fluid",
        "materials.csv line 2, rho_s", "swimmers.csv line 2, form", "swimmers.csv line 3, L_tail",
        "swimmers.csv line 3, material", "readings.csv line 2, T", "readings.csv line 3, value",
        "readings.csv line 5, key", "runs.csv line 3, h_wall", "runs.csv line 4, why",
    }  # fmt: skip
    assert len(lines) == len(places)


@pytest.mark.parametrize(("row", "said"), [
    ("reed-1,syrup,2026-03-02,1,void,", "line 2, why: is missing: a void run says why"),
    ("reed-1,syrup,2026-03-02,1,kept,bubble", "line 2, why 'bubble': belongs to a void run; put it into the note"),
    ("reed-1,syrup,2026-03-02,1,,bubble", "line 2, why 'bubble': belongs to a void run"),
    ("reed-1,syrup,2026-03-02,1,gone,bubble", "line 2, state 'gone': is not known here; one of kept, void"),
])  # fmt: skip
def test_void_rows_say_why(book, write, row, said):
    assert said in findings(book, write("runs.csv", f"swimmer,fluid,at,f [Hz],state,why\n{row}\n"))[0]
    book.load(write("good.csv", "swimmer,fluid,at,f [Hz],state,why\nreed-1,syrup,2026-03-02,1,void,bubble\n"))
    assert book.sheet("R-0001").texts["state"] == "void"


# ---- the same sheet again


def test_the_same_sheet_twice_adds_nothing(book, write):
    path = write("runs.csv", HEADER + ROW + ROW.replace("10:00", "10:01"))
    book.load(path)
    before = tables(book)
    again = book.load(path, by="another")
    assert (again.added["run"], again.known) == (0, 2) and tables(book) == before
    assert str(again) == "nothing new; 2 rows stood in the book already"
    assert book.load(write("copy.csv", HEADER + ROW)).known == 1, "whatever the file is called"


def test_honest_repeats_survive(book, write):
    path = write("runs.csv", HEADER + ROW * 3)
    assert book.load(path).added["run"] == 3
    assert book.load(path).added["run"] == 0
    assert book.load(write("runs.csv", HEADER + ROW * 5)).added["run"] == 2, "the fourth and fifth are new"
    assert len(book.runs()) == 5


def test_a_partly_known_sheet_adds_only_what_is_new(book, write):
    book.load(write("runs.csv", HEADER + ROW))
    late = ROW.replace("10:00", "11:00")
    loaded = book.load(write("runs.csv", HEADER + late + ROW))
    assert (loaded.added["run"], loaded.known) == (1, 1)
    assert book.runs()["code"].tolist() == ["R-0001", "R-0002"]


def test_columns_in_another_order_are_the_same_run(book, write):
    book.load(write("runs.csv", HEADER + ROW))
    same = (
        "U [mm/s],f [Hz],at,fluid,swimmer,T [degC],note\n0.051(3),0.50,2026-03-02T10:00,syrup,reed-1,22.0,\n"
    )
    assert book.load(write("runs.csv", same)).known == 1


CODED = "code,swimmer,fluid,at,f [Hz],U [mm/s],note\nR-0012,reed-1,syrup,2026-03-02T10:00,0.50,0.051(3),dim\n"


def test_a_row_with_a_code_is_known_by_it(book, write):
    book.load(write("runs.csv", CODED))
    assert book.runs()["code"].tolist() == ["R-0012"]
    assert book.load(write("runs.csv", CODED)).known == 1
    (line,) = findings(book, write("runs.csv", CODED.replace("0.051(3)", "0.052(3)")))
    assert line == "runs.csv line 2, run 'R-0012': differs from the book in U; amend it."
    (line,) = findings(book, write("runs.csv", CODED.replace("0.50", "0.5").replace(",dim", ",dark")))
    assert "differs from the book in note, f" in line
    (line,) = findings(book, write("runs.csv", CODED.replace("12,", "13,") + "R-0013"
                           + CODED.splitlines()[1][6:].replace("dim", "dark") + "\n"))  # fmt: skip
    assert "line 3, code 'R-0013': stands twice, first in runs.csv line 2" in line


def test_a_code_that_was_logged_by_hand_is_known_to_a_sheet(book, write):
    book.record(
        code="R-0012",
        swimmer="reed-1",
        fluid="syrup",
        at="2026-03-02T10:00",
        f="0.50 Hz",
        U="0.051(3) mm/s",
        note="dim",
        by="wren",
    )
    assert book.load(write("runs.csv", CODED)).known == 1
    assert (
        "differs from the book in U"
        in findings(book, write("runs.csv", CODED.replace("0.051(3)", "0.052(3)")))[0]
    )
    book.amend("R-0012", why="read again", U="0.052(3) mm/s")
    assert book.load(write("runs.csv", CODED.replace("0.051(3)", "0.052(3)"))).known == 1


def test_readings_and_shelf_rows_twice(book, write):
    readings = write("readings.csv", "of,key,value,T,on\n" + "syrup,mu,4.1(1) Pa.s,22 degC,2026-03-01\n" * 2)
    assert book.load(readings).added["reading"] == 2
    assert book.load(readings).known == 2
    fluids = "code,kind,rho [kg/m3]\nsyrup,measured,1380(2)\n"
    assert book.load(write("fluids.csv", fluids)).known == 1
    (line,) = findings(book, write("fluids.csv", fluids.replace("1380", "1390")))
    assert line == "fluids.csv line 2, fluid 'syrup': differs from the book in rho; amend it."
    assert (
        book.load(
            write("fluids.csv", fluids.replace("[kg/m3]", "").replace("1380(2)", "1380(2) kg/m3"))
        ).known
        == 1
    )


def test_swimmers_may_stand_before_their_parents(book, write):
    text = "code,form,L_body [mm],parent\n" + "".join(
        f"s{i},hinged,30,{f's{i + 1}' if i < 40 else ''}\n" for i in range(41)
    )
    assert book.load(write("swimmers.csv", text)).added["swimmer"] == 41
    circle = "code,form,L_body [mm],parent\na,hinged,30,b\nb,hinged,30,a\n"
    assert any("no swimmer has this code" in line for line in findings(book, write("swimmers.csv", circle)))


def test_progress_is_told_and_adds_up(book, write):
    path = write("runs.csv", HEADER + "".join(ROW.replace("10:00", f"10:{i % 60:02d}") for i in range(2_500)))
    told = []
    book.load(path, progress=lambda what, n: told.append((what, n)))
    assert sum(n for _, n in told) == 2 * 2_500, "once for reading, once for writing"
    assert max(n for _, n in told if _.startswith("reading ")) == 1_000
    assert dict(counted(read_tables(path))) == {"runs.csv": 2_500}


# ---- the demo


@pytest.fixture(scope="module")
def demo(tmp_path_factory):
    with Book.new(tmp_path_factory.mktemp("demo") / "demo.db") as book:
        book.loaded = book.load(demo_folder(), by="sable")
        yield book


def test_the_demo_folder_loads_without_a_warning(demo):
    assert demo.loaded.warned == () and demo.loaded.known == 0
    assert demo.check() == []
    again = demo.load(demo_folder(), by="sable")
    assert not any(again.added.values()) and again.known == sum(demo.loaded.added.values())


def test_the_demo_holds_what_a_groups_year_holds(demo):
    runs = demo.runs(kept=False)
    kept = runs[runs["state"] == "kept"]
    assert len(runs) >= 600 and runs["by"].nunique() == 4
    assert set(runs["state"]) == {"kept", "void"} and runs.loc[runs["state"] == "void", "why"].notna().all()
    slow = kept[(kept["Re_omega"] <= 1.0) & kept["Sp"].between(1, 4)]
    assert len(slow) >= 150
    with closing(sqlite3.connect(demo.target)) as raw:
        forms = {f for (f,) in raw.execute("select distinct form from swimmer")}
        kinds = {k for (k,) in raw.execute("select distinct kind from fluid")}
    assert forms >= {"flexible tail", "helix", "undulating", "rigid tail"}
    assert kinds >= {"water", "glycerol-water", "silicone-oil"}
    for key in ("T", "U", "A_tip", "theta0"):
        assert 0 < runs[key].isna().sum() < len(runs), f"some runs lack {key}"
    repeats = kept.groupby(["swimmer", "fluid", "f", kept["at"].dt.date]).size()
    assert (repeats >= 3).sum() >= 5, "the same trial done again, as one does"
