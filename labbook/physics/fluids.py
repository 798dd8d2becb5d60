"""Correlations for water, glycerol-water and silicone oil: viscosity and density against temperature.

Every function takes keyword arguments, scalars or arrays that broadcast, in SI (T in K, w the glycerol mass
fraction) and returns the same shape. Complex T, w or nu25 work for complex-step derivatives. A value outside a
correlation's range is returned (see `Correlation.covers`); NaN means that the formula itself breaks down there.
"""

from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal

CELSIUS_ZERO = 273.15
LOWEST_SILICONE_GRADE = 1.0e-4  # m2/s, 100 cSt


@dataclass(frozen=True)
class Correlation:
    """One published correlation: where it holds and how sure it is.

    T_low, T_high: K; u_rel: relative standard uncertainty of the model alone; u_rel_above: pairs (mass
    fraction, relative standard uncertainty above it), empty where composition does not matter.
    """

    key: str
    name: str
    T_low: float
    T_high: float
    u_rel: float
    source: str
    u_rel_above: tuple[tuple[float, float], ...] = ()

    def covers(self, *, T) -> np.ndarray:
        """True where T (K) lies in the range, ends included."""
        T_real = np.real(thermodynamic_temperature(T=T))
        slack = 1e-6  # K: a typed end of the range survives its conversion from degC
        return (T_real >= self.T_low - slack) & (T_real <= self.T_high + slack)

    def relative_uncertainty(self, *, w) -> np.ndarray:
        """Relative standard uncertainty of the model at glycerol mass fraction w."""
        w_real = np.real(mass_fraction(w=w))
        u = np.full(np.shape(w_real), self.u_rel)
        for w_edge, u_rel in self.u_rel_above:
            u = np.where(w_real > w_edge + 1e-9, u_rel, u)
        return u[()]


WATER_VISCOSITY = Correlation(
    key="water_viscosity", name="viscosity of water at 0.1 MPa", T_low=253.15, T_high=383.15, u_rel=0.002,
    source="IAPWS SR6-08 (2011), simplified equation at 0.1 MPa",
)
WATER_DENSITY = Correlation(
    key="water_density", name="density of water at 0.1 MPa", T_low=253.15, T_high=383.15, u_rel=1e-4,
    source="IAPWS SR6-08 (2011), specific volume at 0.1 MPa",
)
GLYCEROL_WATER_VISCOSITY = Correlation(
    key="glycerol_water_viscosity", name="viscosity of glycerol-water", T_low=273.15, T_high=373.15, u_rel=0.02,
    source="Cheng, Ind. Eng. Chem. Res. 47:3285 (2008); spread from Segur & Oberstar (1951)",
    u_rel_above=((0.95, 0.05),),
)
GLYCEROL_WATER_DENSITY = Correlation(
    key="glycerol_water_density", name="density of glycerol-water", T_low=288.15, T_high=303.15, u_rel=1e-3,
    source="Volk & Kaehler, Exp. Fluids 59:75 (2018), glycerol 1273 - 0.612 t",
)
# A tolerance of 3 % is read as a rectangular half-width, as the 5 % of a nominal grade is.
SILICONE_OIL_VISCOSITY = Correlation(
    key="silicone_oil_kinematic_viscosity", name="kinematic viscosity of silicone oil, 100 cSt and more",
    T_low=273.15, T_high=373.15, u_rel=0.03 / 3**0.5,
    source="makers' standard curve for polydimethylsiloxane, from memory; range 0 to 100 degC is our choice",
)
SILICONE_OIL_DENSITY = Correlation(
    key="silicone_oil_density", name="density of silicone oil, 100 cSt and more",
    T_low=273.15, T_high=373.15, u_rel=5e-3,
    source="makers' typical data for polydimethylsiloxane, from memory; range 0 to 100 degC is our choice",
)
CORRELATIONS = (
    WATER_VISCOSITY, WATER_DENSITY, GLYCEROL_WATER_VISCOSITY, GLYCEROL_WATER_DENSITY,
    SILICONE_OIL_VISCOSITY, SILICONE_OIL_DENSITY,
)

SR6_08_VISCOSITY = ((280.68, -1.9), (511.45, -7.7), (61.131, -19.6), (0.45903, -40.0))  # uPa.s, exponent of T/300 K
# Specific volume over R T_R/p_0: a constant, then (factor, power) of T_R/(593 K - T) and of T_R/(T - 232 K).
SR6_08_VOLUME = 0.46151805e3 * 10.0 / 0.1e6  # m3/kg
SR6_08_CONSTANT = 1.93763157e-2
SR6_08_HOT = (
    (6.74458446e3, 4), (-2.22521604e5, 5), (1.00231247e8, 7), (-1.63552118e9, 8), (8.32299658e9, 9),
)
SR6_08_COLD = (
    (5.78545292e-3, 1), (-1.53195665e-2, 2), (3.11337859e-2, 3), (-4.23546241e-2, 4), (3.38713507e-2, 5),
    (-1.19946761e-2, 6),
)


def _numbers(field: str, given, ok, reason: str, remedy: str) -> np.ndarray:
    """given as a float or complex array, or a refusal that shows the first value that fails."""
    array = np.asarray(given)
    if array.dtype.kind not in "iufc":
        raise Refusal(field, given, "a number is needed", remedy)
    array = array if array.dtype.kind == "c" else array.astype(float)
    with np.errstate(invalid="ignore"):
        good = np.isfinite(array) & ok(array.real)
    if not np.all(good):
        raise Refusal(field, array[~good].flat[0], reason, remedy)
    return array


