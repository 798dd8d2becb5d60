"""Viscosity between and beyond a fluid's readings: merging, and constant, Andrade or Vogel fits.

All of it serves mu (Pa.s) and nu (m2/s) alike: the value's unit passes through. T in K. The three forms are one
expression, ln value = ln A + B/(T - C), with C = 0 for Andrade and B = C = 0 for a constant.
"""

from dataclasses import dataclass

import numpy as np
from scipy.optimize import least_squares

from labbook.errors import Refusal
from labbook.physics.fluids import thermodynamic_temperature

SAME_TEMPERATURE = 0.1  # K
VOGEL_SPAN = 25.0  # K
VOGEL_MARGIN = 50.0  # K


@dataclass(frozen=True, eq=False)
class ViscosityFit:
    """value(T) = A exp(B/(T - C)) through n readings between T_low and T_high.

    form: 'constant', 'andrade' or 'vogel_fulcher_tammann'; parameters: (A, B, C), C and then B zero in the
    simpler forms; covariance: 3 x 3, of (ln A, B, C), from the stated uncertainties and not rescaled, zero for
    what the form holds fixed; n: readings before merging; ln_A serves where A itself leaves floating point.
    """

    form: str
    parameters: tuple[float, float, float]
    covariance: np.ndarray
    T_low: float
    T_high: float
    n: int
    ln_A: float

    def at(self, *, T):
        """(value, dvalue/dT, standard uncertainty of value from the fit) at T (K), each of T's shape.

        NaN where the curve has no value (T not above C, or beyond floating point).
        """
        _, B, C = self.parameters
        T = thermodynamic_temperature(T=T)
        with np.errstate(all="ignore"):
            inverse = 1.0 / (T - C)
            value = np.exp(self.ln_A + B * inverse)
            holds = (T.real > C) & np.isfinite(value) & (value.real > 0.0)
            value = np.where(holds, value, np.nan)
            slope = -B * inverse**2
            gradient = np.stack([np.ones_like(inverse.real), inverse.real, B * inverse.real**2], axis=-1)
            variance = np.einsum("...i,ij,...j->...", gradient, self.covariance, gradient)
        u = value.real * np.sqrt(np.maximum(variance, 0.0))
        return value[()], (value * slope)[()], u[()]


def merge(*, T, value, u):
    """Readings with those within 0.1 K taken as one: arrays (T, value, u), T ascending.

    The closest two go first, each time by their inverse-variance means of T and value, until all that remain
    lie more than 0.1 K apart; u is the standard uncertainty of the weighted mean.
    Refuses values and uncertainties that are not positive.
    """
    T, value, u = _checked(T, value, u)
    order = np.argsort(T, kind="stable")
    T, value, weight = T[order], value[order], u[order] ** -2.0
    while len(T) > 1:
        gap = np.diff(T)
        i = int(np.argmin(gap))
        if gap[i] > SAME_TEMPERATURE + 1e-9:
            break
        pair = slice(i, i + 2)
        total = weight[pair].sum()
        T[i] = weight[pair] @ T[pair] / total
        value[i] = weight[pair] @ value[pair] / total
        weight[i] = total
        T, value, weight = (np.delete(x, i + 1) for x in (T, value, weight))
    return T, value, weight**-0.5


def fit(*, T, value, u, u_T=None) -> ViscosityFit:
    """The curve through readings: value (Pa.s or m2/s) with standard uncertainty u at T (K).

    After merging, one temperature gives a constant; three or more that span 25 K give Vogel-Fulcher-Tammann
    where 0 < C < T_min - 50 K; otherwise two or more give Andrade. Least squares in ln value, weighted by the
    stated uncertainties. u_T (K, standard) joins them through the slope of an unweighted Andrade line.
    """
    T, value, u = _checked(T, value, u)
    T_low, T_high, n = float(T.min()), float(T.max()), len(T)
    merged = merge(T=T, value=value, u=u)
    if u_T is not None:
        u_T = _temperature_uncertainty(u_T, T)
        if len(merged[0]) > 1:
            slope = value * _unweighted_B(T, np.log(value)) / T**2
            merged = merge(T=T, value=value, u=np.hypot(u, slope * u_T))
    T, value, u = merged
    ln_value, sigma = np.log(value), u / value
    if len(T) == 1:
        return _frozen("constant", (ln_value[0], 0.0, 0.0), np.diag([sigma[0] ** 2, 0.0, 0.0]), T_low, T_high, n)
    if len(T) > 2 and T_high - T_low >= VOGEL_SPAN - 1e-6:
        found = _vogel(T, ln_value, sigma, C_high=T_low - VOGEL_MARGIN)
        if found is not None:
            return _frozen("vogel_fulcher_tammann", *found, T_low, T_high, n)
    return _frozen("andrade", *_andrade(T, ln_value, sigma), T_low, T_high, n)


def scaled(*, T, value, u, T_read, correlation, u_T=None):
    """One reading carried along its fluid's correlation: value(T) = value corr(T)/corr(T_read).

    correlation: analytic callable, called as correlation(T=...). Returns (value, dvalue/dT, u) of T's shape;
    u keeps the reading's relative uncertainty, joined by u_T (K, standard) through the slope at T_read. The
    correlation's own uncertainty is not in it.
    """
    T_read, value, u = _checked(T_read, value, u)
    if len(value) != 1:
        raise Refusal("value", len(value), "a single reading is scaled", "fit several readings")
    at_read, slope_read = _value_and_slope(correlation, T_read)
    at_T, slope_T = _value_and_slope(correlation, thermodynamic_temperature(T=T).real)
    factor = value[0] / at_read[0]
    relative = u[0] / value[0]
    if u_T is not None:
        relative = np.hypot(relative, slope_read[0] / at_read[0] * _temperature_uncertainty(u_T, T_read)[0])
    return factor * at_T, factor * slope_T, factor * at_T * relative


