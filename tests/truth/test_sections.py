"""Second moments, areas and drag radii against handbook values and numerical integration."""

import numpy as np
import pytest
from scipy import integrate

from labbook.physics import sections


def test_second_moments_of_worked_examples():
    # Roark's Formulas; values [C], eight figures printed
    assert sections.rod_second_moment(d=1e-3) == pytest.approx(4.9087385e-14, rel=2e-8)
    assert sections.tube_second_moment(D=1e-3, d_in=0.6e-3) == pytest.approx(4.2725660e-14, rel=2e-8)
    assert sections.strip_second_moment(w=2e-3, t=0.2e-3) == pytest.approx(1.3333333e-15, rel=3e-8)


def moment(half_width, top):
    """Integral of z^2 over a section of given half width at height z, by quadrature: the definition."""
    return integrate.quad(lambda z: 4.0 * z**2 * half_width(z), 0.0, top)[0]


def test_second_moments_by_their_definition():
    # quadrature is good to 1e-8 with the square-root edge
    circle = moment(lambda z: np.sqrt(0.25 - z**2), 0.5)
    assert sections.rod_second_moment(d=1.0) == pytest.approx(circle, rel=1e-8)
    assert sections.tube_second_moment(D=2.0, d_in=1.0) == pytest.approx(15.0 * circle, rel=1e-8)
    assert sections.strip_second_moment(w=3.0, t=0.4) == pytest.approx(moment(lambda z: 1.5, 0.2), rel=1e-12)
    ellipse = moment(lambda z: 3.0 * np.sqrt(1.0 - (z / 0.5) ** 2), 0.5)
    assert sections.ellipse_second_moment(semi_w=3.0, semi_t=0.5) == pytest.approx(ellipse, rel=1e-8)


def test_areas():
    # elementary geometry
    assert sections.rod_area(d=2.0) == pytest.approx(np.pi)
    assert sections.tube_area(D=4.0, d_in=2.0) == pytest.approx(3.0 * np.pi)
    assert sections.strip_area(w=3.0, t=0.5) == pytest.approx(1.5)
    assert sections.ellipse_area(semi_w=3.0, semi_t=0.5) == pytest.approx(1.5 * np.pi)


def test_radii_and_flatness():
    # Batchelor 1970: the mean of the semi-axes; 2 x 0.2 mm strip
    assert sections.strip_radius(w=2e-3, t=0.2e-3) == pytest.approx(0.55e-3)
    assert sections.ellipse_radius(semi_w=1e-3, semi_t=0.1e-3) == pytest.approx(0.55e-3)
    assert sections.rod_radius(d=1e-3) == sections.tube_radius(D=1e-3) == 0.5e-3
    assert sections.strip_flatness(w=2e-3, t=0.2e-3) == pytest.approx(1.0 / 11.0)
    assert sections.strip_flatness(w=1e-3, t=1e-3) == 0.5


def test_fourth_power_of_a_diameter_by_complex_step():
    slope = sections.rod_second_moment(d=1e-3 + 1e-30j).imag / 1e-30
    assert slope * 1e-3 / sections.rod_second_moment(d=1e-3) == pytest.approx(4.0, rel=1e-12)
    slope = sections.strip_second_moment(w=2e-3, t=2e-4 + 1e-30j).imag / 1e-30
    assert slope * 2e-4 / sections.strip_second_moment(w=2e-3, t=2e-4) == pytest.approx(3.0, rel=1e-12)