def thermodynamic_temperature(*, T) -> np.ndarray:
    """T (K) as a float or complex array; refuses what is not finite or not above 0 K."""
    return _numbers("T", T, lambda T_real: T_real > 0.0,
                    "a finite temperature above 0 K is needed", "give kelvin: 293.15 for 20 degC")


def mass_fraction(*, w) -> np.ndarray:
    """w (glycerol mass fraction) as a float or complex array; refuses what lies outside 0 to 1."""
    return _numbers("w", w, lambda w_real: (w_real >= 0.0) & (w_real <= 1.0),
                    "a glycerol mass fraction lies between 0 and 1", "give 0.85 for 85 wt%")


def _celsius(T) -> np.ndarray:
    return thermodynamic_temperature(T=T) - CELSIUS_ZERO


def _where_it_holds(value: np.ndarray, holds=True):
    """value, or NaN where the formula has broken down: not finite, not positive, or said so by `holds`."""
    return np.where(np.isfinite(value) & (value.real > 0.0) & holds, value, np.nan)[()]


def water_viscosity(*, T):
    """Dynamic viscosity (Pa.s) of liquid water at 0.1 MPa, 253 to 383 K (IAPWS SR6-08)."""
    x = thermodynamic_temperature(T=T) / 300.0
    with np.errstate(over="ignore", invalid="ignore"):
        mu = 1e-6 * sum(factor * x**exponent for factor, exponent in SR6_08_VISCOSITY)
    return _where_it_holds(mu)


def water_density(*, T):
    """Density (kg/m3) of liquid water at 0.1 MPa, 253 to 383 K (IAPWS SR6-08)."""
    T = thermodynamic_temperature(T=T)
    with np.errstate(all="ignore"):
        hot, cold = 10.0 / (593.0 - T), 10.0 / (T - 232.0)
        reduced = SR6_08_CONSTANT + sum(factor * hot**power for factor, power in SR6_08_HOT)
        reduced = reduced + sum(factor * cold**power for factor, power in SR6_08_COLD)
        rho = 1.0 / (SR6_08_VOLUME * reduced)
    return _where_it_holds(rho, (T.real > 232.0) & (T.real < 593.0))


def glycerol_water_viscosity(*, w, T):
    """Dynamic viscosity (Pa.s) of glycerol-water, mass fraction w, 0 to 100 degC (Cheng 2008)."""
    w, t = mass_fraction(w=w), _celsius(T)
    a = 0.705 - 0.0017 * t
    b_factor = 4.9 + 0.036 * t
    holds = (a.real > 0.0) & (b_factor.real > 0.0) & (36100.0 + 360.0 * t.real > 0.0)
    with np.errstate(all="ignore"):
        b = b_factor * a**2.5
        ln_mu_w = np.log(1.790e-3) + (-1230.0 - t) * t / (36100.0 + 360.0 * t)
        ln_mu_g = np.log(12.100) + (-1233.0 + t) * t / (9900.0 + 70.0 * t)
        alpha = 1.0 - w + a * b * w * (1.0 - w) / (a * w + b * (1.0 - w))
        mu = np.exp(alpha * ln_mu_w + (1.0 - alpha) * ln_mu_g)
    return _where_it_holds(mu, holds)


def glycerol_water_viscosity_u(*, w):
    """Relative standard uncertainty of `glycerol_water_viscosity`: 0.02 up to 95 wt%, 0.05 above."""
    return GLYCEROL_WATER_VISCOSITY.relative_uncertainty(w=w)


def glycerol_water_density(*, w, T):
    """Density (kg/m3) of glycerol-water, mass fraction w, 15 to 30 degC (Volk & Kaehler 2018).

    The slope in w is not finite at w = 0 and w = 1: take a one-sided difference there.
    """
    w, t = mass_fraction(w=w), _celsius(T)
    away = (t - 3.98) * np.sign(t.real - 3.98)  # |t - 3.98| that keeps a complex step
    with np.errstate(all="ignore"):
        rho_w = 1000.0 * (1.0 - (away / 615.0) ** 1.71)
        rho_g = 1273.0 - 0.612 * t
        # The published mixing term, multiplied out so that w = 0 does not divide: ideal mixing of volumes.
        ideal = rho_w * rho_g / (w * rho_w + (1.0 - w) * rho_g)
        contraction = (1.78e-6 * t**2 - 1.82e-4 * t + 1.41e-2) * np.sin(np.pi * w**1.31) ** 0.81
    return _where_it_holds((1.0 + contraction) * ideal, (rho_w.real > 0.0) & (rho_g.real > 0.0))


def silicone_oil_kinematic_viscosity(*, nu25, T):
    """Kinematic viscosity (m2/s) of silicone oil of nominal grade nu25 (m2/s at 25 degC), 100 cSt and more.

    The makers' standard curve as printed: with 273 for the zero of Celsius, and 1.0040 nu25 at 25 degC.
    Refuses grades below 100 cSt, whose curves differ.
    """
    nu25 = _numbers("nu25", nu25, lambda nu: nu >= LOWEST_SILICONE_GRADE * (1.0 - 1e-9),
                    "the standard curve holds for silicone oils of 100 cSt (1e-4 m2/s) and more",
                    "measure the viscosity at two or more temperatures and enter readings")
    t = _celsius(T)
    with np.errstate(all="ignore"):
        nu = nu25 * np.exp(np.log(10.0) * (763.1 / (273.0 + t) - 2.559))
    return _where_it_holds(nu, 273.0 + t.real > 0.0)


def silicone_oil_density(*, T):
    """Density (kg/m3) of silicone oil of 100 cSt and more: 970 at 25 degC, -0.095 % per K (makers' data)."""
    return _where_it_holds(970.0 * (1.0 - 0.95e-3 * (_celsius(T) - 25.0)))
