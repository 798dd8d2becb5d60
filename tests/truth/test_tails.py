"""Driven flexible tails: published curves, an independent collocation solution, limits, a worked swimmer."""

import numpy as np
import pytest
from scipy import optimize

from labbook.errors import Refusal
from labbook.physics import heads, rods, sections, tail_shapes, tails

# Y of Wiggins & Goldstein 1998; Lauga 2007; Yu, Lauga & Hosoi 2006 [C, exact and an independent time march].
SP = np.array([1.0, 2.0, 3.0, 4.0, 6.0, 10.0])
Y = {
    "hinged_heave": [0.001637, 0.026079, 0.119618, 0.207329, 0.170047, 0.176655],
    "pivoted_angle": [0.009659, 0.233230, 0.172276, 0.143520, 0.150195, 0.146362],
    "clamped_heave": [0.062100, 0.383524, 0.190086, 0.235645, 0.249864, 0.249556],
}
HELD = list(Y)
# b/L = 0.1, L/a = 100, spheroid_asymptotic coefficients [C].
HEAD = dict(head=0.1, head_drag=0.76577553)


def published(drive, Sp, **more):
    """The papers' Y: force over (zeta_n - zeta_t) omega ell^2 theta0^2 for an angle, ell = L/Sp."""
    force = tails.response(drive=drive, Sp=Sp, **more).force
    return force if drive.endswith("heave") else force * np.asarray(Sp) ** 2


@pytest.mark.parametrize("drive", HELD)
def test_published_curves(drive):
    # six decimals printed
    np.testing.assert_allclose(published(drive, SP), Y[drive], atol=6e-7)


@pytest.mark.parametrize(("drive", "Sp", "peak"), [
    ("hinged_heave", 4.07269, 0.207723), ("pivoted_angle", 2.15829, 0.242009),
    ("clamped_heave", 1.89042, 0.392508)])
def test_published_peaks(drive, Sp, peak):
    found = optimize.minimize_scalar(lambda s: -published(drive, s), bounds=(Sp - 0.3, Sp + 0.3),
                                     method="bounded", options=dict(xatol=1e-9))
    assert found.x == pytest.approx(Sp, abs=2e-5)  # a flat top: rounding moves it by sqrt(eps)
    assert -found.fun == pytest.approx(peak, abs=6e-7)


def test_peak_depends_on_what_is_held_fixed():
    # at fixed L and theta0 the pivoted tail peaks at 1.87663 with 0.0601926 [C]
    found = optimize.minimize_scalar(lambda s: -tails.response(drive="pivoted_angle", Sp=s).force,
                                     bounds=(1.5, 2.3), method="bounded", options=dict(xatol=1e-9))
    assert found.x == pytest.approx(1.87663, abs=2e-5)
    assert -found.fun == pytest.approx(0.0601926, abs=6e-8)


@pytest.mark.parametrize(("drive", "limit"), [
    ("hinged_heave", 1.0 / (4.0 * np.sqrt(2.0))), ("pivoted_angle", (2.0 - np.sqrt(2.0)) / 4.0),
    ("clamped_heave", 0.25)])
def test_long_tail_limit(drive, limit):
    # the reflected wave has decayed by exp(-2 x 0.38 Sp): 1e-13 at Sp = 40
    assert published(drive, 40.0) == pytest.approx(limit, rel=1e-11)
    assert published(drive, 1e5) == pytest.approx(limit, rel=1e-11)


@pytest.mark.parametrize(("drive", "limit", "power"), [
    ("hinged_heave", 11.0 / 6720.0, 4), ("pivoted_angle", 7.0 / 720.0, 6), ("clamped_heave", 1.0 / 16.0, 4)])
@pytest.mark.parametrize("Sp", [1e-2, 3e-2, 1e-1])
def test_stiff_tail_limit_without_cancellation(drive, limit, power, Sp):
    # the next term is relative Sp^8 times a number below 1: 1e-8 at 0.1, nothing at 0.01
    assert published(drive, Sp) / Sp**power == pytest.approx(limit, rel=1e-12 + Sp**8)