def _value_and_slope(correlation, T):
    step = 1e-20  # K: a complex step has no cancellation, so it may be this small
    stepped = np.asarray(correlation(T=T + 1j * step))
    return stepped.real[()], (stepped.imag / step)[()]


def _checked(T, value, u):
    """T, value, u as float arrays of one length, or a refusal."""
    T = np.atleast_1d(thermodynamic_temperature(T=T)).real
    if T.ndim != 1 or T.size == 0:
        raise Refusal("T", T.shape, "one row of readings is needed", "give at least one reading")
    value = _positive("value", value, T, "a viscosity is positive")
    u = _positive("u", u, T, "a standard uncertainty is positive")
    return T.copy(), value, u


def _positive(field, given, T, reason):
    return _column(field, given, T, lambda x: x > 0.0, reason)


def _temperature_uncertainty(u_T, T):
    return _column("u_T", u_T, T, lambda x: x >= 0.0, "a standard uncertainty of temperature is not negative")


def _column(field, given, T, ok, reason):
    try:
        array = np.broadcast_to(np.asarray(given, dtype=float), T.shape).copy()
    except (TypeError, ValueError):
        raise Refusal(field, given, f"{len(T)} numbers are needed, one a reading") from None
    good = np.isfinite(array) & ok(array)
    if not np.all(good):
        raise Refusal(field, array[~good][0], reason, "correct or leave out this reading")
    return array


def _frozen(form, ln_parameters, covariance, T_low, T_high, n) -> ViscosityFit:
    ln_A, B, C = ln_parameters
    covariance.setflags(write=False)
    with np.errstate(over="ignore", under="ignore"):
        A = float(np.exp(ln_A))
    return ViscosityFit(form, (A, float(B), float(C)), covariance, T_low, T_high, n, float(ln_A))


def _unweighted_B(T, ln_value):
    x = 1.0 / T - np.mean(1.0 / T)
    return x @ (ln_value - ln_value.mean()) / (x @ x)


# The fits are made in ln value = m - D s/(1 + theta s), s = T - T_0, theta = 1/(T_0 - C): the same curve, with
# m and D its level and slope at the middle of the readings, hence nearly independent of each other.
# Andrade is theta = 1/T_0; a straight line in T is theta = 0.


def _line(s, theta, ln_value, sigma):
    """Weighted (m, D) at a given theta, and their covariance."""
    design = np.column_stack([np.ones_like(s), -s / (1.0 + theta * s)]) / sigma[:, None]
    m_D = np.linalg.lstsq(design, ln_value / sigma, rcond=None)[0]
    return m_D, np.linalg.inv(design.T @ design)


def _andrade(T, ln_value, sigma):
    T_0 = T.mean()
    (m, D), covariance = _line(T - T_0, 1.0 / T_0, ln_value, sigma)
    jacobian = np.array([[1.0, -T_0], [0.0, T_0**2], [0.0, 0.0]])
    return (m - D * T_0, D * T_0**2, 0.0), jacobian @ covariance @ jacobian.T


def _vogel(T, ln_value, sigma, *, C_high):
    """(ln A, B, C) and covariance of the weighted fit, or None where its C is not within 0 to C_high."""
    T_0 = T.mean()
    s = T - T_0

    def residuals(p):
        return (p[0] - p[1] * s / (1.0 + p[2] * s) - ln_value) / sigma

    def jacobian(p):
        x = s / (1.0 + p[2] * s)
        return np.column_stack([np.ones_like(s), -x, p[1] * x**2]) / sigma[:, None]

    theta_low, theta_high = -1.0 / s.max(), -1.0 / s.min()  # no pole among the readings
    guesses = [theta for theta in (_rational_theta(s, ln_value, sigma), 1.0 / (T_0 - 150.0), 1.0 / T_0)
               if theta_low < theta < theta_high]
    starts = [np.array([*_line(s, theta, ln_value, sigma)[0], theta]) for theta in guesses]
    best = min(starts, key=lambda p: np.sum(residuals(p) ** 2))
    solution = least_squares(
        residuals, best, jac=jacobian, bounds=([-np.inf, -np.inf, theta_low], [np.inf, np.inf, theta_high]),
        x_scale="jac", ftol=1e-15, xtol=1e-15, gtol=1e-15, max_nfev=500,
    )
    m, D, theta = solution.x
    if theta <= 0.0 or not 0.0 < T_0 - 1.0 / theta < C_high:
        return None
    at_best = jacobian(solution.x)
    to_parameters = np.array([
        [1.0, -1.0 / theta, D / theta**2],
        [0.0, theta**-2, -2.0 * D / theta**3],
        [0.0, 0.0, theta**-2],
    ])
    covariance = to_parameters @ np.linalg.inv(at_best.T @ at_best) @ to_parameters.T
    return (m - D / theta, D / theta**2, T_0 - 1.0 / theta), covariance


def _rational_theta(s, ln_value, sigma):
    """theta from y (1 + theta s) = m + (m theta - D) s, linear in its unknowns and exact for three readings."""
    y = ln_value - ln_value.mean()
    design = np.column_stack([np.ones_like(s), s, -s * y]) / sigma[:, None]
    return np.linalg.lstsq(design, y / sigma, rcond=None)[0][2]
