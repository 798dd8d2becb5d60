"""Planned runs: targets met through the book's own numbers, limits, zones, inverse answers, proposals.

The worked tail (L 20 mm, d 1 mm, E 1.5 MPa, 1 Pa.s, 2 Hz: Sp 3.07367 with cylinder_finite, 81.918 as fourth
power of spheroid_asymptotic) and the free head's peak (Sp 2.090123, U = 0.015935643 omega L theta0^2) were
computed with an independent solution for the project's physics sheet.
"""

import math
import re

import numpy as np
import pytest

from labbook.book.plan_deriving import derived, fluids_of_viscosity
from labbook.book.plan_inverse import batches_near, inverse
from labbook.book.plan_limits import DOUBTFUL, FORBIDDEN, GOOD, judged
from labbook.book.plan_targets import frequency_for, median_density, optimum, reach, viscosity_for
from labbook.book.plan_zones import good_viscosities, plan_map
from labbook.book.planning import BEYOND, at_frequency, best_first, in_common, to_run
from labbook.errors import Refusal
from labbook.registry.regimes import Band, Regime

TAIL = {
    "form": "flexible tail",
    "L_body": "24 mm",
    "L_tail": "20.000 mm",
    "section": "rod",
    "d": "1.0000 mm",
    "E": "1.5000 MPa",
    "b": "2 mm",
    "theta0": "0.30 rad",
    "T": "22.0 degC",
    "h_wall": "50 mm",
}


@pytest.fixture
def thick(stocked):
    """The stocked shelf with a fluid of exactly 1 Pa.s and 970 kg/m3."""
    stocked.stock("fluid", code="one", kind="measured", rho="970 kg/m3")
    stocked.stock("reading", of="one", key="mu", value="1.0000(1) Pa.s", T="22.0 degC")
    return stocked


def row(table, fluid):
    return table.set_index("fluid").loc[fluid]


# ---- the target


def test_the_worked_tail_needs_2_hertz_for_its_sperm_number(thick):
    plan = thick.plan("new", fluids=["one"], **TAIL)
    found = row(reach(plan, 3.07367), "one")
    # six digits of the sheet's Sp are 4 x 2e-6 in f, and the fluid's mu is exact
    assert found["f"] == pytest.approx(2.0, rel=1e-5)
    assert found["Sp"] == pytest.approx(3.07367, rel=1e-9)
    # rho omega L^2/mu = 4.875752 for these (physics sheet, section 14)
    assert found["Re_omega"] == pytest.approx(4.875752, rel=1e-5)


def test_a_target_in_another_house_dialect(thick):
    thick.adopt_dialect("Sp", {"coefficient": "spheroid_asymptotic", "power": 1}, why="as in the paper")
    plan = thick.plan("new", fluids=["one"], **TAIL)
    found = row(reach(plan, 81.918), "one")
    assert found["f"] == pytest.approx(2.0, rel=2e-5) and found["Sp"] == pytest.approx(81.918, rel=1e-9)


@pytest.mark.parametrize("swimmer", ["reed-1", "ribbon-1", "pipe-1"])
def test_every_answer_lands_on_its_target_when_it_is_typed_on_the_form(filled, swimmer):
    table = reach(filled.plan(swimmer, theta0="0.3 rad", T="22.0 degC"), 2.0)
    assert len(table) == 4
    for found in table.to_dict("records"):
        typed = found["cells"] | {"f": f"{found['f']!r} Hz"}
        seen = filled.preview(**typed)
        assert seen.refused == {}
        assert seen.values["Sp"] == pytest.approx(2.0, rel=1e-6)
        for key in ("Re_omega", "U_model", "mu"):
            assert seen.values[key] == pytest.approx(found[key], rel=1e-6), key


def test_what_is_expected_carries_the_uncertainty_that_the_form_would_show(filled):
    table = at_frequency(filled.plan("reed-1", T="22.0(1) degC"), 0.5)
    found = row(table, "syrup")
    seen = filled.preview(**(found["cells"] | {"f": "0.500 Hz"}))
    for key in ("Sp", "Re_omega", "U_model"):
        assert seen.u[key] == pytest.approx(found[f"u_{key}"], rel=1e-6), key


