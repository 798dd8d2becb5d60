"""Helical tails: worked swimmers, force and torque balance, and the distance of the theory from tank data."""

import numpy as np
import pytest

from labbook.errors import Refusal
from labbook.physics import helices

CELL = dict(R=0.2e-6, pitch=2.2e-6, a=0.012e-6, L=6.2e-6, mu=1e-3)

# Rodenborn et al. 2013, PNAS 110:E338, digitised [R]: R = 6.3 mm, L = 130 mm, a = 0.397 mm.
# pitch/R: measured (thrust, torque, drag), and Gray-Hancock theory [C] to the printed figures.
TANK = {
    2.226: ((6.26, 131.9, 52.06), (18.85, 110.0, 156.5)),
    9.811: ((9.57, 72.69, 35.29), (9.066, 43.53, 35.18)),
}


@pytest.mark.parametrize(("coefficients", "expected"), [
    ("gray_hancock", 14.4054e-6), ("lighthill", 19.3107e-6)])
def test_motor_driven_cell(coefficients, expected):
    # Purcell 1997; Lauga & Powers 2009: b 0.8 um, motor 120 Hz [C], six figures
    speed = helices.free_speed(drive="motor", omega=2.0 * np.pi * 120.0, b=0.8e-6,
                               coefficients=coefficients, **CELL)
    assert speed == pytest.approx(expected, rel=4e-6)


def tank_numbers(pitch_ratio, **more):
    R, mu = 6.3e-3, 1.0
    a11, a12, a22 = helices.resistance(R=R, pitch=pitch_ratio * R, L=0.13, a=0.397e-3, mu=mu, **more)
    return np.array([a12 / (mu * R**2), a22 / (mu * R**3), a11 / (mu * R)])


@pytest.mark.parametrize("pitch_ratio", TANK)
def test_gray_hancock_resistances(pitch_ratio):
    # four printed figures, pitch/R itself rounded to four: 5e-4
    np.testing.assert_allclose(tank_numbers(pitch_ratio), TANK[pitch_ratio][1], rtol=5e-4)


def test_theory_against_the_tank():
    # resistive-force theory is a labelled approximation: thrust and drag three times too large at short
    # pitch; at long pitch thrust within 6 %, drag within 1 %, torque 40 % too small [R]
    short = tank_numbers(2.226) / TANK[2.226][0]
    long = tank_numbers(9.811) / TANK[9.811][0]
    assert 2.8 < short[0] < 3.2 and 2.8 < short[2] < 3.2
    np.testing.assert_allclose(long, [0.947, 0.599, 0.997], atol=2e-3)


@pytest.mark.parametrize("coefficients", helices.COEFFICIENTS)
def test_motor_swimmer_is_free_of_force_and_torque(coefficients):
    # Newton: solve the three balances as a linear system here
    b, mu, omega = 0.8e-6, CELL["mu"], 700.0
    a11, a12, a22 = helices.resistance(coefficients=coefficients, **CELL)
    balance = np.array([
        [a11 + 6.0 * np.pi * mu * b, -a12, 0.0],
        [-a12, a22, 8.0 * np.pi * mu * b**3],
        [0.0, 1.0, -1.0]])
    scale = np.array([1e6, 1e12, 1.0])[:, None]
    U, _, _ = np.linalg.solve(balance * scale, [0.0, 0.0, omega])
    speed = helices.free_speed(drive="motor", omega=omega, b=b, coefficients=coefficients, **CELL)
    assert speed == pytest.approx(U, rel=1e-10)


def test_field_drive_by_hand_and_slower_with_a_motor():
    # the force balance alone; a motor loses to the head the turn that a field would give the tail
    a11, a12, _ = helices.resistance(**CELL)
    field = helices.free_speed(drive="field", omega=50.0, b=0.8e-6, **CELL)
    assert field == pytest.approx(a12 * 50.0 / (a11 + 6.0 * np.pi * 1e-3 * 0.8e-6), rel=1e-14)
    motor = helices.free_speed(drive="motor", omega=50.0, b=0.8e-6, **CELL)
    assert 0.0 < motor < field


def test_resistance_by_local_summation():
    # definition: resolve each element's velocity along and across the filament, add up forces and torques
    R, pitch, L, a, mu = 1.0, 4.0, 12.0, 0.05, 1.0
    c_t = 2.0 * np.pi * mu / (np.log(2.0 * pitch / a) - 0.5)
    c_n = 4.0 * np.pi * mu / (np.log(2.0 * pitch / a) + 0.5)
    n = 3000
    phi = 2.0 * np.pi * (np.arange(n) + 0.5) / n * L / pitch
    along = np.array([-R * np.sin(phi), R * np.cos(phi), np.full(n, pitch / (2.0 * np.pi))])
    ds = np.linalg.norm(along, axis=0)[0] * 2.0 * np.pi * L / pitch / n
    along /= np.linalg.norm(along, axis=0)
    place = np.array([R * np.cos(phi), R * np.sin(phi), np.zeros(n)])

    def load(velocity):
        tangential = np.sum(velocity * along, axis=0) * along
        force = (c_t * tangential + c_n * (velocity - tangential)) * ds
        return force[2].sum(), np.cross(place.T, force.T)[:, 2].sum()

    moving = load(np.array([np.zeros(n), np.zeros(n), np.ones(n)]))
    turning = load(np.cross([0.0, 0.0, 1.0], place.T).T)
    a11, a12, a22 = helices.resistance(R=R, pitch=pitch, L=L, a=a, mu=mu)
    assert moving[0] == pytest.approx(a11, rel=1e-10)
    assert -moving[1] == pytest.approx(a12, rel=1e-10)
    assert -turning[0] == pytest.approx(a12, rel=1e-10)  # reciprocity
    assert turning[1] == pytest.approx(a22, rel=1e-10)


