"""Viscosity from readings: worked Vogel and Andrade figures, independent covariances, Monte Carlo, refusals."""

import numpy as np
import pytest
from iapws import IAPWS95
from iapws._iapws import _Viscosity
from scipy.optimize import curve_fit
from uncertainties import ufloat
from uncertainties.umath import exp, log

from labbook.errors import Refusal
from labbook.physics import fluids, readings

CELSIUS = 273.15


def vogel(T, A, B, C):
    return A * np.exp(B / (T - C))


def exact(T, A=0.05, B=800.0, C=140.0, u_rel=0.01, **more):
    value = vogel(np.asarray(T), A, B, C)
    return readings.fit(T=T, value=value, u=u_rel * value, **more)


def test_vogel_worked_value_and_derivative():
    # A = 0.05, B = 800, C = 140, T = 298.15: 7.867627 and dln/dT = -0.03198539, worked by hand.
    fit = exact([283.15, 298.15, 313.15, 333.15])
    assert fit.form == "vogel_fulcher_tammann"
    np.testing.assert_allclose(fit.parameters, [0.05, 800.0, 140.0], rtol=1e-6)
    value, slope, _ = fit.at(T=298.15)
    assert value == pytest.approx(7.867627, rel=1e-7)
    assert slope / value == pytest.approx(-0.03198539, rel=1e-6)
    assert (fit.T_low, fit.T_high, fit.n) == (283.15, 333.15, 4)


def test_vogel_through_water():
    # IAPWS water at 10, 30, 60 degC (iapws, CoolProp): A, B, C and 25 degC as solved independently.
    T = np.array([10.0, 30.0, 60.0]) + CELSIUS
    value = np.array([1.3058997, 0.7972218, 0.4660351])
    fit = readings.fit(T=T, value=value, u=0.002 * value)
    np.testing.assert_allclose(fit.parameters, [0.0307093, 494.9157, 151.1754], rtol=2e-6)
    at_25 = fit.at(T=298.15)[0]
    assert at_25 == pytest.approx(0.890622, abs=1e-6)
    # The fluid itself at 25 degC: Vogel follows water to 0.1 %.
    T_25 = 298.15
    assert at_25 == pytest.approx(1e3 * _Viscosity(IAPWS95(T=T_25, P=0.101325).rho, T_25), rel=1e-3)


def test_slope_of_each_form_is_the_complex_step():
    for fit in (exact([283.15, 303.15, 333.15]), exact([283.15, 293.15]), exact([290.0])):
        T = np.array([280.0, 300.0, 340.0])
        slope = fit.at(T=T)[1]
        np.testing.assert_allclose(slope, fit.at(T=T + 1e-20j)[0].imag / 1e-20, rtol=1e-12, atol=0)


def test_one_temperature_is_a_constant():
    fit = readings.fit(T=[298.15, 298.20, 298.12], value=[1.00, 1.02, 1.01], u=[0.01, 0.02, 0.01])
    assert (fit.form, fit.n) == ("constant", 3)
    # Weighted mean by hand: weights 4:1:4.
    value, slope, u = fit.at(T=[290.0, 310.0])
    np.testing.assert_allclose(value, (4 * 1.00 + 1.02 + 4 * 1.01) / 9, rtol=1e-12)
    np.testing.assert_allclose(slope, 0.0, atol=0)
    np.testing.assert_allclose(u, 0.02 / 3, rtol=1e-12)
    assert (fit.T_low, fit.T_high) == (298.12, 298.20)


