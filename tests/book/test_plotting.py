"""What a plot asks of the book, against plain SQL on the same file and against the chart's own counting."""

import math
import sqlite3
from contextlib import closing

import numpy as np
import pytest
from sqlalchemy import event

from labbook import Book
from labbook.book import plot_grid, plotting
from labbook.book.asking import Question
from labbook.book.plot_source import GROUPS
from labbook.book.plotting import plot_columns, plot_frame
from labbook.charts import drawable
from labbook.errors import Refusal


@pytest.fixture(scope="module")
def demo(demo_book):
    with Book.open(demo_book) as book:
        yield book


def by_hand(demo_book, statement):
    with closing(sqlite3.connect(demo_book)) as connection:
        return connection.execute(statement).fetchall()


QUESTIONS = (Question(), Question(state="all"), Question(state="void"), Question(people=("wren",)),
             Question(regimes=("working tail",)),
             Question(ranges={"Re": (-1.0, 1e-3)}, since="2026-01-01"))  # fmt: skip


@pytest.mark.parametrize("asked", QUESTIONS, ids=lambda q: q.in_words())
@pytest.mark.parametrize(("x", "y", "log"), [
    ("Sp", "U_scaled", True), ("Sp", "St", True), ("Re", "stride", False), ("T", "De", True),
    ("Sp", "Sp", True),
])  # fmt: skip
def test_the_grid_counts_as_the_chart_does_run_by_run(demo, asked, x, y, log):
    # two routes to one count: a CASE in SQL, and masks in the chart over single runs
    single = demo.ask(plot_frame, asked, x, y, "swimmer", log_x=log, log_y=log)
    grid = demo.ask(plot_frame, asked, x, y, "swimmer", log_x=log, log_y=log, most=0)
    shown, reasons = drawable.split(single.frame, x=x, y=y, log_x=log, log_y=log)
    for why, runs in single.left_out.items():
        reasons[why] = reasons.get(why, 0) + runs
    assert grid.left_out == reasons
    assert grid.frame["n"].sum() == len(shown)


DIALECTS = (
    {"Sp": {"rate": "f", "power": 1}},
    {"Sp": {"coefficient": "eight_pi_mu", "length": "L_body"}, "U_scaled": {"length": "L_body", "rate": "f"}},
    {"Sp": {"coefficient": "lighthill"}, "U_scaled": {"rate": "f"}},  # needs a helix pitch, which no tail has
)  # fmt: skip


@pytest.mark.parametrize("dialects", DIALECTS, ids=str)
@pytest.mark.parametrize("asked", QUESTIONS, ids=lambda q: q.in_words())
@pytest.mark.parametrize(("log", "group"), [(True, "swimmer"), (False, "by"), (True, None)])
def test_a_grid_in_another_dialect_counts_as_the_chart_does_run_by_run(demo, asked, dialects, log, group):
    axes = ("Sp", "U_scaled", group)
    single = demo.ask(plot_frame, asked, *axes, dialects=dialects)
    grid = demo.ask(plot_frame, asked, *axes, log_x=log, log_y=log, most=0, dialects=dialects)
    shown, reasons = drawable.split(single.frame, x="Sp", y="U_scaled", log_x=log, log_y=log)
    for why, runs in single.left_out.items():
        reasons[why] = reasons.get(why, 0) + runs
    assert grid.left_out == reasons
    assert grid.frame["n"].sum() == len(shown)
    assert single.dialects == grid.dialects and set(grid.dialects) == set(dialects)
    if len(shown):
        assert ("lighthill" in str(dialects)) is False
        told = np.log if log else np.asarray
        for key in ("Sp", "U_scaled"):
            # the mean of cell means is that of all runs; the order of a sum of hundreds leaves 1e-12
            mean = np.average(told(grid.frame[key]), weights=grid.frame["n"])
            assert mean == pytest.approx(told(shown[key]).mean(), rel=1e-12)
        if group:
            counted = grid.frame["n"].groupby(grid.frame[group]).sum().to_dict()
            assert counted == shown[group].value_counts().to_dict()


def test_a_grid_in_another_dialect_stands_at_the_restated_values(demo, demo_book):
    # physics.md section 9: f for omega and the fourth power are Sp^4/(2 pi), worked here on plain SQL
    house = dict(by_hand(demo_book, "select run.code, Sp from run join resolved on run_id = run.id"))
    u = dict(by_hand(demo_book, "select run.code, u_own_Sp from run join resolved on run_id = run.id"))
    spoken = DIALECTS[0]
    for most in (0, 5000):
        found = demo.ask(plot_frame, Question(), "Sp", "U_scaled", "swimmer", most=most, dialects=spoken).frame
        named = found[found["code"].notna() & found["Sp"].notna()]
        assert len(named) > 50
        wanted = np.array([house[c] ** 4 / (2 * math.pi) for c in named["code"]])
        # exp(log(x)) of a cell loses a last digit
        assert named["Sp"].to_numpy() == pytest.approx(wanted, rel=1e-12)
        bars = wanted * 4 * np.array([u[c] / house[c] for c in named["code"]])
        assert named["u_own_Sp"].to_numpy() == pytest.approx(bars, rel=1e-9)
    found = demo.ask(plot_frame, Question(), "Sp", "U_scaled", dialects=spoken)
    assert found.dialects == {"Sp": "rate f, power 1"}


