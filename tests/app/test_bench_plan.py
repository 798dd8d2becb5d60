"""Planned runs on Bench: a touch fills the form, the logged run ticks its line off, a sheet is dropped."""

import html

import pytest

from labbook import Book
from labbook.app import bench_plan
from labbook.app.bench_plan import Line, is_run_of
from labbook.exchange.plan_sheets import as_run_sheet, planned_lines

SEEN = {"T": "20.8 degC", "U": "0.0043(9) mm/s"}


@pytest.fixture
def sheet(demo_copy):
    """Three planned runs of sedge-05 as the sheet that Plan and the command line write."""
    with Book.open(demo_copy) as book:
        return as_run_sheet(
            book.propose(book.plan("sedge-05", fluids=["sil12500-a", "syrup-a"]), 3).runs, "plan of a test"
        )


def drop(page, name, content):
    """That file in the zone for planned sheets."""
    zone = next(u for u in page.at.file_uploader if u.key.startswith(bench_plan.SHEET))
    zone.set_value((name, content if isinstance(content, bytes) else content.encode(), "text/csv"))
    return page.run()


@pytest.fixture
def bench(open_page, demo_copy, sheet):
    """Bench with the three lines on it."""
    page = open_page(demo_copy, "bench")
    page.at.session_state[bench_plan.LINES] = tuple(Line(c) for c in planned_lines(sheet))
    return page.run()


def lines(page):
    return page.at.session_state[bench_plan.LINES]


def touch(page, i):
    page.at.button(key=f"bench:planned:{i}").click()
    return page.run()


def field(page, key):
    return page.at.text_input(key=f"bench:{key}").value


def log(page, **cells):
    for key, text in cells.items():
        page.at.text_input(key=f"bench:{key}").set_value(text)
    page.run()
    page.press("Log trial")
    if any(b.label == "It is right, log it" for b in page.at.button):
        page.press("It is right, log it")
    return page


def last_run(path):
    with Book.open(path) as book:
        return book.runs(kept=False).iloc[-1]


def test_bench_without_a_plan_has_no_list(open_page, demo_book):
    page = open_page(demo_book, "bench")
    assert not [b for b in page.at.button if (b.key or "").startswith("bench:planned")]


def test_one_touch_fills_the_form_with_the_lines_settings(bench):
    page = touch(bench, 1)
    planned = lines(page)[1].cells
    for key in ("swimmer", "fluid", "rig"):
        assert page.at.selectbox(key=f"bench:{key}").value == planned[key]
    for key in ("f", "theta0", "I_coil", "h_wall", "note"):
        assert field(page, key) == planned[key], key
    assert page.at.selectbox(key="bench:drive").value == planned["drive"]
    # what is to be seen stays open, the temperature among it: it was planned for, and is not known
    assert not any(field(page, k) for k in ("T", "U", "A_tip"))
    assert "planned at" in field(page, "note")


def test_another_line_replaces_the_first_wholly(bench):
    page = touch(touch(bench, 0), 2)
    planned = lines(page)[2].cells
    assert field(page, "f") == planned["f"] and page.at.selectbox(key="bench:fluid").value == planned["fluid"]


def test_the_logged_run_ticks_its_line_off(bench, demo_copy):
    page = log(touch(bench, 1), **SEEN)
    run = last_run(demo_copy)
    assert [line.code for line in lines(page)] == ["", run["code"], ""]
    button = page.at.button(key="bench:planned:1")
    assert button.disabled and run["code"] in button.label
    assert "1 of 3 logged" in " ".join(m.value for m in page.at.markdown)
    planned = lines(page)[1].cells
    assert (run["swimmer"], run["fluid"], run["series"]) == (
        planned["swimmer"],
        planned["fluid"],
        "plan of a test",
    )
    assert run["f"] == pytest.approx(float(planned["f"].split()[0]))
    assert run["T"] == pytest.approx(293.95) and "planned at" in run["note"]


