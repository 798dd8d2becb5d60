"""The trend's theory in every dialect that it has: curves, families, bands and the line of no residual."""

import math

import numpy as np
import pandas as pd
import pytest

from labbook.charts.theory import INPUTS, tail_curves, why_no_curve
from labbook.charts.theory_axes import Reach, has_theory, reach, takes, theory_on, why_none
from labbook.charts.theory_band import SOURCES, relative_u
from labbook.charts.theory_residual import inputs, residual_line
from labbook.errors import Refusal
from labbook.physics import rods, sections, tails, walls
from labbook.registry.dialects import AT_BIRTH

SWIMMER = {"L_tail": 0.030, "b": 3e-3, "mu": 5.0, "zeta_n": 18.0, "zeta_t": 12.0}


def frame(*rows, drive="free_head_angle", form="flexible tail"):
    """Runs with every column that the curves take; what a row does not give is absent."""
    full = [dict.fromkeys(INPUTS, np.nan) | {"drive": drive, "form": form, "swimmer": "reed"} | SWIMMER | row for row in rows]
    return pd.DataFrame(full)


def curve_of(runs, low, high, **options):
    found = tail_curves(runs, low, high, **options)
    assert not found.why
    return found.frame


def test_the_curve_is_the_speed_of_the_one_swimmer_it_was_given():
    runs, EI, theta0 = frame({}), 1e-7, 0.2
    for f in (0.05, 0.3, 1.0):
        omega = 2 * math.pi * f
        Sp = 0.030 * (18.0 * omega / EI) ** 0.25
        U = tails.free_speed(drive="free_head_angle", L=0.030, a=5e-4, EI=EI, mu=5.0, f=f, theta0=theta0,
                             b=3e-3, zeta_n=18.0, zeta_t=12.0)  # fmt: skip
        # the same formula, once with units and once without: rounding alone differs
        assert curve_of(runs, Sp, 2 * Sp)["y"].iloc[0] == pytest.approx(U / (omega * 0.030 * theta0**2), rel=1e-9)


# physics.md section 8, the table for b/L = 0.1, L/a = 100 in the coefficients of the spheroid
TABLE = [(1.0, 6.14119949e-03, 1.67386937e-03), (2.0, 5.75838456e-02, 1.56952783e-02),
         (3.0, 2.80621475e-02, 7.64872873e-03), (4.0, 1.51948173e-02, 4.14155887e-03)]  # fmt: skip
MU = 1.0
TABLED = {"L_tail": 0.030, "b": 3e-3, "mu": MU, "zeta_t": 2 * math.pi * MU / (math.log(100) - 0.5),
          "zeta_n": 4 * math.pi * MU / (math.log(100) + 0.5)}  # fmt: skip


@pytest.mark.parametrize(("Sp", "push", "speed"), TABLE)
def test_speed_and_push_are_the_worked_ones_in_a_house_of_another_drag_model(Sp, push, speed):
    runs = frame(TABLED)
    own = {"Sp": AT_BIRTH["Sp"] | {"coefficient": "spheroid_asymptotic"}, "U_scaled": AT_BIRTH["U_scaled"]}
    house = dict(coefficient="spheroid_asymptotic")
    # the table has nine figures
    assert curve_of(runs, Sp, 2 * Sp, spoken=own, **house)["y"].iloc[0] == pytest.approx(speed, rel=1e-8)
    assert curve_of(runs, Sp, 2 * Sp, y="F_scaled", **house)["y"].iloc[0] == pytest.approx(push, rel=1e-8)
    moved = own | {"Sp": own["Sp"] | {"power": 1}}
    found = curve_of(runs, Sp**4, 2 * Sp**4, spoken=moved, **house)
    assert found["y"].iloc[0] == pytest.approx(speed, rel=1e-8)
    assert found["x"].iloc[[0, -1]].tolist() == pytest.approx([Sp**4, 2 * Sp**4], rel=1e-12)


