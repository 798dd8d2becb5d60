"""Which values a run uses (design 5): nearest set, rho before nu, single readings carried, fits, marks, sentences.

Expected values are worked out here from the published formulas and by numpy's own least squares, never with
labbook's functions; each names its source.
"""

import math

import numpy as np
import pytest
from iapws._iapws import _Liquid

K = 273.15


def cheng(w, t):
    """Viscosity of glycerol-water (Pa.s): Cheng, Ind. Eng. Chem. Res. 47:3285 (2008), t in degC."""
    mu_w = 1.790 * math.exp((-1230 - t) * t / (36100 + 360 * t))
    mu_g = 12100 * math.exp((-1233 + t) * t / (9900 + 70 * t))
    a, b = 0.705 - 0.0017 * t, (4.9 + 0.036 * t) * (0.705 - 0.0017 * t) ** 2.5
    alpha = 1 - w + a * b * w * (1 - w) / (a * w + b * (1 - w))
    return mu_w**alpha * mu_g ** (1 - alpha) / 1000


def volk(w, t):
    """Density of glycerol-water (kg/m3): Volk & Kaehler, Exp. Fluids 59:75 (2018), t in degC."""
    rho_w, rho_g = 1000 * (1 - abs((t - 3.98) / 615) ** 1.71), 1273 - 0.612 * t
    kappa = 1 + (1.78e-6 * t**2 - 1.82e-4 * t + 1.41e-2) * math.sin(math.pi * w**1.31) ** 0.81
    return kappa * (rho_w + (rho_g - rho_w) / (1 + rho_g / rho_w * (1 / w - 1)))


def standard_curve(nu25, t):
    """Kinematic viscosity of silicone oil: makers' curve log10(nu/nu25) = 763.1/(273+t) - 2.559 (from memory)."""
    return nu25 * 10 ** (763.1 / (273 + t) - 2.559)


def oil_density(t):
    """Density of silicone oil: 970 at 25 degC, -0.95e-3 per K (from memory)."""
    return 970 * (1 - 0.95e-3 * (t - 25))


@pytest.fixture
def bench(empty):
    """Short verbs on an empty book with one swimmer: fluid, read, and a run's sheet."""
    book = empty
    book.stock("material", code="sil", made="2026-01-01")
    book.stock("swimmer", code="s", form="flexible tail", material="sil", L_body="30 mm", L_tail="25 mm", section="rod",
               d="1.00(1) mm")  # fmt: skip

    class Bench:
        def fluid(self, kind, **cells):
            book.stock("fluid", code="x", kind=kind, **cells)

        def read(self, key, value, T=None, on=None, of="x", **options):
            return book.stock("reading", of=of, key=key, value=value, T=T, on=on, **options)

        def run(self, T=None, at="2026-03-10T12:00", **cells):
            code = book.record(swimmer="s", fluid="x", f="1 Hz", T=T, at=at, **cells)
            return book.sheet(code)

        def mu(self, T="20.0(1) degC", at="2026-03-10T12:00", **cells):
            return self.run(T, at, **cells).values["mu"]

    bench = Bench()
    bench.book = book
    return bench


# ---- the nearest set


@pytest.mark.parametrize(("at", "mu"), [
    ("2026-02-01T09:00", 1.0),  # before every set: the first
    ("2026-03-01T23:30", 1.0),
    ("2026-03-04T12:00", 1.0),  # three days after the first, seven before the second
    ("2026-03-05T23:59", 1.0),
    ("2026-03-06T00:01", 1.0),  # five days from both: the earlier
    ("2026-03-06T23:59", 1.0),
    ("2026-03-07T00:01", 2.0),  # nearer to the later set, which was measured after the run
    ("2026-03-11T08:00", 2.0),
    ("2027-01-01T00:00", 2.0),
])  # fmt: skip
def test_the_nearest_set_before_or_after(bench, at, mu):
    bench.fluid("measured")
    bench.read("mu", "1.00(1) Pa.s", "20 degC", "2026-03-01")
    bench.read("mu", "2.00(1) Pa.s", "20 degC", "2026-03-11")
    assert bench.mu(at=at) == pytest.approx(mu, rel=1e-12)


