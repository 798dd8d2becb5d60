"""Planned runs as a run sheet that loads once filled in, as a page that asks for nothing, as JSON, and in."""

import csv
import io
import json
import re

import pytest

from labbook import Book
from labbook.book.cautions import CAUTIONS
from labbook.book.plan_targets import reach
from labbook.book.planning import at_frequency, to_run
from labbook.errors import LabbookError, Refusal
from labbook.exchange.plan_sheets import as_json, as_page, as_run_sheet, duration, planned_lines


@pytest.fixture
def bench(tmp_path):
    """A book with a rod, two fluids and a coil."""
    with Book.new(tmp_path / "bench.db") as book:
        book.stock("fluid", code="oil", kind="silicone-oil", grade="12500 cSt")
        book.stock("fluid", code="syrup", kind="measured", rho="1380 kg/m3")
        book.stock("reading", of="syrup", key="mu", value="4.10(4) Pa.s", T="22.0 degC")
        book.stock("material", code="sil")
        book.stock("reading", of="sil", key="E", value="1.50(3) MPa")
        book.stock("rig", code="coil", kind="Helmholtz pair", current_to_B="1.1 mT/A")
        for code in ("reed", "=reed"):
            book.stock(
                "swimmer",
                code=code,
                form="flexible tail",
                material="sil",
                L_body="24 mm",
                L_tail="20.0 mm",
                d="1.00 mm",
                b="2.0 mm",
            )
        yield book


CELLS = dict(theta0="0.30(1) rad", T="22.0 degC", rig="coil", B="2.0 mT")


def runs_of(bench, swimmer="reed", **more):
    plan = bench.plan(swimmer, **CELLS | more)
    return plan, to_run(plan, reach(plan, 2.0))


def rows_of(text):
    return list(csv.DictReader(io.StringIO(text)))


def filled(text, **cells):
    """The sheet with these columns filled in, line by line."""
    rows = rows_of(text)
    for i, row in enumerate(rows):
        row |= {k: v.format(i) for k, v in cells.items()}
    out = io.StringIO()
    writer = csv.DictWriter(out, rows[0].keys())
    writer.writeheader()
    writer.writerows(rows)
    return out.getvalue()


def test_a_sheet_loads_once_at_and_u_are_filled_in_and_gives_what_was_planned(bench, tmp_path):
    _, runs = runs_of(bench)
    path = tmp_path / "planned.csv"
    path.write_text(as_run_sheet(runs, "plan of today"), encoding="utf-8")
    with pytest.raises(LabbookError, match="at: is missing"):
        bench.load(path)
    text = path.read_text(encoding="utf-8")
    path.write_text(
        filled(text, at="2026-03-01T10:0{}", **{"T [degC]": "22.0", "U [mm/s]": "0.01{}(2)"}),
        encoding="utf-8",
    )
    assert bench.load(path).added["run"] == len(runs)
    logged = bench.runs(series="plan of today", columns=("f", "Sp", "U_model", "theta0", "B"))
    assert sorted(logged["f"]) == pytest.approx(sorted(runs["f"]))
    for key in ("Sp", "U_model", "theta0", "B"):
        assert sorted(logged[key]) == pytest.approx(sorted(runs[key]), rel=1e-9), key


def test_what_a_trial_is_there_to_tell_stays_empty(bench):
    _, runs = runs_of(bench)
    for row in rows_of(as_run_sheet(runs)):
        assert {row[c] for c in ("at", "T [degC]", "U [mm/s]", "A_tip [mm]")} == {""}
        assert row["note"].startswith("planned at 22.0 degC: Sp 2.00")
        assert "settles in" in row["note"]


