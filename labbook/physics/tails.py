"""Flexible tails driven at the base in Stokes flow: small-amplitude mean force, speed and tip motion."""

from collections.abc import Callable
from dataclasses import dataclass
from math import pi

import numpy as np

from labbook.errors import Refusal
from labbook.physics import rods, walls
from labbook.physics.beams import Phasor, free_tip_beam

THETA0_CHECKED = 0.3  # rad; up to here the linear speed is within 1 % of nonlinear simulations


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
class TailResponse:
    """Normalised answer of a driven tail (see response); all fields have the broadcast shape.

    force: mean propulsive force; tip: amplitude at the tip; base: amplitude of the base position; slope:
    amplitude of the base angle; torque: amplitude of the torque that drives a free head, NaN for a held base.
    """

    force: np.ndarray
    tip: np.ndarray
    base: np.ndarray
    slope: np.ndarray
    torque: np.ndarray


_ONE, _NONE = Phasor(1.0, 0.0), Phasor(0.0, 0.0)


def _hinged_heave(beam, head, head_drag):
    return _ONE, _NONE - beam.P / beam.M


def _pivoted_angle(beam, head, head_drag):
    return _NONE, _ONE


def _clamped_heave(beam, head, head_drag):
    return _ONE, _NONE


def _free_head_angle(beam, head, head_drag):
    # lateral balance of tail and head: Q h + P + r (h - head) = 0
    return (Phasor(head_drag * head, 0.0) - beam.P) / (beam.Q + Phasor(head_drag, 0.0)), _ONE


def _free_head_torque(beam, head, head_drag):
    h, slope = _free_head_angle(beam, head, head_drag)
    torque = _head_torque(beam, h, slope, head, head_drag)
    return h / torque, slope / torque


def _head_torque(beam, h, slope, head, head_drag):
    # -h''(0)/Sp^4, plus the sphere's own 8 pi mu b^3 = (4/3) b^2 R and the arm b of its lateral drag
    arm = slope.scaled(7.0 / 3.0 * head) - h
    turned = beam.P * h + beam.M * slope + arm.scaled(head_drag * head)
    return Phasor(-turned.q, turned.p)


_LAUGA = "Wiggins & Goldstein 1998; Lauga 2007, Phys. Rev. E 75:041916; Yu, Lauga & Hosoi 2006"
DRIVES = {
    row.key: row
    for row in (
        TailDrive("hinged_heave", "h(0) = h0, h''(0) = 0", True, False, _hinged_heave, _LAUGA),
        TailDrive("pivoted_angle", "h(0) = 0, h'(0) = theta0", False, False, _pivoted_angle, _LAUGA),
        TailDrive("clamped_heave", "h(0) = h0, h'(0) = 0", True, False, _clamped_heave, _LAUGA),
        TailDrive("free_head_angle", "h'(0) = theta0, no lateral force on head and tail", False, True,
                  _free_head_angle, "lateral balance of a sphere and a resistive-force tail"),
        TailDrive("free_head_torque", "torque T0 on the head, no lateral force", False, True,
                  _free_head_torque, "lateral and torque balance of a sphere and a resistive-force tail"),
    )
}


