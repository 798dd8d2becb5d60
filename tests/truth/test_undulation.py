"""Undulating swimmers: printed scalings, classical sheets and filaments."""

import numpy as np
import pytest
from scipy import optimize

from labbook.errors import Refusal
from labbook.physics import undulation


def test_swimming_number_powers_from_the_paper():
    # Gazzola, Argentina & Mahadevan 2014: Re ~ Sw^(4/3) laminar, Re ~ Sw turbulent [R]; the fitted powers
    # 1.31 and 1.02 [M] are within 0.025 of theory
    def power(Sw, branch=None):
        step = undulation.swimming_reynolds(Sw=Sw * (1 + 1e-30j), branch=branch)
        return step.imag / 1e-30 / step.real

    assert power(1e2, "laminar") == pytest.approx(4.0 / 3.0, abs=0.025)
    assert power(1e6, "turbulent") == pytest.approx(1.0, abs=0.025)
    assert power(1e2) == pytest.approx(1.31) and power(1e6) == pytest.approx(1.02)


def test_branches_cross_near_the_stated_reynolds_number():
    # near Re = 3.6e3, two figures
    Sw = optimize.brentq(lambda s: np.log(undulation.swimming_reynolds(Sw=s, branch="laminar")
                                          / undulation.swimming_reynolds(Sw=s, branch="turbulent")), 1e2, 1e6)
    assert undulation.swimming_reynolds(Sw=Sw) == pytest.approx(3.6e3, rel=0.02)


def test_speed_from_the_scaling_by_hand():
    # from memory: Re = 0.4 Sw^1.02. omega 20 rad/s, A 2 cm, L 10 cm, nu 1e-6: Sw 4e4, Re 0.4 exp(1.02 ln 4e4)
    speed = undulation.swimming_speed(omega=20.0, A_tip=0.02, L_body=0.1, nu=1e-6)
    assert speed == pytest.approx(0.4 * np.exp(1.02 * np.log(4e4)) * 1e-5, rel=1e-12)
    assert 20.0 / (2 * np.pi) * 0.02 / speed == pytest.approx(0.32, abs=0.01)  # a cruising St, 0.2 to 0.4 [R]


def test_bainbridge_fish():
    # Bainbridge 1958: L = 30 cm, f = 10 Hz: 195 cm/s; with A = 0.2 L, St = 0.308 [M, C]
    speed = undulation.bainbridge_speed(L_body=0.30, f=10.0)
    assert speed == pytest.approx(1.95, rel=1e-12)
    assert 10.0 * 0.2 * 0.30 / speed == pytest.approx(0.308, abs=5e-4)


def test_taylor_sheet():
    # Taylor 1951: f = 10 Hz, lambda = 20 um, b = 1 um: 9.869604 um/s; with the next term 8.712871
    wave = dict(omega=20.0 * np.pi, wavenumber=2.0 * np.pi / 20e-6, amplitude=1e-6)
    assert undulation.sheet_speed(**wave) == pytest.approx(9.869604e-6, rel=1e-7)
    assert undulation.sheet_speed(**wave, order=4) == pytest.approx(8.712871e-6, rel=1e-7)


def test_filament_needs_unequal_drag():
    # xi = 1 gives 0, xi = 2 the sheet
    wave = dict(omega=3.0, wavenumber=2.0, amplitude=0.1)
    assert undulation.filament_speed(**wave, zeta_ratio=1.0) == 0.0
    assert undulation.filament_speed(**wave, zeta_ratio=2.0) == undulation.sheet_speed(**wave)
    assert undulation.filament_speed(**wave, zeta_ratio=1.5) == pytest.approx(0.015)


def test_filament_by_resistive_force_on_a_wave():
    # resistive-force theory summed over one wave of y = b sin(k x - omega t) held free of force, amplitude
    # small: zeta_t U = (zeta_n - zeta_t) <-y_x y_t>; terms of order (k b)^2 = 1e-6 are left out
    k, omega, b, xi = 1.0, 1.0, 1e-3, 1.7
    x = np.linspace(0.0, 2.0 * np.pi, 400, endpoint=False)
    y_x, y_t = b * k * np.cos(k * x), -b * omega * np.cos(k * x)
    push = (xi - 1.0) * np.mean(-y_x * y_t / (1.0 + y_x**2))
    drag = np.mean((1.0 + xi * y_x**2) / (1.0 + y_x**2))
    assert undulation.filament_speed(omega=omega, wavenumber=k, amplitude=b, zeta_ratio=xi) == pytest.approx(
        push / drag, rel=3e-6)


