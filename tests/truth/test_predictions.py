"""One prediction per form and drive: worked swimmers, what is missing, where it is doubtful, steps and
slopes."""

import numpy as np
import pytest

from labbook.errors import Refusal
from labbook.physics import (
    heads,
    helices,
    prediction_doubts,
    predictions,
    rods,
    sections,
    tails,
    undulation,
)

# physics sheet: L 30 mm, d 1 mm, E 1.5 MPa, b 2 mm, 1 Pa.s, 1 Hz, 0.3 rad, spheroid_asymptotic [C]
ZETA_N, ZETA_T = rods.resistive_coefficients(model="spheroid_asymptotic", L=0.03, a=5e-4, mu=1.0)
SWIMMER = dict(L_tail=0.03, a=5e-4, EI=1.5e6 * sections.rod_second_moment(d=1e-3), mu=1.0, f=1.0,
               omega=2.0 * np.pi, b=2e-3, theta0=0.3, h0=2e-3, zeta_n=ZETA_N, zeta_t=ZETA_T, m_mag=4e-4,
               B=5e-3)
HELD = ("hinged_heave", "pivoted_angle", "clamped_heave")


def test_worked_swimmer():
    got = predictions.predicted(form="flexible tail", drive="free_head_angle", values=SWIMMER)
    assert got["Sp_model"] == pytest.approx(3.70806644, rel=1e-8)
    assert got["U_model"] == pytest.approx(7.43970681e-05, rel=1e-8)
    assert got["F_model"] == pytest.approx(6.70625393e-06, rel=1e-8)
    assert got["A_tip_model"] == pytest.approx(2.0 * 1.00363402e-3, rel=1e-8)
    assert got["theta_model"] == pytest.approx(0.3, rel=1e-15)
    # the nonlinear simulation of the sheet, 7.37698e-05, lies within what the model says of itself, not far
    # within
    assert 0.2 * got["u_own_model"] < got["U_model"] - 7.37698e-05 < got["u_own_model"]


def test_the_field_drives_a_free_head_by_m_B():
    # torque m B (magnet square to the field), by the public call; and its power is torque times rate of turn
    got = predictions.predicted(form="flexible tail", drive="free_head_torque", values=SWIMMER)
    same = dict(L=0.03, a=5e-4, EI=SWIMMER["EI"], mu=1.0, f=1.0, b=2e-3, zeta_n=ZETA_N, zeta_t=ZETA_T)
    public = tails.free_speed(drive="free_head_torque", torque=2e-6, **same)
    assert got["U_model"] == pytest.approx(public, rel=1e-12)
    by_angle = predictions.predicted(form="flexible tail", drive="free_head_angle",
                                     values=SWIMMER | {"theta0": got["theta_model"]})
    for key in ("U_model", "A_tip_model", "F_model", "P_model"):
        assert by_angle[key] == pytest.approx(got[key], rel=1e-12)
    assert 0.0 < got["P_model"] < 0.5 * 2e-6 * SWIMMER["omega"] * got["theta_model"]


@pytest.mark.parametrize("drive", HELD)
def test_a_held_base_runs_along_its_guide(drive):
    # Y of the published table at Sp = 3 [C, six decimals], and nothing to drag but the tail, or tail and head
    Y = dict(hinged_heave=0.119618, pivoted_angle=0.172276, clamped_heave=0.190086)[drive]
    values = SWIMMER | {"EI": ZETA_N * SWIMMER["omega"] * (0.03 / 3.0) ** 4}
    amplitude = 0.01 * 0.3 if drive == "pivoted_angle" else 2e-3  # ell theta0, or h0
    push = (ZETA_N - ZETA_T) * SWIMMER["omega"] * amplitude**2 * Y
    headless = {key: value for key, value in values.items() if key != "b"}
    bare = predictions.predicted(form="flexible tail", drive=drive, values=headless)
    headed = predictions.predicted(form="flexible tail", drive=drive, values=values)
    assert bare["F_model"] == pytest.approx(push, rel=6e-6)
    assert bare["U_model"] == pytest.approx(push / (ZETA_T * 0.03), rel=6e-6)
    assert headed["U_model"] == pytest.approx(push / (ZETA_T * 0.03 + 6.0 * np.pi * 2e-3), rel=6e-6)
    said = prediction_doubts.reasons(form="flexible tail", drive=drive, values=values)
    assert any("held" in sentence for sentence in said)


@pytest.mark.parametrize("form", ["rigid tail", "hinged"])
def test_the_scallop_theorem(form):
    # Purcell 1977: zero, whatever the rates; and it says so
    for drive in tails.DRIVES:
        got = predictions.predicted(form=form, drive=drive, values=dict(f=np.array([0.1, 30.0, np.nan])))
        np.testing.assert_array_equal(got["U_model"], [0.0, 0.0, np.nan])
        assert "scallop" in predictions.model_of(form=form, drive=drive).says


HELIX = dict(R_helix=0.2e-6, pitch=2.2e-6, a=0.012e-6, L_tail=6.2e-6, mu=1e-3, b=0.8e-6,
             omega=2.0 * np.pi * 120.0)