def test_the_optimum_is_where_theory_puts_it(thick):
    thick.adopt_dialect("Sp", {"coefficient": "spheroid_asymptotic"}, why="as in the sheet")
    cells = TAIL | {
        "L_tail": "30.000 mm",
        "L_body": "36 mm",
        "d": "0.60000 mm",
        "b": "3.0000 mm",
    }  # b/L 0.1, L/a 100
    del cells["h_wall"]
    plan = thick.plan("new", fluids=["one"], **cells)
    assert optimum(plan) == pytest.approx(
        2.090123, rel=2e-5
    )  # the top is flat: a grid and a parabola find it so far
    found = row(reach(plan, 2.090123), "one")
    assert found["U_scaled_model"] == pytest.approx(0.015935643, rel=1e-6)


# ---- what a plan goes by


def test_what_is_not_given_comes_from_the_last_run_and_is_said(filled):
    plan = filled.plan("reed-1")
    assert plan.cells["theta0"] == "0.30(1) rad" and "R-0009" in plan.notes[0]
    assert plan.cells["T"].endswith("degC") and "newest" in plan.notes[1]
    assert "rig" not in plan.cells, "the last kept run named no rig"
    other = filled.plan("reed-1", theta0="0.2 rad", rig="coil-1")
    assert other.cells["theta0"] == "0.2 rad" and "theta0" not in other.notes[0]
    assert other.has_run.f_low == 0.5 and other.has_run.f_high == 2.0


def test_one_field_is_told_by_b_or_by_the_current(filled):
    assert filled.plan("screw-1", I_coil="2 A").cells.get("B") is None
    assert filled.plan("screw-1").cells["B"].startswith("2.00(3)")


def test_a_book_without_runs_takes_22_degrees_and_says_so(stocked):
    plan = stocked.plan("reed-1")
    assert plan.cells["T"] == "22(1) degC" and plan.notes == ("T 22(1) degC: no run tells another",)
    told = row(at_frequency(plan, 1.0), "syrup")
    assert np.isnan(told["U_model"]) and "no predicted speed: needs theta0" in told["against"][-1]


def test_a_swimmer_changed_in_a_plan_is_changed_there_alone(filled):
    plan = filled.plan("reed-1", d="2.00(1) mm", E="3.0(1) MPa")
    assert plan.built and plan.swimmer.value("d") == pytest.approx(2e-3)
    before, after = (row(at_frequency(p, 1.0), "syrup")["Sp"] for p in (filled.plan("reed-1"), plan))
    assert after < before / 2.0
    assert filled.plan("reed-1").swimmer.value("d") == pytest.approx(1e-3)


def test_fluids_are_those_not_retired_or_those_named(filled):
    filled.retire("fluid", "gly85", why="watered down")
    assert "gly85" not in set(reach(filled.plan("reed-1"), 2.0)["fluid"])
    assert reach(filled.plan("reed-1", fluids=["gly85"]), 2.0)["fluid"].tolist() == ["gly85"]


# ---- what stands against a run


def test_re_omega_is_judged_by_the_books_own_regimes(filled):
    def verdict(mu_f):
        return row(at_frequency(filled.plan("reed-1", T="22.0 degC"), mu_f), "syrup")

    # rho omega L^2/mu = 1380 x 2 pi f x 0.03^2/4.10 = 1.9034 f
    assert verdict(0.05)["verdict"] == GOOD  # 0.095
    assert (
        verdict(0.06)["verdict"] == DOUBTFUL and "Re_omega above 0.1" in verdict(0.06)["against"][0]
    )  # 0.114
    assert verdict(0.60)["verdict"] == FORBIDDEN and "Re_omega above 1" in verdict(0.60)["against"][0]  # 1.14
    filled.set_regime(
        Regime("creeping", (Band("Re_omega", high=0.01, high_closed=False),), "stricter"), why="x"
    )
    assert verdict(0.05)["against"][0].startswith("Re_omega above 0.01: inertia begins to count")