def test_a_run_without_a_value_in_a_dialect_is_counted_with_the_reason(demo, demo_book):
    (have,), = by_hand(demo_book, "select count(Sp) from resolved where state = 'kept'")
    reason = "no Sp in this dialect (needs a helix pitch)"
    for most in (0, 5000):
        found = demo.ask(plot_frame, Question(), "Sp", "U", most=most, dialects=DIALECTS[2])
        assert found.left_out[reason] == have > 0
        assert found.dialects == {"Sp": "coefficient lighthill"}, "U has no dialect and U_scaled is not drawn"


def test_a_run_without_x_is_counted_as_that_whatever_its_y_lost(demo, demo_book):
    (without, lost), = by_hand(demo_book, """select sum(U_scaled is null),
        sum(U_scaled is not null and Sp is not null) from resolved where state = 'kept'""")  # fmt: skip
    single = demo.ask(plot_frame, Question(), "U_scaled", "Sp", dialects=DIALECTS[2])
    grid = demo.ask(plot_frame, Question(), "U_scaled", "Sp", most=0, dialects=DIALECTS[2])
    reason = "no Sp in this dialect (needs a helix pitch)"
    assert single.left_out[reason] == grid.left_out[reason] == lost > 0
    told = [why for why in grid.left_out if why.endswith("without U_scaled")]
    assert sum(grid.left_out[why] for why in told) == without > 0


def test_the_house_dialect_by_any_words_is_counted_by_the_database(demo, monkeypatch):
    monkeypatch.setattr(plotting, "dialect_grid", None)  # would raise if it were called
    house = {"Sp": {"rate": "omega"}, "Re": {"length": "L_tail"}}  # Re is on no axis
    grid = demo.ask(plot_frame, Question(), "Sp", "U_scaled", most=0, dialects=house)
    assert grid.binned and grid.dialects == {}


def test_an_unknown_dialect_is_refused(demo):
    with pytest.raises(Refusal):
        demo.ask(plot_frame, Question(), "Sp", "U", dialects={"Sp": {"rate": "rpm"}})


def test_a_small_answer_is_given_run_by_run_and_a_large_one_on_a_grid(demo):
    assert not demo.ask(plot_frame, Question(), "Sp", "U_scaled").binned
    assert demo.ask(plot_frame, Question(), "Sp", "U_scaled", most=100).binned


@pytest.mark.parametrize("log", [True, False])
def test_cells_stand_at_the_mean_of_their_runs(demo, log):
    # a mean of cell means, weighted by their runs, is the mean of all runs
    single = demo.ask(plot_frame, Question(), "Sp", "U_scaled").frame
    single = single[(single["Sp"] > 0) & (single["U_scaled"] > 0)]
    grid = demo.ask(plot_frame, Question(ranges={"Sp": (0, math.inf), "U_scaled": (1e-300, math.inf)}), "Sp",
                    "U_scaled", log_x=log, log_y=log, most=0).frame  # fmt: skip
    told = np.log if log else np.asarray
    for key in ("Sp", "U_scaled"):
        # sums of a few hundred doubles: 1e-12 leaves room for their order alone
        expected = told(single[key]).mean()
        assert np.average(told(grid[key]), weights=grid["n"]) == pytest.approx(expected, rel=1e-12)


def test_a_run_that_stands_still_has_no_place_on_a_log_axis(filled):
    # one of the ten runs is typed "0.000(3) mm/s", one is void; the same runs all stand on a linear axis
    for most in (0, 5000):
        found = filled.ask(plot_frame, Question(), "f", "U", most=most)
        shown, reasons = drawable.split(found.frame, x="f", y="U", log_x=True, log_y=True)
        assert found.left_out | reasons == {"void": 1, "U zero or negative on a log axis": 1}
        assert drawable.runs_of(shown).sum() == 8
    level = filled.ask(plot_frame, Question(), "f", "U", log_y=False, most=0)
    assert level.left_out == {"void": 1} and level.frame["n"].sum() == 9


def test_no_two_cells_of_a_group_lie_in_one_place(demo):
    grid = demo.ask(plot_frame, Question(), "Sp", "U_scaled", "fluid", most=0).frame
    span = [np.log(grid[k]) for k in ("Sp", "U_scaled")]
    cells = [np.floor((s - s.min()) / (np.ptp(s) * (1 + 1e-9)) * n)
             for s, n in zip(span, (plot_grid.COLUMNS, plot_grid.ROWS), strict=True)]  # fmt: skip
    # the means of the outermost cells shift the grid a little: a cell may be split over that edge, not more
    assert len(set(zip(grid["fluid"], *cells, strict=True))) > 0.9 * len(grid)
    assert len(grid) > 100