def test_a_longer_head_and_a_wall_are_in_the_curve():
    EI, omega = 1e-7, 2.0
    Sp = 0.030 * (18.0 * omega / EI) ** 0.25
    for more in ({"b_long": 5e-3}, {"D_tank": 0.04}, {"h_wall": 0.02}):
        U = tails.free_speed(drive="free_head_angle", L=0.030, a=5e-4, EI=EI, mu=5.0, f=omega / (2 * math.pi), theta0=0.2,
                             b=3e-3, zeta_n=18.0, zeta_t=12.0, **more)  # fmt: skip
        found = curve_of(frame(more), Sp, 2 * Sp)["y"].iloc[0]
        assert found == pytest.approx(U / (omega * 0.030 * 0.2**2), rel=1e-9)
        assert abs(found / curve_of(frame({}), Sp, 2 * Sp)["y"].iloc[0] - 1) > 1e-3
    # what a minority of runs has is not the swimmer's
    few = curve_of(frame({}, {}, {"D_tank": 0.04}), Sp, 2 * Sp)["y"].iloc[0]
    assert few == pytest.approx(curve_of(frame({}), Sp, 2 * Sp)["y"].iloc[0], rel=1e-12)


SPOKEN = {"Sp": {"length": "L_tail", "rate": "f", "coefficient": "cylinder_finite", "power": 1},
          "U_scaled": {"length": "L_tail", "rate": "f"}}  # fmt: skip


def test_the_curve_in_other_rates_and_powers_goes_through_the_same_swimmer():
    f, EI, theta0 = 0.3, 1e-7, 0.2
    U = tails.free_speed(drive="free_head_angle", L=0.030, a=5e-4, EI=EI, mu=5.0, f=f, theta0=theta0, b=3e-3,
                         zeta_n=18.0, zeta_t=12.0)  # fmt: skip
    first = 18.0 * f * 0.030**4 / EI  # zeta_n f L^4/EI, as the dialect's row has it
    curve = curve_of(frame({}), first, 2 * first, spoken=SPOKEN)
    assert curve["x"].iloc[[0, -1]].tolist() == pytest.approx([first, 2 * first], rel=1e-12)
    assert curve["y"].iloc[0] == pytest.approx(U / (f * 0.030 * theta0**2), rel=1e-9)


@pytest.mark.parametrize(("number", "name", "option"), [
    ("Sp", "length", "L_body"), ("Sp", "coefficient", "mu"), ("Sp", "coefficient", "spheroid_asymptotic"),
    ("U_scaled", "length", "L_body"),
])  # fmt: skip
def test_there_is_no_curve_where_each_swimmer_would_have_one_of_its_own(number, name, option):
    spoken = SPOKEN | {number: SPOKEN[number] | {name: option}}
    assert option in why_no_curve("cylinder_finite", spoken) and number in why_no_curve("cylinder_finite", spoken)
    found = tail_curves(frame({}), 1.0, 2.0, spoken=spoken)
    assert found.frame.empty and option in found.why
    assert why_no_curve("cylinder_finite", SPOKEN) == ""


def test_there_is_no_curve_without_a_zeta_t_of_the_same_model():
    # log_slender is 4 pi mu/ln(L/a), for zeta_n alone
    spoken = SPOKEN | {"Sp": SPOKEN["Sp"] | {"coefficient": "log_slender"}}
    assert "zeta_n alone" in why_no_curve("log_slender", spoken)


# ---- families


def small_and_large():
    return frame({"swimmer": "small", "b": 2e-3}, {"swimmer": "large", "b": 6e-3}, {"swimmer": "large", "b": 6e-3})


def test_each_swimmer_has_its_own_curve_over_its_own_span_and_a_little_more():
    spans = {"small": (1.0, 2.0), "large": (2.0, 4.0)}
    found = tail_curves(small_and_large(), 0.5, 8.0, family="swimmer", spans=spans)
    parts = dict(list(found.frame.groupby("family")))
    assert parts.keys() == spans.keys() and "a curve for each of 2" in found.words[0]
    for name, b in (("small", 2e-3), ("large", 6e-3)):
        alone = curve_of(frame({"b": b}), parts[name]["x"].min(), parts[name]["x"].max())
        assert parts[name]["y"].to_numpy() == pytest.approx(alone["y"].to_numpy(), rel=1e-9)
    assert (parts["small"]["x"].min(), parts["small"]["x"].max()) == pytest.approx((1 / 1.3, 2 * 1.3))
    # alone on the figure it goes from end to end
    one = tail_curves(small_and_large().iloc[:1], 0.5, 8.0, family="swimmer", spans={"small": (1.0, 2.0)}).frame
    assert (one["x"].min(), one["x"].max()) == pytest.approx((0.5, 8.0)) and set(one["family"]) == {"small"}