def test_an_undated_reading_takes_the_day_the_batch_was_made(bench):
    bench.fluid("measured", made="2026-03-01")
    bench.read("mu", "1.00(1) Pa.s", "20 degC")
    bench.read("mu", "2.00(1) Pa.s", "20 degC", "2026-03-11")
    assert bench.mu(at="2026-03-05T12:00") == pytest.approx(1.0)
    assert bench.mu(at="2026-03-07T12:00") == pytest.approx(2.0)
    assert bench.run("20 degC", "2026-03-02T12:00").sentences["mu_from"] == (
        "viscosity: reading of 2026-03-01, taken as constant"
    )


def test_an_undated_reading_of_an_undated_batch_serves_any_time(bench):
    bench.fluid("measured")
    bench.read("mu", "1.00(1) Pa.s", "20 degC")
    for at in ("1999-01-01T00:00", "2026-03-05T12:00"):
        sheet = bench.run("20 degC", at)
        assert sheet.values["mu"] == pytest.approx(1.0)
    assert sheet.sentences["mu_from"] == "viscosity: reading without date, taken as constant"


def test_a_void_reading_is_not_used(bench):
    bench.fluid("measured")
    bench.read("mu", "1.00(1) Pa.s", "20 degC", "2026-03-01")
    wrong = bench.read("mu", "2.00(1) Pa.s", "20 degC", "2026-03-10")
    assert bench.mu() == pytest.approx(2.0)
    bench.book.void(wrong, why="spindle was wrong")
    assert bench.book.sheet("R-0001").values["mu"] == pytest.approx(1.0)


# ---- no set: composition, else absent


def test_water_without_readings(bench):
    bench.fluid("water")
    sheet = bench.run("25.0(1) degC")
    # IAPWS SR6-08 and IAPWS-95 by the iapws package: 889.996774 uPa.s (physics 1), 997.0476 kg/m3
    liquid = _Liquid(298.15)
    assert sheet.values["mu"] == pytest.approx(liquid["mu"], rel=1e-6)
    assert sheet.values["rho"] == pytest.approx(997.0476, abs=0.002)
    assert sheet.sentences == {
        "mu_from": "viscosity: correlation, viscosity of water at 0.1 MPa",
        "rho_from": "density: correlation, density of water at 0.1 MPa",
    }
    assert "mu" not in sheet.marks


@pytest.mark.parametrize("w", [0.5, 0.85, 0.97])
def test_glycerol_water_without_readings(bench, w):
    bench.fluid("glycerol-water", glycerol=f"{100 * w:g}.0(3) wt%")
    sheet = bench.run("22.0(1) degC")
    assert sheet.values["mu"] == pytest.approx(cheng(w, 22.0), rel=1e-9)
    assert sheet.values["rho"] == pytest.approx(volk(w, 22.0), rel=1e-9)
    # u: 2 % of the model (5 % above 95 wt%), T and composition by numerical slopes of the formula above
    model = 0.05 if w > 0.95 else 0.02
    slope_T = (cheng(w, 22.01) - cheng(w, 21.99)) / 0.02
    slope_w = (cheng(w + 0.003, 22) - cheng(w - 0.003, 22)) / 0.006
    mu = sheet.values["mu"]
    assert sheet.u_own["mu"] == pytest.approx(abs(slope_T) * 0.1, rel=1e-4)
    assert sheet.u_shared["mu"] == pytest.approx(math.hypot(model * mu, slope_w * 0.003), rel=1e-4)


def test_silicone_oil_by_its_grade(bench):
    bench.fluid("silicone-oil", grade="5000 cSt")
    sheet = bench.run("22.0(1) degC")
    mu = standard_curve(5e-3, 22.0) * oil_density(22.0)
    assert sheet.values["mu"] == pytest.approx(mu, rel=1e-9)
    assert sheet.values["rho"] == pytest.approx(oil_density(22.0), rel=1e-9)
    assert sheet.sentences["mu_from"] == "viscosity: nominal grade of x along the standard curve"
    # a nominal grade: 5 %/sqrt 3; density 0.5 %
    assert sheet.u_shared["mu"] / mu == pytest.approx(math.hypot(0.05 / math.sqrt(3), 0.005), rel=1e-9)


