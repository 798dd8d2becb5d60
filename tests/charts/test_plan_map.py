"""Plan's map and coverage: where zones, lines, names and rings stand, on planes whose answers are plain.

Every expected place is worked out here by hand from powers of ten; no drawing of our own serves as truth.
"""

from types import SimpleNamespace

import numpy as np
import pandas as pd
import pytest

from labbook.charts.palette import text_width
from labbook.charts.plan_coverage import coverage
from labbook.charts.plan_map import NOMINAL, along, ground, plan_map
from labbook.charts.plan_marks import LINE, apart, joined, numbers, spread_out, thinned
from labbook.charts.plan_words import CLEAR, Worded, placed
from labbook.charts.plan_zones import hatch, tint, union

F, MU = np.geomspace(0.01, 10.0, 31), np.geomspace(0.01, 10.0, 21)  # three decades each
NONE = pd.DataFrame(columns=["code", "fluid", "f", "mu", "place"])


def zone(name="inertia", verdict="doubtful", side="above", edge=None):
    """f = mu: the diagonal, unless another edge is given."""
    return SimpleNamespace(name=name, verdict=verdict, why="", side=side, edge=MU if edge is None else edge)


def fluids(**mu):
    return pd.DataFrame({"code": list(mu), "mu": list(mu.values())})


def runs(*rows):
    return pd.DataFrame(rows, columns=["code", "fluid", "f", "mu"])


def drawn(zones=(), levels=(), target=None, stock=None, done_runs=NONE, **more):
    below = ground(
        f=F, mu=MU, zones=list(zones), fluids=fluids(oil=1.0) if stock is None else stock, runs=done_runs
    )
    given = dict(proposed=NONE, waiting=NONE, done=NONE, surface=np.sqrt(F[None, :] * MU[:, None])) | more
    return plan_map(f=F, mu=MU, below=below, zones=list(zones), levels=levels, target=target, **given)


def of(spec, kind):
    return [row for row in spec["datasets"]["rows"] if row["kind"] == kind]


# ---- zones


def test_a_doubtful_zone_is_tinted_from_its_edge_to_the_frame():
    spec = drawn([zone()])
    found = of(spec, "doubtful")
    # f = mu runs from corner to corner, straight in the logarithms: its ends are enough
    assert [(r["mu"], r["low"], r["high"]) for r in found] == [(0.01, 0.01, 10.0), (10.0, 10.0, 10.0)]
    assert of(spec, "forbidden") == [] and of(spec, "hatch") == []


def test_what_is_forbidden_is_hatched_and_not_tinted_as_doubtful():
    spec = drawn([zone(), zone(verdict="forbidden", edge=10.0 * MU)])
    # at mu = 0.1 doubtful from 0.1 to 1 Hz, forbidden from 1 Hz on; f = 10 mu leaves the frame at mu = 1
    doubtful, forbidden = (sorted(of(spec, k), key=lambda r: r["mu"]) for k in ("doubtful", "forbidden"))
    assert (doubtful[0]["low"], doubtful[0]["high"]) == (0.01, pytest.approx(0.1))
    assert [(r["mu"], r["low"]) for r in forbidden if r["mu"] < 0.9] == [(0.01, pytest.approx(0.1))]
    # a bend is drawn to a row in 128: 3 decades / 128 is 5.5 %
    assert min(r["mu"] for r in forbidden if r["low"] > 9.99) == pytest.approx(1.0, rel=0.06)
    lines = of(spec, "hatch")
    assert len(lines) > 10
    for line in lines:
        for f, mu in ((line["f"], line["mu"]), (line["f2"], line["mu2"])):
            # a line ends within one of its 400 places of the edge: 6 decades / 400, some 4 %
            assert f > 10.0 * mu * 0.95 and f < 10.0 * 1.001


def test_zones_above_and_below_meet_without_being_tinted_twice():
    both = [zone(), zone("slow", side="below", edge=np.full(21, 0.1))]
    rows = of(drawn(both), "doubtful")
    for mu in {r["mu"] for r in rows}:
        parts = sorted((r["low"], r["high"]) for r in rows if r["mu"] == mu)
        assert all(a[1] <= b[0] * 1.001 for a, b in zip(parts, parts[1:], strict=False)), mu
    where = union([*both], F, MU)
    inside = where.holds(np.array([0.05, 0.5, 0.5]), np.array([1.0, 1.0, 0.1]))
    assert inside.tolist() == [True, False, True]  # slow; clear of both; past f = mu


def test_of_two_zones_the_nearer_edge_begins_the_tint():
    rows = of(drawn([zone(), zone("camera", edge=np.full(21, 1.0))]), "doubtful")
    assert {(r["mu"], r["low"]) for r in rows} >= {(0.01, 0.01), (10.0, 1.0)}
    slow = [zone("slow", side="below", edge=np.full(21, x)) for x in (0.1, 0.2)]
    assert {r["high"] for r in of(drawn(slow), "doubtful")} == {0.2}