def test_a_cell_of_one_run_is_named_and_has_its_bars(demo):
    single = demo.ask(plot_frame, Question(), "Sp", "U_scaled", "swimmer").frame.set_index("code")
    grid = demo.ask(plot_frame, Question(), "Sp", "U_scaled", "swimmer", most=0).frame
    alone = grid[grid["n"] == 1]
    assert len(alone) > 50
    assert grid.loc[grid["n"] > 1, ["code", "u_Sp"]].isna().all(axis=None)
    same = single.loc[alone["code"]]
    assert same["swimmer"].tolist() == alone["swimmer"].tolist()
    # exp(log(x)) loses a last digit
    assert alone["Sp"].to_numpy() == pytest.approx(same["Sp"].to_numpy(), rel=1e-12)
    for column in ("u_own_Sp", "u_shared_Sp", "u_U_scaled"):
        assert alone[column].to_numpy() == pytest.approx(same[column].to_numpy(), rel=1e-15, nan_ok=True)


@pytest.mark.parametrize("group", GROUPS)
def test_the_groups_add_up(demo, demo_book, group):
    column = f"run.{group}" if group in ("by", "series") else f"{group}.code"
    joined = "" if group in ("by", "series") else f"left join {group} on {group}.id = r.{group}_id"
    counted = dict(by_hand(demo_book, f"""
        select {column}, count(*) from resolved r join run on run.id = r.run_id {joined}
        where r.state = 'kept' and r.Sp > 0 and r.U_scaled > 0 group by 1"""))  # fmt: skip
    grid = demo.ask(plot_frame, Question(), "Sp", "U_scaled", group, most=0).frame
    counted["none"] = counted.pop(None, 0)
    ours = grid["n"].groupby(grid[group].fillna("none")).sum().to_dict()
    assert {"none": 0} | ours == counted


@pytest.mark.parametrize("group", [None, *GROUPS])
@pytest.mark.parametrize("state", ["kept", "all"])
def test_columns_are_those_of_plain_sql(demo, demo_book, group, state):
    told = {"by": "run.by", "series": "run.series", None: "null"}.get(group, f"{group}.code")
    where = "where r.state = 'kept'" if state == "kept" else ""
    rows = by_hand(demo_book, f"""
        select r.Sp, r.stride, {told} from resolved r join run on run.id = r.run_id
        join swimmer on swimmer.id = r.swimmer_id join fluid on fluid.id = r.fluid_id
        left join material on material.id = r.material_id {where}""")  # fmt: skip
    found = demo.ask(plot_columns, Question(state=state), ("Sp", "stride"), group)
    names = found[group].tolist() if group else [None] * len(found["Sp"])
    values = [[None if math.isnan(v) else v for v in found[key].tolist()] for key in ("Sp", "stride")]
    ours = list(zip(*values, names, strict=True))
    assert sorted(ours, key=repr) == sorted(rows, key=repr)


def test_the_plot_of_every_run_reads_nothing_but_its_index(demo, demo_book):
    # judged by SQLite's own planner
    seen = []

    def listen(connection, cursor, statement, parameters, context, many):
        seen.append((statement, parameters))

    event.listen(demo.engine, "before_cursor_execute", listen)
    try:
        demo.ask(plot_columns, Question(), ("Sp", "stride"), "swimmer")
    finally:
        event.remove(demo.engine, "before_cursor_execute", listen)
    statement, parameters = next(s for s in seen if "stride" in s[0])
    with closing(sqlite3.connect(demo_book)) as connection:
        plan = [r[3] for r in connection.execute(f"explain query plan {statement}", parameters)]
    assert any("COVERING INDEX ix_resolved_plot" in step for step in plan), plan


def test_sqlite_without_mathematics_gives_the_same(demo, monkeypatch):
    builtin = demo.ask(plot_frame, Question(), "Sp", "U_scaled", "swimmer", most=0)
    monkeypatch.setattr(plot_grid, "_MATHEMATICS", "an option that no SQLite has")
    taught = demo.ask(plot_frame, Question(), "Sp", "U_scaled", "swimmer", most=0)
    assert taught.left_out == builtin.left_out
    assert taught.frame["n"].tolist() == builtin.frame["n"].tolist()
    assert taught.frame["Sp"].to_numpy() == pytest.approx(builtin.frame["Sp"].to_numpy(), rel=1e-12)


def test_an_empty_answer_keeps_its_columns(demo):
    for most in (0, 5000):
        found = demo.ask(plot_frame, Question(text="no run says this"), "Sp", "U_scaled", "fluid", most=most)
        assert len(found.frame) == 0 and not found.left_out
        assert {"code", "Sp", "U_scaled", "fluid"} <= set(found.frame.columns)
    assert len(demo.ask(plot_columns, Question(text="no run says this"), ("Sp",), "by")["by"]) == 0


@pytest.mark.parametrize(("arguments", "field"), [(("Sp", "speed"), "key"), (("Spp", "U"), "key"),
                                                  (("Sp", "U", "rig"), "colour")])  # fmt: skip
def test_unknown_keys_and_groups_are_refused(demo, arguments, field):
    with pytest.raises(Refusal) as refused:
        demo.ask(plot_frame, Question(), *arguments)
    assert refused.value.field == field