def test_step_out_is_forbidden_and_its_margin_doubtful(filled):
    plan = filled.plan("screw-1", T="25.0 degC", fluids=["oil-5k"])
    at_1 = row(at_frequency(plan, 1.0), "oil-5k")
    step_out = at_1["f_stepout"]
    assert step_out == pytest.approx(1.0 / at_1["f_ratio"])

    def against(share):
        return " ".join(row(at_frequency(plan, share * step_out), "oil-5k")["against"])

    assert "f_ratio above 1: the magnet slips" in against(1.001)
    assert "f_ratio within its uncertainty of being above 1" in against(0.999)
    assert "f_ratio" not in against(0.5)
    assert "Re_omega above 0.1" in against(1.5), "and less grave, so it is said after it"
    assert against(1.5).startswith("f_ratio above 1")


def test_the_rig_its_field_and_its_camera_set_limits(filled):
    filled.stock("rig", code="coil-1", fps="4.00 fps", why="camera noted")
    told = row(at_frequency(filled.plan("reed-1", rig="coil-1", B="9 mT"), 3.0), "syrup")["against"]
    assert "f above 2 Hz: faster than coil-1 has run so far" in told
    assert [s for s in told if "frames a beat" in s] == [
        "f above 2 Hz: less than two frames a beat, the beat cannot be told (Nyquist)"
    ], "of one thing the gravest alone"
    assert any(s.startswith("B above") and "stronger than coil-1" in s for s in told)
    slow = row(at_frequency(filled.plan("reed-1", rig="coil-1"), 0.3), "syrup")["against"]
    assert "f below 0.5 Hz: slower than coil-1 has run so far" in slow


def test_an_angle_beyond_the_linear_range_and_a_near_wall_are_doubtful(filled):
    table = at_frequency(filled.plan("reed-1", theta0="0.5 rad", T="22.0 degC"), 0.04)
    assert any("0.3 rad" in s for s in in_common(table))
    assert row(table, "syrup")["verdict"] == DOUBTFUL
    near = row(at_frequency(filled.plan("reed-1", h_wall="4 mm", T="22.0 degC"), 0.04), "syrup")
    assert any("wall" in s for s in near["against"])


def test_the_best_come_first_and_what_one_could_run_is_set_to_three_digits(filled):
    table = reach(filled.plan("reed-1", T="22.0 degC"), 2.0)
    order = best_first(table)["verdict"].map([GOOD, DOUBTFUL, FORBIDDEN, BEYOND].index)
    assert (np.diff(order) >= 0).all()
    runs = to_run(filled.plan("reed-1", T="22.0 degC"), table)
    assert FORBIDDEN not in set(runs["verdict"])
    for found in runs.to_dict("records"):
        assert float(found["f_typed"].split()[0]) == pytest.approx(found["f"], rel=1e-12)
        assert found["Sp"] == pytest.approx(
            2.0, rel=2e-3
        )  # half of the third digit of f, to the quarter power


# ---- the plane


def test_edges_and_lines_of_the_plane_stand_where_the_formulas_put_them(thick):
    plan = thick.plan("new", **TAIL)
    seen = plan_map(plan, levels=(2.0, 3.07367))
    edge = {z.verdict: z for z in seen.zones if z.name == "inertia"}
    for verdict, limit in ((DOUBTFUL, 0.1), (FORBIDDEN, 1.0)):
        # f = limit mu/(2 pi rho L^2)
        assert edge[verdict].side == "above"
        assert edge[verdict].edge == pytest.approx(
            limit * seen.mu / (2 * math.pi * seen.rho * 0.02**2), rel=1e-9
        )
    # at fixed Sp mu f is constant: 2 Pa.s Hz for the worked tail
    assert seen.lines[3.07367] * seen.mu == pytest.approx(np.full(len(seen.mu), 2.0), rel=1e-5)
    Re = seen.grid["Re_omega"]
    assert Re == pytest.approx(
        seen.rho * 2 * math.pi * seen.f[None, :] * 0.02**2 / seen.mu[:, None], rel=1e-9
    )
    assert (seen.verdict[Re > 1.0] == FORBIDDEN).all() and (seen.verdict[Re < 0.1] != FORBIDDEN).all()