def test_two_temperatures_give_andrade_with_the_uncertainty_that_uncertainties_gives():
    T1, T2 = 288.15, 303.15
    m1, m2 = ufloat(2.0, 0.03), ufloat(1.1, 0.01)
    B = log(m1 / m2) / (1 / T1 - 1 / T2)
    fit = readings.fit(T=[T2, T1], value=[1.1, 2.0], u=[0.01, 0.03])
    assert fit.form == "andrade"
    assert fit.parameters[1] == pytest.approx(B.n, rel=1e-9)
    assert fit.covariance[1, 1] ** 0.5 == pytest.approx(B.s, rel=1e-9)
    for T in (280.0, 295.0, 320.0):
        by_hand = m1 * exp(B * (1 / T - 1 / T1))
        value, _, u = fit.at(T=T)
        # Both are first order and exact; 1e-6 is what double precision leaves of the cancelling covariance.
        assert (value, u) == (pytest.approx(by_hand.n, rel=1e-9), pytest.approx(by_hand.s, rel=1e-6))


def test_andrade_line_against_polyfit():
    rng = np.random.default_rng(5)
    T = np.array([285.0, 289.0, 294.0, 298.0, 305.0])  # spans 20 K: Andrade by rule
    value = 1e-6 * np.exp(2000.0 / T) * rng.normal(1.0, 0.02, T.size)
    u = value * np.array([0.01, 0.03, 0.02, 0.01, 0.04])
    fit = readings.fit(T=T, value=value, u=u)
    (B, ln_A), covariance = np.polyfit(1.0 / T, np.log(value), 1, w=value / u, cov="unscaled")
    assert fit.form == "andrade"
    np.testing.assert_allclose([np.log(fit.parameters[0]), fit.parameters[1]], [ln_A, B], rtol=1e-9)
    np.testing.assert_allclose(fit.covariance[:2, :2], covariance[::-1, ::-1], rtol=1e-7)
    assert not fit.covariance[2].any() and not fit.covariance[:, 2].any() and fit.parameters[2] == 0.0


def test_three_temperatures_against_the_closed_solution_in_uncertainties():
    # (T3 - C)/(T1 - C) = (y1 - y2)(T3 - T2)/((y2 - y3)(T2 - T1)) with y = ln value: solved for C, then B, A.
    T1, T2, T3 = 283.15, 303.15, 333.15
    numbers = vogel(np.array([T1, T2, T3]), 0.05, 800.0, 140.0)
    m = [ufloat(x, s * x) for x, s in zip(numbers, (0.01, 0.02, 0.015), strict=True)]
    y1, y2, y3 = (log(x) for x in m)
    r = (y1 - y2) * (T3 - T2) / ((y2 - y3) * (T2 - T1))
    C = (T3 - r * T1) / (1 - r)
    B = (y1 - y3) / (1 / (T1 - C) - 1 / (T3 - C))
    fit = readings.fit(T=[T1, T2, T3], value=numbers, u=[x.s for x in m])
    np.testing.assert_allclose(fit.parameters, [0.05, B.n, C.n], rtol=1e-8)
    assert fit.covariance[1, 1] ** 0.5 == pytest.approx(B.s, rel=1e-6)
    assert fit.covariance[2, 2] ** 0.5 == pytest.approx(C.s, rel=1e-6)
    for T in (275.0, 298.15, 350.0):
        by_hand = exp(y1 + B / (T - C) - B / (T1 - C))
        value, _, u = fit.at(T=T)
        assert (value, u) == (pytest.approx(by_hand.n, rel=1e-8), pytest.approx(by_hand.s, rel=1e-5))


def test_weighted_vogel_against_curve_fit():
    rng = np.random.default_rng(11)
    T = np.linspace(278.15, 338.15, 7)
    value = vogel(T, 1e-5, 900.0, 150.0) * rng.normal(1.0, 0.004, T.size)
    u = value * np.linspace(0.003, 0.006, T.size)
    fit = readings.fit(T=T, value=value, u=u)
    best, covariance = curve_fit(lambda T, a, B, C: a + B / (T - C), T, np.log(value), p0=[-11.0, 800.0, 140.0],
                                 sigma=u / value, absolute_sigma=True, xtol=1e-14, ftol=1e-14)
    assert fit.form == "vogel_fulcher_tammann"
    # curve_fit differences its Jacobian and stops at a flat bottom: 1e-4 of the parameters and covariance.
    np.testing.assert_allclose([np.log(fit.parameters[0]), *fit.parameters[1:]], best, rtol=1e-4)
    np.testing.assert_allclose(fit.covariance, covariance, rtol=1e-3)