def test_all_three_can_be_logged_and_the_list_taken_away(bench, demo_copy):
    page = bench
    for i in range(3):
        page = log(touch(page, i), **SEEN)
    assert all(line.code for line in lines(page)) and len({line.code for line in lines(page)}) == 3
    page.at.button(key="bench:planned:clear").click()
    page.run()
    assert bench_plan.LINES not in page.at.session_state


def test_a_refused_trial_ticks_nothing_off_and_keeps_the_form(bench):
    page = touch(bench, 0)
    page.at.text_input(key="bench:T").set_value("warm")
    page.run()
    page.press("Log trial")
    assert not any(line.code for line in lines(page))
    assert field(page, "T") == "warm" and field(page, "f") == lines(page)[0].cells["f"]


def test_a_run_in_another_fluid_is_another_run(bench):
    page = touch(bench, 0)
    other = "sil1000-a"
    page.at.selectbox(key="bench:fluid").set_value(other)
    page = log(page, **SEEN)
    assert not any(line.code for line in lines(page))


CELLS = {"swimmer": "a", "fluid": "oil", "f": "1.00 Hz", "theta0": "0.20 rad"}


@pytest.mark.parametrize(("cells", "same"), [
    ({}, True),
    ({"f": "1.04 Hz"}, True),  # set a little off: within 5 %
    ({"f": "60 rpm"}, True),
    ({"f": "1.06 Hz"}, False),
    ({"theta0": "11.5 deg"}, True),  # 0.2007 rad
    ({"theta0": "0.25 rad"}, False),
    ({"theta0": ""}, False),
    ({"swimmer": "b"}, False),
    ({"T": "20 degC"}, True),
])  # fmt: skip
def test_which_run_a_line_stands_for(cells, same):
    assert is_run_of(CELLS | cells, Line(CELLS)) is same


def test_of_equal_lines_each_is_ticked_off_once(open_page, demo_copy, sheet):
    page = open_page(demo_copy, "bench")
    one = Line(planned_lines(sheet)[0])
    page.at.session_state[bench_plan.LINES] = (one, one)
    page.run()
    page = log(touch(page, 1), **SEEN)
    assert [bool(line.code) for line in lines(page)] == [False, True], "the one in hand"
    page = log(touch(page, 0), **SEEN)
    assert all(line.code for line in lines(page))


# ---- a sheet


def test_a_dropped_sheet_stands_as_lines(open_page, demo_copy, sheet):
    page = drop(open_page(demo_copy, "bench"), "plan.csv", sheet)
    assert [dict(line.cells) for line in lines(page)] == planned_lines(sheet)
    page.run()
    assert len(lines(page)) == 3, "it is read once"
    assert page.at.button(key="bench:planned:2").label.startswith("3 · ")


def test_a_sheet_joins_those_that_wait_and_sends_away_those_done(bench, sheet):
    page = log(touch(bench, 0), **SEEN)
    page = drop(page, "more.csv", sheet)
    assert len(lines(page)) == 5 and not any(line.code for line in lines(page))


@pytest.mark.parametrize(("name", "content", "said"), [
    ("plan.csv", "swimmer,fluid,at,f\nsedge-05,syrup-a,,1 kg\n", "1 kg"),
    ("plan.csv", "swimmer,fluid,at,f\n", "holds no planned line"),
    ("plan.csv", "a,b\n1,2\n", "no such column"),
    ("plan.csv", b"\xff\xfe\x00x", "not UTF-8"),
    ("plan.csv", "swimmer,fluid,at,f\n" + "sedge-05,syrup-a,,1 Hz\n" * 60, "at most 50"),
])  # fmt: skip
def test_a_bad_sheet_is_refused_and_what_waits_stays(bench, name, content, said):
    before = lines(bench)
    page = drop(bench, name, content)
    assert said in html.unescape(" ".join(page.said()))
    assert lines(page) == before and page.at.button(key="bench:planned:0")
