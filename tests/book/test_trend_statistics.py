"""Statistics of a trend over a book's runs: which runs, whose errors, planted truths found again, the text."""

import re
from dataclasses import replace

import numpy as np
import pytest

from labbook import Book
from labbook.book import trend_source
from labbook.book.asking import Question
from labbook.book.queries import count
from labbook.book.repeat_groups import grouped, narrowed, repeat_groups
from labbook.book.trend_group import FAMILIES, of_form, trend_group
from labbook.book.trend_source import TrendRuns, trend_runs
from labbook.book.trend_statistics import (
    BELOW,
    BEYOND,
    CHOSEN,
    STEPS,
    WHOLE,
    changed_over_time,
    family_names,
    outlying_runs,
    repeats_placed,
    slopes,
    statistics,
    top_of,
)
from labbook.book.trend_suspects import NEAR, suspects
from labbook.book.trend_tables import as_numbers, repeats_table, tops_table
from labbook.book.trend_told import axis_name, interval, paragraphs, verdict
from labbook.errors import Refusal
from labbook.physics import tails
from labbook.physics.trend_points import SharedError

SP_TOP = 2.090123  # physics.md section 8: free head at a prescribed angle, b/L = 0.1


@pytest.fixture(scope="module")
def book(demo_book):
    with Book.open(demo_book) as opened:
        yield opened


@pytest.fixture(scope="module")
def group(book):
    return book.ask(trend_group, Question(), "Sp", "U_scaled")


@pytest.fixture(scope="module")
def found(group):
    return statistics(group, "material")


def speed(Sp):
    return tails.response(drive="free_head_angle", Sp=Sp, head=0.1, head_drag=0.76577553).force


def made(n=300, swimmers=6, seed=3, **more):
    """A TrendRuns of flexible tails on the theory's curve: 5 % own u in y, one modulus of 3 batches each."""
    rng = np.random.default_rng(seed)
    swimmer = rng.integers(0, swimmers, n)
    batch = swimmer % 3
    x = np.exp(rng.uniform(np.log(0.9), np.log(4.2), n))
    y = speed(x) * np.exp(0.05 * rng.normal(size=n))
    named = {"swimmer": swimmer, "material": batch, "fluid": rng.integers(0, 2, n)}
    texts = {k: np.array([f"{k[0]}{i}" for i in v], object) for k, v in named.items()}
    zero = np.zeros(n)
    parts = {
        "x_key": "Sp", "y_key": "U_scaled", "code": np.array([f"R-{i:04d}" for i in range(n)], object),
        "day": 739_000 + np.arange(n), **texts, "form": np.full(n, "flexible tail", object),
        "settings": {"f": np.arange(1.0, n + 1.0), "theta0": np.full(n, 0.3), "B": np.full(n, 4e-3)},
        "x": x, "y": y, "own_x": 0.002 * x, "own_y": 0.05 * y,
        "shared": (SharedError("E", batch.astype(object), -0.01 * x, zero),),
        "own": {"T": (0.002 * x, zero), "U": (zero, 0.05 * y)}, "beyond": np.zeros(n, bool),
        "T": np.full(n, 295.0), "wall": np.full(n, 0.03),
    }  # fmt: skip
    return TrendRuns(**parts | more)


# ---- the runs


def test_every_run_that_the_question_finds_is_used_or_counted(book, group):
    with book.engine.connect() as connection:
        (kept,) = connection.exec_driver_sql("select count(*) from run where state = 'kept'").one()
        (void,) = connection.exec_driver_sql("select count(*) from run where state = 'void'").one()
        rows = connection.exec_driver_sql(
            "select s.form, count(*) from run r join swimmer s on s.id = r.swimmer_id"
            " where r.state = 'kept' group by s.form"
        )
        per_form = {form: n for form, n in rows}
    assert (group.found, group.excluded["void"], group.form) == (kept, void, "flexible tail")
    for form, n in per_form.items():
        if form != "flexible tail":
            assert group.excluded[f"of form {form}"] == n
    # void runs are beside those found
    assert len(group.points.index) + sum(group.excluded.values()) - void == kept
    assert set(group.runs.form) == {"flexible tail"} and len(group.runs) == per_form["flexible tail"]