def test_a_grade_with_its_own_uncertainty_is_not_taken_as_nominal(bench):
    bench.fluid("silicone-oil", grade="5000 +- 50 cSt")
    sheet = bench.run("22.0(1) degC")
    assert sheet.u_shared["mu"] / sheet.values["mu"] == pytest.approx(math.hypot(0.01, 0.005), rel=1e-9)


@pytest.mark.parametrize(("kind", "cells", "why"), [
    ("measured", {}, "x has no viscosity reading, and a measured fluid needs one"),
    ("glycerol-water", {}, "x has no reading and its glycerol share is not typed"),
    ("silicone-oil", {}, "x has no reading and its grade is not typed"),
    ("silicone-oil", {"grade": "50 cSt"}, "x is thinner than 100 cSt and needs readings"),
])  # fmt: skip
def test_neither_set_nor_composition(bench, kind, cells, why):
    bench.fluid(kind, **cells)
    sheet = bench.run("20 degC", U="1.0(1) mm/s")
    assert sheet.values["mu"] is None and sheet.values["Re"] is None
    assert why in sheet.why_absent["mu"] and why in sheet.why_absent["Re"]
    assert sheet.values["omega"] == pytest.approx(2 * math.pi)  # nothing else fails
    assert sheet.values["stride"] == pytest.approx(1e-3 / 0.030)


def test_a_missing_temperature_makes_absent_what_needs_it(bench):
    bench.fluid("silicone-oil", grade="5000 cSt")
    bench.read("E", "1.50(3) MPa", of="sil", on="2026-03-01")
    sheet = bench.run(U="1.0(1) mm/s")
    for key in ("mu", "rho", "nu", "Re", "Sp", "Re_omega"):
        assert sheet.values[key] is None
        assert "T was not typed" in sheet.why_absent[key]
    assert sheet.values["EI"] == pytest.approx(1.5e6 * math.pi / 64 * 1e-12)


# ---- density and kinematic viscosity


def test_density_reading_then_constant_then_correlation(bench):
    bench.fluid("silicone-oil", grade="5000 cSt")
    assert bench.run("21.0(1) degC").sentences["rho_from"].startswith("density: correlation, ")
    bench.book.stock("fluid", code="x", rho="0.975(2) g/cm3", why="weighed")
    sheet = bench.book.sheet("R-0001")
    assert sheet.values["rho"] == pytest.approx(975.0)
    assert sheet.sentences["rho_from"] == "density: stated for x"
    bench.read("rho", "968(1) kg/m3", "22 degC", "2026-03-09")
    bench.read("rho", "960(1) kg/m3", "22 degC", "2026-04-09")
    sheet = bench.book.sheet("R-0001")
    assert sheet.values["rho"] == pytest.approx(968.0)
    assert sheet.sentences["rho_from"] == "density: reading of 2026-03-09"
    # and the oil's mu follows its nu with that density
    assert sheet.values["mu"] == pytest.approx(standard_curve(5e-3, 21.0) * 968.0, rel=1e-9)


def test_nu_becomes_mu_with_the_density_at_the_runs_temperature(bench):
    bench.fluid("silicone-oil")
    bench.read("nu", "5000(50) cSt", "25.0 degC", "2026-03-01")
    sheet = bench.run("35.0(1) degC")
    nu = 5e-3 * 10 ** (763.1 / (273 + 35) - 763.1 / (273 + 25))
    assert sheet.values["mu"] == pytest.approx(nu * oil_density(35.0), rel=1e-9)
    assert sheet.values["nu"] == pytest.approx(nu, rel=1e-9)
    # the density's 0.5 % is in mu, and cancels in nu = mu/rho
    digits = 0.05 / math.sqrt(3)  # '25.0 degC' of the reading, through the curve's slope at 25 degC
    slope = math.log(10) * 763.1 / (273 + 25) ** 2
    nu_part = math.hypot(0.01, slope * digits)
    assert sheet.u_shared["nu"] / nu == pytest.approx(nu_part, rel=1e-6)
    assert sheet.u_shared["mu"] / sheet.values["mu"] == pytest.approx(math.hypot(nu_part, 0.005), rel=1e-6)


