"""The predicted speed that is stored with every run: worked cases from outside, uncertainty, absence in words."""

import numpy as np
import pytest

from labbook.book.asking import Question
from labbook.book.budgets import budgets, simulate
from labbook.physics.undulation import swimming_speed
from labbook.registry.written import shown

# the SI case: L 30 mm, d 1 mm, E 1.5 MPa, b 2 mm, 1 Pa.s, 1 Hz, 0.3 rad, coefficients of the spheroid; its linear
# speed and tip, and the nonlinear simulation's speed, were computed independently of this project
LINEAR, TIP, NONLINEAR = 7.43970681e-5, 2 * 1.00363402e-3, 7.37698e-5


@pytest.fixture
def worked(empty):
    """A book with that swimmer in a fluid of 1 Pa.s, in the spheroid's coefficients, and that run."""
    empty.stock("material", code="cast", rho_s="1.03 g/cm3")
    empty.stock("reading", of="cast", key="E", value="1.500(15) MPa", on="2026-03-01")
    empty.stock("fluid", code="oil", kind="measured", rho="970 kg/m3")
    empty.stock("reading", of="oil", key="mu", value="1.000(10) Pa.s", T="25.0(1) degC", on="2026-03-01")
    empty.stock("swimmer", code="reed", form="flexible tail", material="cast", L_body="34.00(1) mm", L_tail="30.00(1) mm",
                section="rod", d="1.000(2) mm", b="2.000(5) mm")  # fmt: skip
    empty.adopt_dialect("Sp", {"coefficient": "spheroid_asymptotic"}, why="to compare", by="wren")
    empty.record(swimmer="reed", fluid="oil", code="R-1", at="2026-03-02T10:00", f="1.0000(5) Hz", theta0="0.3000(15) rad",
                 T="25.0(1) degC", U="73.8(5) um/s", A_tip="2.00(2) mm")  # fmt: skip
    return empty


def test_the_worked_case(worked):
    sheet = worked.sheet("R-1")
    assert sheet.values["U_model"] == pytest.approx(LINEAR, rel=1e-8)
    assert sheet.values["U_ratio"] == pytest.approx(73.8e-6 / LINEAR, rel=1e-8)
    assert shown("U_model", sheet.values["U_model"]) == "0.0744 mm/s", "in the unit of U"
    assert sheet.prediction.A_tip == pytest.approx(TIP, rel=1e-8)
    assert abs(sheet.values["U_model"] / NONLINEAR - 1) < 0.01  # what the model's own uncertainty stands for
    assert "small-angle theory" in sheet.prediction.says and "lateral balance" in sheet.prediction.source


def test_scaled_push_is_the_theory_s_at_the_predicted_speed(worked):
    sheet = worked.sheet("R-1")
    # F/((zeta_n - zeta_t) omega L^2 theta0^2) of that case
    push = 6.70625393e-06 / ((2.73518245 - 1.7480754) * 2 * np.pi * 0.03**2 * 0.3**2)
    assert sheet.values["F_scaled"] / sheet.values["U_ratio"] == pytest.approx(push, rel=1e-6)


def test_uncertainty_agrees_with_drawn_worlds(worked):
    # JCGM 101:2008: every input drawn and pushed through the whole chain; the model's own error is not drawn
    told = worked.ask(budgets, "R-1")["U_ratio"]
    theory = next(c for c in told.contributions if c.source == "theory")
    drawn = worked.ask(simulate, "R-1", "U_ratio", draws=40_000)
    first_order = np.sqrt(told.u**2 - theory.part**2)
    assert first_order == pytest.approx(drawn.sample.u, rel=0.02)  # 40 000 draws know a u to 0.4 %
    assert theory.belongs == "theory"
    # 3 % at most against nonlinear simulations at 0.3 rad (tails.THETA0_CHECKED), taken as rectangular
    assert abs(theory.part) / told.value == pytest.approx(0.03 / np.sqrt(3), rel=1e-6)


def test_what_follows_the_temperature_is_shared_rightly(worked):
    told = worked.ask(budgets, "R-1")["U_ratio"]
    assert {"E", "mu_readings", "d"} <= {c.source for c in told.contributions if not c.own}
    assert {"U", "theta0", "f"} <= {c.source for c in told.contributions if c.own}


def test_a_larger_angle_is_doubted(worked):
    worked.amend("R-1", why="wider", theta0="0.5 rad", confirm=True)
    assert any("0.3 rad" in sentence for sentence in worked.sheet("R-1").prediction.doubts)


def test_every_form_has_a_prediction_or_says_why_not(filled):
    found = filled.frame(Question(), keys=("U_model", "f", "A_tip", "L_body", "nu"), texts=("code", "swimmer", "form"))
    row = found[found["swimmer"] == "eel-1"].iloc[0]
    expected = swimming_speed(omega=2 * np.pi * row["f"], A_tip=row["A_tip"], L_body=row["L_body"], nu=row["nu"])
    assert row["U_model"] == pytest.approx(expected, rel=1e-12)
    # the scallop theorem (Purcell 1977): a rigid tail gets nowhere, and no ratio to nothing is made
    filled.stock("swimmer", code="stick-1", form="rigid tail", L_body="24 mm", L_tail="20 mm", section="rod", d="1 mm", b="2 mm")
    code = filled.record(swimmer="stick-1", fluid="syrup", f="0.5 Hz", theta0="0.3 rad", T="22 degC", U="1(1) um/s")
    sheet = filled.sheet(code)
    assert sheet.values["U_model"] == 0.0 and sheet.values["U_ratio"] is None
    assert "scallop theorem" in sheet.why_absent["U_ratio"]
    turned = filled.sheet(filled.record(swimmer="stick-1", fluid="syrup", f="0.5 Hz", drive="field", T="22 degC"))
    assert turned.values["U_model"] is None and turned.why_absent["U_model"].startswith("no model:")


def test_what_is_missing_for_a_prediction_is_said(stocked):
    sheet = stocked.sheet(stocked.record(swimmer="reed-1", fluid="syrup", f="0.5 Hz", T="22 degC", U="0.05 mm/s"))
    assert sheet.why_absent["U_model"] == "needs theta0: it was not typed"
    assert sheet.why_absent["U_ratio"] == "needs theta0: it was not typed"


def test_a_coefficient_that_is_no_drag_model_gives_no_prediction(worked):
    worked.adopt_dialect("Sp", {"coefficient": "mu"}, why="as others print it", by="wren")
    sheet = worked.sheet("R-1")
    model_stays = worked.registry.coefficient
    assert (sheet.values["U_model"] is None) == (model_stays == "mu")


def test_drives_in_one_batch_do_not_mix(worked):
    worked.stock("swimmer", code="bare", form="flexible tail", material="cast", L_body="30 mm", L_tail="30 mm", section="rod", d="1 mm")
    worked.record(swimmer="bare", fluid="oil", code="R-2", at="2026-03-02T11:00", f="1 Hz", theta0="0.3 rad", T="25 degC")
    worked.record(swimmer="reed", fluid="oil", code="R-3", at="2026-03-02T12:00", f="1 Hz", theta0="0.3 rad", T="25 degC",
                  drive="pivoted_angle")  # fmt: skip
    assert worked.check() == []
    assert worked.sheet("R-3").why_absent["F_scaled"] == "only for free_head_angle, and this run's is pivoted_angle"
    before = {c: worked.sheet(c).values["U_model"] for c in ("R-1", "R-2", "R-3")}
    assert len(set(before.values())) == 3 and before["R-1"] == pytest.approx(LINEAR, rel=1e-8)