def test_own_and_shared_uncertainties_are_those_that_the_book_stores(book):
    runs = book.ask(trend_runs, Question(), "Sp", "U_scaled")
    table = book.frame(Question(), keys=("Sp", "U_scaled", "T", "f", "theta0", "B"), texts=("code", "form"))
    table = table.set_index("code").loc[list(runs.code)]
    for key, value, own, side in (("Sp", runs.x, runs.own_x, "x"), ("U_scaled", runs.y, runs.own_y, "y")):
        known = np.isfinite(value)
        assert np.array_equal(known, table[key].notna().to_numpy()) and known.sum() > 500
        # the same arithmetic on both sides, in another order: rounding
        assert value[known] == pytest.approx(table[key][known], rel=1e-9)
        assert own[known] == pytest.approx(table[f"u_own_{key}"][known], rel=1e-9, abs=1e-15)
        shared = np.sqrt(sum(getattr(s, side) ** 2 for s in runs.shared))
        assert shared[known] == pytest.approx(table[f"u_shared_{key}"][known], rel=1e-9, abs=1e-15)
    assert list(runs.form) == list(table["form"])
    for key in ("f", "theta0", "B"):
        assert np.array_equal(runs.settings[key], table[key].to_numpy(), equal_nan=True)
    assert np.array_equal(runs.T, table["T"].to_numpy(), equal_nan=True)


def test_an_error_belongs_to_the_batch_the_fluid_the_swimmer_or_the_rig(book):
    runs = book.ask(trend_runs, Question(), "Sp", "U_scaled")
    shared = {s.name: s for s in runs.shared}

    def owners_of(source, by):
        reached = shared[source].x != 0.0
        pairs = set(zip(shared[source].owner[reached], by[reached], strict=True))
        return len(pairs), len({owner for owner, _ in pairs}), len({name for _, name in pairs})

    pairs, owners, batches = owners_of("E", runs.material)
    # six rubbers and the steel; a batch that was measured again has sets that err apart
    assert pairs == owners > batches == 7, "no set of readings is of two batches"
    # one modulus moves several swimmers, a tail's length one, a reading of viscosity whoever swam in it
    for source, by, wide in (("E", runs.material, True), ("mu_readings", runs.fluid, True),
                             ("L_tail", runs.swimmer, False)):  # fmt: skip
        reached = shared[source].x != 0.0
        for name in set(by[reached]):
            mine = reached & (by == name)
            if len(set(runs.swimmer[mine])) > 2 or not wide:
                pairs = set(zip(shared[source].owner[mine], runs.swimmer[mine], strict=True))
                assert (len(pairs) > len({owner for owner, _ in pairs})) == wide, (source, name)
    pairs, owners, swimmers = owners_of("L_tail", runs.swimmer)
    assert pairs == owners == swimmers >= 21
    pairs, owners, fluids = owners_of("mu_readings", runs.fluid)
    assert pairs == owners >= fluids


def test_rigid_controls_beside_the_maximum_do_not_drag_it():
    tails_alone = made()
    rng = np.random.default_rng(5)
    n, rigid = 100, made(n=100, seed=9)
    still = replace(rigid, form=np.full(n, "rigid tail", object), x=rng.uniform(1.5, 2.9, n), y=np.full(n, 0.012),
                    own_y=np.full(n, 0.003), swimmer=np.full(n, "stick", object))  # fmt: skip
    both = joined(tails_alone, still)
    top = top_of(of_form(both)).maximum
    alone = top_of(of_form(tails_alone)).maximum
    assert (top.x, top.y) == (alone.x, alone.y) and of_form(both).excluded["of form rigid tail"] == n
    assert top.x_low < SP_TOP < top.x_high
    dragged = top_of(of_form(both, "all")).maximum
    # 100 points at a fifth of the height: together they are no curve
    assert not dragged.found or dragged.verdict or dragged.between_y > 5 * max(alone.between_y, 0.02)


