"""One prediction of speed per form and drive, or the sentence that says why there is none."""

from collections.abc import Mapping

import numpy as np

from labbook.errors import Refusal
from labbook.physics import helices, undulation
from labbook.physics.predicted_tails import TAIL_MODELS
from labbook.physics.prediction_steps import HEAD, HEAD_IF_ANY, WALLS, Model, Step

FORMS = ("flexible tail", "rigid tail", "helix", "undulating", "hinged")
HELIX_DRIVES = ("field", "motor")
DRIVES = (*TAIL_MODELS, *HELIX_DRIVES)


def model_of(*, form, drive) -> Model:
    """The model of a form (one of FORMS) with a drive (one of DRIVES); Refusal for others."""
    for field, given, known in (("form", form, FORMS), ("drive", drive, DRIVES)):
        if given not in known:
            raise Refusal(field, given, "has no place among the predictions", "one of " + ", ".join(known))
    if form == "undulating":
        return _UNDULATING
    if form == "helix":
        return _HELICES.get(drive) or _without("a helix is predicted for field and motor alone")
    if drive in HELIX_DRIVES:
        return _without(f"{_TURNED[form]} in a rotating field is no planar stroke, and no helix either")
    return TAIL_MODELS[drive] if form == "flexible tail" else _STILL[form]


def predicted(*, form, drive, values: Mapping) -> dict:
    """Everything that the model of a form and drive gives: key -> value; empty where there is no model.

    values: SI by key (omega, EI, zeta_n, zeta_t, a and nu among them), real scalars or arrays that broadcast,
    NaN or left out where not known. Answers are NaN where something needed is missing (see missing);
    u_own_model is the model's own standard uncertainty of U_model, where one can be stated.
    """
    model = model_of(form=form, drive=drive)
    known = {key: np.asarray(values.get(key, np.nan), dtype=float) for key in (*model.needs, *model.may)}
    found = {}
    with np.errstate(all="ignore"):
        for step in (*model.steps, *model.more):
            given = {key: found[key] if key in found else known[key] for key in step.takes}
            result = step.function(**given)
            found |= zip(step.gives, result if len(step.gives) > 1 else (result,), strict=True)
        if model.own_u is not None:
            found["u_own_model"] = model.own_u(known | found)
    return found


def missing(*, form, drive, values: Mapping) -> list[str]:
    """The keys that the model needs and that `values` (scalars) does not have."""
    needs = model_of(form=form, drive=drive).needs
    return [key for key in needs if values.get(key) is None or np.isnan(values[key])]


def _without(why) -> Model:
    return Model("none", f"no model: {why}")


def _helix_model(drive) -> Model:
    magnet, head = (("m_mag", "B"), ()) if drive == "field" else ((), ("b",))

    def speed(omega, A11, A12, A22_helix, head_axial, head_spinning, **magnetic):
        return helices.speed_of(drive=drive, omega=omega, a11=A11, a12=A12, a22=A22_helix, axial=head_axial,
                                spinning=head_spinning, **magnetic)

    def own_u(values):
        same = {key: values[key] for key in ("omega", "pitch", "a", "mu", *magnet)}
        low, high = helices.speed_range(drive=drive, R=values["R_helix"], L=values["L_tail"], **same,
                                        axial=values["head_axial"], spinning=values["head_spinning"])
        return (high - low) / np.sqrt(12.0)  # rectangular, JCGM 100, 4.3.7

    says = ("that a rotating field turns; above step-out, at its mean rate" if drive == "field" else
            "that a motor turns against its head")
    takes = ("omega", "A11", "A12", "A22_helix", "head_axial", "head_spinning", *magnet)
    return Model(
        drive, f"resistive-force theory of a helix {says}", "Purcell 1997; Lauga & Powers 2009",
        ("R_helix", "pitch", "L_tail", "a", "mu", "omega", *head),
        (*magnet, *WALLS, *(() if head else ("b",))),
        (_RESISTANCE, HEAD if head else HEAD_IF_ANY, Step(("U_model",), takes, speed)), (), own_u,
    )  # fmt: skip


_RESISTANCE = Step(
    ("A11", "A12", "A22_helix"), ("R_helix", "pitch", "L_tail", "a", "mu"),
    lambda R_helix, pitch, L_tail, a, mu: helices.resistance(R=R_helix, pitch=pitch, L=L_tail, a=a, mu=mu),
)  # fmt: skip
_HELICES = {drive: _helix_model(drive) for drive in HELIX_DRIVES}
_UNDULATING = Model(
    "undulating", "scaling of swimming animals, from the swimming number of the measured tip excursion",
    "Gazzola, Argentina & Mahadevan 2014, Nature Phys. 10:758", ("omega", "A_tip", "L_body", "nu"), (),
    (Step(("U_model",), ("omega", "A_tip", "L_body", "nu"), undulation.swimming_speed),),
)  # fmt: skip
_TURNED = {"flexible tail": "a bent tail", "rigid tail": "a straight tail", "hinged": "a hinged body"}
_ZERO = Step(("U_model",), ("f",), lambda f: 0.0 * f)
_STILL = {
    form: Model("scallop", f"scallop theorem: {what} retraces its own path and gets nowhere in Stokes flow",
                "Purcell 1977, Am. J. Phys. 45:3", ("f",), (), (_ZERO,), (), lambda v: 0.0 * v["U_model"])
    for form, what in (("rigid tail", "a rigid tail"), ("hinged", "a body with one hinge"))
}  # fmt: skip