def test_a_nu_reading_without_any_density(bench):
    bench.fluid("measured")
    bench.read("nu", "100(1) cSt", "20 degC", "2026-03-01")
    sheet = bench.run("20 degC")
    assert sheet.values["mu"] is None
    assert "density" in sheet.why_absent["mu"]


def test_mu_and_nu_of_one_day_are_one_set(bench):
    bench.fluid("measured", rho="1250(1) kg/m3")
    bench.read("mu", "1.25(1) Pa.s", "20.00 degC", "2026-03-01")
    bench.read("nu", "5.0(1) St", "30.00 degC", "2026-03-01")  # 5e-4 m2/s times 1250 is 0.625 Pa.s
    mu = bench.mu("25.00(1) degC")
    # Andrade through two points is a straight line of ln mu in 1/T
    x = (1 / 298.15 - 1 / 303.15) / (1 / 293.15 - 1 / 303.15)
    assert mu == pytest.approx(0.625 * (1.25 / 0.625) ** x, rel=1e-9)


def test_mixed_sets_take_the_density_of_their_own_day(bench):
    bench.fluid("measured")
    bench.read("rho", "1000(1) kg/m3", on="2025-01-01")
    bench.read("rho", "1250(1) kg/m3", on="2026-03-01")
    bench.read("mu", "1.25(1) Pa.s", "20.00 degC", "2026-03-01")
    bench.read("nu", "5.0(1) St", "30.00 degC", "2026-03-01")
    assert bench.mu("30.00(1) degC") == pytest.approx(0.625, rel=1e-9)


# ---- one reading, two, three


def test_readings_within_a_tenth_of_a_kelvin_are_one(bench):
    bench.fluid("measured")
    bench.read("mu", "1.00(1) Pa.s", "20.00(1) degC", "2026-03-01")
    bench.read("mu", "1.10(2) Pa.s", "20.10(1) degC", "2026-03-01")
    sheet = bench.run("20.0(1) degC")
    # weighted mean with weights 1/u^2: (1.00/1e-4 + 1.10/4e-4)/(1/1e-4 + 1/4e-4), u = (1.25e4)^-1/2
    assert sheet.values["mu"] == pytest.approx(1.02, rel=1e-9)
    assert sheet.u_shared["mu"] == pytest.approx(1.25e4**-0.5, rel=1e-9)
    assert sheet.sentences["mu_from"] == "viscosity: mean of 2 readings of 2026-03-01, taken as constant"


def test_beyond_a_tenth_of_a_kelvin_they_are_two(bench):
    bench.fluid("measured")
    bench.read("mu", "1.00(1) Pa.s", "20.00(1) degC", "2026-03-01")
    bench.read("mu", "1.10(2) Pa.s", "20.20(1) degC", "2026-03-01")
    assert "fit of 2 readings of 2026-03-01 (Andrade)" in bench.run("20.1 degC").sentences["mu_from"]


@pytest.mark.parametrize(
    ("T", "marked"), [(20.9, False), (21.0, False), (19.0, False), (21.2, True), (18.7, True)]
)
def test_a_lone_reading_is_constant_and_marked_beyond_a_kelvin(bench, T, marked):
    bench.fluid("measured")
    bench.read("mu", "1.00(1) Pa.s", "20.0 degC", "2026-03-01")
    sheet = bench.run(f"{T:.1f} degC")
    assert sheet.values["mu"] == pytest.approx(1.0)
    assert ("extrapolated" in sheet.marks.get("mu", [])) is marked
    assert ("extrapolated" in sheet.marks.get("Re_omega", [])) is False  # rho is absent, so it is too