@pytest.mark.parametrize("drive", tails.DRIVES)
def test_scallop_theorem(drive):
    # a rigid tail has one degree of freedom: no thrust, whatever the drive (Purcell 1977)
    force = tails.response(drive=drive, Sp=np.array([0.0, 1e-3, 1e-2]), **HEAD).force
    assert force[0] == 0.0
    assert np.all(np.abs(force) < 1e-7)


def test_stiff_tail_on_a_free_head():
    # force goes as Sp^4 times 6.1583e-3 [C], five figures
    force = tails.response(drive="free_head_angle", Sp=0.01, **HEAD).force
    assert force / 0.01**4 == pytest.approx(6.1583e-3, abs=6e-8)


def test_free_head_table():
    # b/L = 0.1, L/a = 100, spheroid_asymptotic [C]: Sp, force, U/(omega L theta0^2), tip; nine figures
    table = np.array([
        [1.0, 6.14119949e-03, 1.67386937e-03, 0.75916495],
        [2.0, 5.75838456e-02, 1.56952783e-02, 0.58434589],
        [3.0, 2.80621475e-02, 7.64872873e-03, 0.20200505],
        [4.0, 1.51948173e-02, 4.14155887e-03, 0.11398763],
        [10.0, 6.38839090e-03, 1.74124482e-03, 0.00771567]])
    L, a, mu, f, theta0 = 0.03, 0.0003, 2.0, 1.5, 0.2
    zeta_n, zeta_t = rods.resistive_coefficients(model="spheroid_asymptotic", L=L, a=a, mu=mu)
    assert 6.0 * np.pi * mu * 0.1 / zeta_n == pytest.approx(0.76577553, abs=6e-9)
    answer = tails.response(drive="free_head_angle", Sp=table[:, 0], **HEAD)
    np.testing.assert_allclose(answer.force, table[:, 1], rtol=1e-8)
    np.testing.assert_allclose(answer.tip, table[:, 3], atol=6e-9)
    omega = 2.0 * np.pi * f
    EI = zeta_n * omega * (L / table[:, 0]) ** 4
    speed = tails.free_speed(drive="free_head_angle", L=L, a=a, EI=EI, mu=mu, f=f, theta0=theta0, b=0.003,
                             zeta_n=zeta_n, zeta_t=zeta_t)
    np.testing.assert_allclose(speed / (omega * L * theta0**2), table[:, 2], rtol=1e-8)


def test_fastest_free_head():
    # Sp = 2.090123, U = 0.015935643 omega L theta0^2, that is 0.1001266 theta0^2 tail lengths per beat [C]
    zeta_n, zeta_t = rods.resistive_coefficients(model="spheroid_asymptotic", L=1.0, a=0.01, mu=1.0)

    def speed(Sp):
        return tails.free_speed(drive="free_head_angle", L=1.0, a=0.01, EI=zeta_n / Sp**4, mu=1.0,
                                f=1.0 / (2.0 * np.pi), theta0=1.0, b=0.1, zeta_n=zeta_n, zeta_t=zeta_t)

    found = optimize.minimize_scalar(lambda s: -speed(s), bounds=(1.8, 2.4), method="bounded",
                                     options=dict(xatol=1e-9))
    assert found.x == pytest.approx(2.090123, abs=1e-5)
    assert -found.fun == pytest.approx(0.015935643, abs=6e-10)
    assert -found.fun * 2.0 * np.pi == pytest.approx(0.1001266, abs=6e-8)


WORKED = dict(L=0.03, a=5e-4, EI=1.5e6 * sections.rod_second_moment(d=1e-3), mu=1.0, f=1.0, b=2e-3)


def test_worked_swimmer():
    # L 30 mm, d 1 mm, E 1.5 MPa, b 2 mm, 1 Pa.s, 1 Hz, 0.3 rad, spheroid_asymptotic [C]
    zeta_n, zeta_t = rods.resistive_coefficients(model="spheroid_asymptotic", L=0.03, a=5e-4, mu=1.0)
    assert (zeta_n, zeta_t) == pytest.approx((2.73518245, 1.7480754), rel=1e-8)
    assert 0.03 * (zeta_n * 2.0 * np.pi / WORKED["EI"]) ** 0.25 == pytest.approx(3.70806644, rel=1e-8)
    common = dict(drive="free_head_angle", theta0=0.3, zeta_n=zeta_n, zeta_t=zeta_t, **WORKED)
    speed = tails.free_speed(**common)
    assert speed == pytest.approx(7.43970681e-05, rel=1e-8)
    assert speed * (zeta_t * 0.03 + 6.0 * np.pi * 2e-3) == pytest.approx(6.70625393e-06, rel=1e-8)
    assert tails.tip_excursion(**common) == pytest.approx(2.0 * 1.00363402e-3, rel=1e-8)
    # a fully nonlinear resistive-force simulation of the same case gives 7.37698e-05: linear 0.85 % high [C]
    assert speed / 7.37698e-05 - 1.0 == pytest.approx(0.0085, abs=1e-4)


