"""Flexible tails driven at the base in Stokes flow: small-amplitude mean force, power, speed and tip
motion."""

from dataclasses import dataclass
from math import pi

import numpy as np

from labbook.errors import Refusal
from labbook.physics import heads, rods
from labbook.physics.phasors import Phasor
from labbook.physics.tail_drives import DRIVES, SPHERE_TURN, drive_row, tail_motion

# rad; here the linear speed is 0.4 to 3 % above nonlinear simulations (most near Sp = 2, round heads up to
# b/L = 0.2), and the excess goes as the angle squared
THETA0_CHECKED = 0.3
INPUTS = ("Sp", "head", "head_drag", "head_turn")


@dataclass(frozen=True)
class TailResponse:
    """Normalised answer of a driven tail (see response); all fields have the broadcast shape.

    force: mean propulsive force of the tail; tip: amplitude at the tip; base: amplitude of the base position;
    slope: amplitude of the base angle; torque: amplitude of the torque that drives a free head, NaN for a
    held base; head_push: mean of minus lateral speed times angle of a free head, which pushes where the
    head's lateral and axial drag differ, 0 for a held base; power: mean power that the drive puts in.
    """

    force: np.ndarray
    tip: np.ndarray
    base: np.ndarray
    slope: np.ndarray
    torque: np.ndarray
    head_push: np.ndarray
    power: np.ndarray


def response(*, drive, Sp, head=0.0, head_drag=0.0, head_turn=SPHERE_TURN):
    """Mean force, tip amplitude and power of a flexible tail driven at its base, normalised, as a
    TailResponse.

    Sp = L (zeta_n omega/EI)^(1/4); head = c/L with c from the head's centre back to the tail (b of a sphere);
    head_drag = R/(zeta_n L) with R the head's lateral drag; head_turn = its rotational drag over c^2 R (4/3
    of a sphere). Force is divided by (zeta_n - zeta_t) omega L^2 theta0^2, tip and base by L theta0, torque
    by zeta_n omega L^3 theta0, head_push by omega L theta0^2, power by zeta_n omega^2 L^3 theta0^2; for a
    heave theta0 reads h0/L; free_head_torque has theta0 = T0/(zeta_n omega L^3). Positive force pushes base
    first. Scalars or arrays that broadcast, real or complex step (carried to first order); Sp from 0 up
    without overflow. Refuses an unknown drive, and a free head without size or drag. Source: each row of
    DRIVES.
    """
    inputs = [np.asarray(x) for x in (Sp, head, head_drag, head_turn)]
    stepped = any(np.iscomplexobj(x) for x in inputs)
    answer = _answer(drive, [Phasor(x.real * 1.0, (x.imag,) if np.iscomplexobj(x) else ()) for x in inputs])
    shape = np.broadcast_shapes(*(x.shape for x in inputs))
    return TailResponse(*(np.broadcast_to(_with_step(field) if stepped else field.z, shape)[()]
                          for field in answer))


def response_slopes(*, drive, Sp, head=0.0, head_drag=0.0, head_turn=SPHERE_TURN):
    """The response and its slopes: (TailResponse, {input: TailResponse of d(field)/d(input)}).

    Real arguments and refusals as in response; about twice the work of one response, where complex steps take
    one response an input. A slope that is zero throughout is a plain 0.0.
    """
    one = tuple(tuple(1.0 if i == j else None for j in range(4)) for i in range(4))
    given = (Sp, head, head_drag, head_turn)
    answer = _answer(drive, [Phasor(np.asarray(x, dtype=float), d) for x, d in zip(given, one, strict=True)])
    shape = np.broadcast_shapes(*(np.shape(x) for x in given))
    values = TailResponse(*(np.broadcast_to(field.z, shape)[()] for field in answer))
    by_input = (TailResponse(*(_slope(field, i) for field in answer)) for i in range(len(INPUTS)))
    return values, dict(zip(INPUTS, by_input, strict=True))


def _slope(field, i):
    return 0.0 if i >= len(field.d) or field.d[i] is None else field.d[i]


def _with_step(field):
    return field.z + 1j * field.d[0] if field.d and field.d[0] is not None else field.z