def test_a_lone_reading_is_carried_along_the_kinds_correlation(bench):
    bench.fluid("glycerol-water", glycerol="85.0(3) wt%")
    bench.read("mu", "110.0(11) mPa.s", "20.0(1) degC", "2026-03-01")
    sheet = bench.run("26.0(1) degC")
    mu = 0.110 * cheng(0.85, 26.0) / cheng(0.85, 20.0)
    assert sheet.values["mu"] == pytest.approx(mu, rel=1e-9)
    assert sheet.sentences["mu_from"] == (
        "viscosity: reading of 2026-03-01 scaled along the correlation, viscosity of glycerol-water"
    )
    slope = math.log(cheng(0.85, 20.01) / cheng(0.85, 19.99)) / 0.02
    assert sheet.u_shared["mu"] / mu == pytest.approx(math.hypot(0.01, slope * 0.1), rel=1e-4)
    assert "mu" not in sheet.marks


def test_a_lone_reading_of_water_and_of_oil(bench):
    bench.fluid("water")
    bench.read("mu", "1.030(5) mPa.s", "20.0(1) degC", "2026-03-01")
    ratio = _Liquid(303.15)["mu"] / _Liquid(293.15)["mu"]
    assert bench.mu("30.0(1) degC") == pytest.approx(1.030e-3 * ratio, rel=1e-6)
    bench.book.stock("fluid", code="oil", kind="silicone-oil", grade="1000 cSt")
    bench.read("mu", "1.00(1) Pa.s", "20.0(1) degC", "2026-03-01", of="oil")
    code = bench.book.record(swimmer="s", fluid="oil", f="1 Hz", T="30.0(1) degC")
    ratio = 10 ** (763.1 / 303 - 763.1 / 293) * oil_density(30) / oil_density(20)
    assert bench.book.sheet(code).values["mu"] == pytest.approx(ratio, rel=1e-9)


THREE = ((10.0, 1.3058997e-3), (30.0, 0.7972218e-3), (60.0, 0.4660351e-3))


def test_three_readings_over_25_kelvin_are_a_vogel_fit(bench):
    """Through IAPWS water at 10, 30, 60 degC the Vogel curve is 0.890622 mPa.s at 25 degC (physics 4)."""
    bench.fluid("measured")
    for t, mu in THREE:
        bench.read("mu", f"{mu * 1e3:.7f}(10000) mPa.s", f"{t:.2f}(1) degC", "2026-03-01")
    sheet = bench.run("25.0(1) degC")
    assert sheet.values["mu"] == pytest.approx(0.890622e-3, rel=2e-6)
    assert sheet.sentences["mu_from"] == "viscosity: fit of 3 readings of 2026-03-01 (Vogel-Fulcher-Tammann)"
    # slope of A exp(B/(T-C)) with B = 494.9157, C = 151.1754
    assert sheet.u_own["mu"] == pytest.approx(
        0.890622e-3 * 494.9157 / (298.15 - 151.1754) ** 2 * 0.1, rel=1e-4
    )


def test_three_readings_over_less_than_25_kelvin_are_andrade(bench):
    bench.fluid("measured")
    T, mu = np.array([15.0, 20.0, 25.0]) + K, np.array([6.2, 4.4, 3.3])
    for t, m in zip(T, mu, strict=True):
        bench.read("mu", f"{m:.2f}(5) Pa.s", f"{t - K:.3f}(1) degC", "2026-03-01")
    sheet = bench.run("22.0(1) degC")
    B, ln_A = np.polyfit(1 / T, np.log(mu), 1, w=mu / 0.05)  # weights 1/sigma of ln mu
    # T of the readings joins the weights at 0.001 K: less than 1e-6 of them
    assert sheet.values["mu"] == pytest.approx(math.exp(ln_A + B / 295.15), rel=1e-6)
    assert sheet.sentences["mu_from"] == "viscosity: fit of 3 readings of 2026-03-01 (Andrade)"