def test_the_plane_tells_of_the_fluids_and_earlier_runs_and_what_holds_everywhere(filled):
    seen = plan_map(filled.plan("reed-1", theta0="0.5 rad", T="22.0 degC"))
    assert set(seen.fluids["code"]) == {"water-1", "gly85", "oil-5k", "syrup"}
    assert seen.fluids.set_index("code")["mu"]["syrup"] == pytest.approx(
        4.10, rel=5e-3
    )  # its reading at 22 degC
    assert seen.runs["code"].tolist() == ["R-0001", "R-0002", "R-0003", "R-0009"]
    assert any("0.3 rad" in s for s in seen.everywhere)
    assert list(seen.lines) == [1.0, 4.0], "the limits of the book's regimes on Sp"


def test_the_sentence_on_viscosities_is_true(thick):
    plan = thick.plan("new", **TAIL)
    said = good_viscosities(plan, 2.0)
    low = float(said.split("from ")[1].split(" to ")[0])
    # Re_omega < 0.1 at Sp 2: mu f = 2 (2/3.07367)^4, so mu^2 > 2 pi rho L^2 x that/0.1 (rho: the fluids'
    # median)
    needed = math.sqrt(2 * math.pi * plan_map(plan).rho * 0.02**2 * 2.0 * (2.0 / 3.07367) ** 4 / 0.1)
    assert (
        needed <= low <= needed * 10 ** (5 / 40) * 1.06
    )  # the next of forty steps over five decades, two digits
    assert "no viscosity puts new at Sp = 2 without a doubt" in good_viscosities(
        thick.plan("new", **TAIL | {"theta0": "0.5 rad"}), 2.0
    )


# ---- the inverse question


@pytest.mark.parametrize(("key", "expected"), [("d", 1e-3), ("E", 1.5e6), ("L_tail", 0.020), ("mu", 1.0)])
def test_the_worked_tail_is_found_again_from_its_sperm_number(thick, key, expected):
    start = TAIL | {
        "d": {"d": "3 mm"}.get(key, TAIL["d"]),
        "E": {"E": "40 MPa"}.get(key, TAIL["E"]),
        "L_tail": {"L_tail": "12 mm"}.get(key, TAIL["L_tail"]),
    }
    found = inverse(thick.plan("new", fluids=["one"], **start), key, 2.0, 3.07367)
    # the sheet's six digits of Sp, 1.6e-6: times 4 in E and mu, less in d and L
    assert found[key].iloc[0] == pytest.approx(expected, rel=1e-5)
    assert found["Sp"].iloc[0] == pytest.approx(3.07367, rel=1e-6)


@pytest.mark.parametrize(
    ("swimmer", "key"),
    [
        ("reed-1", "d"),
        ("reed-1", "L_tail"),
        ("ribbon-1", "t"),
        ("ribbon-1", "w"),
        ("pipe-1", "D"),
        ("pipe-1", "d_in"),
        ("reed-1", "E"),
    ],
)
def test_inverse_answers_typed_into_a_plan_land_on_the_target(filled, swimmer, key):
    found = inverse(filled.plan(swimmer, T="22.0 degC"), key, 0.05, 2.0)
    reached = found[np.isfinite(found[key])]
    assert len(reached)
    unit = "Pa" if key == "E" else "m"
    for one in reached.to_dict("records"):
        changed = filled.plan(
            swimmer, fluids=[one["fluid"]], T="22.0 degC", **{key: f"{one[key]:.12e} {unit}"}
        )
        assert at_frequency(changed, 0.05)["Sp"].iloc[0] == pytest.approx(2.0, rel=1e-6)
    for one in found[~np.isfinite(found[key])].to_dict("records"):
        assert one["verdict"] == BEYOND and "no " in one["against"][0]


def test_the_slope_says_how_exactly_it_has_to_be_made(thick):
    found = inverse(thick.plan("new", fluids=["one"], **TAIL), "E", 2.0, 2.0)
    assert found["slope"].iloc[0] == pytest.approx(
        -0.25, rel=1e-2
    )  # Sp goes as E^(-1/4); a step of 1 % is taken
    # E^(-1/4): a batch sixteen times as stiff halves Sp
    assert viscosity_for(thick.plan("new", fluids=["one"], **TAIL), 3.07367 / 2.0, 2.0) == pytest.approx(
        1 / 16, rel=1e-5
    )


