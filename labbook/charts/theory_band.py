"""How uncertain a swimmer's curve is along the sperm number: what its runs share, and the model itself."""

from collections.abc import Mapping

import numpy as np

from labbook.physics import rods, sections
from labbook.physics.predictions import model_of
from labbook.registry.spread import Spread

# what is shared by the runs of one swimmer in one fluid, and what of it each kind of section takes
SOURCES = ("b", "b_long", "L_tail", "d", "w", "t", "D", "d_in", "E", "mu")
SECTIONS = {
    "rod": (("d",), lambda d: (sections.rod_second_moment(d=d), sections.rod_radius(d=d))),
    "tube": (
        ("D", "d_in"),
        lambda D, d_in: (sections.tube_second_moment(D=D, d_in=d_in), sections.tube_radius(D=D)),
    ),
    "strip": (
        ("w", "t"),
        lambda w, t: (sections.strip_second_moment(w=w, t=t), sections.strip_radius(w=w, t=t)),
    ),
}


def section_in(known: Mapping[str, float]) -> str:
    """The section that some dimensions (NaN where absent) make up; '' where they make up none."""
    for section, (keys, _) in SECTIONS.items():
        if all(np.isfinite(known[key]) for key in keys):
            return section
    return ""


def relative_u(
    known: Mapping[str, float],
    u: Mapping[str, float],
    Sp: np.ndarray,
    *,
    form: str,
    drive: str,
    coefficient: str,
) -> np.ndarray:
    """Relative standard uncertainty of a tail's predicted speed at each Sp; NaN without section or modulus.

    known: SI values of SOURCES, theta0, h_wall and D_tank, NaN where absent; u: shared standard uncertainties
    of SOURCES. A run keeps the rate at which its nominal Sp is the one given, so an error of modulus or
    viscosity moves it along the curve, and one error of a size enters Sp, drag and head together. The model's
    own standard uncertainty is that at theta0. Source: JCGM 100:2008, 5; the steps of
    labbook.physics.predictions.
    """
    section, model, Sp = section_in(known), model_of(form=form, drive=drive), np.asarray(Sp, dtype=float)
    if not section or not np.isfinite(known["E"]):
        return np.full(Sp.shape, np.nan)
    spread = Spread()
    for key in (*SOURCES, "theta0", "h_wall", "D_tank"):
        spread.measured(key, np.full(Sp.shape, known[key]), u.get(key, 0.0))
        if not u.get(key, 0.0) > 0:
            spread.parts[key] = {}
    keys, cut = SECTIONS[section]
    spread.follow(("I_area", "a"), cut, keys)
    spread.follow(("EI",), lambda E, I_area: E * I_area, ("E", "I_area"))
    spread.follow(
        ("zeta_n", "zeta_t"),
        _drag(section, coefficient),
        ("mu", "L_tail", "w", "t") if section == "strip" else ("mu", "L_tail", "a"),
    )
    now = spread.values
    spread.values["omega"] = Sp**4 * now["EI"] / (now["zeta_n"] * now["L_tail"] ** 4)
    spread.parts["omega"] = {}
    with np.errstate(all="ignore"):
        for step in model.steps:
            spread.follow(step.gives, step.function, step.takes, step.slopes)
        spread.parts["U_model"]["theory"] = model.own_u(spread.values)
        return spread.shared("U_model") / np.abs(spread.values["U_model"])


def _drag(section: str, coefficient: str):
    """The resistive coefficients of a section; a strip that bends in t moves broadside."""

    def function(mu, L_tail, a=None, w=None, t=None):
        if section != "strip":
            return rods.resistive_coefficients(model=coefficient, L=L_tail, a=a, mu=mu)
        flatness, a = sections.strip_flatness(w=w, t=t), sections.strip_radius(w=w, t=t)
        return rods.resistive_coefficients(model=coefficient, L=L_tail, a=a, mu=mu, flatness=flatness)

    return function