def test_groups_of_several_swimmers_share_the_curve_of_the_median_one():
    heads = (2e-3, 3e-3, 6e-3)
    runs = frame(*({"swimmer": f"s{b}", "b": b, "fluid": "syrup"} for b in heads))
    found = tail_curves(runs, 0.5, 8.0, family="fluid", spans={"syrup": (0.5, 8.0)})
    each = [curve_of(frame({"b": b}), 0.5, 8.0)["y"].to_numpy() for b in heads]
    assert found.frame["y"].to_numpy() == pytest.approx(each[1], rel=1e-12)
    assert set(found.frame["family"]) == {""} and "(medians)" in found.frame["label"].iloc[0]
    assert found.frame["low"].to_numpy() == pytest.approx(np.min(each, axis=0), rel=1e-12)
    assert found.frame["high"].to_numpy() == pytest.approx(np.max(each, axis=0), rel=1e-12)
    assert "median of 3 swimmers" in found.words[0]
    assert tail_curves(runs, 0.5, 8.0).frame["y"].tolist() == found.frame["y"].tolist()  # without any colour


def test_runs_without_a_series_are_a_group_of_that_name():
    runs = frame({"series": None}, {"swimmer": "other", "b": 6e-3, "series": "B"})
    found = tail_curves(runs, 0.5, 8.0, family="series", spans={"none given": (0.5, 8.0), "B": (0.5, 8.0)})
    assert set(found.frame["family"]) == {"none given", "B"}


def test_curves_that_cannot_be_told_apart_are_drawn_as_one():
    runs = frame({"swimmer": "a"}, {"swimmer": "b", "b": 3.02e-3})
    found = tail_curves(runs, 0.5, 8.0, family="swimmer", spans={"a": (0.5, 8.0), "b": (0.5, 8.0)})
    assert set(found.frame["family"]) == {""} and found.frame["label"].nunique() == 1


def test_never_more_than_six_curves():
    rows = [{"swimmer": f"s{i}", "b": 2e-3 * 1.2**i} for i in range(7) for _ in range(i + 1)]
    spans = {f"s{i}": (1.0, 3.0) for i in range(7)}
    found = tail_curves(frame(*rows), 1.0, 3.0, family="swimmer", spans=spans)
    assert set(found.frame["family"]) == {f"s{i}" for i in range(1, 7)}  # the one with fewest runs goes without
    assert "No curve for s0" in found.words


def test_runs_that_are_no_driven_tail_take_no_part():
    both = pd.concat([frame({}), frame({"b": 9e-3, "swimmer": "stick"}, form="rigid tail"),
                      frame({"b": 9e-3, "swimmer": "spun"}, drive="field")])  # fmt: skip
    assert curve_of(both, 0.5, 8.0)["y"].tolist() == curve_of(frame({}), 0.5, 8.0)["y"].tolist()


def test_a_tail_that_pivots_about_its_base_has_a_curve_without_a_head():
    runs = pd.concat([frame({"b": np.nan}, {"b": np.nan}, drive="pivoted_angle"), frame({"b": 9e-3, "swimmer": "free"})])
    found = tail_curves(runs, 2.0, 4.0)
    # physics.md section 8: the force of a pivoted tail at Sp = 2 is 0.233230 (ell/L)^2, ell = L/Sp; no head to drag
    assert found.frame["y"].iloc[0] == pytest.approx(0.233230 / 4 * (18.0 - 12.0) / 12.0, rel=3e-6)
    assert "base pivoted, ζ_n/ζ_t = 1.5" in found.frame["label"].iloc[0]


@pytest.mark.parametrize(("runs", "said"), [
    (frame({}, drive="field"), "free_head_angle"), (frame({}, form="helix"), "flexible tail"),
    (frame({"b": np.nan}), "b, which the curve takes: give the swimmer the radius b"),
    (frame({"zeta_n": np.nan, "zeta_t": np.nan}), "section"),
    (frame({"zeta_n": np.nan, "zeta_t": np.nan, "mu": np.nan}), "viscosity"),
])  # fmt: skip
def test_what_would_make_a_curve_possible_is_said(runs, said):
    found = tail_curves(runs, 1.0, 2.0)
    assert found.frame.empty and said in found.why and found.words == ()


