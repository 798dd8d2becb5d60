"""The trend's curve in every dialect that it has, against the physics and worked values."""

import math

import numpy as np
import pandas as pd
import pytest

from labbook.charts.theory import tail_curve, why_no_curve
from labbook.physics import tails
from labbook.registry.dialects import AT_BIRTH

SWIMMER = {"L_tail": 0.030, "b": 3e-3, "mu": 5.0, "zeta_n": 18.0, "zeta_t": 12.0}


def test_the_curve_is_the_speed_of_the_one_swimmer_it_was_given():
    runs = pd.DataFrame([{"drive": "free_head_angle", **SWIMMER}])
    EI, theta0 = 1e-7, 0.2
    for f in (0.05, 0.3, 1.0):
        omega = 2 * math.pi * f
        Sp = 0.030 * (18.0 * omega / EI) ** 0.25
        U = tails.free_speed(drive="free_head_angle", L=0.030, a=5e-4, EI=EI, mu=5.0, f=f, theta0=theta0,
                             b=3e-3, zeta_n=18.0, zeta_t=12.0)  # fmt: skip
        curve = tail_curve(runs, Sp, 2 * Sp)
        # the same formula, once with units and once without: rounding alone differs
        assert curve["y"].iloc[0] == pytest.approx(U / (omega * 0.030 * theta0**2), rel=1e-9)


def test_the_curve_takes_the_median_swimmer_and_only_its_drive():
    heads = (2e-3, 3e-3, 9e-3)
    rows = [{"drive": "free_head_angle", **SWIMMER, "b": b} for b in heads]
    rows += [{"drive": "field", **SWIMMER, "b": 1e-3}]
    rows += [{"drive": "free_head_angle", **SWIMMER, "zeta_n": np.nan}]
    middle = tail_curve(pd.DataFrame(rows[1:2]), 0.5, 8.0)
    every = tail_curve(pd.DataFrame(rows), 0.5, 8.0)
    assert every["y"].to_numpy() == pytest.approx(middle["y"].to_numpy(), rel=1e-12)
    assert "b/L_tail = 0.1" in middle["label"].iloc[0]


def test_without_such_runs_there_is_no_curve():
    assert tail_curve(pd.DataFrame([{"drive": "field", **SWIMMER}]), 1.0, 2.0).empty
    assert tail_curve(pd.DataFrame([{"drive": "free_head_angle", **SWIMMER}]), 0.0, 2.0).empty


SPOKEN = {"Sp": {"length": "L_tail", "rate": "f", "coefficient": "cylinder_finite", "power": 1},
          "U_scaled": {"length": "L_tail", "rate": "f"}}  # fmt: skip


def test_the_curve_in_other_rates_and_powers_goes_through_the_same_swimmer():
    runs = pd.DataFrame([{"drive": "free_head_angle", **SWIMMER}])
    f, EI, theta0 = 0.3, 1e-7, 0.2
    U = tails.free_speed(drive="free_head_angle", L=0.030, a=5e-4, EI=EI, mu=5.0, f=f, theta0=theta0, b=3e-3,
                         zeta_n=18.0, zeta_t=12.0)  # fmt: skip
    first = 18.0 * f * 0.030**4 / EI  # zeta_n f L^4/EI, as the dialect's row has it
    curve = tail_curve(runs, first, 2 * first, spoken=SPOKEN)
    assert curve["x"].iloc[[0, -1]].tolist() == pytest.approx([first, 2 * first], rel=1e-12)
    assert curve["y"].iloc[0] == pytest.approx(U / (f * 0.030 * theta0**2), rel=1e-9)


@pytest.mark.parametrize(("Sp", "U_scaled"), [
    (1.0, 1.67386937e-03), (2.0, 1.56952783e-02), (3.0, 7.64872873e-03), (4.0, 4.14155887e-03),
])  # fmt: skip
def test_the_curve_in_a_house_of_another_drag_model_is_the_worked_one(Sp, U_scaled):
    # physics.md section 8, the table for b/L = 0.1, L/a = 100; its coefficients as section 5 writes them
    mu = 1.0
    swimmer = {"L_tail": 0.030, "b": 3e-3, "mu": mu, "zeta_t": 2 * math.pi * mu / (math.log(100) - 0.5),
               "zeta_n": 4 * math.pi * mu / (math.log(100) + 0.5)}  # fmt: skip
    runs = pd.DataFrame([{"drive": "free_head_angle", **swimmer}])
    own = {"Sp": AT_BIRTH["Sp"] | {"coefficient": "spheroid_asymptotic"}, "U_scaled": AT_BIRTH["U_scaled"]}
    curve = tail_curve(runs, Sp, 2 * Sp, spoken=own, coefficient="spheroid_asymptotic")
    assert curve["y"].iloc[0] == pytest.approx(U_scaled, rel=1e-8)  # the table has nine figures
    moved = own | {"Sp": own["Sp"] | {"power": 1}}
    curve = tail_curve(runs, Sp**4, 2 * Sp**4, spoken=moved, coefficient="spheroid_asymptotic")
    assert curve["y"].iloc[0] == pytest.approx(U_scaled, rel=1e-8)


@pytest.mark.parametrize(("number", "name", "option"), [
    ("Sp", "length", "L_body"), ("Sp", "coefficient", "mu"), ("Sp", "coefficient", "spheroid_asymptotic"),
    ("U_scaled", "length", "L_body"),
])  # fmt: skip
def test_there_is_no_curve_where_each_swimmer_would_have_one_of_its_own(number, name, option):
    spoken = SPOKEN | {number: SPOKEN[number] | {name: option}}
    assert option in why_no_curve("cylinder_finite", spoken) and number in why_no_curve("cylinder_finite", spoken)
    runs = pd.DataFrame([{"drive": "free_head_angle", **SWIMMER}])
    assert tail_curve(runs, 1.0, 2.0, spoken=spoken).empty
    assert why_no_curve("cylinder_finite", SPOKEN) == ""


def test_there_is_no_curve_without_a_zeta_t_of_the_same_model():
    # log_slender is 4 pi mu/ln(L/a), for zeta_n alone
    spoken = SPOKEN | {"Sp": SPOKEN["Sp"] | {"coefficient": "log_slender"}}
    assert "zeta_n alone" in why_no_curve("log_slender", spoken)
