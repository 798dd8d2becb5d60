"""Viscosity against temperature and modulus against date."""

import numpy as np
import pandas as pd
import pytest

from labbook.charts.fluid_chart import modulus_chart, viscosity_chart
from labbook.charts.palette import paper
from labbook.errors import Refusal


def readings():
    # water: IAPWS values of physics.md section 1, mu in mPa s at 20 and 40 degC, rho at 25 degC
    return pd.DataFrame(
        [
            dict(T=293.15, value=1.00160e-3, u=1e-5, on="2025-01-12", key="mu", rho=np.nan),
            dict(T=313.15, value=0.65273e-3, u=1e-5, on="2025-01-12", key="mu", rho=np.nan),
            dict(T=298.15, value=0.89002e-3 / 997.0476, u=1e-9, on="2025-02-14", key="nu", rho=997.0476),
            dict(T=298.15, value=1e-6, u=1e-8, on=None, key="nu", rho=np.nan),
        ]
    )


def curves():
    T = np.linspace(288.15, 318.15, 400)
    mu = 1e-3 * np.exp(-0.02 * (T - 293.15))
    return pd.DataFrame(dict(T=T, mu=mu, low=0.98 * mu, high=1.02 * mu, set="2025-01-12"))


def test_readings_stand_in_degc_and_mpa_s(samples):
    spec = viscosity_chart(readings(), curves()).to_dict()
    found = samples.rows(spec, "readings")
    assert [(r["T"], r["mu"]) for r in found] == [
        (pytest.approx(20.0), pytest.approx(1.0016)),
        (pytest.approx(40.0), pytest.approx(0.65273)),
        (pytest.approx(25.0), pytest.approx(0.89002)),  # nu times rho
    ]
    assert found[0]["low"] == pytest.approx(0.9916) and found[0]["high"] == pytest.approx(1.0116)
    assert samples.layer(spec, "readings")["encoding"]["y"]["scale"]["type"] == "log"
    assert spec["title"]["text"] == ["1 reading of ν not drawn: no density"]
    assert len(samples.rows(spec, "curves")) <= 120


def test_sets_share_one_legend_and_the_run_is_rust(samples):
    for dark in (False, True):
        spec = viscosity_chart(readings(), curves(), dict(T=296.5, mu=9e-4, u_mu=1e-5), dark).to_dict()
        encoding = samples.layer(spec, "readings")["encoding"]
        assert (
            encoding["fill"]["scale"]["domain"]
            == encoding["shape"]["scale"]["domain"]
            == ["2025-01-12", "2025-02-14"]
        )
        rule = samples.layer(spec, "run_T")
        assert rule["mark"]["color"] == paper(dark).rust
        assert samples.rows(spec, "run_T")[0]["T"] == pytest.approx(23.35)
        assert samples.addresses(spec) == []


def test_no_readings_and_no_curves_draw_an_empty_frame():
    viscosity_chart(readings().iloc[:0], curves().iloc[:0]).to_dict()


def test_a_missing_column_is_refused():
    with pytest.raises(Refusal, match="lacks u"):
        viscosity_chart(readings().drop(columns="u"), curves())
    with pytest.raises(Refusal, match="lacks on"):
        modulus_chart(pd.DataFrame(dict(value=[1e6], u=[1e4])))


def test_modulus_stands_at_its_date_in_a_fitting_unit(samples):
    frame = pd.DataFrame(
        dict(
            value=[1.5e6, 1.4e6, 1.6e6],
            u=[5e4, np.nan, 1e4],
            how=["sag", "ring-down", None],
            on=["2024-06-02", "2024-09-10", None],
        )
    )
    spec = modulus_chart(frame).to_dict()
    found = samples.rows(spec, "readings")
    assert [r["E"] for r in found] == [1.5, 1.4]
    assert (found[0]["low"], found[0]["high"]) == (1.45, 1.55)
    assert found[0]["text"] == "1.50(5) MPa"
    assert found[0]["on"].startswith("2024-06-02")
    assert spec["title"]["text"] == ["1 reading without a date not drawn"]
    modulus_chart(frame.iloc[:0]).to_dict()
