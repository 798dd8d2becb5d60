"""The trend's curve and the sperm number's dialects, against the physics and the registry's answers."""

import math

import numpy as np
import pandas as pd
import pytest

from labbook.charts.dialect_axis import dialect_title, dialects, restated_frame
from labbook.charts.theory import tail_curve
from labbook.physics import tails
from labbook.registry.dialects import DIALECTS

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


@pytest.mark.parametrize("dialect", DIALECTS, ids=lambda d: dialect_title(d))
def test_an_axis_shows_the_value_that_the_dialects_source_gives(dialect):
    # answers of the registry's rows, recomputed independently of the package; 2 % on the house value as u
    house = next(d for d in DIALECTS if not d.choices).answer
    inputs = {**dialect.example, "w": np.nan, "t": np.nan}
    if dialect.choices:
        inputs["zeta_n"] = DIALECTS[0].example["zeta_n"]
    frame = pd.DataFrame([{**inputs, "Sp": house, "u_Sp": 0.02 * house, "u_own_Sp": 0.01 * house}])
    spoken = restated_frame(frame, dialect).iloc[0]
    # the answers carry five or six figures
    assert spoken["Sp"] == pytest.approx(dialect.answer, rel=4e-5)
    power = 4 if dialect.choices.get("power") == 1 else 1
    assert spoken["u_Sp"] / spoken["Sp"] == pytest.approx(0.02 * power, rel=1e-12)
    assert spoken["u_own_Sp"] / spoken["Sp"] == pytest.approx(0.01 * power, rel=1e-12)


def test_every_dialect_has_words_and_a_title_of_its_own():
    named = dialects()
    assert len(named) == len(DIALECTS) and next(iter(named)) == "house"
    titles = {dialect_title(d) for d in DIALECTS}
    assert len(titles) == len(DIALECTS)
    assert sum("house dialect" in t and "not" not in t for t in titles) == 1
