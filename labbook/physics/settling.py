"""How long a trial takes to settle after the drive is switched on: the fluid, the tail, and some beats."""

from dataclasses import dataclass
from math import log

import numpy as np

FIRST_MODE = 1.875104069  # of a clamped, free beam (Roark's Formulas for Stress and Strain; Blevins 1979)
LEFT = 0.01  # of the tail's start-up when it counts as gone: common practice, no source
BEATS = 3  # common practice, no source
SOURCES = {
    "t_tail": "viscous diffusion over the tail, L_tail^2/nu: Batchelor, Introduction to Fluid Dynamics (1967), 4.3",
    "t_tank": "viscous diffusion to the wall, h^2/nu: Batchelor (1967), 4.3",
    "t_elastic": "slowest bending mode of a clamped tail, down to 1 %: Wiggins & Goldstein 1998 for the "
    "equation, Roark for the mode",
    "t_beats": f"{BEATS} beats: common practice, no source",
}


@dataclass(frozen=True)
class Settling:
    """Times in s, NaN where not known: of the fluid around the tail, of the tank, of the tail, of some beats.

    total: the longest of them.
    """

    t_tail: np.ndarray
    t_tank: np.ndarray
    t_elastic: np.ndarray
    t_beats: np.ndarray

    @property
    def total(self) -> np.ndarray:
        """The longest of those that are known, s."""
        return np.fmax.reduce([self.t_tail, self.t_tank, self.t_elastic, self.t_beats])


def settling(*, f, L_tail, nu, zeta_n, EI, reach=np.nan) -> Settling:
    """How long start-up lasts, by what makes it last (sources: SOURCES).

    f: Hz; L_tail, reach (distance to the wall that the flow has to find, NaN: not known): m; nu: m2/s;
    zeta_n: Pa.s; EI: N.m2; scalars or arrays. The slowest mode of a clamped overdamped tail decays at the
    rate FIRST_MODE^4 EI/(zeta_n L_tail^4).
    """
    f, L_tail, nu, zeta_n, EI, reach = np.broadcast_arrays(
        *(np.asarray(v, float) for v in (f, L_tail, nu, zeta_n, EI, reach))
    )
    with np.errstate(all="ignore"):
        slowest = zeta_n * L_tail**4 / (FIRST_MODE**4 * EI)
        return Settling(L_tail**2 / nu, reach**2 / nu, slowest * log(1.0 / LEFT), BEATS / f)