def _answer(drive, inputs):
    """The fields of a TailResponse as real phasors, with the slopes of their inputs."""
    row = drive_row(drive)
    Sp, head, head_drag, head_turn = inputs
    moved = tail_motion(row, Sp, head, head_drag, head_turn)
    stiff = Phasor(Sp.z**4, tuple(None if d is None else 4.0 * Sp.z**3 * d for d in Sp.d))
    # Sp^4 <h''^2>/2 - <h' h'''> with h'' = -i Sp^4 bend, h''' = i Sp^4 shear, over Sp^4: no small difference
    pull = moved.slope.mean_product(moved.shear.linear(lambda z: 1j * z))
    force = stiff * moved.bend.square().linear(lambda z: z * 0.25) - pull
    # the tail takes -<h_t h'''> + <h_t' h''> at its base over Sp^4
    power = moved.h.mean_product(moved.shear) + moved.slope.mean_product(moved.bend)
    torque, head_push = Phasor(np.full(np.shape(Sp.z), np.nan)), Phasor(np.zeros(np.shape(Sp.z)))
    if row.free:
        head_push = pull / head_drag  # the head's lateral speed is -i shear/head_drag
        power = moved.slope.linear(lambda z: 1j * z).mean_product(moved.turn)
        torque = moved.turn.amplitude()
    sizes = (moved.tip.amplitude(), moved.h.amplitude(), moved.slope.amplitude())
    return (force, *sizes, torque, head_push, power)


def speed_of(*, force, omega, L, theta0, zeta_n, zeta_t, head_push=0.0, axial=0.0, lateral=0.0):
    """Speed of a tail from its normalised force and what it has to drag, m/s.

    force, head_push: as in response; axial, lateral: drag of the head in these directions, N.s/m; theta0:
    rad, or h0/L, or T0/(zeta_n omega L^3). Axial balance of second order in the angle: tail, and a head whose
    lateral drag differs from its axial one. Scalars or arrays, real or complex. Source: as response.
    """
    push = (zeta_n - zeta_t) * L * force + (lateral - axial) * head_push
    return push * omega * L * theta0**2 / (zeta_t * L + axial)


def free_speed(*, drive, L, a, EI, mu, f, b, theta0=None, torque=None, zeta_n=None, zeta_t=None, b_long=None,
               h_wall=None, D_tank=None):  # fmt: skip
    """Speed, head first, of a head that pulls a flexible tail, m/s.

    drive "free_head_angle" takes theta0 (rad), "free_head_torque" takes torque (N.m), both amplitudes.
    L, a, b: m; EI: N.m^2; mu: Pa.s; f: Hz; zeta_n, zeta_t: Pa.s, else those of a round tail in house model;
    b_long, h_wall, D_tank: the head's axial semi-axis and the walls that raise its drag, as in
    heads.head_drag. Scalars or arrays, real or complex step. Refuses a held base and a missing amplitude. For
    its range see THETA0_CHECKED. Source: DRIVES; Lauga 2007.
    """
    answer, theta0, zeta_n, zeta_t, head = _driven(
        drive, L, a, EI, mu, f, b, theta0, torque, zeta_n, zeta_t, b_long, h_wall, D_tank)
    return speed_of(force=answer.force, head_push=answer.head_push, omega=2.0 * pi * np.asarray(f),
                    L=np.asarray(L), theta0=theta0, zeta_n=zeta_n, zeta_t=zeta_t, axial=head.axial,
                    lateral=head.lateral)


def tip_excursion(*, drive, L, a, EI, mu, f, b, theta0=None, torque=None, zeta_n=None, zeta_t=None,
                  b_long=None, h_wall=None, D_tank=None):  # fmt: skip
    """Peak-to-peak excursion of the tail tip of a free swimmer (A_tip), m.

    Arguments and refusals as in free_speed. Source: DRIVES.
    """
    answer, theta0, _, _, _ = _driven(
        drive, L, a, EI, mu, f, b, theta0, torque, zeta_n, zeta_t, b_long, h_wall, D_tank)
    return 2.0 * answer.tip * L * theta0


def _driven(drive, L, a, EI, mu, f, b, theta0, torque, zeta_n, zeta_t, b_long, h_wall, D_tank):
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
    head = heads.head_drag(mu=mu, b=b, b_long=b_long, h_wall=h_wall, D_tank=D_tank)
    answer = response(
        drive=drive, Sp=sperm_number(L=L, zeta_n=zeta_n, omega=omega, EI=EI), head=head.back / L,
        head_drag=head.lateral / (zeta_n * L), head_turn=head.turning / (head.lateral * head.back**2),
    )  # fmt: skip
    return answer, given / (zeta_n * omega * L**3) if key == "torque" else given, zeta_n, zeta_t, head


def sperm_number(*, L, zeta_n, omega, EI):
    """Sp = L (zeta_n omega/EI)^(1/4), whatever the house dialect says; SI, scalars or arrays, real or
    complex."""
    return L * np.sqrt(np.sqrt(zeta_n * omega / EI))