def test_a_vogel_fit_that_goes_astray_falls_back_on_andrade(bench):
    """ln mu concave in 1/T needs a negative C: not within 0 < C < T_min - 50 K."""
    bench.fluid("measured")
    T, mu = np.array([10.0, 30.0, 50.0]) + K, np.array([3.0, 2.5, 1.4])
    for t, m in zip(T, mu, strict=True):
        bench.read("mu", f"{m:.2f}(5) Pa.s", f"{t - K:.3f}(1) degC", "2026-03-01")
    sheet = bench.run("30.0(1) degC")
    B, ln_A = np.polyfit(1 / T, np.log(mu), 1, w=mu / 0.05)
    assert sheet.values["mu"] == pytest.approx(math.exp(ln_A + B / 303.15), rel=1e-6)
    assert "(Andrade)" in sheet.sentences["mu_from"]


@pytest.mark.parametrize(
    ("t", "beyond"), [(17.9, True), (18.0, False), (22.0, False), (26.0, False), (26.1, True)]
)
def test_outside_the_readings_is_marked_and_saved(bench, t, beyond):
    bench.fluid("measured", rho="1380(2) kg/m3")
    for at, mu in (("18.0", "5.20(5)"), ("26.0", "3.25(3)")):
        bench.read("mu", f"{mu} Pa.s", f"{at} degC", "2026-03-01")
    sheet = bench.run(f"{t:.1f}(1) degC", U="1.0(1) mm/s")
    assert ("extrapolated" in sheet.marks.get("mu", [])) is beyond
    assert ("extrapolated" in sheet.marks.get("Re", [])) is beyond
    assert "extrapolated" not in sheet.marks.get("stride", [])
    assert sheet.values["Re"] is not None


def test_outside_the_correlation_is_marked(bench):
    bench.fluid("glycerol-water", glycerol="85.0(3) wt%")
    inside, outside = bench.run("30.0(1) degC"), bench.run("31.0(1) degC")
    assert "rho" not in inside.marks
    assert outside.marks["rho"] == ["extrapolated"]  # Volk & Kaehler holds from 15 to 30 degC
    assert "mu" not in outside.marks  # Cheng holds to 100 degC
    assert outside.values["rho"] is not None


def test_t_end_makes_t_the_mean_and_its_half_difference_uncertain(bench):
    bench.fluid("silicone-oil", grade="5000 cSt")
    sheet = bench.run("22.0(1) degC", T_end="23.2(1) degC")
    assert sheet.values["T"] == pytest.approx(22.6 + K)
    assert sheet.u_own["T"] == pytest.approx(math.sqrt(0.1**2 + 0.6**2 / 3), rel=1e-9)
    assert sheet.values["mu"] == pytest.approx(standard_curve(5e-3, 22.6) * oil_density(22.6), rel=1e-9)


# ---- modulus, relaxation time


def test_the_modulus_is_the_weighted_mean_of_the_nearest_set(bench):
    bench.fluid("water")
    bench.read("E", "1.50(3) MPa", of="sil", on="2026-03-01", how="sag")
    bench.read("E", "1.62(6) MPa", of="sil", on="2026-03-01", how="ring-down")
    bench.read("E", "9.90(9) MPa", of="sil", on="2026-04-01")
    sheet = bench.run("20 degC")
    # weights 1/0.03^2 and 1/0.06^2: (4 x 1.50 + 1.62)/5
    assert sheet.values["E"] == pytest.approx(1.524e6, rel=1e-9)
    assert sheet.u_shared["E"] == pytest.approx(0.03e6 * math.sqrt(4 / 5), rel=1e-9)
    assert sheet.u_own["E"] == 0
    assert sheet.sentences["E_from"] == "modulus: mean of 2 readings of 2026-03-01"
    assert bench.run("20 degC", "2026-03-25T10:00").values["E"] == pytest.approx(9.9e6)


def test_relaxation_time_reading_before_constant(bench):
    bench.fluid("measured", lam="0.50(2) s")
    assert bench.run("20 degC").values["lam"] == pytest.approx(0.5)
    bench.read("lam", "0.70(2) s", on="2026-03-01")
    sheet = bench.book.sheet("R-0001")
    assert sheet.values["lam"] == pytest.approx(0.7)
    assert sheet.values["De"] == pytest.approx(0.7 * 2 * math.pi)
    assert sheet.sentences["lam_from"] == "relaxation time: reading of 2026-03-01"