def test_an_edge_that_is_not_known_shades_nothing():
    where = union([zone(edge=np.full(21, np.nan))], F, MU)
    assert where.above is None and tint(where) == [] and hatch(where, 1.5) == []


# ---- lines


def test_a_line_of_equal_number_stands_where_the_number_has_that_value():
    spec = drawn(levels=(1.0,), target=2.0)
    # sqrt(f mu) = 1: f = 1/mu, and 4/mu for 2
    assert [(r["f"], r["mu"]) for r in of(spec, "levels")] == [(100.0, 0.01), (0.1, 10.0)]
    assert [(r["f"], r["mu"]) for r in of(spec, "target")] == [(400.0, 0.01), (0.4, 10.0)]
    words = {r["text"]: r for r in of(spec, "words")}
    assert set(words) == {"Sp 2, target", "Sp 1"}
    for text, product in (("Sp 2, target", 4.0), ("Sp 1", 1.0)):
        # names stand on lines that were laid out in pixels and rounded to five digits
        assert words[text]["f"] * words[text]["mu"] == pytest.approx(product, rel=0.02)


def test_a_level_that_is_the_target_is_not_drawn_twice():
    spec = drawn(levels=(1.0, 2.0), target=2.0)
    assert {r["line"] for r in of(spec, "levels")} == {"1"}


def test_a_number_that_is_absent_has_no_lines():
    spec = drawn(levels=(1.0,), target=2.0, surface=np.full((21, 31), np.nan))
    assert of(spec, "levels") == of(spec, "target") == of(spec, "words") == []
    assert np.isnan(along(np.full((21, 31), np.nan), F, 1.0)).all()


# ---- names


def along_of(found):
    """(dx, dy) in pixels from a name's place to the point further along."""
    x, y = (
        np.log10([r / 0.01 for r in pair]) / 3.0
        for pair in ((found["f"], found["f2"]), (found["mu"], found["mu2"]))
    )
    return (x[1] - x[0]) * NOMINAL[0], (y[1] - y[0]) * NOMINAL[1]


@pytest.mark.parametrize(("side", "edge", "baseline"), [
    ("above", MU, "top"),  # rises to the right: higher f is below the letters
    ("below", MU, "bottom"),
    ("above", 0.1 / MU, "bottom"),  # falls to the right: higher f is above them
    ("below", 0.1 / MU, "top"),
    ("above", np.full(21, 1.0), "top"),  # upright, read from below: higher f is on the letters' lower side
])  # fmt: skip
def test_a_zone_has_its_name_inside_and_read_from_left_to_right(side, edge, baseline):
    (found,) = placed([Worded("inertia", edge, side, "zone")], F, MU, NOMINAL)
    assert found["baseline"] == baseline and found["dy"] == (4 if baseline == "top" else -4)
    dx, dy = along_of(found)
    assert dx > 0 or (abs(dx) < 0.1 and dy > 0)


def test_names_keep_clear_of_each_other_and_of_the_frame():
    asked = [
        Worded(f"camera: doubtful {i}", np.full(21, x), "above", "zone")
        for i, x in enumerate((1.0, 1.05, 1.1))
    ]
    found = placed(asked, F, MU, NOMINAL)
    half = text_width(asked[0].text, 11) / 2
    at = [np.log10(r["mu"] / 0.01) / 3.0 * NOMINAL[1] for r in found]
    assert len(found) >= 2 and min(at) > half and max(at) < NOMINAL[1] - half
    # 1.05 is 5 pixels beside 1.0: their names cannot stand side by side, so one lies above the other
    assert all(
        abs(a - b) >= 2 * half or abs(i - j) == 0
        for i, a in enumerate(at)
        for j, b in enumerate(at)
        if i != j
    )
    assert CLEAR > 5


def test_a_line_outside_the_frame_has_no_name():
    assert placed([Worded("far", np.full(21, 1e3), "above", "zone")], F, MU, NOMINAL) == []


def test_names_of_fluids_stand_a_line_apart_beside_their_lines():
    rows = apart(fluids(a=1.0, b=1.01, c=1.02, d=0.02), MU, 320.0)
    y = [np.log10(r["at"] / 0.01) / 3.0 * 320.0 for r in rows]
    assert [r["name"] for r in rows] == ["d", "a", "b", "c"]
    assert np.diff(y)[1:] == pytest.approx(LINE, rel=1e-3)  # pushed apart, no further than need be
    assert rows[2]["at"] == pytest.approx(1.01, rel=1e-3), "the middle one stays"
    assert rows[0]["at"] == rows[0]["mu"] == 0.02, "the one that has room stays"


def test_more_fluids_than_lines_share_names_and_lose_none():
    many = fluids(**{f"oil{i:02d}": 0.1 * 1.05**i for i in range(40)})
    rows = apart(many, MU, 140.0)
    named = [r["name"] for r in rows if r["name"]]
    assert len(named) == 10 and len(rows) == 40
    said = sum(int(n.split(" and ")[1].split()[0]) + 1 if " and " in n else n.count(",") + 1 for n in named)
    assert said == 40