def test_speed_follows_theta0_squared_and_the_torque_drive_gives_the_same_swimmer():
    by_angle = tails.free_speed(drive="free_head_angle", theta0=0.2, **WORKED)
    assert tails.free_speed(drive="free_head_angle", theta0=0.1, **WORKED) == pytest.approx(by_angle / 4.0)
    zeta_n, zeta_t = rods.resistive_coefficients(model=rods.HOUSE_MODEL, L=0.03, a=5e-4, mu=1.0)
    omega = 2.0 * np.pi
    Sp = 0.03 * (zeta_n * omega / WORKED["EI"]) ** 0.25
    needed = tails.response(drive="free_head_angle", Sp=Sp, head=2e-3 / 0.03,
                            head_drag=6.0 * np.pi * 2e-3 / (zeta_n * 0.03)).torque
    torque = needed * zeta_n * omega * 0.03**3 * 0.2
    by_torque = dict(drive="free_head_torque", torque=torque, **WORKED)
    assert tails.free_speed(**by_torque) == pytest.approx(by_angle, rel=1e-12)
    assert tails.tip_excursion(**by_torque) == pytest.approx(
        tails.tip_excursion(drive="free_head_angle", theta0=0.2, **WORKED), rel=1e-12)


def chebyshev(n):
    """Points on 0..1 from base to tip, differentiation matrix (Trefethen 2000) and quadrature weights."""
    k = np.arange(n + 1)
    x = np.cos(np.pi * k / n)
    c = np.where((k == 0) | (k == n), 2.0, 1.0) * (-1.0) ** k
    D = np.outer(c, 1.0 / c) / (x[:, None] - x + np.eye(n + 1))
    D -= np.diag(D.sum(axis=1))
    weights = np.linalg.solve(np.polynomial.chebyshev.chebvander(x, n).T,
                              [0.0 if j % 2 else 2.0 / (1.0 - j * j) for j in range(n + 1)])
    return (1.0 - x) / 2.0, -2.0 * D, weights / 2.0


def collocated(drive, Sp, head, head_drag, head_turn=4.0 / 3.0, n=22):
    """Places, h along the tail and h' at its base, from i Sp^4 h = -h'''' solved by collocation."""
    s, D, _ = chebyshev(n)
    D2, one = D @ D, np.eye(n + 1)
    D3, D4, S = D2 @ D, D2 @ D2, Sp**4
    matrix, right = (D4 / S + 1j * one).astype(complex), np.zeros(n + 1, complex)
    shear_balance = D3[0] / S + 1j * head_drag * (one[0] - head * D[0])
    torque_row = -D2[0] / S + 1j * head_drag * head * ((1.0 + head_turn) * head * D[0] - one[0])
    rows = {
        "hinged_heave": ((one[0], 1.0), (D2[0] / S, 0.0)),
        "pivoted_angle": ((one[0], 0.0), (D[0], 1.0)),
        "clamped_heave": ((one[0], 1.0), (D[0], 0.0)),
        "free_head_angle": ((shear_balance, 0.0), (D[0], 1.0)),
        "free_head_torque": ((shear_balance, 0.0), (torque_row, 1.0)),
    }[drive]
    for at, (row, value) in zip((0, 1, n - 1, n), (*rows, (D2[-1] / S, 0.0), (D3[-1] / S, 0.0)), strict=True):
        matrix[at], right[at] = row, value
    h = np.linalg.solve(matrix, right)
    return s, h, D[0] @ h