def test_covariance_against_monte_carlo():
    # 1,200 draws give a standard deviation to 2 %; 7 % is three and a half of that.
    rng = np.random.default_rng(3)
    T = np.array([278.15, 293.15, 308.15, 333.15])
    true, u = vogel(T, 0.05, 800.0, 140.0), 0.005
    asked = np.array([273.15, 285.0, 298.15, 320.0, 345.0])
    draws = []
    for _ in range(1200):
        fit = readings.fit(T=T, value=true * rng.normal(1.0, u, T.size), u=u * true)
        assert fit.form == "vogel_fulcher_tammann"
        draws.append(fit.at(T=asked)[0])
    stated = exact(T, u_rel=u).at(T=asked)[2]
    np.testing.assert_allclose(np.std(draws, axis=0, ddof=1), stated, rtol=0.07)


def test_covariance_is_absolute():
    # Twice the stated uncertainty is twice the fit's, however well the points lie on the curve.
    small, large = (exact([283.15, 298.15, 313.15, 333.15], u_rel=u).at(T=300.0)[2] for u in (0.01, 0.02))
    assert large / small == pytest.approx(2.0, rel=1e-6)


def test_temperature_uncertainty_joins_through_the_slope():
    # Two readings of one Andrade line: at a reading's own T the fit's u is that reading's, u^2 + (slope u_T)^2.
    T, B = np.array([290.0, 305.0]), 3000.0
    value = np.exp(B / T - 10.0)
    fit = readings.fit(T=T, value=value, u=0.01 * value, u_T=[0.2, 0.5])
    expected = value * np.hypot(0.01, B / T**2 * np.array([0.2, 0.5]))
    np.testing.assert_allclose(fit.at(T=T)[2], expected, rtol=1e-6)
    lone = readings.fit(T=290.0, value=1.0, u=0.01, u_T=0.2)
    assert lone.at(T=290.0)[2] == pytest.approx(0.01, rel=1e-12)


@pytest.mark.parametrize("T, C, form", [
    ([293.15, 305.0, 318.15], 140.0, "vogel_fulcher_tammann"),  # 25 K, typed as 20 and 45 degC
    ([293.15, 305.0, 317.9], 140.0, "andrade"),                 # 24.75 K
    ([293.15, 318.15], 140.0, "andrade"),                       # two temperatures
    ([293.15, 293.2, 333.15], 140.0, "andrade"),                # two after merging
    ([293.15, 305.0, 330.0], 242.0, "vogel_fulcher_tammann"),   # C = T_min - 51.15 K
    ([293.15, 305.0, 330.0], 244.0, "andrade"),                 # C = T_min - 49.15 K
    ([293.15, 305.0, 330.0], 5.0, "vogel_fulcher_tammann"),
    ([293.15, 305.0, 330.0], -20.0, "andrade"),
])
def test_which_form(T, C, form):
    fit = exact(T, C=C)
    assert fit.form == form
    if form == "vogel_fulcher_tammann":
        assert fit.parameters[2] == pytest.approx(C, abs=1e-4)


def test_falls_back_to_andrade_when_the_logarithm_bends_the_wrong_way():
    T = np.array([283.15, 303.15, 333.15])
    for ln_value in ([1.0, 0.9, 0.2], [1.0, 0.4, -0.5], [0.0, 0.0, 0.0], [1.0, 0.2, 0.2]):
        fit = readings.fit(T=T, value=np.exp(ln_value), u=0.01)
        assert fit.form == "andrade"
        assert np.isfinite(fit.at(T=300.0)).all()