def test_places_are_spread_as_little_as_may_be():
    assert spread_out([0.0, 100.0], 10, -50, 200) == [0.0, 100.0]
    assert spread_out([50.0, 50.0, 50.0], 10, 0, 100) == [40.0, 50.0, 60.0]
    assert spread_out([98.0, 99.0], 10, 0, 100) == [90.0, 100.0]
    assert spread_out([1.0, 1.0], 10, 5, 100) == [5.0, 15.0]


# ---- runs


def test_proposals_in_one_place_share_a_ring():
    table = pd.DataFrame(
        {"place": [1, 2, 3, 4], "fluid": ["a", "a", "b", "a"], "f": [1.0, 1.0, 2.0, 1.0], "mu": 1.0}
    )
    assert [(r["place"], r["f"]) for r in joined(table)] == [("1,2,4", 1.0), ("3", 2.0)]
    assert numbers([1, 2, 3]) == "1–3" and numbers([7]) == "7"


def test_runs_that_fall_together_are_one_dot():
    many = runs(*((f"R-{i}", "oil", 1.0 * (1 + 1e-4 * i), 1.0) for i in range(50)), ("R-x", "oil", 2.0, 1.0))
    assert set(thinned(many, F, MU)["code"]) == {"R-0", "R-x"}


def test_every_kind_of_run_has_a_mark_of_its_own():
    one = runs(("R-1", "oil", 1.0, 1.0))
    spec = drawn(done_runs=one, proposed=one.assign(place=[1]), waiting=one, done=one)
    marks = {layer["name"]: layer["mark"] for layer in spec["layer"]}
    told = ("filled", "fill", "strokeDash", "size")
    looks = {k: [marks[k].get(t) for t in told]
             for k in ("runs", "proposed", "waiting", "done")}  # fmt: skip
    assert len(set(map(str, looks.values()))) == 4 and marks["waiting"]["strokeDash"]
    for kind in looks:
        assert len(of(spec, kind)) == 1
        layer = next(x for x in spec["layer"] if x["name"] == kind)
        assert layer["transform"] == [{"filter": f"datum.kind === '{kind}'"}]


def test_both_themes_and_no_address(samples):
    light, dark = drawn([zone()]), drawn([zone()], dark=True)
    assert light["datasets"] == dark["datasets"] and light["layer"] != dark["layer"]
    assert samples.addresses(light) == []
    # rows alone differ between two targets, so that a page draws what moved and builds nothing anew
    one, other = drawn(target=1.0), drawn(target=2.0)
    one.pop("datasets"), other.pop("datasets")
    assert one == other


# ---- coverage


def test_coverage_has_a_dot_for_kept_runs_and_a_ring_for_each_proposal():
    kept = pd.DataFrame({"code": ["R-1", "R-2", "R-3"], "swimmer": ["reed", "rush", "reed"],
                         "Sp": [1.0, 2.0, np.nan], "Re_omega": [0.1, 0.2, 0.3]})  # fmt: skip
    proposed = pd.DataFrame({"Sp": [4.0], "Re_omega": [1.0], "place": [1], "fluid": ["oil"]})
    spec, n = coverage(kept=kept, proposed=proposed, x="Sp", y="Re_omega", swimmer="reed", done=("R-1",))
    assert n == 2
    assert [r["code"] for r in of(spec, "own")] == ["R-1"] and [r["code"] for r in of(spec, "kept")] == [
        "R-2"
    ]
    assert [r["code"] for r in of(spec, "done")] == ["R-1"]
    assert [(r["x"], r["y"], r["place"]) for r in of(spec, "proposed")] == [(4.0, 1.0, "1")]
    low, high = spec["layer"][0]["encoding"]["x"]["scale"]["domain"]
    assert low < 1.0 and high > 4.0, "the ring is inside the frame"
    assert "Sp = " in "".join(spec["layer"][0]["encoding"]["x"]["axis"]["title"])


def test_coverage_takes_the_prediction_where_a_speed_is_not_measured_yet():
    kept = pd.DataFrame({"code": ["R-1"], "swimmer": ["reed"], "Sp": [1.0], "U_scaled": [0.01]})
    proposed = pd.DataFrame({"Sp": [2.0], "U_scaled_model": [0.015], "place": [1], "fluid": ["oil"]})
    spec, _ = coverage(
        kept=kept, proposed=proposed, x="Sp", y="U_scaled", swimmer="reed", proposed_y="U_scaled_model"
    )
    assert of(spec, "proposed")[0]["y"] == 0.015


def test_an_empty_group_has_a_frame_with_its_proposals():
    kept = pd.DataFrame(columns=["code", "swimmer", "Sp", "Re_omega"])
    proposed = pd.DataFrame({"Sp": [2.0], "Re_omega": [0.5], "place": [1], "fluid": ["oil"]})
    spec, n = coverage(kept=kept, proposed=proposed, x="Sp", y="Re_omega", swimmer="reed")
    assert n == 0 and len(of(spec, "proposed")) == 1
