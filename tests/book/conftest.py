"""Books for these tests, made through the migrations: an empty one, and one with a small stocked shelf."""

import shutil
import sqlite3
from contextlib import closing
from pathlib import Path

import pytest

from labbook import Book

SHELF = {
    "fluids": """code,kind,glycerol [wt%],grade [cSt],rho [kg/m3],lam [s],made,note
water-1,water,,,,,2026-01-05,
gly85,glycerol-water,85.0(3),,,,2026-01-10,
oil-5k,silicone-oil,,5000,,,2026-01-10,
syrup,measured,,,1380(2),0.50(2),2026-01-10,"corn syrup, diluted"
""",
    "materials": """code,rho_s [g/cm3],made
sil-1,1.07(1),2026-01-08
sil-2,1.05(1),2026-01-08
""",
    "swimmers": """code,form,material,L_body [mm],L_tail [mm],section,d [mm],w [mm],t [mm],D [mm],d_in [mm],R_helix [mm],pitch [mm],b [mm],m_mag [mA.m2]
reed-1,flexible tail,sil-1,34.0(2),30.0(1),rod,1.00(1),,,,,,,2.00(2),4.2(1)
ribbon-1,flexible tail,sil-1,24.0(2),20.0(1),strip,,2.00(2),0.200(3),,,,,2.00(2),
pipe-1,flexible tail,sil-2,34.0(2),30.0(1),tube,,,,1.00(1),0.60(1),,,2.00(2),
eel-1,undulating,,300(1),,,,,,,,,,,
screw-1,helix,,30.0(2),24.0(1),,0.80(1),,,,,2.0(1),10.0(1),2.00(2),4.2(1)
""",
    "rigs": """code,kind,current_to_B [mT/A],u_f,u_B,u_T,calibrated
coil-1,Helmholtz pair,1.12(1),0.1 %,0.03 mT,0.15 K,2026-01-06
cam-1,camera,,,,,2026-01-06
""",
    "readings": """of,key,value,T,on,how
syrup,mu,5.20(5) Pa.s,18.0(1) degC,2026-03-01,falling ball
syrup,mu,4.10(4) Pa.s,22.0(1) degC,2026-03-01,falling ball
syrup,mu,3.25(3) Pa.s,26.0(1) degC,2026-03-01,falling ball
sil-1,E,1.50(3) MPa,,2026-02-20,sag
sil-2,E,0.80(2) MPa,,2026-02-20,sag
""",
}  # fmt: skip

RUNS = """swimmer,fluid,rig,at,by,f [Hz],theta0 [rad],B,I_coil,T [degC],U,A_tip,series,state,why,note
reed-1,syrup,coil-1,2026-03-02T10:00,wren,0.50,0.30(1),2.00(3) mT,,22.0(1),0.051(3) mm/s,2.0(1) mm,sweep,,,
reed-1,syrup,coil-1,2026-03-02T10:10,wren,1.00,0.30(1),,2.0(1) A,22.0(1),0.062(3) mm/s,1.5(1) mm,sweep,,,
reed-1,syrup,coil-1,2026-03-02T10:20,knot,2.00,0.30(1),2.00(3) mT,,22.5(1),0.055(3) mm/s,1.0(1) mm,sweep,,,good light
ribbon-1,gly85,,2026-03-03T10:00,knot,2.0,0.30(1),,,23.0(1),0.40(2) mm/s,3.0(1) mm,,,,
pipe-1,oil-5k,,2026-03-03T11:00,knot,0.50,0.30(1),,,25.0(1),0.040(2) mm/s,,,,,
eel-1,water-1,,2026-03-04T11:00,sable,2.50(1),,,,20.0(1),0.30(1) m/s,40(1) mm,,,,
eel-1,water-1,,2026-03-04T11:05,sable,3.00(1),,,,20.0(1),0.40(1) m/s,40(1) mm,,,,
screw-1,oil-5k,coil-1,2026-03-05T11:00,wren,1.00,,2.00(3) mT,,25.0(1),0.12(1) mm/s,,,,,
reed-1,gly85,,2026-03-06T09:00,wren,0.50,0.30(1),,,23.0(1),0.000(3) mm/s,2.0(1) mm,,,,
reed-1,syrup,coil-1,2026-03-06T10:00,wren,0.50,0.30(1),,,22.0(1),0.051(3) mm/s,,,void,bubble on the tail,
"""


def write_folder(folder: Path, runs: str = "") -> Path:
    """The shelf as a folder of sheets, with runs.csv where runs are given."""
    folder.mkdir(exist_ok=True)
    for name, text in {**SHELF, **({"runs": runs} if runs else {})}.items():
        (folder / f"{name}.csv").write_text(text, encoding="utf-8")
    return folder


@pytest.fixture(autouse=True)
def _who(monkeypatch):
    monkeypatch.setenv("LABBOOK_BY", "tester")
    monkeypatch.delenv("LABBOOK_BOOK", raising=False)


@pytest.fixture(scope="session")
def _templates(tmp_path_factory):
    folder = tmp_path_factory.mktemp("templates")
    Book.new(folder / "empty.db").close()
    for name, runs in (("stocked", ""), ("filled", RUNS)):
        with Book.new(folder / f"{name}.db") as book:
            book.load(write_folder(folder / name, runs), by="tester")
    return folder


def _copied(_templates, tmp_path, name):
    path = tmp_path / f"{name}.db"
    shutil.copy(_templates / f"{name}.db", path)
    return Book.open(path)


@pytest.fixture
def empty(_templates, tmp_path):
    """A book without any record."""
    with _copied(_templates, tmp_path, "empty") as book:
        yield book


@pytest.fixture
def stocked(_templates, tmp_path):
    """A book with a shelf, no run."""
    with _copied(_templates, tmp_path, "stocked") as book:
        yield book


@pytest.fixture
def filled(_templates, tmp_path):
    """A book with a shelf and ten runs, R-0001 to R-0010, the last one void."""
    with _copied(_templates, tmp_path, "filled") as book:
        yield book


@pytest.fixture
def folder(tmp_path):
    """The shelf and the ten runs as a folder of sheets."""
    return write_folder(tmp_path / "sheets", RUNS)


TABLES = ("book", "fluid", "material", "swimmer", "rig", "reading", "run", "ledger", "ledger_run", "resolved")


@pytest.fixture
def counts():
    """A function: rows of every table of a book, read past labbook."""

    def of(book) -> dict[str, int]:
        with closing(sqlite3.connect(book.target)) as raw:
            return {t: raw.execute(f"select count(*) from {t}").fetchone()[0] for t in TABLES}

    return of


@pytest.fixture
def by_hand():
    """A function: run SQL on a book's file past labbook, as somebody with a database browser would."""

    def run(book, statement, *parameters):
        with closing(sqlite3.connect(book.target)) as raw:
            found = raw.execute(statement, parameters).fetchall()
            raw.commit()
        return found

    return run