def test_oscillatory_example():
    # rho = 970, L = 20 mm, mu = 1, f = 2 Hz [C]: sqrt(2 nu/omega) = 12.80926 mm; rho omega L^2/mu = 4.875752
    depth = undulation.penetration_depth(nu=1.0 / 970.0, omega=4.0 * np.pi)
    assert depth == pytest.approx(12.80926e-3, rel=1e-6)
    assert 2.0 * (0.02 / depth) ** 2 == pytest.approx(4.875752, rel=2e-7)


def test_refusals():
    with pytest.raises(Refusal, match="turbulent"):
        undulation.swimming_reynolds(Sw=1.0, branch="fast")
    with pytest.raises(Refusal, match="order"):
        undulation.sheet_speed(omega=1.0, wavenumber=1.0, amplitude=1.0, order=3)


def linked_stroke(shape, steps=400):
    """Net displacement over one cycle of free rigid links in resistive-force drag.

    Links of length 1, drag per length 2 across and 1 along; shape(t), t from 0 to 1, gives the joint angles;
    midpoint rule in time, which is exact on a path gone back on itself in the same steps.
    """
    place = np.zeros(3)  # start of the first link, and its direction

    def frame(angles, heading):
        phi = heading + np.concatenate([[0.0], np.cumsum(angles)])
        along = np.stack([np.cos(phi), np.sin(phi)], axis=1)
        starts = np.concatenate([np.zeros((1, 2)), np.cumsum(along, axis=0)[:-1]])
        return phi, along, starts + along / 2.0

    def velocity(angles, rates, heading):
        phi, along, centre = frame(angles, heading)
        moves = np.zeros((len(phi), 3, 3 + len(rates)))  # velocity and turn of each link per unit rate
        moves[:, 0, 0] = moves[:, 1, 1] = 1.0
        for joint in range(-1, len(rates)):
            pivot = centre[joint + 1] - along[joint + 1] / 2.0 if joint >= 0 else np.zeros(2)
            arm = centre[joint + 1 :] - pivot
            moves[joint + 1 :, :, 3 + joint] += np.stack([-arm[:, 1], arm[:, 0], np.ones(len(arm))], axis=1)
        total = np.zeros((3, 3 + len(rates)))
        for link, t, c in zip(moves, along, centre, strict=True):
            force = (2.0 * np.eye(2) - np.outer(t, t)) @ link[:2]
            total += np.vstack([force, c[0] * force[1] - c[1] * force[0] + link[2] / 6.0])
        return np.linalg.solve(total[:, :3], -total[:, 3:] @ rates)

    times = np.linspace(0.0, 1.0, steps + 1)
    for low, high in zip(times[:-1], times[1:], strict=True):
        step = shape(high) - shape(low)
        angles = (shape(high) + shape(low)) / 2.0
        half = place[2] + velocity(angles, step, place[2])[2] / 2.0
        place = place + velocity(angles, step, half)
    return place


def test_a_single_hinge_gets_nowhere_whatever_its_rates():
    # Purcell 1977: one hinge retraces its path: opened in a tenth of the cycle, closed in the rest
    def scallop(t):
        return np.array([0.2 + 1.3 * (t / 0.1 if t < 0.1 else (1.0 - t) / 0.9)])

    # the two legs are stepped differently: second order leaves 1e-5 at 400 steps, a quarter of it at 800
    rough, fine = (np.max(np.abs(linked_stroke(scallop, steps))) for steps in (400, 800))
    assert fine < 0.3 * rough < 1e-4
    # two hinges that move in turn round a square, his three-link swimmer, do get on: a sum can differ from 0
    corners = np.array([[0.5, 0.5], [-0.5, 0.5], [-0.5, -0.5], [0.5, -0.5], [0.5, 0.5]])

    def square(t):
        side = min(int(4.0 * t), 3)
        return corners[side] + (4.0 * t - side) * (corners[side + 1] - corners[side])

    assert np.hypot(*linked_stroke(square)[:2]) > 5e-3