def collocation(drive, Sp, head, head_drag):
    """Thrust, as -<h_t h_x> summed along the tail, and tip of the collocated tail."""
    s, h, _ = collocated(drive, Sp, head, head_drag)
    _, D, weights = chebyshev(len(s) - 1)
    return -0.5 * weights @ np.real(1j * h * np.conj(D @ h)), abs(h[-1])


@pytest.mark.parametrize("drive", tails.DRIVES)
@pytest.mark.parametrize("Sp", [1.0, 1.9, 2.1, 3.0, 5.0, 9.0])
@pytest.mark.parametrize(("head", "head_drag"), [(0.1, 0.76577553), (0.3, 2.0)])
def test_against_collocation(drive, Sp, head, head_drag):
    # independent discretisation and independent expression for the thrust (along the tail, not at its base);
    # rounding in fourth derivatives on 23 Chebyshev points leaves 1e-8 of order-one products in the thrust
    thrust, tip = collocation(drive, Sp, head, head_drag)
    answer = tails.response(drive=drive, Sp=Sp, head=head, head_drag=head_drag)
    assert answer.force == pytest.approx(thrust, rel=1e-6, abs=3e-8)
    assert answer.tip == pytest.approx(tip, rel=1e-6)


def test_wave_far_from_the_base():
    # Machin 1958: decay over 2.6131 ell: tips of two long tails differ by exp(-4/2.6131) [C, five figures]
    tips = tails.response(drive="pivoted_angle", Sp=np.array([30.0, 34.0])).tip * np.array([30.0, 34.0])
    assert 4.0 / np.log(tips[0] / tips[1]) == pytest.approx(2.6131, abs=1e-4)


@pytest.mark.parametrize("drive", tails.DRIVES)
def test_the_two_evaluations_meet(drive):
    # power series below Sp = 2, exponentials above: no jump beyond rounding
    answer = tails.response(drive=drive, Sp=np.array([2.0 - 1e-12, 2.0]), **HEAD)
    for key in ("force", "tip"):
        low, high = getattr(answer, key)
        assert low == pytest.approx(high, rel=1e-11)


@pytest.mark.parametrize("drive", tails.DRIVES)
def test_smooth_and_finite_from_stiff_to_floppy(drive):
    Sp = np.geomspace(0.01, 40.0, 400)
    with np.errstate(all="raise", under="ignore"):
        answer = tails.response(drive=drive, Sp=Sp, **HEAD)
    assert np.all(np.isfinite(answer.force)) and np.all(np.isfinite(answer.tip))
    assert np.all(answer.tip > 0.0)


def test_broadcasting_and_complex_step():
    Sp = np.array([0.02, 0.7, 1.999, 2.0, 3.5, 20.0])
    shape = tails.response(drive="free_head_angle", Sp=Sp[:, None], head=np.array([0.05, 0.1]), head_drag=0.8)
    assert shape.force.shape == shape.tip.shape == (6, 2)
    for drive in tails.DRIVES:
        for key in ("Sp", "head", "head_drag"):
            at = dict(Sp=Sp, head=np.full(6, 0.1), head_drag=np.full(6, 0.8))

            def force(factor, drive=drive, key=key, at=at):
                return tails.response(drive=drive, **{**at, key: at[key] * factor}).force

            step = force(1.0 + 1e-30j).imag / 1e-30
            # central difference with relative step 1e-5: truncation near 1e-8, rounding near 1e-10
            np.testing.assert_allclose(step, (force(1.0 + 1e-5) - force(1.0 - 1e-5)) / 2e-5, rtol=1e-6,
                                       atol=1e-8 * np.max(np.abs(force(1.0))))


def test_refusals():
    with pytest.raises(Refusal, match="pivoted_angle"):
        tails.response(drive="wiggle", Sp=2.0)
    with pytest.raises(Refusal, match="head_drag"):
        tails.response(drive="free_head_angle", Sp=2.0)
    with pytest.raises(Refusal, match="free_head_torque"):
        tails.free_speed(drive="pivoted_angle", theta0=0.1, **WORKED)
    with pytest.raises(Refusal, match="theta0"):
        tails.free_speed(drive="free_head_angle", **WORKED)
    with pytest.raises(Refusal, match="torque"):
        tails.free_speed(drive="free_head_torque", theta0=0.1, **WORKED)


