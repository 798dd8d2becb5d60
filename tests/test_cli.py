"""The command line: every command runs, says what it did, and ends with 0, 1 or 2."""

import csv
import io
import json
import subprocess
import sys
from pathlib import Path

import pytest
from terminal import run

from labbook import Book
from labbook.cli import main

SHELF = {
    "fluid": ("code=oil", "kind=silicone-oil", "grade=5000 cSt"),
    "material": ("code=sil", "rho_s=1.07 g/cm3"),
    "swimmer": (
        "code=reed",
        "form=flexible tail",
        "material=sil",
        "L_body=34 mm",
        "L_tail=30.0(1) mm",
        "d=1.00(1) mm",
    ),
    "rig": ("code=coil", "current_to_B=1.12(1) mT/A", "u_f=0.1 %"),
    "reading": ("of=sil", "key=E", "value=1.50(3) MPa", "on=2026-02-20"),
}


@pytest.fixture(autouse=True)
def _environment(monkeypatch, tmp_path):
    monkeypatch.setenv("LABBOOK_BY", "tester")
    monkeypatch.delenv("LABBOOK_BOOK", raising=False)
    monkeypatch.setenv("XDG_DATA_HOME", str(tmp_path / "data"))


@pytest.fixture
def bench(tmp_path):
    """A book made and stocked by commands alone, with three runs."""
    path = tmp_path / "bench.db"
    assert run("new", path).stdout == f"made {path}\n"
    said = [run(kind, path, *cells).stdout.strip() for kind, cells in SHELF.items()]
    assert said == ["oil", "sil", "reed", "coil", "M-0001"]
    for i, (f, U) in enumerate(
        (("0.5 Hz", "0.051(3) mm/s"), ("1 Hz", "-0.02(3) mm/s"), ("2 Hz", "0.055(3) mm/s"))
    ):
        done = run("log", path, "swimmer=reed", "fluid=oil", "rig=coil", f"f={f}", f"U={U}", "T=22.4 degC",
                   f"at=2026-03-0{i + 1}T10:00", "A_tip=2.0(1) mm", f"by={'wren' if i else 'knot'}")  # fmt: skip
        assert done.stdout == f"R-{i + 1:04d}\n"
    return path


# ---- help, usage


def test_every_command_explains_itself():
    text = run("--help").stdout
    for name, command in main.commands.items():
        assert name in text and command.help
        assert "Usage" in run(name, "--help").stdout
    assert {"demo", "open", "new", "load", "log", "runs", "numbers", "draw", "check", "copy", "amend", "void", "fluid",
            "material", "swimmer", "rig", "reading"} <= set(main.commands)  # fmt: skip
    assert "labbook" in run("--version").stdout


@pytest.mark.parametrize("words", [
    ("log",), ("log", "x.db"), ("amend", "x.db", "R-0001", "f=1 Hz"), ("void", "x.db", "R-0001"), ("nonsense",), ("new",),
    ("runs", "--as", "xml"), ("runs", "--range", "U", "low", "high"), ("runs", "--range", "U", "1"), ("runs", "--state", "lost"),
    ("runs", "--newest", "0"), ("draw", "x.db", "Sp", "stride"), ("log", "x.db", "f"), ("log", "x.db", "f=1 Hz", "f=2 Hz"),
    ("log", "x.db", "=1 Hz"), ("open", "--port", "here"), ("runs", "--nonsense"),
])  # fmt: skip
def test_wrong_usage_is_2(words):
    done = run(*words, code=2)
    assert "Usage" in done.stderr or "Error" in done.stderr


def test_from_a_real_terminal(bench):
    """One whole process: exit codes, streams, and that nothing but the answer is on stdout."""

    def shell(*words):
        return subprocess.run([sys.executable, "-c", "from labbook.cli import main; main()", *map(str, words)],
                              capture_output=True, text=True, timeout=100, cwd=Path(__file__).parents[1])  # fmt: skip

    done = shell("log", bench, "swimmer=reed", "fluid=oil", "f=-1 Hz")
    assert (done.returncode, done.stdout) == (1, "")
    assert done.stderr == "f '-1 Hz': a frequency must be greater than zero.\n"


# ---- acts


def test_log_says_the_code_and_who(bench):
    runs = Book.open(bench).runs()
    assert runs["by"].tolist() == ["knot", "wren", "wren"]
    assert run("log", bench, "swimmer=reed", "fluid=oil", "f=1 Hz").stdout == "R-0004\n"
    run("log", bench, "swimmer=reed", "fluid=oil", "f=1 Hz", "--by", "sable")
    run(
        "log", bench, "swimmer=reed", "fluid=oil", "f=1 Hz", "by=finch", "--by", "sable"
    )  # whose run, who writes it
    with Book.open(bench) as book:
        assert book.runs()["by"].tolist()[3:] == ["tester", "sable", "finch"]
    run("log", bench, "swimmer=reed", "fluid=oil", "f=1 Hz", "--by", "", code=0)


