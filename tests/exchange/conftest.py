"""A small stocked book, a writer of sheets, and the demo book, for the sheets' tests."""

import pytest

from labbook import Book

FLUIDS = "code,kind,rho [kg/m3]\noil,silicone-oil,\nsyrup,measured,1380(2)\n"
SWIMMERS = (
    "code,form,L_body [mm],L_tail [mm],d [mm],b [mm]\nreed-1,flexible tail,34.0(2),30.0(1),1.00(1),2.00(2)\n"
)


@pytest.fixture(autouse=True)
def _who(monkeypatch):
    monkeypatch.setenv("LABBOOK_BY", "tester")


@pytest.fixture
def write(tmp_path):
    """A function: text or bytes into a file of this name; returns its path."""

    def written(name, content):
        path = tmp_path / name
        path.parent.mkdir(exist_ok=True)
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
        return path

    return written


@pytest.fixture
def book(tmp_path, write):
    """A book with two fluids and one swimmer."""
    with Book.new(tmp_path / "bench.db") as book:
        write("stock/fluids.csv", FLUIDS)
        write("stock/swimmers.csv", SWIMMERS)
        book.load(tmp_path / "stock")
        yield book