def test_a_motor_driven_helix_and_what_the_theory_leaves_open():
    # physics sheet: 14.4054 um/s with one pair of coefficients, 19.3107 with the other [C]
    got = predictions.predicted(form="helix", drive="motor", values=HELIX)
    assert got["U_model"] == pytest.approx(14.4054e-6, rel=4e-6)
    # rectangular over a range that has both in it: no less than their own distance over sqrt 12
    assert got["u_own_model"] >= (19.3107 - 14.4054) * 1e-6 / np.sqrt(12.0) * (1.0 - 1e-5)
    assert "resistive-force" in predictions.model_of(form="helix", drive="motor").says


def test_a_field_driven_helix_below_and_above_step_out():
    a11, a12, a22 = helices.resistance(R=0.2e-6, pitch=2.2e-6, L=6.2e-6, a=0.012e-6, mu=1e-3)
    turn, drag = 8.0 * np.pi * 1e-3 * 0.8e-6**3 + a22, a11 + 6.0 * np.pi * 1e-3 * 0.8e-6
    B = turn * HELIX["omega"] / 1e-15 * np.array([2.0, 0.8, np.nan])  # step-out at 2 and 0.8 times the rate
    got = predictions.predicted(form="helix", drive="field", values=HELIX | {"m_mag": 1e-15, "B": B})
    # 1 - sqrt(1 - 0.8^2) = 0.4 of the rate, by hand
    follows = a12 * HELIX["omega"] / drag
    np.testing.assert_allclose(got["U_model"], follows * np.array([1.0, 0.4, 1.0]), rtol=1e-12)
    known = HELIX | {"m_mag": 1e-15, "B": B, "f_ratio": np.array([0.5, 1.25, np.nan])}
    rows = prediction_doubts.doubts(form="helix", drive="field", values=known)
    held = {row.key: np.broadcast_to(row.where, 3).tolist() for row in rows}
    assert held["step-out"] == [False, True, False]
    assert held["step-out not known"] == [False, False, True]
    bare = predictions.predicted(form="helix", drive="field", values=HELIX | {"b": np.nan})
    assert bare["U_model"] == pytest.approx(a12 * HELIX["omega"] / a11, rel=1e-12)


def test_an_undulating_body_follows_the_scaling():
    # from memory: Re = 0.4 Sw^1.02 in the turbulent branch; Sw = omega A L/nu = 4e4
    values = dict(omega=20.0, A_tip=0.02, L_body=0.1, nu=1e-6)
    got = predictions.predicted(form="undulating", drive="pivoted_angle", values=values)
    assert got["U_model"] == pytest.approx(0.4 * np.exp(1.02 * np.log(4e4)) * 1e-5, rel=1e-12)
    assert "u_own_model" not in got
    thick = dict(values, nu=1e-3)
    slow = predictions.predicted(form="undulating", drive="pivoted_angle", values=thick)
    assert slow["U_model"] == pytest.approx(undulation.swimming_speed(**thick, branch="laminar"), rel=1e-12)
    said = prediction_doubts.reasons(form="undulating", drive="pivoted_angle", values=thick | slow)
    assert [s for s in said if "Re is below" in s] and len(said) == 2


def test_every_form_and_drive_has_a_prediction_or_says_why_not():
    for form in predictions.FORMS:
        for drive in predictions.DRIVES:
            model = predictions.model_of(form=form, drive=drive)
            got = predictions.predicted(form=form, drive=drive, values=SWIMMER | HELIX | dict(
                A_tip=0.01, L_body=0.1, nu=1e-6))
            assert bool(got) is (model.key != "none")
            assert ("U_model" in got and bool(model.source)) if got else model.says.startswith("no model: ")
    kinds = {form: sum(predictions.model_of(form=form, drive=d).key != "none" for d in predictions.DRIVES)
             for form in predictions.FORMS}
    assert kinds == {"flexible tail": 5, "rigid tail": 5, "helix": 2, "undulating": 7, "hinged": 5}
    with pytest.raises(Refusal, match="form"):
        predictions.model_of(form="kite", drive="field")
    with pytest.raises(Refusal, match="drive"):
        predictions.model_of(form="helix", drive="hand")


def test_missing_inputs_are_named_and_give_no_number():
    values = {k: v for k, v in SWIMMER.items() if k not in ("theta0", "b")} | {"EI": np.nan}
    lacks = predictions.missing(form="flexible tail", drive="free_head_angle", values=values)
    assert lacks == ["EI", "theta0", "b"]
    got = predictions.predicted(form="flexible tail", drive="free_head_angle", values=values)
    assert np.isnan(got["U_model"]) and np.isnan(got["A_tip_model"])
    assert predictions.missing(form="flexible tail", drive="free_head_torque", values={"b": 1.0})[-3:] == [
        "m_mag", "B", "mu"]
    assert predictions.missing(form="flexible tail", drive="pivoted_angle", values=SWIMMER) == []


