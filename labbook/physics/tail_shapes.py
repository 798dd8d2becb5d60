"""Shape in time of a driven flexible tail: complex amplitude along it, frames of a beat and envelope."""

from dataclasses import dataclass, fields

import numpy as np

from labbook.physics.beams import ALPHA, BETA, SERIES_BELOW, Beam, free_tip_beam, series
from labbook.physics.phasors import Phasor
from labbook.physics.tail_drives import SPHERE_TURN, drive_row, tail_motion


@dataclass(frozen=True)
class TailShape:
    """A beat of one tail (see shape); lengths across the tail over L theta0, or over h0 for a heave.

    s: places from base 0 to tip 1; phase: omega t of the frames, rad; amplitude: complex, one value a place,
    the displacement is Re[amplitude exp(i phase)]; frames: displacements, a row a phase; envelope: its
    largest value at each place; angle: complex amplitude of the base's angle over theta0; head: frames of the
    head's centre, at -back along the tail, 0 for a held base without one.
    """

    s: np.ndarray
    phase: np.ndarray
    amplitude: np.ndarray
    frames: np.ndarray
    envelope: np.ndarray
    angle: complex
    head: np.ndarray


def shape(*, drive, Sp, head=0.0, head_drag=0.0, head_turn=SPHERE_TURN, places=81, phases=12):
    """The beat of one tail as a TailShape: `places` points from base to tip, `phases` frames of one period.

    Scalars as in tails.response, with its normalisation; a prescribed position or angle, or the torque, goes
    as the cosine of the phase. Refusals as there.
    """
    s, phase = np.linspace(0.0, 1.0, places), np.linspace(0.0, 2.0 * np.pi, phases, endpoint=False)
    amplitude, angle = displacement(drive=drive, Sp=float(Sp), s=s, head=float(head),
                                    head_drag=float(head_drag), head_turn=float(head_turn))
    turning = np.exp(1j * phase)
    centre = amplitude[0] - float(head) * angle
    return TailShape(s, phase, amplitude, np.real(turning[:, None] * amplitude), np.abs(amplitude), angle,
                     np.real(turning * centre))


def displacement(*, drive, Sp, s, head=0.0, head_drag=0.0, head_turn=SPHERE_TURN):
    """Complex amplitude of the tail's displacement at s = x/L, and that of the base's angle.

    Normalised as in tails.response. Sp and the head's numbers: real scalars or arrays that broadcast; s:
    array of places in 0..1; answers of shape Sp.shape + s.shape and Sp.shape. Exact solution of the
    small-amplitude beam, from Sp = 0 up without overflow or loss of digits. Source: Wiggins & Goldstein 1998.
    """
    given = np.broadcast_arrays(*(np.asarray(x, dtype=float) for x in (Sp, head, head_drag, head_turn)))
    Sp, s = given[0].reshape(-1), np.asarray(s, dtype=float)
    moved = tail_motion(drive_row(drive), *(Phasor(x.reshape(-1)) for x in given))
    h, slope = (np.broadcast_to(z, Sp.shape).astype(complex) for z in (moved.h.z, moved.slope.z))
    beam = free_tip_beam(Sp=Sp)
    answer = np.empty((Sp.size, s.size), complex)
    small = Sp < SERIES_BELOW
    for rows, form in ((small, _by_series), (~small, _by_waves)):
        part = Beam(*(getattr(beam, field.name)[rows] for field in fields(Beam)))
        answer[rows] = form(Sp[rows], s.reshape(-1), part, h[rows], slope[rows])
    return answer.reshape(given[0].shape + s.shape), slope.reshape(given[0].shape)[()]


def _by_series(Sp, s, beam, h, slope):
    """From the tip's position and slope, which fix a free tip's shape, with z the distance from the tip."""
    tip, tip_slope = _tip(beam, h, slope)
    z = 1.0 - s
    full = -((Sp[:, None] * z) ** 4)
    return tip[:, None] * series(full, 0) - tip_slope[:, None] * z * series(full, 1)


def _by_waves(Sp, s, beam, h, slope):
    """As four waves, two that fade from the base and two from the tip, none larger than its amplitude
    there."""
    k = Sp * complex(ALPHA, -BETA)
    stiff = Sp**4
    bend, shear = -1j * stiff * (beam.P * h + beam.M * slope), 1j * stiff * (beam.Q * h + beam.P * slope)
    tip, tip_slope = _tip(beam, h, slope)
    answer = 0.0
    for root in (k, 1j * k):
        leaving = (h - slope / root + bend / root**2 - shear / root**3) / 4.0
        reflected = (tip + tip_slope / root) / 4.0
        answer = answer + leaving[:, None] * np.exp(-root[:, None] * s) + reflected[:, None] * np.exp(
            -root[:, None] * (1.0 - s))
    return answer


def _tip(beam, h, slope):
    return beam.tip_h * h + beam.tip_slope * slope, beam.turn_h * h + beam.tip_h * slope