# ---- bands

ROD = {"L_tail": 0.030, "d": 1e-3, "E": 1.5e6, "b": 2e-3, "mu": 1.0, "theta0": 0.3}
STRIP = {"L_tail": 0.020, "w": 2e-3, "t": 2e-4, "E": 1.5e6, "b": 2e-3, "mu": 0.2, "theta0": 0.3}
TUBE = {"L_tail": 0.030, "D": 1e-3, "d_in": 6e-4, "E": 1.5e6, "b": 2e-3, "mu": 5.0, "theta0": 0.3}


def drawn_speeds(known, section, omega, drawn):
    """Speeds with the inputs drawn together, each through the whole chain with no derivative anywhere."""
    v = known | drawn
    if section == "strip":
        a, second = sections.strip_radius(w=v["w"], t=v["t"]), sections.strip_second_moment(w=v["w"], t=v["t"])
        flatness = v["t"] / (v["w"] + v["t"])
    elif section == "tube":
        a, second, flatness = v["D"] / 2, sections.tube_second_moment(D=v["D"], d_in=v["d_in"]), 0.5
    else:
        a, second, flatness = v["d"] / 2, sections.rod_second_moment(d=v["d"]), 0.5
    zeta_n, zeta_t = rods.resistive_coefficients(model="cylinder_finite", L=v["L_tail"], a=a, mu=v["mu"], flatness=flatness)
    Sp = tails.sperm_number(L=v["L_tail"], zeta_n=zeta_n, omega=omega, EI=v["E"] * second)
    R = walls.sphere_drag(mu=v["mu"], b=v["b"])
    force = tails.response(drive="free_head_angle", Sp=Sp, head=v["b"] / v["L_tail"], head_drag=R / (zeta_n * v["L_tail"])).force
    return force * (zeta_n - zeta_t) * omega * v["L_tail"] ** 2 * 0.3**2 / (zeta_t * v["L_tail"] + R), Sp


@pytest.mark.parametrize(("section", "known"), [("rod", ROD), ("strip", STRIP), ("tube", TUBE)])
def test_the_band_is_what_drawn_swimmers_spread(section, known):
    # JCGM 101:2008; u of 1 % and 50 000 draws: second order and chance stay within 2 %
    full = dict.fromkeys((*SOURCES, "theta0", "h_wall", "D_tank"), np.nan) | known
    u = {key: 0.01 * known[key] for key in SOURCES if key in known}
    chance = np.random.default_rng(5)
    drawn = {key: known[key] + size * chance.standard_normal(50_000) for key, size in u.items()}
    for omega in (0.3, 3.0, 30.0):
        U, Sp = drawn_speeds(known, section, omega, {})
        many, _ = drawn_speeds(known, section, omega, drawn)
        found = relative_u(full, u, np.array([Sp]), form="flexible tail", drive="free_head_angle", coefficient="cylinder_finite")[0]
        # the model's own: 3 % at most at 0.3 rad against nonlinear simulations, taken as rectangular
        own = 0.03 / np.sqrt(3.0)
        assert found == pytest.approx(np.hypot(np.std(many) / abs(U), own), rel=0.02)
        alone = relative_u(full, {}, np.array([Sp]), form="flexible tail", drive="free_head_angle", coefficient="cylinder_finite")[0]
        assert alone == pytest.approx(own, rel=1e-9)


def test_without_modulus_or_section_there_is_a_curve_and_no_band():
    for lacking in ("E", "d"):
        runs = frame(ROD | {lacking: np.nan})
        found = tail_curves(runs, 0.5, 8.0)
        assert found.frame["y"].notna().all() and found.frame["low"].isna().all()
        assert not any("Bands" in sentence for sentence in found.words)
    known = ROD | {f"u_shared_{key}": 0.01 * ROD[key] for key in ("d", "E", "mu", "b", "L_tail")}
    found = tail_curves(frame(known), 0.5, 8.0)
    share = found.frame["high"] / found.frame["y"] - 1
    assert (share > 0.017).all() and (share < 0.1).all() and "1 u of the predicted speed" in found.words[1]
    assert (found.frame["low"] + found.frame["high"]).to_numpy() == pytest.approx(2 * found.frame["y"].to_numpy())


# ---- the line of no residual