def test_negative_values_and_equals_signs(bench):
    run("log", bench, "swimmer=reed", "fluid=oil", "f=1 Hz", "U=-0.05(3) mm/s", "note=a=b, -c")
    with Book.open(bench) as book:
        sheet = book.sheet("R-0004")
    assert sheet.values["U"] == pytest.approx(-5e-5) and sheet.texts["note"] == "a=b, -c"


def test_amend_and_void(bench):
    assert (
        run("amend", bench, "R-0001", "f=0.6 Hz", "A_tip=", "by=finch", "--why", "read again").stdout
        == "amended R-0001\n"
    )
    assert run("void", bench, "R-0002", "--why", "bubble").stdout == "R-0002 is void\n"
    assert run("void", bench, "M-0001", "--why", "wrong sample").stdout == "M-0001 is void\n"
    with Book.open(bench) as book:
        sheet = book.sheet("R-0001")
        assert (
            sheet.values["f"] == pytest.approx(0.6)
            and sheet.values["A_tip"] is None
            and sheet.texts["by"] == "finch"
        )
        assert sheet.values["E"] is None
        assert book.runs()["code"].tolist() == ["R-0001", "R-0003"]


def test_shelf_commands_amend_and_retire(bench):
    assert run("fluid", bench, "code=oil", "grade=1000 cSt", "--why", "label").stdout == "oil\n"
    assert run("fluid", bench, "code=oil", "--retire", "--why", "used up").stdout == "oil is retired\n"
    assert run("fluid", bench, "code=oil", "--back", "--why", "found more").stdout == "oil is back in use\n"
    assert "code" in run("swimmer", "--help").stdout


def test_load(bench, tmp_path):
    (tmp_path / "runs.csv").write_text(
        "swimmer,fluid,at,f [Hz]\nreed,oil,2026-03-05T10:00,1\nreed,oil,2026-03-05T10:01,1\n"
    )
    assert run("load", bench, tmp_path / "runs.csv").stdout == "added 2 runs\n"
    assert (
        run("load", bench, tmp_path / "runs.csv").stdout == "nothing new; 2 rows stood in the book already\n"
    )
    (tmp_path / "odd.csv").write_text("swimmer,fluid,at,f [Hz]\nreed,oil,2026-03-06T10:00,5000\n")
    done = run("load", bench, tmp_path / "odd.csv", code=1)
    assert done.stderr.startswith("odd.csv line 2, f: 5000 lies outside") and "--confirm" in done.stderr
    done = run("load", bench, tmp_path / "odd.csv", "--confirm")
    assert done.stdout == "added 1 run\n" and done.stderr.startswith("confirmed: odd.csv line 2, ")


# ---- questions


def test_runs_as_a_table(bench):
    lines = run("runs", bench).stdout.splitlines()
    assert lines[0].split()[:5] == ["run", "at", "by", "swimmer", "fluid"]
    assert [line.split()[0] for line in lines[1:4]] == ["R-0001", "R-0002", "R-0003"]
    assert "3 runs: kept" in lines and "0.051(3)" in lines[1]
    assert run("runs", bench, "--text", "no such word").stdout.splitlines()[0] == "no runs"
    refused = run("runs", bench, "--fluid", "water", code=1)
    assert "no fluid has this code" in refused.stderr


def test_runs_as_csv_and_json(bench):
    rows = list(csv.DictReader(io.StringIO(run("runs", bench, "--as", "csv").stdout)))
    objects = json.loads(run("runs", bench, "--as", "json").stdout)
    assert [r["code"] for r in rows] == [o["code"] for o in objects] == ["R-0001", "R-0002", "R-0003"]
    assert float(rows[0]["U [m/s]"]) == objects[0]["U"] == pytest.approx(5.1e-5)
    newest = json.loads(run("runs", bench, "--as", "json", "--newest", "1").stdout)
    assert [o["code"] for o in newest] == ["R-0003"]


@pytest.mark.parametrize(("options", "found"), [
    (("--range", "U", "-inf", "0"), [2]), (("--range", "U", "-1e-3", "-1e-9"), [2]), (("--range", "f", "1", "inf"), [2, 3]),
    (("--range", "f", "1", "inf", "--range", "U", "0", "inf"), [3]), (("--person", "knot", "--person", "wren"), [1, 2, 3]),
    (("--person", "knot"), [1]), (("--since", "2026-03-02"), [2, 3]), (("--until", "2026-03-01"), [1]),
    (("--regime", "creeping"), [1, 2, 3]), (("--regime", "creeping", "--regime", "inertial"), []), (("--state", "void"), []),
    (("--text", "R-0002"), [2]), (("--material", "sil", "--swimmer", "reed", "--fluid", "oil"), [1, 2, 3]),
])  # fmt: skip
def test_options_of_runs(bench, options, found):
    if options == ("--regime", "creeping"):  # 5000 cSt, L 30 mm: omega L^2/nu is 0.57 at 0.5 Hz
        options = ("--regime", "nearly creeping")
        found = [1]
    objects = json.loads(run("runs", bench, "--as", "json", *options).stdout)
    assert [int(o["code"][2:]) for o in objects] == found


