"""Where a prediction leaves the range in which it was checked: short reasons, for one run or for many."""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from labbook.physics import rods, tails, walls
from labbook.physics.predictions import model_of

HELIX_PITCH_CHECKED = 9.8  # pitch/R_helix of the tank's long helix, where thrust and drag came out within 6 %
STOUTEST = 8.0  # L/(2a) from which a bent rod is taken for slender (common practice, no source)
ANIMALS_FROM = 10.0  # Re of the smallest larvae in the scaling (from memory)


@dataclass(frozen=True)
class Doubt:
    """One reason to trust a prediction less: key, the sentence, and where it holds (bool array)."""

    key: str
    says: str
    where: np.ndarray


def doubts(*, form, drive, values: Mapping, drag_model=rods.HOUSE_MODEL) -> list[Doubt]:
    """Every reason that could hold for this form and drive, with where it does.

    values: SI by key, scalars or arrays that broadcast: those of predictions.predicted, what that gave
    (U_model, theta_model, Sp_model), and Re_omega; a reason whose keys are not there holds nowhere.
    drag_model: of zeta_n and zeta_t, with the slenderness in which its row is trusted. Refusals as
    predictions.model_of.
    """
    model = model_of(form=form, drive=drive)
    if model.key == "none":
        return []

    def of(key):
        return np.asarray(values.get(key, np.nan), dtype=float)

    with np.errstate(all="ignore"):
        found = [Doubt(*row) for row in _rows(model.key, of, drag_model)]
    return found


def reasons(*, form, drive, values: Mapping, drag_model=rods.HOUSE_MODEL) -> list[str]:
    """The sentences that hold for one run (scalars)."""
    every = doubts(form=form, drive=drive, values=values, drag_model=drag_model)
    return [doubt.says for doubt in every if np.any(doubt.where)]


def _rows(key, of, drag_model):
    if key == "undulating":
        yield from _undulating(of)
        return
    yield from _inertia(of, key == "scallop")
    if key == "scallop":
        return
    yield from _wall(of)
    yield from _helix(of, key) if key in ("field", "motor") else _tail(of, key, drag_model)


def _inertia(of, still):
    Re = of("Re_omega")
    so = "and what cannot swim in Stokes flow may" if still else "and the theory leaves it out"
    yield ("inertia", f"Re_omega is 0.1 to 1: the fluid's inertia begins to count, {so}",
           (Re >= 0.1) & (Re <= 1.0))  # fmt: skip
    yield "not creeping", f"Re_omega is above 1: this is no creeping flow, {so}", Re > 1.0


def _wall(of):
    b, L, h, bore = of("b"), of("L_tail"), of("h_wall"), of("D_tank")
    b = np.fmax(b, of("b_long"))
    near = (b / h > walls.PLANE_X_CHECKED) | (2.0 * b / bore > walls.TUBE_KAPPA_CHECKED)
    yield "wall at head", "the wall is so near that the correction of the head's drag is not checked", near
    yield ("wall at tail", "the wall is nearer than a tail length: the tail's drag is that of open fluid",
           np.fmin(h, bore / 2.0) < L)  # fmt: skip


def _tail(of, key, drag_model):
    free = key.startswith("free")
    # a heaved tail slopes by about h0 over the length of its wave, or over its own where that is shorter
    angle = of("h0") / of("L_tail") * np.fmax(of("Sp_model"), 1.0) if key.endswith("heave") else (
        of("theta_model") if key == "free_head_torque" else of("theta0"))
    checked = tails.THETA0_CHECKED
    yield "angle", f"the angle is above {checked} rad, where small-angle theory was checked", angle > checked
    row, slender = rods.MODELS.get(drag_model), of("L_tail") / (2.0 * of("a"))
    if row is not None:
        beyond = ~rods.within_range(model=drag_model, L=of("L_tail"), a=of("a")) & np.isfinite(slender)
        trusted = f"{row.p_low:g} to {row.p_high:g}" if np.isfinite(row.p_high) else f"{row.p_low:g} and more"
        yield "slenderness", f"L_tail/(2a) is outside {trusted}, the range of {row.key}", beyond
    yield ("stout", f"L_tail is less than {STOUTEST:g} diameters: theory takes the tail for slender", slender < STOUTEST)
    if not free:
        yield ("held base", "the base is held: what holds it must add no drag along the axis",
               np.isfinite(of("L_tail")))  # fmt: skip


def _helix(of, key):
    short = of("pitch") / of("R_helix")
    yield ("resistive force", "resistive-force theory of a helix: its coefficients alone differ by a third",
           np.isfinite(short))  # fmt: skip
    yield ("short pitch", f"pitch below {HELIX_PITCH_CHECKED} helix radii: thrust and drag come out up to "
           "three times too large (Rodenborn et al. 2013)", short < HELIX_PITCH_CHECKED)  # fmt: skip
    if key == "field":
        ratio = of("f_ratio")
        yield "step-out", "above step-out: the mean rate of a magnet that slips", ratio > 1.0
        yield ("step-out not known", "without m_mag and B no step-out: the helix is taken to follow",
               np.isnan(of("m_mag") * of("B")) & np.isfinite(short))  # fmt: skip


def _undulating(of):
    Re = of("U_model") * of("L_body") / of("nu")
    yield ("scatter", "a fit through many animals: how far one body lies off it is not in the uncertainty",
           np.isfinite(Re))  # fmt: skip
    yield "slow", f"Re is below {ANIMALS_FROM:g}: below every animal of the fit", Re < ANIMALS_FROM
