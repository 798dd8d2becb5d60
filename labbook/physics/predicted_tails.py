"""The prediction of a flexible tail for each of its drives: speed, tip excursion, angle, push and power."""

import numpy as np

from labbook.physics import tails
from labbook.physics.prediction_steps import HEAD, HEAD_IF_ANY, WALLS, Model, Step
from labbook.physics.tail_drives import DRIVES, TailDrive

# key of a step -> field of tails.TailResponse
_FIELDS = {"tail_force": "force", "tail_tip": "tip", "head_push": "head_push", "tail_angle": "slope",
           "tail_power": "power"}  # fmt: skip
_FREE = "the head free to move sideways"
_HELD = "its base held on the axis by what adds no drag along it, which is the most such a tail can do"
LINEAR_HIGH = 0.03  # of the speed at 0.3 rad, at most (round heads up to b/L = 0.2; see THETA0_CHECKED)


def tail_model(row: TailDrive) -> Model:
    """The model of one drive: Sp and the head's numbers, the tail's answer to them, closed formulas for the
    rest."""
    head = (HEAD, _SHARES) if row.free else (HEAD_IF_ANY,)
    shares = _SHARES.gives if row.free else ()
    # the torque alone depends on how the head resists turning
    swims = shares if row.key == "free_head_torque" else shares[:2]
    scale = _scale(row)
    dragged = ("head_axial", "head_lateral") if row.free else ("head_axial",)
    speed = Step(("U_model",), ("tail_force", "head_push", *_SIZES, "zeta_t", *dragged), _speed)
    answer = _answer(row.key, ("tail_force", "tail_tip", "head_push"), ("Sp_model", *swims))
    further = _answer(row.key, ("tail_angle", "tail_power"), ("Sp_model", *shares))
    amplitude = tuple(key for key in scale.takes if key in ("theta0", "h0", "m_mag", "B"))
    known = ("mu", "b")
    return Model(
        row.key, f"small-angle theory of an elastic tail in Stokes flow, {_FREE if row.free else _HELD}",
        row.source,
        ("L_tail", "EI", "zeta_n", "zeta_t", "omega", *amplitude, *(known if row.free else ())),
        (*WALLS, *(() if row.free else known)),
        (_SPERM, *head, answer, scale, speed, _TIP), (further, _ANGLE, _PUSH, _POWER), _own_u,
    )  # fmt: skip


def _answer(drive, gives, takes) -> Step:
    def named(Sp_model, **head):
        return dict(drive=drive, Sp=Sp_model, **head)

    def function(**given):
        answer = tails.response(**named(**given))
        return tuple(getattr(answer, _FIELDS[key]) for key in gives)

    def slopes(**given):
        answer, by = tails.response_slopes(**named(**given))
        inputs = {key: by["Sp" if key == "Sp_model" else key] for key in takes}
        return tuple(
            (getattr(answer, field), {name: getattr(slope, field) for name, slope in inputs.items()})
            for field in (_FIELDS[key] for key in gives))

    return Step(gives, takes, function, slopes)


def _scale(row) -> Step:
    """What stands in the place of theta0 (see tails.response)."""
    if row.key == "free_head_torque":  # the field's torque, taken as m B: the magnet stays near square to it
        return Step(("tail_scale",), ("m_mag", "B", "zeta_n", "omega", "L_tail"),
                    lambda m_mag, B, zeta_n, omega, L_tail: m_mag * B / (zeta_n * omega * L_tail**3))
    if row.heave:
        return Step(("tail_scale",), ("h0", "L_tail"), lambda h0, L_tail: h0 / L_tail)
    return Step(("tail_scale",), ("theta0",), lambda theta0: theta0)


def _speed(tail_force, head_push, omega, L_tail, tail_scale, zeta_n, zeta_t, head_axial, head_lateral=0.0):
    return tails.speed_of(force=tail_force, head_push=head_push, omega=omega, L=L_tail, theta0=tail_scale,
                          zeta_n=zeta_n, zeta_t=zeta_t, axial=head_axial, lateral=head_lateral)


def _shares(head_back, head_lateral, head_turning, zeta_n, L_tail):
    return head_back / L_tail, head_lateral / (zeta_n * L_tail), head_turning / (head_lateral * head_back**2)


def _push(tail_force, omega, L_tail, tail_scale, zeta_n, zeta_t):
    return (zeta_n - zeta_t) * omega * (L_tail * tail_scale) ** 2 * tail_force


def _power(tail_power, omega, L_tail, tail_scale, zeta_n):
    return zeta_n * (omega * L_tail * tail_scale) ** 2 * L_tail * tail_power


def _own_u(values):
    """Rectangular, half-width LINEAR_HIGH at 0.3 rad and of order theta^2 elsewhere (JCGM 100, 4.3.7)."""
    share = LINEAR_HIGH / np.sqrt(3.0) * (values["tail_scale"] / tails.THETA0_CHECKED) ** 2
    return np.abs(values["U_model"]) * share


def _sperm_number(L_tail, zeta_n, omega, EI):
    return tails.sperm_number(L=L_tail, zeta_n=zeta_n, omega=omega, EI=EI)


_SIZES = ("omega", "L_tail", "tail_scale", "zeta_n")
_SPERM = Step(("Sp_model",), ("L_tail", "zeta_n", "omega", "EI"), _sperm_number)
_SHARES = Step(("head", "head_drag", "head_turn"),
               ("head_back", "head_lateral", "head_turning", "zeta_n", "L_tail"), _shares)  # fmt: skip
_TIP = Step(("A_tip_model",), ("tail_tip", "L_tail", "tail_scale"),
            lambda tail_tip, L_tail, tail_scale: 2.0 * tail_tip * L_tail * tail_scale)
_ANGLE = Step(("theta_model",), ("tail_angle", "tail_scale"),
              lambda tail_angle, tail_scale: tail_angle * tail_scale)
_PUSH = Step(("F_model",), ("tail_force", *_SIZES, "zeta_t"), _push)
_POWER = Step(("P_model",), ("tail_power", *_SIZES), _power)

TAIL_MODELS = {key: tail_model(row) for key, row in DRIVES.items()}