@pytest.mark.parametrize("drive", tails.DRIVES)
@pytest.mark.parametrize("Sp", [1.0, 1.9, 2.1, 5.0, 9.0])
def test_shape_and_power_against_collocation(drive, Sp):
    # the whole tail, not its ends; power as what the fluid takes: <h_t^2> along the tail, and the head's
    # share
    head, head_drag, head_turn = 0.3, 2.0, 1.1
    s, h, slope = collocated(drive, Sp, head, head_drag, head_turn)
    exact, angle = tail_shapes.displacement(drive=drive, Sp=Sp, s=s, head=head, head_drag=head_drag,
                                            head_turn=head_turn)
    size = np.max(np.abs(h))
    np.testing.assert_allclose(exact, h, atol=3e-7 * size)  # rounding as in test_against_collocation
    assert angle == pytest.approx(slope, abs=3e-7 * (size + abs(slope)))
    answer = tails.response(drive=drive, Sp=Sp, head=head, head_drag=head_drag, head_turn=head_turn)
    _, _, weights = chebyshev(len(s) - 1)
    taken = 0.5 * weights @ np.abs(h) ** 2
    if drive.startswith("free"):
        centre = h[0] - head * slope
        taken += 0.5 * head_drag * (abs(centre) ** 2 + head_turn * head**2 * abs(slope) ** 2)
        pushed = -0.5 * np.real(1j * centre * np.conj(slope))
        assert answer.head_push == pytest.approx(pushed, abs=1e-7 * size**2)
    assert answer.power == pytest.approx(taken, rel=1e-6)


def test_a_stiff_tail_takes_the_power_of_a_rigid_rod():
    # zeta_n omega^2 theta0^2/2 times int s^2 ds = L^3/3 about the pivot; a heaved clamp moves all of it: 1/2
    assert tails.response(drive="pivoted_angle", Sp=0.01).power == pytest.approx(1.0 / 6.0, rel=1e-9)
    assert tails.response(drive="clamped_heave", Sp=0.01).power == pytest.approx(0.5, rel=1e-9)
    # about a hinge a rod swings free of torque: int (1 - 3 s/2)^2 ds = 1/4
    assert tails.response(drive="hinged_heave", Sp=0.01).power == pytest.approx(1.0 / 8.0, rel=1e-9)


def test_the_wave_far_from_the_base_has_machins_length_and_decay():
    # Machin 1958: wavelength 6.8009 ell, decay over 2.6131 ell [C], five figures; from 15 ell on the faster
    # of the two waves has died by exp(-0.54 x 15) = 3e-4 of the other, and beats with it: hence over a
    # stretch of 30 ell
    Sp, s = 100.0, np.linspace(0.4, 0.7, 2001)
    amplitude, _ = tail_shapes.displacement(drive="pivoted_angle", Sp=Sp, s=s)
    phase, size = np.unwrap(np.angle(amplitude)), np.log(np.abs(amplitude))
    ells = (s[-1] - s[0]) * Sp
    assert 2.0 * np.pi * ells / (phase[0] - phase[-1]) == pytest.approx(6.8009, abs=5e-5)
    assert ells / (size[0] - size[-1]) == pytest.approx(2.6131, abs=5e-5)


@pytest.mark.parametrize("drive", tails.DRIVES)
@pytest.mark.parametrize("Sp", [0.0, 0.01, 1.0, 1.999999, 2.0, 5.0, 40.0, 300.0])
def test_shape_at_every_stiffness_meets_the_response(drive, Sp):
    # displacement and response share the base's answer but not the way to the tip; no overflow, no noise
    with np.errstate(all="raise", under="ignore"):
        beat = tail_shapes.shape(drive=drive, Sp=Sp, **HEAD)
    answer = tails.response(drive=drive, Sp=Sp, **HEAD)
    assert beat.envelope[-1] == pytest.approx(answer.tip, rel=1e-12)
    assert beat.envelope[0] == pytest.approx(answer.base, rel=1e-12, abs=1e-15)
    assert abs(beat.angle) == pytest.approx(answer.slope, rel=1e-12)
    assert beat.frames.shape == (12, 81)
    assert np.all(np.abs(beat.frames) <= beat.envelope * (1.0 + 1e-12) + 1e-15)
    # a quarter beat before the frame at phase 0 stands the imaginary part
    np.testing.assert_allclose(beat.frames[9], np.imag(beat.amplitude), atol=1e-12 * np.max(beat.envelope))
    centre = beat.amplitude[0] - HEAD["head"] * beat.angle
    moved = np.real(centre * np.exp(1j * beat.phase))
    np.testing.assert_allclose(beat.head, moved, atol=1e-15 + 1e-12 * abs(centre))