@pytest.mark.parametrize("options", [("--regime", "swimming"), ("--range", "Q", "0", "1"), ("--range", "U", "2", "1"),
                                     ("--range", "U", "nan", "1"), ("--since", "March")])  # fmt: skip
def test_questions_that_are_refused(bench, options):
    assert len(run("runs", bench, *options, code=1).stderr.splitlines()) == 1


def test_numbers(bench):
    table = run("numbers", bench).stdout.splitlines()
    assert table[0].split()[0] == "key"
    rows = {r["key"]: r for r in json.loads(run("numbers", bench, "--as", "json").stdout)}
    assert {"Re", "Re_omega", "Wo", "Sp", "St", "Sw", "stride", "U_scaled", "De", "Mn", "f_ratio", "zeta_ratio", "slenderness",
            "wall"} <= set(rows)  # fmt: skip
    assert (
        rows["Sp"]["runs"] == 3 and rows["St"]["runs"] == 2 and rows["Sp"]["formula"] and rows["Sp"]["source"]
    )
    assert rows["Sp"]["regimes"] == ["stiff tail", "working tail", "floppy tail"]
    assert len(list(csv.DictReader(io.StringIO(run("numbers", bench, "--as", "csv").stdout)))) == len(rows)


@pytest.mark.parametrize(("name", "start"), [("fig.svg", b"<svg"), ("fig.png", b"\x89PNG")])
def test_draw(bench, tmp_path, name, start):
    done = run(
        "draw",
        bench,
        "Sp",
        "stride",
        "-o",
        tmp_path / name,
        "--linear",
        "--bars",
        "total",
        "--colour",
        "fluid",
    )
    assert done.stdout.startswith("3 runs drawn into ")
    assert start in (tmp_path / name).read_bytes()[:300]
    logarithmic = run("draw", bench, "Sp", "stride", "-o", tmp_path / name)
    assert logarithmic.stdout.startswith("2 runs drawn") and "1 not drawn" in logarithmic.stdout


@pytest.mark.parametrize("words", [("Sp", "Q", "-o", "a.svg"), ("Sp", "De", "-o", "a.svg"), ("Sp", "stride", "-o", "a.doc"),
                                   ("Sp", "stride", "-o", "no/such/folder/a.svg")])  # fmt: skip
def test_figures_that_are_refused(bench, tmp_path, monkeypatch, words):
    monkeypatch.chdir(tmp_path)
    assert len(run("draw", bench, *words, code=1).stderr.splitlines()) == 1
    assert not list(tmp_path.glob("a.*"))


def test_check(bench):
    import sqlite3

    assert run("check", bench).stdout == "nothing stale; the ledger's chain holds\n"
    raw = sqlite3.connect(bench)
    raw.execute("UPDATE resolved SET Sp=Sp*1.01 WHERE run_id=2")
    raw.commit()
    raw.close()
    done = run("check", bench, code=1)
    assert done.stdout == "R-0002: a stored number or what was typed was changed by hand (Sp)\n"


def test_copy(bench, tmp_path):
    assert run("copy", bench, tmp_path / "copy.db").stdout == f"copied to {tmp_path / 'copy.db'}\n"
    assert run("runs", tmp_path / "copy.db", "--as", "csv").stdout == run("runs", bench, "--as", "csv").stdout


# ---- which book, who


def test_the_book_may_be_left_out(bench, monkeypatch, tmp_path):
    for words in (("runs",), ("numbers",), ("check",)):
        assert "does not exist: make it with `labbook new" in run(*words, code=1).stderr
    monkeypatch.setenv("LABBOOK_BOOK", str(bench))
    assert "R-0001" in run("runs").stdout
    run("numbers")
    run("check")
    assert run("runs", tmp_path / "other.db", code=1).stderr.startswith(str(tmp_path / "other.db")), (
        "a named book wins"
    )


def test_the_users_own_book(bench, tmp_path):
    own = tmp_path / "data" / "labbook"
    own.mkdir(parents=True)
    run("copy", bench, own / "bench.db")
    assert "R-0001" in run("runs").stdout


def test_who_when_nobody_is_named(bench, monkeypatch):
    monkeypatch.delenv("LABBOOK_BY")
    monkeypatch.setattr("labbook.places.getpass.getuser", lambda: "pat")
    run("log", bench, "swimmer=reed", "fluid=oil", "f=1 Hz")
    monkeypatch.setattr("labbook.places.getpass.getuser", lambda: "")
    assert (
        "say who you are with --by" in run("log", bench, "swimmer=reed", "fluid=oil", "f=1 Hz", code=1).stderr
    )
    with Book.open(bench) as book:
        assert book.runs()["by"].tolist()[3:] == ["pat"]