def joined(a, b):
    rows = {k: np.concatenate([getattr(a, k), getattr(b, k)])
            for k in ("code", "day", "swimmer", "fluid", "material", "form", "x", "y", "own_x", "own_y", "beyond",
                      "T", "wall")}  # fmt: skip
    shared = tuple(
        SharedError(s.name, *(np.concatenate([getattr(s, k), getattr(t, k)]) for k in ("owner", "x", "y")))
        for s, t in zip(a.shared, b.shared, strict=True)
    )
    settings = {k: np.concatenate([a.settings[k], b.settings[k]]) for k in a.settings}
    own = {k: tuple(np.concatenate(p) for p in zip(a.own[k], b.own[k], strict=True)) for k in a.own}
    return replace(a, **rows, shared=shared, settings=settings, own=own)


@pytest.mark.parametrize(("asked", "axes", "form", "said"), [
    (Question(state="void"), ("Sp", "U_scaled"), "", "void runs stay out of statistics"),
    (Question(ranges={"Sp": (100, 200)}), ("Sp", "U_scaled"), "", "no kept run was found"),
    (Question(), ("Sp", "U_scaled"), "helix", "none of the 106 runs of form helix"),
    (Question(), ("Sp", "U_scaled"), "eel", "one of flexible tail, helix, rigid tail, undulating, hinged, or all"),
    (Question(), ("Sp", "speed"), "", "is no quantity or number of a run"),
])  # fmt: skip
def test_what_cannot_be_asked_is_said_in_a_sentence(book, asked, axes, form, said):
    with pytest.raises(Refusal) as refused:
        book.ask(trend_group, asked, *axes, form)
    assert said in str(refused.value)


def test_more_runs_than_can_be_waited_for_are_refused(book, monkeypatch):
    monkeypatch.setattr(trend_source, "MOST", 100)
    with pytest.raises(Refusal, match="'894': statistics take 100 runs at most; narrow the filter"):
        book.ask(trend_group, Question(), "Sp", "U_scaled")


def test_void_runs_stay_out_whatever_is_asked(book, group):
    every = book.ask(trend_group, Question(state="all"), "Sp", "U_scaled")
    assert np.array_equal(every.runs.code, group.runs.code) and every.excluded == group.excluded


# ---- planted truths


def test_the_maximum_of_the_group_and_of_its_batches_is_the_theorys():
    group = of_form(made(n=600, swimmers=12))
    top = top_of(group).maximum
    # 5 % of noise on some 250 runs and 1 % of shared error in x: the interval is a few per cent at most
    assert top.x_low < SP_TOP < top.x_high and top.x_high / top.x_low < 1.08
    assert top.y_low < speed(SP_TOP) < top.y_high
    names, more = family_names(group, "material")
    assert (names, more) == (("m0", "m1", "m2"), 0)
    for name in names:
        one = top_of(group, "material", name)
        assert one.n == np.sum(group.runs.material == name) and one.maximum.swimmers == 4
        assert one.maximum.x == pytest.approx(SP_TOP, rel=0.05)


def test_the_slope_on_either_side_and_in_a_range():
    group = of_form(made(n=600, swimmers=12))
    below, beyond = slopes(group, top_of(group).maximum)
    assert (below.where, beyond.where) == (BELOW, BEYOND)
    # physics.md section 8: Sp^4 at small Sp; from 0.9 to 1.5 the theory's own mean slope
    low, high = 0.9, top_of(group).maximum.window[0]
    mean = np.log(speed(high) / speed(low)) / np.log(high / low)
    assert below.law.slope == pytest.approx(mean, abs=0.3) and 3.0 < mean < 4.0 and beyond.law.slope < 0
    (chosen,) = slopes(group, None, (0.9, 1.2))
    assert chosen.where == CHOSEN and chosen.law.low >= 0.9 and chosen.law.high <= 1.2
    assert chosen.law.slope == pytest.approx(3.9, abs=0.6)
    (whole,) = slopes(group, None)
    assert whole.where == WHOLE and whole.law.n == 600
    (none,) = slopes(group, None, (10.0, 20.0))
    assert none.law is None and "0 usable runs" in none.why
    with pytest.raises(Refusal, match="lower end first"):
        slopes(group, None, (2.0, 1.0))