def residual_runs(*rows):
    full = [dict.fromkeys(inputs(), np.nan) | row for row in rows]
    return pd.DataFrame(full)


TAIL = {"form": "flexible tail", "drive": "free_head_angle", "U_ratio": 1.1, "L_tail": 0.03, "EI": 7.4e-8, "zeta_n": 2.7,
        "zeta_t": 1.7, "omega": 6.3, "theta0": 0.3, "mu": 1.0, "b": 2e-3}  # fmt: skip


def test_the_line_is_at_one_with_the_models_own_band():
    found = residual_line(residual_runs(TAIL, TAIL | {"theta0": 0.15}), 0.1, 10.0)
    assert found.frame["y"].tolist() == [1.0, 1.0] and found.frame["x"].tolist() == [0.1, 10.0]
    # 3 % at 0.3 rad, rectangular, as the square of the angle: root mean square of 1 and 1/4 of it
    share = 0.03 / np.sqrt(3.0) * np.sqrt((1 + 1 / 16) / 2)
    assert found.frame["high"].iloc[0] == pytest.approx(1 + share, rel=1e-9)
    assert "1.3 % for a flexible tail" in found.words[0]


def test_a_model_without_a_stated_uncertainty_says_so():
    eel = {"form": "undulating", "drive": "pivoted_angle", "U_ratio": 0.9, "omega": 15.0, "A_tip": 0.03, "L_body": 0.3, "nu": 1e-6}
    found = residual_line(residual_runs(eel), 1.0, 2.0)
    assert found.frame["y"].tolist() == [1.0, 1.0] and found.frame["low"].isna().all()
    assert found.words == ("The model for an undulating body has no stated u",)
    both = residual_line(residual_runs(eel, TAIL), 1.0, 2.0)
    assert len(both.frame) == 2 and len(both.words) == 2
    none = residual_line(residual_runs(TAIL | {"U_ratio": np.nan}), 1.0, 2.0)
    assert none.frame.empty and "predicted speed" in none.why


# ---- axes


def test_the_axes_that_have_a_theory():
    assert has_theory("Sp", "U_scaled") and has_theory("Sp", "F_scaled") and has_theory("T", "U_ratio")
    for x, y in (("U_scaled", "Sp"), ("Re", "U_scaled"), ("Sp", "stride"), ("U_ratio", "U_ratio")):
        assert not has_theory(x, y) and "have a theory" in why_none(x, y, "cylinder_finite", {})
    assert why_none("Sp", "U_ratio", "mu", {"Sp": {"length": "L_body"}}) == ""  # 1 is 1 in every dialect
    assert "zeta_n alone" in why_none("Sp", "F_scaled", "mu", {"Sp": AT_BIRTH["Sp"]})


def test_the_reach_is_that_of_the_rows_that_can_be_drawn():
    rows = pd.DataFrame({"Sp": [1.0, 2.0, 3.0, 9.0, 8.0], "U_scaled": [1.0, 1.0, 1.0, -1.0, np.nan],
                         "swimmer": ["a", "a", "b", "b", "b"]})  # fmt: skip
    found = reach(rows, "Sp", "U_scaled", "swimmer", log_x=True, log_y=True)
    assert found == Reach((1.0, 3.0), {"a": (1.0, 2.0), "b": (3.0, 3.0)})
    assert reach(rows, "Sp", "U_scaled", None, log_x=True, log_y=False).whole == (1.0, 9.0)
    assert reach(rows.iloc[3:], "Sp", "U_scaled", None, log_x=True, log_y=True) is None
    nothing = theory_on(frame({}), None, "Sp", "U_scaled", group=None, spoken={}, coefficient="cylinder_finite")
    assert nothing.frame.empty and "has both" in nothing.why


def test_the_residual_band_is_that_of_runs_with_a_place_on_x():
    runs = residual_runs(TAIL, TAIL | {"theta0": 0.6}).assign(Sp=[2.0, np.nan])
    found = theory_on(runs, Reach((1.0, 3.0), {}), "Sp", "U_ratio", group=None, spoken={}, coefficient="cylinder_finite")
    assert found.frame["high"].iloc[0] == pytest.approx(1 + 0.03 / np.sqrt(3.0), rel=1e-9)


def test_axes_without_a_theory_are_refused():
    with pytest.raises(Refusal, match="nothing to draw"):
        takes("Re", "stride")