def test_merging_keeps_the_weighted_mean():
    T, value, u = readings.merge(T=[303.15, 293.20, 293.15], value=[1.0, 2.1, 2.0], u=[0.1, 0.1, 0.05])
    # Weights 100 and 400 by hand.
    np.testing.assert_allclose(T, [293.16, 303.15], rtol=1e-12)
    np.testing.assert_allclose(value, [2.02, 1.0], rtol=1e-12)
    np.testing.assert_allclose(u, [500**-0.5, 0.1], rtol=1e-12)


def test_merging_does_not_swallow_a_slow_ramp():
    T = np.arange(0.0, 50.0, 0.05) + 283.15
    merged, _, u = readings.merge(T=T, value=np.ones_like(T), u=np.full_like(T, 0.1))
    assert np.diff(merged).min() > 0.1
    assert merged.size > 200
    assert np.sum(u**-2.0) == pytest.approx(T.size * 100.0, rel=1e-9)  # no reading is lost


def test_order_of_readings_does_not_matter():
    T, value = np.array([283.15, 298.15, 313.15, 333.15]), np.array([12.0, 7.9, 5.2, 3.2])
    back = slice(None, None, -1)
    one = readings.fit(T=T, value=value, u=0.01 * value)
    two = readings.fit(T=T[back], value=value[back], u=0.01 * value[back])
    assert one.parameters == two.parameters


def test_scaled_along_a_correlation():
    # One reading 5 % above Cheng at 20 degC stays 5 % above it, and follows its slope.
    mu_20 = fluids.glycerol_water_viscosity(w=0.85, T=293.15)

    def correlation(T):
        return fluids.glycerol_water_viscosity(w=0.85, T=T)

    T = np.array([293.15, 298.15])
    value, slope, u = readings.scaled(T=T, value=1.05 * mu_20, u=0.02 * mu_20, T_read=293.15,
                                      correlation=correlation)
    np.testing.assert_allclose(value, 1.05 * correlation(T), rtol=1e-12)
    np.testing.assert_allclose(u / value, 0.02 / 1.05, rtol=1e-12)
    assert slope[1] / value[1] == pytest.approx(-0.0624, abs=5e-5)  # printed sensitivity, three figures
    _, _, with_T = readings.scaled(T=298.15, value=1.0, u=0.01, T_read=298.15, correlation=correlation, u_T=0.1)
    assert with_T == pytest.approx(np.hypot(0.01, 0.00624), rel=1e-3)
    assert np.ndim(with_T) == 0


@pytest.mark.parametrize("bad", [
    {"value": [1.0, -1.0]}, {"value": [1.0, 0.0]}, {"value": [1.0, np.nan]}, {"u": [0.1, 0.0]}, {"u": [0.1, -0.1]},
    {"u": [0.1, np.inf]}, {"T": [290.0, 0.0]}, {"T": [290.0, np.nan]}, {"T": []}, {"value": [1.0, 2.0, 3.0]},
    {"u_T": [-0.1, 0.1]}, {"value": "thick"},
])
def test_refusals(bad):
    with pytest.raises(Refusal) as told:
        readings.fit(**({"T": [290.0, 300.0], "value": [2.0, 1.0], "u": [0.1, 0.1]} | bad))
    assert told.value.field in bad


def test_scaling_takes_one_reading():
    with pytest.raises(Refusal, match="single reading"):
        readings.scaled(T=300.0, value=[1.0, 2.0], u=0.1, T_read=[290.0, 300.0],
                        correlation=fluids.water_viscosity)


def test_no_value_at_or_below_the_pole():
    fit = exact([283.15, 303.15, 333.15])
    value, slope, u = fit.at(T=np.array([100.0, 140.0, 300.0]))
    assert np.isnan([value[:2], slope[:2], u[:2]]).all()
    assert np.isfinite([value[2], slope[2], u[2]]).all()
    with pytest.raises(ValueError):
        fit.covariance[0, 0] = 1.0
