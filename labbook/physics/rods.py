"""Resistive coefficients of slender rods: one row per drag model, and the call that evaluates a row."""

from collections.abc import Callable
from dataclasses import dataclass
from math import inf, pi

import numpy as np

from labbook.errors import Refusal


@dataclass(frozen=True)
class DragModel:
    """One drag model as facts plus its two denominators.

    zeta_t = 2 pi mu/den_t and zeta_n = 4 pi mu/den_n, with (den_t, den_n) = denominators(x); x is 2a/L, or
    a/wavelength where needs_wavelength is true. p_low and p_high bound the slenderness L/(2a) in which the
    row is trusted.
    """

    key: str
    name: str
    source: str
    needs_wavelength: bool
    p_low: float
    p_high: float
    denominators: Callable

    def __post_init__(self):
        for field in ("key", "name", "source"):
            if not getattr(self, field):
                raise Refusal(f"drag model {field}", None, "is missing", "every row names its source")
        if not 0.0 <= self.p_low < self.p_high:
            raise Refusal("drag model range", (self.p_low, self.p_high), "is empty", "give p_low < p_high")


def _spheroid_asymptotic(x):
    log_ratio = np.log(2.0 / x)
    return log_ratio - 0.5, log_ratio + 0.5


def _cylinder_two_term(x):
    log_ratio = np.log(4.0 / x)
    return log_ratio - 1.5, log_ratio - 0.5


def _cylinder_finite(x):
    log_x = np.log(x)
    return x * (0.980 - 0.133 * x) - (log_x + 0.207), x * (0.185 + 0.233 * x) - (log_x - 0.839)


def _gray_hancock_1955(x):
    den = np.log(2.0 / x) - 0.5
    return den, den


def _lighthill(x):
    log_ratio = np.log(0.18 / x)
    return log_ratio, log_ratio + 0.5


# Asymptotic rows carry no printed range: 5 is the smallest slenderness at which we compared any row with a
# direct boundary-element solution.
_SLENDER = 5.0

MODELS = {
    row.key: row
    for row in (
        DragModel("spheroid_asymptotic", "slender prolate spheroid, leading order",
                  "slender-spheroid limit of Stokes flow; common in the driven-tail literature",
                  False, _SLENDER, inf, _spheroid_asymptotic),
        DragModel("cylinder_two_term", "slender cylinder, two terms",
                  "Cox 1970, J. Fluid Mech. 44:791; Batchelor 1970, J. Fluid Mech. 44:419; "
                  "Tillett 1970, J. Fluid Mech. 44:401",
                  False, _SLENDER, inf, _cylinder_two_term),
        DragModel("cylinder_finite", "finite cylinder, fit",
                  "Tirado & Garcia de la Torre 1979, J. Chem. Phys. 71:2581: fitted over 2 < p < 30; "
                  "0.2 to 3.4 % from a direct boundary-element solution for 5 < p < 100",
                  False, 2.0, 100.0, _cylinder_finite),
        DragModel("gray_hancock_1955", "waving filament, Gray and Hancock as printed",
                  "Gray & Hancock 1955, J. Exp. Biol. 32:802 (zeta_n = 2 zeta_t)",
                  True, _SLENDER, inf, _gray_hancock_1955),
        DragModel("lighthill", "waving filament, Lighthill (wavelength along the filament)",
                  "Lighthill 1976, SIAM Rev. 18:161",
                  True, _SLENDER, inf, _lighthill),
    )
}

HOUSE_MODEL = "cylinder_finite"


def resistive_coefficients(*, model, L, a, mu, wavelength=None, flatness=0.5):
    """Normal and tangential resistive coefficients (zeta_n, zeta_t) of a slender rod.

    Force per length is -zeta times velocity. L full length, a (equivalent) radius, wavelength: m; mu: Pa.s;
    flatness = t/(w + t) of a strip that bends in t (0.5 for a round section), which adds flatness - 1/2 to
    the denominator of zeta_n (Batchelor 1970).
    Scalars or arrays that broadcast, real or complex; answers in Pa.s, NaN where the rod is too stout for the
    model to mean anything. Refuses an unknown model, and a missing wavelength. Source: each row.
    """
    row = _row(model)
    if row.needs_wavelength:
        if wavelength is None:
            raise Refusal("wavelength", None, f"is needed by the drag model {row.key}",
                          "give wavelength in m, or use " + HOUSE_MODEL)
        x = a / np.asarray(wavelength)
    else:
        x = 2.0 * np.asarray(a) / L
    den_t, den_n = row.denominators(x)
    if not (np.isscalar(flatness) and flatness == 0.5):
        den_n = den_n + (np.asarray(flatness) - 0.5)
    drag = np.asarray(mu) * (2.0 * pi)
    return 2.0 * drag / _positive(den_n), drag / _positive(den_t)


def within_range(*, model, L, a):
    """Whether slenderness L/(2a) lies in the range where a drag model is trusted.

    L, a: m, scalars or arrays; boolean answer of the broadcast shape. Refuses an unknown model.
    """
    row = _row(model)
    p = np.real(np.asarray(L) / (2.0 * np.asarray(a)))
    return (p >= row.p_low) & (p <= row.p_high)


def _row(model):
    if model not in MODELS:
        raise Refusal("model", model, "is not a drag model", "one of " + ", ".join(MODELS))
    return MODELS[model]


def _positive(den):
    bad = den.real <= 0.0
    return np.where(bad, np.nan, den) if np.any(bad) else den