def test_a_straight_wire_does_not_propel():
    a11, a12, a22 = helices.resistance(R=0.0, pitch=1.0, L=2.0, a=0.01, mu=1.0)
    assert a12 == 0.0 and a22 == 0.0
    assert a11 == pytest.approx(2.0 * 2.0 * np.pi / (np.log(200.0) - 0.5))  # c_t L


def test_complex_step_and_refusals():
    def speed(R):
        return helices.free_speed(drive="motor", omega=700.0, b=0.8e-6, **{**CELL, "R": R})

    R = CELL["R"]
    assert speed(R * (1.0 + 1e-30j)).imag / 1e-30 == pytest.approx(
        (speed(R * (1 + 1e-5)) - speed(R * (1 - 1e-5))) / 2e-5, rel=1e-7)
    with pytest.raises(Refusal, match="field or motor"):
        helices.free_speed(drive="hand", omega=1.0, b=1e-6, **CELL)
    with pytest.raises(Refusal, match="lighthill"):
        helices.resistance(coefficients="mine", **CELL)


def test_step_out_slows_a_field_driven_helix_to_its_mean_rate():
    # overdamped rotor: at 1.25 times step-out the mean rate is 1.25 - sqrt(1.25^2 - 1) = 0.5 of step-out, by
    # hand
    b, mu, m_mag, B = 0.8e-6, CELL["mu"], 1e-15, 5e-3
    a11, a12, a22 = helices.resistance(**CELL)
    head = dict(axial=6.0 * np.pi * mu * b, spinning=8.0 * np.pi * mu * b**3)
    limit = m_mag * B / (head["spinning"] + a22)
    given = dict(drive="field", a11=a11, a12=a12, a22=a22, **head)
    per_turn = a12 / (a11 + head["axial"])
    speed = helices.speed_of(omega=limit * np.array([0.5, 1.25]), m_mag=m_mag, B=B, **given)
    np.testing.assert_allclose(speed, per_turn * limit * 0.5, rtol=1e-12)
    # what is not known is not taken as passed
    for unknown in (dict(m_mag=np.nan, B=B), dict(m_mag=m_mag, B=np.nan), dict(m_mag=m_mag), {}):
        follows = helices.speed_of(omega=3.0 * limit, **given, **unknown)
        assert follows == pytest.approx(per_turn * 3.0 * limit, rel=1e-12)
    with np.errstate(all="raise"):
        step = helices.speed_of(omega=limit * (1.25 + 1e-30j), m_mag=m_mag, B=B, **given).imag / 1e-30
    assert step == pytest.approx(per_turn * limit * (1.0 - 1.25 / 0.75), rel=1e-12)  # derivative by hand


@pytest.mark.parametrize("pitch_ratio", TANK)
def test_the_range_covers_the_tanks_own_speed(pitch_ratio):
    # Rodenborn et al. 2013 [R]: U = thrust Omega/(drag + head) with what was measured; resistive-force theory
    # is an approximation off by 0 % (no head) to a factor 2.1 (a head ten helix radii in size) at short pitch
    R, mu, omega = 6.3e-3, 1.0, 2.0
    helix = dict(omega=omega, R=R, pitch=pitch_ratio * R, L=0.13, a=0.397e-3, mu=mu)
    for b in (0.0, R, 10.0 * R):
        axial, spinning = 6.0 * np.pi * mu * b, 8.0 * np.pi * mu * b**3
        thrust, torque, drag = TANK[pitch_ratio][0]
        measured = thrust * mu * R**2 * omega / (drag * mu * R + axial)
        low, high = helices.speed_range(drive="field", axial=axial, spinning=spinning, **helix)
        assert low * 0.9995 <= measured <= high * 1.0005  # theory printed to four figures
        plain = helices.free_speed(drive="field", b=b, **helix)
        assert low <= plain <= high
        # the approximation is off by what the printed numbers say: 1.00, 1.22, 2.10 at the short pitch for
        # the three heads, 0.95 at the long one
        (thrust_t, _, drag_t), pull = TANK[pitch_ratio][1], axial / (mu * R)
        off = thrust_t / (drag_t + pull) / (thrust / (drag + pull))
        assert plain / measured == pytest.approx(off, rel=1e-3)
        assert off == pytest.approx(1.0, abs=0.06) or (pitch_ratio < 3.0 and 1.2 < off < 2.15)
    head = dict(axial=6.0 * np.pi * mu * R, spinning=8.0 * np.pi * mu * R**3)
    spun = helices.speed_range(drive="motor", **head, **helix)
    assert 0.0 < spun[0] < spun[1]