def test_a_sheet_comes_in_as_lines_for_the_form(bench):
    _, runs = runs_of(bench)
    lines = planned_lines(as_run_sheet(runs, "today"), "today.csv")
    assert [x["f"] for x in lines] == runs["f_typed"].tolist()
    for line in lines:
        assert line["theta0"] == "0.30(1) rad" and line["series"] == "today" and "at" not in line
        assert bench.preview(**line).refused == {}
    # a header's unit goes into the cell, and what was measured meanwhile is kept
    text = "swimmer,fluid,at,f [rpm],T [degC],U [mm/s]\nreed,oil,,30.0,21.5,\n"
    assert planned_lines(text) == [{"swimmer": "reed", "fluid": "oil", "f": "30.0 rpm", "T": "21.5 degC"}]


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("swimmer,fluid,at,f\nreed,oil,,1 mm\n", "plan.csv line 2, f"),
        ("swimmer,fluid,at,f\nreed,oil,,\n", "f: is missing"),
        ("swimmer,fluid,at,f\nreed,oil,yesterday,1 Hz\n", "at 'yesterday'"),
        ("swimmer,fluid,at,f,colour\nreed,oil,,1 Hz,red\n", "no such column"),
        ("swimmer,fluid,at,f\n", "no planned line"),
    ],
)
def test_a_sheet_that_is_wrong_is_refused(text, said):
    with pytest.raises(LabbookError, match=re.escape(said)):
        planned_lines(text)


def test_spreadsheet_formulas_are_made_harmless(bench):
    _, runs = runs_of(bench, "=reed", note="=HYPERLINK(1)")
    row = rows_of(as_run_sheet(runs, "@plan"))[0]
    assert row["swimmer"] == "'=reed" and row["series"] == "'@plan" and row["note"].startswith("'=HYPERLINK")


def test_a_page_asks_for_nothing_and_escapes_what_people_typed(bench):
    bench.stock("fluid", code="<b>oil</b>", kind="silicone-oil", grade="12500 cSt")
    plan, runs = runs_of(bench)
    page = as_page(plan, runs, "Planned <script>", ["a & b"])
    assert not re.search(r"https?:|src=|href=|url\(|@import|<script", page)
    assert "default-src 'none'" in page
    assert "&lt;b&gt;oil&lt;/b&gt;" in page and "Planned &lt;script&gt;" in page and "a &amp; b" in page


def test_a_page_has_a_box_for_each_run_and_caution_and_room_to_write(bench):
    plan, runs = runs_of(bench)
    page = as_page(plan, runs, "Planned")
    for i in range(1, len(runs) + 1):
        assert f'aria-label="run {i} done"' in page
    assert page.count('class="fill"') == 5 * len(runs)
    for name in ("magnets", "coils", "oils", "biological"):  # a coil pair, an oil, a measured fluid
        assert CAUTIONS[name] in page
    assert CAUTIONS["drives"] not in page, "no motor here"
    assert "in every run: rig coil" in page and all(f in page for f in runs["f_typed"])


def test_json_is_in_si_with_null_for_what_is_absent(bench):
    plan = bench.plan("reed", **CELLS)
    rows = json.loads(as_json(at_frequency(plan, 0.5)))
    assert {r["f"] for r in rows} == {0.5} and all(r["f_ratio"] is None for r in rows)
    assert all(isinstance(r["cells"], dict) and isinstance(r["against"], list) for r in rows)


@pytest.mark.parametrize(
    ("seconds", "said"),
    [
        (3.21, "3.2 s"),
        (75.4, "75 s"),
        (110, "110 s"),
        (600, "10 min"),
        (5300, "88 min"),
        (9000, "2.5 h"),
        (float("nan"), ""),
    ],
)
def test_a_time_is_said_as_one_waits(seconds, said):
    assert duration(seconds) == said


def test_a_sheet_of_a_swimmer_that_is_not_built_says_so(bench):
    plan = bench.plan("reed", d="1.5 mm", **CELLS)
    assert "not on the shelf" in plan.notes[-1]
    assert "not on the shelf" in as_page(plan, to_run(plan, reach(plan, 2.0)), "x")
    with pytest.raises(Refusal, match="nothing is left"):
        to_run(plan, reach(plan, 2.0).iloc[:0])