@pytest.mark.parametrize(("change", "key"), [
    (dict(theta0=0.31), "angle"), (dict(Re_omega=0.1), "inertia"), (dict(Re_omega=1.1), "not creeping"),
    (dict(L_tail=1.9e-3, a=5e-4), "slenderness"), (dict(h_wall=5.9e-3), "wall at head"),
    (dict(D_tank=9.9e-3), "wall at head"), (dict(h_wall=0.029), "wall at tail"),
    (dict(b_long=8e-3, h_wall=0.02), "wall at head"), (dict(L_tail=0.11), "slenderness"),
    (dict(L_tail=7.9e-3, a=5e-4), "stout")])
def test_doubts_begin_at_the_stated_limits(change, key):
    # 0.3 rad; Re_omega 0.1 and 1; slenderness 2 to 100, stout below 8; h_wall = 3 b; D_tank = 5 b; a tail length
    safe = SWIMMER | dict(Re_omega=0.099, h_wall=0.031, D_tank=0.062)
    drive = dict(form="flexible tail", drive="free_head_angle")
    assert prediction_doubts.reasons(**drive, values=safe) == []
    held = {row.key for row in prediction_doubts.doubts(**drive, values=safe | change) if np.any(row.where)}
    assert key in held
    assert all(len(s) < 130 for s in prediction_doubts.reasons(**drive, values=safe | change))


def test_doubts_of_a_torque_drive_look_at_the_angle_that_follows():
    got = predictions.predicted(form="flexible tail", drive="free_head_torque", values=SWIMMER | {"B": 0.02})
    said = prediction_doubts.doubts(form="flexible tail", drive="free_head_torque", values=SWIMMER | got)
    assert got["theta_model"] > 0.3 and [row.key for row in said if np.any(row.where)] == ["angle"]
    # in an array each run has its own answer
    rows = prediction_doubts.doubts(form="flexible tail", drive="free_head_angle",
                                    values=SWIMMER | {"theta0": np.array([0.2, 0.4])})
    assert next(row for row in rows if row.key == "angle").where.tolist() == [False, True]


def chained(model, values):
    """U_model by walking the steps by hand; inputs left out are NaN."""
    found = {key: np.nan for key in (*model.needs, *model.may)} | values
    for step in model.steps:
        result = step.function(**{key: found[key] for key in step.takes})
        found |= zip(step.gives, result if len(step.gives) > 1 else (result,), strict=True)
    return found["U_model"]


@pytest.mark.parametrize("case", [*(("flexible tail", d) for d in tails.DRIVES), ("helix", "field"),
                                  ("helix", "motor"), ("undulating", "pivoted_angle")])
def test_steps_carry_complex_steps_from_every_input(case):
    form, drive = case
    base = SWIMMER | dict(A_tip=0.01, L_body=0.1, nu=1e-6, b_long=3e-3, h_wall=0.02)
    if form == "helix":
        base = HELIX | dict(b_long=1e-6, h_wall=5e-6, m_mag=1e-15, B=1e-3)
    model = predictions.model_of(form=form, drive=drive)
    for key in (*model.needs, *model.may):
        if key not in base:
            continue

        def speed(factor, key=key):
            return chained(model, {**base, key: base[key] * factor})

        step = np.imag(speed(1.0 + 1e-30j)) / 1e-30
        # central difference: truncation near 1e-9 relative of the curvature, rounding near 1e-11 of the value
        difference = (speed(1.0 + 1e-5) - speed(1.0 - 1e-5)) / 2e-5
        assert step == pytest.approx(difference, rel=1e-6, abs=1e-8 * speed(1.0))


def test_slopes_of_the_costly_step_are_those_of_its_function():
    at = dict(Sp_model=np.array([0.5, 2.5]), head=np.full(2, 0.1), head_drag=np.full(2, 0.8),
              head_turn=np.full(2, 1.2))
    for drive in tails.DRIVES:
        model = predictions.model_of(form="flexible tail", drive=drive)
        step = next(step for step in model.steps if step.slopes)
        takes = {key: at[key] for key in step.takes}
        assert "Sp_model" in step.takes and step.gives[0] == "tail_force"
        for name in step.takes:
            shifted = step.function(**{**takes, name: takes[name] * (1.0 + 1e-30j)})
            for (value, slopes), plain, moved in zip(
                    step.slopes(**takes), step.function(**takes), shifted, strict=True):
                np.testing.assert_array_equal(value, plain)
                stepped = np.imag(moved) / 1e-30
                np.testing.assert_allclose(slopes[name] * takes[name], stepped, rtol=1e-11, atol=1e-15)


def test_a_long_head_pushes():
    # the same drag in tow, once with lateral drag equal to the axial: only the head's own push differs
    values = SWIMMER | {"b_long": 6e-3}
    got = predictions.predicted(form="flexible tail", drive="free_head_angle", values=values)
    drag = heads.head_drag(mu=1.0, b=2e-3, b_long=6e-3)
    extra = (drag.lateral - drag.axial) * got["head_push"] * SWIMMER["omega"] * 0.03 * 0.09
    assert got["U_model"] == pytest.approx((got["F_model"] + extra) / (ZETA_T * 0.03 + drag.axial), rel=1e-12)
    assert extra > 0.05 * got["F_model"]
