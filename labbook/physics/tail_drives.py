"""Ways to drive the base of a flexible tail: what is prescribed, and the base motion that follows."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal
from labbook.physics.beams import beam_slopes, free_tip_beam
from labbook.physics.phasors import Phasor

SPHERE_TURN = 4.0 / 3.0  # 8 pi mu b^3 over b^2 6 pi mu b


@dataclass(frozen=True)
class TailDrive:
    """One way to drive the base: what is prescribed, and the base motion (h, h') per unit of it."""

    key: str
    prescribed: str
    heave: bool
    free: bool
    base: Callable
    source: str


@dataclass(frozen=True)
class TailMotion:
    """What a drive makes of base and tail, all phasors.

    h, slope: base position and slope; bend, shear: h''(0) = -i Sp^4 bend and h'''(0) = i Sp^4 shear; tip: its
    position; turn: torque that drives a free head over zeta_n omega L^3, None for a held base.
    """

    h: Phasor
    slope: Phasor
    bend: Phasor
    shear: Phasor
    tip: Phasor
    turn: Phasor | None


@dataclass(frozen=True)
class _Felt:
    """What the base feels: the tail's answers and the head's numbers, all phasors."""

    P: Phasor
    M: Phasor
    Q: Phasor
    head: Phasor
    drag: Phasor
    turn: Phasor


_ONE, _NONE = Phasor(1.0), Phasor(0.0)


def _hinged_heave(felt):
    return _ONE, _NONE - felt.P / felt.M


def _pivoted_angle(felt):
    return _NONE, _ONE


def _clamped_heave(felt):
    return _ONE, _NONE


def _free_head_angle(felt):
    # lateral balance of tail and head: Q h + P + r (h - head) = 0
    return (felt.drag * felt.head - felt.P) / (felt.Q + felt.drag), _ONE


def _free_head_torque(felt):
    h, slope = _free_head_angle(felt)
    torque = _head_torque(felt, h, slope)
    return h / torque, slope / torque


def _head_torque(felt, h, slope):
    # -h''(0)/Sp^4, plus the head's own resistance to turning and the arm of its lateral drag
    turned = felt.P * h + felt.M * slope
    own = felt.drag * felt.head * (felt.head * (felt.turn + _ONE) * slope - h)
    return (turned + own).linear(lambda z: 1j * z)


_LAUGA = "Wiggins & Goldstein 1998; Lauga 2007, Phys. Rev. E 75:041916; Yu, Lauga & Hosoi 2006"
DRIVES = {
    row.key: row
    for row in (
        TailDrive("hinged_heave", "h(0) = h0, h''(0) = 0", True, False, _hinged_heave, _LAUGA),
        TailDrive("pivoted_angle", "h(0) = 0, h'(0) = theta0", False, False, _pivoted_angle, _LAUGA),
        TailDrive("clamped_heave", "h(0) = h0, h'(0) = 0", True, False, _clamped_heave, _LAUGA),
        TailDrive("free_head_angle", "h'(0) = theta0, no lateral force on head and tail", False, True,
                  _free_head_angle, "lateral balance of a head and a resistive-force tail"),
        TailDrive("free_head_torque", "torque T0 on the head, no lateral force", False, True,
                  _free_head_torque, "lateral and torque balance of a head and a resistive-force tail"),
    )
}


def drive_row(drive) -> TailDrive:
    """The row of a drive; Refusal for an unknown one."""
    if drive not in DRIVES:
        raise Refusal("drive", drive, "is not a drive of a tail", "one of " + ", ".join(DRIVES))
    return DRIVES[drive]


def tail_motion(row, Sp, head, head_drag, head_turn) -> TailMotion:
    """Base, load and tip of a driven tail; the inputs are real phasors, and their slopes are carried along.

    Refuses a free head without size or drag. Source: the drive's row.
    """
    if row.free and (np.any(head.z <= 0.0) or np.any(head_drag.z <= 0.0)):
        raise Refusal("head", None, f"{row.key} needs a head", "give head = b/L and head_drag = R/(zeta_n L)")
    beam = free_tip_beam(Sp=Sp.z)
    P, M, Q, tip_h, tip_slope = _carried(beam, Sp)
    felt = _Felt(P, M, Q, head, head_drag, head_turn)
    h, slope = row.base(felt)
    turn = _head_torque(felt, h, slope) if row.free else None
    return TailMotion(h, slope, P * h + M * slope, Q * h + P * slope, tip_h * h + tip_slope * slope, turn)


def _carried(beam, Sp):
    values = beam.P, beam.M, beam.Q, beam.tip_h, beam.tip_slope
    if not any(step is not None for step in Sp.d):
        return tuple(Phasor(z) for z in values)
    slopes = beam_slopes(Sp=Sp.z, beam=beam)
    return tuple(Phasor(z, tuple(None if step is None else slope * step for step in Sp.d))
                 for z, slope in zip(values, slopes, strict=True))