def test_a_size_that_is_looked_for_is_as_well_known_as_the_present_one(thick):
    found = inverse(thick.plan("new", fluids=["one"], **TAIL | {"d": "3.00(3) mm"}), "d", 2.0, 3.07367)
    typed = at_frequency(thick.plan("new", fluids=["one"], **TAIL | {"d": "1.00(1) mm"}), 2.0)
    assert found["u_Sp"].iloc[0] == pytest.approx(typed["u_Sp"].iloc[0], rel=1e-4)


def test_the_nearest_batches_of_the_shelf(filled):
    assert [c for c, _ in batches_near(filled.plan("reed-1"), 1.0e6)] == [
        "sil-2",
        "sil-1",
    ]  # 0.8 and 1.5 MPa: by ratio


# ---- proposals


def test_a_gap_is_filled_with_runs_that_are_not_forbidden(filled):
    plan = filled.plan("reed-1", rig="coil-1", T="22.0 degC", fluids=["syrup", "oil-5k"])
    found = filled.propose(plan, 3)
    assert len(found.runs) == 3 and FORBIDDEN not in set(found.runs["verdict"])
    assert found.after < found.before and "maximin" in found.criterion
    assert set(found.kept["swimmer"]) == {"reed-1", "ribbon-1", "pipe-1"}, "kept runs of the same form"
    assert found.runs["f"].between(0.5 * 0.999, 2.0 * 1.001).all(), "within what the rig has run"
    assert all("nearest kept run R-" in why for why in found.runs["why"])


def test_a_proposed_run_stops_being_a_gap_once_it_is_logged(filled):
    plan = filled.plan("reed-1", rig="coil-1", T="22.0 degC", fluids=["syrup"])
    first = filled.propose(plan, 1).runs.iloc[0]
    filled.record(**(first["cells"] | {"U": "0.05(1) mm/s"}), confirm=True)
    again = filled.propose(filled.plan("reed-1", rig="coil-1", T="22.0 degC", fluids=["syrup"]), 1)
    assert again.runs["f"].iloc[0] != first["f"]
    assert again.before < np.inf


def test_amplitudes_vary_where_an_axis_is_the_amplitude(filled):
    found = filled.propose(
        filled.plan("reed-1", T="22.0 degC", fluids=["syrup"]),
        4,
        fill=("Sp", "theta0"),
        within={"Sp": (0.5, 3.0), "theta0": (0.1, 0.3)},
    )
    assert found.runs["theta0"].nunique() > 1 and found.runs["theta0"].between(0.1, 0.3).all()
    assert [c["theta0"] for c in found.runs["cells"]] == [f"{x:.3g} rad" for x in found.runs["theta0"]]
    assert found.runs["Sp"].between(0.5, 3.0).all()


def test_strict_proposals_have_nothing_against_them(thick):
    plan = thick.plan("new", fluids=["one"], **TAIL)
    found = thick.propose(plan, 3, strict=True, within={"Sp": (0.3, 1.2), "Re_omega": (1e-3, 1.0)})
    assert set(found.runs["verdict"]) == {GOOD}


def test_the_maximum_is_pinned_down_near_where_theory_has_it(thick):
    thick.stock("fluid", code="ten", kind="measured", rho="970 kg/m3")
    thick.stock("reading", of="ten", key="mu", value="10.000(1) Pa.s", T="22.0 degC")
    plan = thick.plan("new", fluids=["ten"], **TAIL)
    found = thick.propose(plan, 6, top=True)
    top = optimum(plan)
    # at best three at each edge: u/(sqrt 6 ln 1.4) of the slope, over twice the curvature of some 6 (the
    # curve of the # sheet falls from 0.01570 at Sp 2 to 0.00765 at 3, so by 0.72 over (ln 1.44)^2 = 0.13)
    assert np.isinf(found.before) and found.after == pytest.approx(
        0.05 / (6**0.5 * np.log(1.4)) / 12, rel=0.2
    )
    assert found.runs["Sp"].between(top / 1.4 * 0.999, top * 1.4 * 1.001).all()
    assert found.runs["Sp"].min() < top < found.runs["Sp"].max(), "from both sides"
    assert any("where theory has it" in s for s in found.notes)


def test_a_helix_has_its_own_axes(filled):
    found = filled.propose(filled.plan("screw-1", fluids=["oil-5k", "syrup"], T="22.0 degC", rig="coil-1"), 2)
    assert "f_ratio" in found.criterion


# ---- bad input


