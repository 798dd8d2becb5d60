"""Theory under a figure of the command line: drawn, captioned, or refused with what would make it possible."""

import re

import pytest
from terminal import run


@pytest.fixture(autouse=True)
def _who(monkeypatch):
    monkeypatch.setenv("LABBOOK_BY", "tester")
    monkeypatch.delenv("LABBOOK_BOOK", raising=False)


ROD = ("form=flexible tail", "material=sil", "L_body=34 mm", "L_tail=30.0(1) mm", "d=1.00(1) mm", "b=2.00(2) mm")


@pytest.fixture
def book(tmp_path):
    """A book with a fluid and a material, and a way to put a swimmer with its runs in it."""
    path = tmp_path / "bench.db"
    run("new", path)
    run("fluid", path, "code=oil", "kind=silicone-oil", "grade=5000 cSt")
    run("material", path, "code=sil", "rho_s=1.07 g/cm3")
    run("reading", path, "of=sil", "key=E", "value=1.50(3) MPa", "on=2026-02-20")

    def with_runs(*swimmer, **set_):
        run("swimmer", path, f"code={set_.pop('code', 'reed')}", *swimmer)
        cells = {"swimmer": "reed", "fluid": "oil", "U": "0.051(3) mm/s", "T": "22.4 degC", "theta0": "0.30(1) rad"} | set_
        for f in ("0.5 Hz", "1 Hz", "2 Hz"):
            run("log", path, *(f"{k}={v}" for k, v in cells.items() if v), f"f={f}", "--confirm")
        return path

    return with_runs


def words_of(figure):
    return " ".join(re.sub(r"<[^>]*>", " ", figure.read_text(encoding="utf-8")).split())


@pytest.mark.parametrize(("y", "said"), [
    ("U_scaled", "Theory: the curve of reed, at its own head, drag ratio and walls"),
    ("F_scaled", "1 u of the predicted speed"), ("U_ratio", "1 u of the model itself, 1.7 % for a flexible tail"),
])  # fmt: skip
def test_the_figure_carries_theory_and_says_what_it_is(book, tmp_path, y, said):
    path, figure = book(*ROD), tmp_path / "fig.svg"
    assert run("draw", path, "Sp", y, "-o", figure).stdout.startswith("3 runs drawn")
    assert "theory" not in words_of(figure).lower()
    assert run("draw", path, "Sp", y, "--theory", "-o", figure).stdout.startswith("3 runs drawn")
    words = words_of(figure)
    assert said in words and "theory:" in words and "()" not in words


def test_theory_follows_the_dialect_and_other_colours(book, tmp_path):
    path, figure = book(*ROD), tmp_path / "fig.svg"
    run("draw", path, "Sp", "U_scaled", "--theory", "-o", figure, "--dialect", "Sp=rate:f,power:1", "--colour", "fluid")
    assert "theory: small angle, head free" in words_of(figure) and "rate f, power 1" in words_of(figure)
    said = run("draw", path, "Sp", "U_scaled", "--theory", "-o", figure, "--dialect", "Sp=length:L_body", code=1).stderr
    assert "the curve needs L_tail as the length in Sp" in said and said.count("\n") == 1


def test_axes_without_a_theory_are_refused_in_one_sentence(book, tmp_path):
    said = run("draw", book(*ROD), "Re", "stride", "--theory", "-o", tmp_path / "fig.svg", code=1).stderr
    assert "U_scaled and F_scaled over Sp, and U_ratio over anything, have a theory" in said and said.count("\n") == 1
    assert not list(tmp_path.glob("fig*"))


def without(*names):
    return tuple(cell for cell in ROD if cell.partition("=")[0] not in names)


@pytest.mark.parametrize(("swimmer", "set_", "said"), [
    (ROD, {"theta0": ""}, "has no U_scaled: needs theta0: it was not typed"),
    (without("material"), {}, "has no Sp: needs E"),
    (without("d"), {}, "the section of reed is not complete"),
    (without("b"), {"drive": "free_head_angle"}, "no run found has b, which the curve takes: give the swimmer the radius b of its head"),
    (ROD, {"drive": "field", "theta0": "0.3 rad"}, "(free_head_angle or pivoted_angle): no run found has one"),
    (("form=rigid tail", *ROD[1:]), {}, "the curve is that of a flexible tail"),
])  # fmt: skip
def test_runs_that_cannot_be_compared_say_what_is_missing(book, tmp_path, swimmer, set_, said):
    done = run("draw", book(*swimmer, **set_), "Sp", "U_scaled", "--theory", "-o", tmp_path / "fig.svg", code=1)
    assert said in done.stderr and done.stderr.count("\n") == 1
    assert not list(tmp_path.glob("fig*"))


def test_a_question_that_finds_nothing_is_said(book, tmp_path):
    done = run("draw", book(*ROD), "Sp", "U_scaled", "--theory", "-o", tmp_path / "fig.svg", "--person", "nobody", code=1)
    assert "the question finds none" in done.stderr