def response(*, drive, Sp, head=0.0, head_drag=0.0):
    """Mean force and tip amplitude of a flexible tail driven at its base, normalised, as a TailResponse.

    Sp = L (zeta_n omega/EI)^(1/4); head = b/L; head_drag = R/(zeta_n L) with R the head's drag. Force is
    divided by (zeta_n - zeta_t) omega L^2 theta0^2 and tip by L theta0, or by (zeta_n - zeta_t) omega h0^2
    and h0 for a heave; free_head_torque has theta0 = T0/(zeta_n omega L^3). Positive force pushes base first.
    Scalars or arrays that broadcast, real or complex step; Sp from 0 up without overflow. Refuses an unknown
    drive, and a free head without size or drag. Source: each row of DRIVES.
    """
    row = DRIVES.get(drive)
    if row is None:
        raise Refusal("drive", drive, "is not a drive of a tail", "one of " + ", ".join(DRIVES))
    Sp, head, head_drag = np.asarray(Sp) * 1.0, np.asarray(head), np.asarray(head_drag)
    if row.free and (np.any(head.real <= 0.0) or np.any(head_drag.real <= 0.0)):
        raise Refusal("head", None, f"{drive} needs a head", "give head = b/L and head_drag = R/(zeta_n L)")
    beam = free_tip_beam(Sp=Sp)
    h, slope = row.base(beam, head, head_drag)
    bend = beam.P * h + beam.M * slope
    shear = beam.Q * h + beam.P * slope
    # Sp^4 <h''^2>/2 - <h' h'''> with h'' = -i Sp^4 bend, h''' = i Sp^4 shear, over Sp^4: no small difference
    force = Sp**4 * bend.square() / 4.0 - slope.mean_product(Phasor(-shear.q, shear.p))
    tip = beam.tip_h * h + beam.tip_slope * slope
    held = np.full(Sp.shape, np.nan)
    torque = _head_torque(beam, h, slope, head, head_drag).amplitude() if row.free else held
    fields = (force, tip.amplitude(), h.amplitude(), slope.amplitude(), torque)
    shape = np.broadcast_shapes(Sp.shape, head.shape, head_drag.shape)
    return TailResponse(*(np.broadcast_to(field, shape)[()] for field in fields))


def free_speed(*, drive, L, a, EI, mu, f, b, theta0=None, torque=None, zeta_n=None, zeta_t=None):
    """Speed, head first, of a sphere of radius b that pulls a flexible tail, m/s.

    drive "free_head_angle" takes theta0 (rad), "free_head_torque" takes torque (N.m), both amplitudes.
    L, a, b: m; EI: N.m^2; mu: Pa.s; f: Hz; zeta_n, zeta_t: Pa.s, else those of a round tail in house model.
    Scalars or arrays, real or complex step. Refuses a held base and a missing amplitude. Checked to 1 %
    against nonlinear simulation for theta0 up to 0.3 rad. Source: DRIVES; Lauga 2007.
    """
    answer, amplitude, zeta_n, zeta_t = _driven(drive, L, a, EI, mu, f, b, theta0, torque, zeta_n, zeta_t)
    force = answer.force * (zeta_n - zeta_t) * (2.0 * pi * f) * (L * amplitude) ** 2
    return force / (zeta_t * L + walls.sphere_drag(mu=mu, b=b))


def tip_excursion(*, drive, L, a, EI, mu, f, b, theta0=None, torque=None, zeta_n=None, zeta_t=None):
    """Peak-to-peak excursion of the tail tip of a free swimmer (A_tip), m.

    Arguments and refusals as in free_speed. Source: DRIVES.
    """
    answer, amplitude, _, _ = _driven(drive, L, a, EI, mu, f, b, theta0, torque, zeta_n, zeta_t)
    return 2.0 * answer.tip * L * amplitude


def _driven(drive, L, a, EI, mu, f, b, theta0, torque, zeta_n, zeta_t):
    row = DRIVES.get(drive)
    if row is None or not row.free:
        raise Refusal("drive", drive, "is not a drive of a free swimmer",
                      "free_head_angle or free_head_torque")
    key, given = ("torque", torque) if drive == "free_head_torque" else ("theta0", theta0)
    if given is None:
        raise Refusal(key, None, f"is needed by {drive}", "give its amplitude")
    if zeta_n is None or zeta_t is None:
        zeta_n, zeta_t = rods.resistive_coefficients(model=rods.HOUSE_MODEL, L=L, a=a, mu=mu)
    L, omega = np.asarray(L), 2.0 * pi * np.asarray(f)
    answer = response(drive=drive, Sp=L * (zeta_n * omega / EI) ** 0.25, head=b / L,
                      head_drag=walls.sphere_drag(mu=mu, b=b) / (zeta_n * L))
    return answer, given / (zeta_n * omega * L**3) if key == "torque" else given, zeta_n, zeta_t