@pytest.mark.parametrize(
    ("change", "reason", "remedy"),
    [
        ({"E": None}, "names no material", "material="),
        ({"section": None, "d": None}, "section of new is not complete", "section=rod"),
        ({"L_tail": None}, "no tail length", "L_tail="),
    ],
)
def test_what_a_swimmer_lacks_is_said_with_what_would_do(thick, change, reason, remedy):
    with pytest.raises(Refusal) as refused:
        reach(thick.plan("new", **TAIL | change), 2.0)
    assert reason in refused.value.reason and remedy in refused.value.remedy


def test_a_target_that_no_fluid_reaches_names_the_viscosity_or_the_tail_that_would(thick):
    plan = thick.plan("new", fluids=["water-1"], **TAIL)
    with pytest.raises(Refusal, match="water-1 comes nearest.*a viscosity of .* would reach it between"):
        reach(plan, 8.0)
    with pytest.raises(Refusal, match="softer, thinner or longer"):
        reach(plan, 400.0)
    with pytest.raises(Refusal, match="stiffer, thicker or shorter"):
        reach(plan, 1e-3)
    with pytest.raises(Refusal, match="no sperm number"):
        reach(plan, -2.0)


@pytest.mark.parametrize(
    ("asked", "said"),
    [
        (dict(swimmer="reed-99"), "no swimmer has this code"),
        (dict(swimmer="reed-1", fluids=["none"]), "no fluid"),
        (dict(swimmer="reed-1", rig="none"), "no rig"),
        (dict(swimmer="reed-1", material="none"), "no material"),
        (dict(swimmer="reed-1", U="1 mm/s"), "no cell of a planned run"),
        (dict(swimmer="reed-1", theta0="3 mm"), "angle"),
        (dict(swimmer="reed-1", h_wall="1 mm"), "closer than the head"),
        (dict(swimmer="reed-1", L_tail="40 mm"), "longer than the body"),
    ],
)
def test_unknown_codes_and_impossible_cells_are_refused(filled, asked, said):
    with pytest.raises(Refusal, match=said):
        filled.plan(asked.pop("swimmer"), **asked)


def test_questions_that_have_no_answer_are_refused(filled):
    plan = filled.plan("reed-1", T="22.0 degC")
    for refused, said in (
        (lambda: inverse(plan, "t", 1.0, 2.0), "one of d, L_tail, E, mu"),
        (lambda: inverse(plan, "d", 1.0, 1e6), "can be reached"),
        (lambda: filled.propose(plan, 0), "how many runs"),
        (lambda: filled.propose(plan, 2, fill=("Sp",)), "names no plane"),
        (lambda: filled.propose(plan, 2, fill=("Sp", "speed")), "is no quantity or number"),
        (lambda: filled.propose(plan, 2, within={"Sp": (900.0, 1000.0)}), "reaches no place there"),
        (lambda: filled.propose(plan, 2, within={"Sp": (3.0, 1.0)}), "is no range"),
        (lambda: optimum(filled.plan("screw-1")), "no target was given"),
    ):
        with pytest.raises(Refusal, match=said):
            refused()


def test_fluids_without_objection_lie_inside_the_range_that_is_said(filled):
    plan, seen = filled.plan("reed-1"), 0
    for Sp in (1.2, 1.5, 2.0):
        said = good_viscosities(plan, Sp)
        if "nothing against it" not in said:
            continue
        low, high = (float(x) for x in re.search(r"from (\S+) to (\S+) Pa.s", said).groups())
        rho = median_density(derived(plan, 1.0, [fluid.id for fluid in plan.fluids]))
        # within the ends, and 2 % beyond them; no oil thicker than 100 Pa.s is asked for
        mu = np.array([1.01 * low, np.sqrt(low * high), 0.99 * high, 0.98 * low, min(1.02 * high, 100.0)])
        ids, shelf = np.arange(1, 6), fluids_of_viscosity(plan, mu, rho)
        f = frequency_for(plan, Sp, ids, shelf)
        verdict, _ = judged(plan, derived(plan, f, ids, shelf=shelf), f)
        assert (verdict[:3] == GOOD).all() and verdict[3] != GOOD
        assert verdict[4] != GOOD or high > 99.0
        seen += 1
    assert seen