def test_a_batch_that_ages_is_named_and_the_others_are_not():
    runs = made(n=600, swimmers=12)
    years = (runs.day - runs.day.mean()) / 365.25
    aged = replace(runs, y=runs.y * np.where(runs.material == "m1", np.exp(-0.4 * years), 1.0))
    rows = {r.owner: r for r in changed_over_time(of_form(aged), "material").rows}
    assert rows["m1"].y.low < -0.4 < rows["m1"].y.high < 0.0 and rows["m1"].y.p_all < 0.01
    assert all(rows[m].y.p_all > 0.05 for m in ("m0", "m2"))
    assert changed_over_time(of_form(aged), "swimmer").owner == "swimmer"
    assert {r.owner for r in changed_over_time(of_form(aged), "swimmer").rows} == set(runs.swimmer)


def test_an_outlier_is_listed_with_the_reading_that_explains_it():
    runs = made()
    k = int(np.argmin(np.abs(runs.x - 1.2)))
    hot = runs.x.copy()
    own_x = runs.own_x.copy()
    # a thermometer 4 of its u off moves Sp by 16 %, where U_scaled goes as Sp^4
    own_x[k] = 0.04 * runs.x[k]
    hot[k] *= 1.0 + 4 * 0.04
    T = (own_x, np.zeros(len(runs)))
    far = outlying_runs(of_form(replace(runs, x=hot, own_x=0.002 * hot, own=runs.own | {"T": T}))).found
    assert [runs.code[row.index] for row in far.rows] == [runs.code[k]]
    assert far.rows[0].cause == "temperature" and far.rows[0].shift == pytest.approx(4.0, abs=1.5)
    assert far.rows[0].sentence.startswith(f"{runs.code[k]}: ")


def test_suspects_are_what_reaches_the_values_and_a_wall_nearby_slows():
    runs = made()
    causes = {c.name: c for c in suspects(runs)}
    assert list(causes) == ["temperature", "E"] and causes["E"].owner is runs.shared[0].owner
    wall = np.where(np.arange(len(runs)) < 5, NEAR + 0.02, 0.03)
    beyond = np.arange(len(runs)) > 290
    fluid = SharedError("mu_readings", runs.fluid, 0.01 * runs.x, 0.0 * runs.x)
    angle = (0.0 * runs.x, -0.04 * runs.y)
    more = replace(runs, wall=wall, beyond=beyond, shared=(*runs.shared, fluid), own=runs.own | {"theta0": angle})
    causes = {c.name: c for c in suspects(more)}
    assert set(causes) == {"temperature", "amplitude", "E", "fluid reading", "wall"}
    assert causes["wall"].sign == -1 and list(np.flatnonzero(causes["wall"].flag)) == [0, 1, 2, 3, 4]
    assert causes["fluid reading"].flag is more.beyond and causes["E"].flag is None
    stroke = replace(more, own={k: p for k, p in more.own.items() if k != "U"})
    assert {c.name: c for c in suspects(stroke)}["wall"].sign == 0


# ---- repeats


def columns(n, **more):
    same = {"code": [f"R-{i}" for i in range(n)], "swimmer": ["reed"] * n, "fluid": ["oil"] * n}
    found = {k: np.array(v, object) for k, v in same.items()}
    settings = {"f": np.ones(n), "theta0": np.full(n, np.nan), "B": np.full(n, np.nan)}
    return found | {"settings": settings, "T": np.full(n, 295.0), "own_y": np.ones(n)} | more


