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