@pytest.mark.parametrize("drive", tails.DRIVES)
def test_slopes_are_the_complex_steps_and_the_differences(drive):
    Sp = np.array([0.02, 0.7, 1.999, 2.001, 3.5, 20.0])
    at = dict(Sp=Sp, head=np.full(6, 0.1), head_drag=np.full(6, 0.8), head_turn=np.full(6, 1.2))
    value, slopes = tails.response_slopes(drive=drive, **at)
    plain = tails.response(drive=drive, **at)
    for field in ("force", "tip", "base", "slope", "torque", "head_push", "power"):
        np.testing.assert_array_equal(getattr(value, field), getattr(plain, field))
        for key in at:
            def shifted(factor, field=field, key=key):
                return getattr(tails.response(drive=drive, **{**at, key: at[key] * factor}), field)

            here = np.nan_to_num(shifted(1.0))  # the torque of a held base is NaN throughout
            slope = np.nan_to_num(getattr(slopes[key], field) * at[key])
            step = np.nan_to_num(np.imag(shifted(1.0 + 1e-30j))) / 1e-30
            # the same arithmetic, rounded in another order; slopes that vanish leave rounding of the values
            np.testing.assert_allclose(slope + 0.0 * Sp, step + 0.0 * Sp, rtol=1e-10,
                                       atol=1e-14 * np.max(here))
            # central difference with relative step 1e-5: truncation near 1e-8, rounding near 1e-10
            difference = np.nan_to_num(shifted(1.0 + 1e-5) - shifted(1.0 - 1e-5)) / 2e-5
            np.testing.assert_allclose(step + 0.0 * Sp, difference, rtol=1e-6, atol=1e-8 * np.max(here))


def test_several_steps_at_once_add_up():
    # a complex step carries every input's own imaginary part
    at = dict(Sp=2.2, head=0.1, head_drag=0.8)
    _, slopes = tails.response_slopes(drive="free_head_angle", **at)
    both = tails.response(drive="free_head_angle", Sp=2.2 + 3e-30j, head=0.1, head_drag=0.8 - 2e-30j).force
    expected = 3.0 * slopes["Sp"].force - 2.0 * slopes["head_drag"].force
    assert both.imag / 1e-30 == pytest.approx(expected, rel=1e-12)


def test_free_speed_with_a_spheroid_and_a_wall():
    # by hand from the response: head's centre b_long ahead, its lateral drag in the balance, its axial drag
    # in tow
    zeta_n, zeta_t = rods.resistive_coefficients(model=rods.HOUSE_MODEL, L=0.03, a=5e-4, mu=1.0)
    head = heads.head_drag(mu=1.0, b=2e-3, b_long=5e-3, h_wall=0.02)
    omega, Sp = 2.0 * np.pi, 0.03 * (zeta_n * 2.0 * np.pi / WORKED["EI"]) ** 0.25
    answer = tails.response(drive="free_head_angle", Sp=Sp, head=1.0 / 6.0,
                            head_drag=head.lateral / (zeta_n * 0.03))
    push = (zeta_n - zeta_t) * 0.03 * answer.force + (head.lateral - head.axial) * answer.head_push
    speed = tails.free_speed(drive="free_head_angle", theta0=0.2, b_long=5e-3, h_wall=0.02, **WORKED)
    assert speed == pytest.approx(push * omega * 0.03 * 0.2**2 / (zeta_t * 0.03 + head.axial), rel=1e-12)
    round_head = tails.free_speed(drive="free_head_angle", theta0=0.2, **WORKED)
    assert tails.free_speed(drive="free_head_angle", theta0=0.2, b_long=2e-3, **WORKED) == pytest.approx(
        round_head, rel=1e-14)
    assert speed != pytest.approx(round_head, rel=0.05)