def test_repeats_are_summed_up_as_by_hand():
    f = np.array([0.500, 0.502, 0.510, 0.500, 0.500])
    y = np.array([1.0, 3.0, 9.0, 2.0, np.nan])
    rows = columns(5, y=y) | {"settings": {"f": f, "theta0": np.full(5, 0.3), "B": np.full(5, np.nan)}}
    rows["fluid"][3] = "syrup"
    groups = grouped("U", **rows)
    (row,) = groups.table.to_dict("records")
    assert row["codes"] == ("R-0", "R-1"), "0.51 Hz is another setting, syrup another fluid, one has no U"
    # by hand: mean 2, scatter root 2, over u = 1; chi-square 2 with one degree of freedom, table: p = 0.1573
    assert (row["n"], row["mean"], groups.runs) == (2, 2.0, 4)
    assert row["scatter"] == pytest.approx(2**0.5) and row["over_stated"] == pytest.approx(2**0.5)
    assert row["u_mean"] == pytest.approx(1.0) and row["p"] == pytest.approx(0.1573, abs=5e-5)
    assert (row["f_low"], row["f_high"], row["T_low"]) == (0.500, 0.502, 295.0)
    assert groups.bare == 0 and "B equal within 0.5 %" in groups.in_words()


def test_groups_of_which_only_the_frequency_is_known_are_told():
    groups = grouped("U", **columns(4, y=np.array([1.0, 2.0, 3.0, 4.0])))
    assert groups.bare == 1 and "1 group has neither theta0 nor B typed" in groups.in_words()
    none = grouped("U", **columns(1, y=np.ones(1)))
    assert none.table.empty and none.bare == 0 and "No run was repeated" in none.in_words()


def test_the_filter_of_a_group_finds_its_runs_and_no_others(book):
    groups = book.ask(repeat_groups, Question(), "U")
    assert len(groups.table) > 30
    wide = 0
    for group in groups.table.to_dict("records"):
        codes = set(book.frame(narrowed(Question(), group), keys=("U",), texts=("code",))["code"])
        assert codes >= set(group["codes"])
        untyped = [k for k in ("theta0", "B") if np.isnan(group[f"{k}_low"])]
        if not untyped:
            # a run set up alike without a U is found, and is none of the group's
            rest = book.frame(narrowed(Question(), group), keys=("U",), texts=("code",)).set_index("code")["U"]
            assert rest[list(codes - set(group["codes"]))].isna().all(), group["codes"]
        wide += len(untyped) > 0
    assert 0 < wide < len(groups.table)


def test_a_filter_that_is_there_is_kept(book):
    asked = Question(regimes=("creeping",), ranges={"Sp": (1, 3), "f": (0.0, 10.0)})
    groups = book.ask(repeat_groups, asked, "U_scaled")
    group = groups.table.to_dict("records")[0]
    alone = narrowed(asked, group)
    assert alone.regimes == ("creeping",) and alone.ranges["Sp"] == (1, 3)
    assert alone.ranges["f"] == pytest.approx((group["f_low"], group["f_high"]), rel=1e-9)
    assert book.ask(count, alone) == group["n"]


def test_groups_stand_at_the_means_of_their_runs(group, found):
    placed = repeats_placed(group, found.repeats)
    runs, table = group.runs, found.repeats.table
    assert len(placed) == len(table) > 5
    for at, row in zip(placed.itertuples(), table.itertuples(), strict=True):
        mine = np.isin(runs.code, row.codes)
        have = runs.x[mine & np.isfinite(runs.x)]
        assert at.x == pytest.approx(have.mean() if len(have) else np.nan, nan_ok=True)
        assert at.y == pytest.approx(runs.y[mine].mean())
        assert at.scatter == pytest.approx(np.std(runs.y[mine], ddof=1)) and at.n == mine.sum()


# ---- families, text, tables


def test_the_largest_families_are_looked_at_and_the_rest_counted(group, monkeypatch):
    monkeypatch.setattr("labbook.book.trend_statistics.MOST_FAMILIES", 2)
    names, more = family_names(group, "material")
    assert len(names) == 2 and more == 4
    sizes = {m: np.sum(group.runs.material[group.points.index] == m) for m in set(group.runs.material)}
    assert set(names) == set(sorted(sizes, key=sizes.get)[-2:])
    with pytest.raises(Refusal, match="material, swimmer, fluid, none"):
        family_names(group, "person")


def test_steps_are_told_in_order(group):
    told = []
    statistics(group, "none", (0.8, 1.5), told.append)
    assert tuple(told) == STEPS


def test_the_text_has_the_numbers_with_intervals_n_and_what_was_left_out(book, group, found):
    text = paragraphs(found, "kept", book.registry, "Sp = L_tail (zeta_n omega/EI)^(1/4).")
    top = found.top.maximum
    whole = "\n".join(text)
    assert text[0].startswith(f"Data: {len(group.points.index)} of the 894 runs found (kept), those of form flexible")
    assert "Axes: Sp = L_tail" in text[0] and "21 swimmers, 6 material batches, 7 fluids" in text[0]
    assert f"at Sp = {top.x:.3f} (95 % interval {top.x_low:.3f} to {top.x_high:.3f}), from {top.n} runs" in whole
    assert text[-1].startswith("Excluded beforehand: 26 runs void, 106 runs of form helix")
    assert whole.count("less than three own u above zero") == 1, "what all leave out is told once"
    for one in found.tops:
        assert one.name in whole
    assert len(re.findall(r"goes as Sp to the power", whole)) == 2
    assert "No change shown for" in whole and "groups of repeated runs" in whole and "utlier" in whole
    assert not re.search(r"\b(nan|inf|None)\b", whole)


def test_of_axes_without_a_curve_the_text_says_that_time_may_stand_for_something_else(book):
    mixed = book.ask(trend_group, Question(), "f", "U")
    text = "\n".join(paragraphs(statistics(mixed, "swimmer"), "kept", book.registry))
    assert "f in Hz, U in m/s" in text and "near f = " in text and "near x" not in text
    assert "U is no function of f alone" in text
    assert "By swimmer, no maximum is shown by any of 21" in text


def test_a_reason_names_the_axes():
    assert verdict("y is highest near x = 2 (x/y^2, xy)", "Sp", "U") == "U is highest near Sp = 2 (x/y^2, xy)"
    # an axis called y: a name that is put in is not replaced again
    assert verdict("x and y", "y", "x") == "y and x"


def test_an_interval_as_it_is_written():
    assert interval(2.1301, 2.105, 2.1537) == "2.130 (2.105 to 2.154)"
    assert interval(2.1301, np.nan, np.nan) == "2.13" and interval(np.nan, 1.0, 2.0) == ""
    assert interval(-0.2, -21.4, 20.1) == "0 (-21 to 20)"


def test_names_of_axes(book):
    assert axis_name("Sp", book.registry) == "Sp" and axis_name("U", book.registry) == "U"
    assert axis_name("U_scaled", book.registry) == "U/(ω L_tail θ₀²)"


@pytest.mark.parametrize("family", FAMILIES)
def test_tables_have_a_cell_under_every_heading(group, family):
    s = statistics(group, family)
    lines = tops_table([s.top, *s.tops], family, "Sp", "U")
    assert {len(line) for line in lines} == {6} and lines[1][0] == "all runs"
    assert len(lines) == 2 + len(s.tops) and (family == "none") == (not s.tops)
    assert {len(line) for line in repeats_table(s.repeats)} == {11}


def test_the_numbers_are_plain_and_none_where_unknown(found):
    import json

    told = json.loads(json.dumps(as_numbers(found), allow_nan=False))
    top = found.top.maximum
    assert told["maximum"]["x"] == top.x and told["maximum"]["x_low"] == top.x_low
    assert told["runs_used"] == 467 and told["excluded"]["void"] == 26
    bare = next(f for f in told["families"] if f["name"] == "soft-a")
    assert bare["x"] > 2 and bare["x_low"] is None and "no interval" in bare["said"]
    assert len(told["repeats"]["groups"]) == len(found.repeats.table)
    assert [s["where"] for s in told["slopes"]] == [BELOW, BEYOND]
