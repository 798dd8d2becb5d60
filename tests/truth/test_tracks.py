"""Reduction of tracks against worked examples, dense algebra, scipy, published formulas and known motions."""

import numpy as np
import pytest
from scipy import signal, stats

from labbook.errors import Refusal
from labbook.physics import track_axis, track_cleaning, track_paths, track_rows, tracks
from labbook.physics.track_drift import drift_of
from labbook.physics.track_mixture import Mixture
from labbook.physics.track_noise import NoiseFit

F, FPS = 2.0, 60.0
EX = (1.0, 0.0)


def path(seed, cycles=10.0, U=0.4, sigma=0.05, along=1.0, across=2.0, fps=FPS):
    """(t, x, y): uniform motion along x, a beat of two harmonics, white noise; mm and s."""
    rng = np.random.default_rng(seed)
    t = np.arange(round(cycles * fps / F)) / fps
    turn = 2.0 * np.pi * (F * t + rng.uniform())
    x = (
        U * t
        + along * np.cos(turn)
        + 0.3 * along * np.cos(2.0 * turn + 1.0)
        + sigma * rng.normal(size=len(t))
    )
    return t, x, across * np.sin(turn) + sigma * rng.normal(size=len(t))


# --- worked examples and dense algebra
# ----------------------------------------------------------------------------------------------------


def test_straight_line_of_the_gum():
    # JCGM 100:2008 H.3, thermometer calibration: readings and published answers, each to half its last digit
    at = np.array([21.521, 22.012, 22.512, 23.003, 23.507, 23.999, 24.513, 25.002, 25.503, 26.010, 26.511])
    b = -np.array([0.171, 0.169, 0.166, 0.159, 0.164, 0.165, 0.156, 0.157, 0.159, 0.161, 0.160])
    # wobble far shorter than the steps and no random walk: what is left is white noise
    fit = NoiseFit(t=at, counts=np.ones(11), averaged=(1, 0.5), X=np.column_stack([np.ones(11), at - 20.0]), y=b,
                   slowest=1e-3, finest=1e-3, walk_weight=1e-300)  # fmt: skip
    intercept, slope, at_30 = (fit.figure(d) for d in ([1.0, 0.0], [0.0, 1.0], [1.0, 10.0]))
    assert intercept.mean == pytest.approx(-0.1712, abs=5e-5)
    assert intercept.scale == pytest.approx(0.0029, abs=5e-5)
    assert slope.mean == pytest.approx(0.00218, abs=5e-6)
    assert slope.scale == pytest.approx(0.00067, abs=5e-6)
    assert at_30.mean == pytest.approx(-0.1494, abs=5e-5)
    assert at_30.scale == pytest.approx(0.0041, abs=5e-5)
    r = (at_30.scale**2 - intercept.scale**2 - 100.0 * slope.scale**2) / (
        20.0 * intercept.scale * slope.scale
    )
    assert r == pytest.approx(-0.930, abs=5e-4)
    assert set(slope.dof) == {9.0}


@pytest.mark.parametrize("m", [1, 3])
def test_noise_fit_against_dense_matrices(m):
    # frames with white noise and a wobble exp(-|dt|/tau), averaged m at a time, written out as full matrices;
    # restricted likelihood, weights and mixture follow by their definitions (Harville 1974) on a fine grid
    rng = np.random.default_rng(4)
    n, dt, tau = 60, 0.1, 0.8
    frames = np.sort(rng.permutation(n * m + 30)[: n * m]) * dt if m == 1 else np.arange(n * m) * dt
    mean = np.kron(np.eye(n), np.full(m, 1.0 / m))
    K = np.exp(-np.abs(frames[:, None] - frames) / tau)
    noise = np.linalg.cholesky(K + 0.3 * np.eye(n * m)) @ rng.normal(size=n * m)
    X = mean @ np.column_stack([np.ones(n * m), frames - frames.mean(), np.cos(2.0 * np.pi * frames)])
    y = X @ [1.0, 0.2, 3.0] + mean @ noise
    fit = NoiseFit(t=mean @ frames, counts=np.full(n, float(m)), averaged=(m, dt), X=X, y=y, slowest=tau, finest=tau,
                   walk_weight=1e-300)  # fmt: skip
    ln_likelihood, centre, scale = [], [], []
    for ln_ratio in np.linspace(np.log(0.003 / n), np.log(1e5), 400):
        S = mean @ (np.eye(n * m) + np.exp(ln_ratio) * K) @ mean.T
        V = np.linalg.inv(X.T @ np.linalg.solve(S, X))
        beta = V @ X.T @ np.linalg.solve(S, y)
        rss = (y - X @ beta) @ np.linalg.solve(S, y - X @ beta)
        ln_likelihood.append(-0.5 * np.linalg.slogdet(S)[1] + 0.5 * np.linalg.slogdet(V)[1]
                             - 0.5 * (n - 3) * np.log(rss))  # fmt: skip
        centre.append(beta[1])
        scale.append(np.sqrt(rss / (n - 3) * V[1, 1]))
    weight = np.exp(ln_likelihood - np.max(ln_likelihood))
    weight, centre, scale = weight / weight.sum(), np.array(centre), np.array(scale)
    u = np.sqrt(weight @ (scale**2 * (n - 3) / (n - 5) + (centre - weight @ centre) ** 2))
    got = fit.figure([0.0, 1.0, 0.0])
    # the lattice has a step of 1 in ln ratio; a tenth of that step changes the answers by less than 1 % of u
    assert got.mean == pytest.approx(weight @ centre, abs=0.01 * u)
    assert got.u == pytest.approx(u, rel=0.01)
    below = weight @ stats.t.cdf((got.quantile(0.975) - centre) / scale, n - 3)
    assert below == pytest.approx(0.975, abs=1e-3)


def test_beat_frequency_against_a_lomb_scargle_periodogram():
    rng = np.random.default_rng(8)
    for seed in range(6):
        t, x, y = path(seed, cycles=12.4, sigma=0.2)
        kept = rng.random(len(t)) > 0.15
        t, x, y = t[kept], x[kept], y[kept]
        r = tracks.reduce(t=t, x=x, y=y, axis=EX)
        T = t[-1] - t[0]
        grid = F + np.linspace(-1.0, 1.0, 4001) / T
        power = signal.lombscargle(t, y - np.polyval(np.polyfit(t, y, 1), t), 2.0 * np.pi * grid)
        peak = grid[np.argmax(power)]
        # the same frames; they differ by the harmonics and the joint line, a few hundredths of a cycle
        assert abs(r.f_beat - peak) * T < 0.03
        assert abs(r.f_beat - F) < 4.0 * r.u_f_beat
        assert (
            0.2 < r.u_f_beat * 2.0 * np.pi * T * 2.0 / 0.2 / np.sqrt(24.0 / len(t)) < 5.0
        )  # Cramer-Rao's order


# --- active Brownian motion
# ----------------------------------------------------------------------------------------------------


def howse(*, lag, D, v, tau_R):
    """Howse et al., PRL 99:048102 (2007), as printed (from memory): tau_R of a particle turning in space."""
    return 4.0 * D * lag + 0.5 * (v * tau_R) ** 2 * (2.0 * lag / tau_R + np.exp(-2.0 * lag / tau_R) - 1.0)


def active_particle(rng, n, dt, *, D, v, D_r):
    """Langevin steps in the plane: direction diffuses with D_r, position with D, propulsion v; many short
    substeps."""
    sub = 8
    turn = np.sqrt(2.0 * D_r * dt / sub) * rng.normal(size=n * sub)
    push = v * np.exp(1j * np.cumsum(turn)) * dt / sub
    kick = np.sqrt(2.0 * D * dt / sub) * (rng.normal(size=n * sub) + 1j * rng.normal(size=n * sub))
    z = np.cumsum(push + kick)[::sub]
    return np.arange(n) * dt, z.real, z.imag


def test_displacement_of_an_active_particle_against_the_published_formula():
    lag = np.geomspace(0.01, 100.0, 30)
    assert track_paths.active_msd(lag=lag, D=0.3, v=2.0, tau=1.5) == pytest.approx(
        howse(lag=lag, D=0.3, v=2.0, tau_R=3.0), rel=1e-9)  # fmt: skip
    # limits: v t at once, D + v^2 tau/2 at last
    assert track_paths.active_msd(lag=1e-4, D=0.0, v=2.0, tau=1.5) == pytest.approx(4e-8, rel=1e-4)
    assert track_paths.active_msd(lag=1e6, D=0.3, v=2.0, tau=1.5) == pytest.approx(
        4e6 * (0.3 + 3.0), rel=1e-5
    )


def test_simulated_active_particles_follow_it():
    rng = np.random.default_rng(11)
    lags = np.array([1, 4, 16, 64, 128])
    runs = []
    for _ in range(60):
        t, x, y = active_particle(rng, 3000, 0.05, D=0.2, v=3.0, D_r=0.5)
        lag, msd = track_paths.mean_square_displacement(t=t, x=x, y=y, lags=lags)
        runs.append(msd)
    mean, u = np.mean(runs, axis=0), np.std(runs, axis=0, ddof=1) / np.sqrt(len(runs))
    assert np.all(np.abs(mean - howse(lag=lag, D=0.2, v=3.0, tau_R=4.0)) < 4.0 * u)
    assert np.all(u < 0.05 * mean)  # so that the line above can fail


def test_a_swimmer_that_turns_is_told_from_one_that_diffuses():
    rng = np.random.default_rng(12)
    t, x, y = active_particle(rng, 12000, 0.05, D=0.2, v=3.0, D_r=0.5)
    free = track_paths.free_path(t=t, x=x, y=y)
    assert abs(free.v - 3.0) < 4.0 * free.u_v and free.u_v < 0.3
    assert abs(free.tau - 2.0) < 4.0 * free.u_tau and free.u_tau < 0.6
    assert abs(free.D - 0.2) < 4.0 * free.u_D and free.u_D < 0.05
    assert free.Pe == pytest.approx(3.0 * np.sqrt(2.0 / 0.2), rel=0.3)
    diffusing = 0
    for _ in range(12):
        t, x, y = active_particle(rng, 2000, 0.05, D=0.2, v=0.0, D_r=0.5)
        diffusing += track_paths.free_path(t=t, x=x, y=y).v is None
    assert diffusing >= 10  # one in fifty was called active in longer trials: 3 of 12 would come once in 600


def test_diffusivity_in_si_is_that_of_stokes_and_einstein():
    # a sphere of 0.5 um in water at 298.15 K: D = 4.907480e-13 m2/s [C]
    rng = np.random.default_rng(13)
    t, x, y = active_particle(rng, 20000, 0.02, D=4.907480e-13, v=0.0, D_r=1.0)
    free = track_paths.free_path(t=t, x=x, y=y)
    assert free.v is None
    assert abs(free.D - 4.907480e-13) < 4.0 * free.u_D and free.u_D < 0.05 * free.D


def test_a_diffusing_body_without_beat_is_not_called_swimming():
    rng = np.random.default_rng(14)
    called = 0
    for _ in range(24):
        t, x, y = active_particle(rng, 400, 0.05, D=0.2, v=0.0, D_r=1.0)
        r = tracks.reduce(t=t, x=x, y=y)
        assert r.f_beat is None and r.cycles is None and r.net_per_cycle is None and r.amplitude is None
        called += r.p_zero < 0.05
    # 7 % in longer trials (5 % if the noise were known); a straight line by least squares calls nearly all so
    assert called <= stats.binom.ppf(0.9999, 24, 0.08)


def test_positions_that_hardly_change_are_refused_or_left_out():
    t = np.arange(3000) / FPS
    for x in (0.0 * t, 0.0 * t + 5.0):
        with pytest.raises(Refusal, match="the positions hardly ever change"):
            track_paths.free_path(t=t, x=x, y=0.0 * t)
    rng = np.random.default_rng(24)
    steps = np.round(
        0.05 * np.cumsum(rng.normal(size=(2, 3000)), axis=1)
    )  # whole pixels, most frames like the last
    one = np.where(t > 25.0, 1.0, 0.0)  # a single step in all
    with np.errstate(all="raise"):
        free = track_paths.free_path(t=t, x=steps[0], y=steps[1])
        assert np.all(free.msd > 0.0) and (free.D is None or free.D > 0.0)
        track_paths.free_path(t=t, x=one, y=0.0 * t)


def test_circle_has_the_curvature_of_its_radius():
    rng = np.random.default_rng(15)
    t = np.arange(1200) / FPS
    for side in (1.0, -1.0):
        x, y = 8.0 * np.sin(0.15 * t), side * 8.0 * (1.0 - np.cos(0.15 * t))
        free = track_paths.free_path(
            t=t, x=x + 0.01 * rng.normal(size=1200), y=y + 0.01 * rng.normal(size=1200)
        )
        assert free.curvature == pytest.approx(side / 8.0, rel=0.02)


# --- known motions
# ----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("cycles", [3.0, 5.0, 5.37, 9.9, 30.45])
def test_motion_without_noise_is_found_exactly(cycles):
    t, x, y = path(0, cycles=cycles, sigma=0.0)
    r = tracks.reduce(t=t, x=x, y=y, f=F, axis=EX)
    assert r.U == pytest.approx(0.4, abs=1e-9)
    assert r.net_per_cycle == pytest.approx(0.2, abs=1e-9)
    assert r.cycles == pytest.approx(cycles, abs=0.6 * F / FPS)
    assert (r.frames, r.gaps, r.rejected, r.trimmed) == (len(t), 0, 0, 0.0)
    # half the extent of cos(p) + 0.3 cos(2 p + 1) over a beat, on a grid of its own
    p = np.linspace(0.0, 2.0 * np.pi, 100_001)
    assert r.amplitude == pytest.approx(0.5 * np.ptp(np.cos(p) + 0.3 * np.cos(2.0 * p + 1.0)), rel=3e-4)


def test_what_must_not_matter_does_not():
    t, x, y = path(1, sigma=0.1)
    base = tracks.reduce(t=t, x=x, y=y, f=F, axis=EX)
    told = ("U", "u_U", "U_low", "U_high", "amplitude", "u_amplitude", "p_zero", "net_per_cycle")
    order = np.random.default_rng(2).permutation(len(t))
    turned = np.exp(0.7j) * (x + 1j * y)
    for other in (
        tracks.reduce(t=t[order], x=x[order], y=y[order], f=F, axis=EX),
        tracks.reduce(t=np.r_[t, t[:40]], x=np.r_[x, x[:40]], y=np.r_[y, y[:40]], f=F, axis=EX),
        tracks.reduce(t=t + 1.7e9, x=x + 300.0, y=y - 70.0, f=F, axis=(2.0, 0.0)),
        tracks.reduce(t=t, x=turned.real, y=turned.imag, f=F, axis=(np.cos(0.7), np.sin(0.7))),
        tracks.reduce(t=t, x=x + 0.9 * t, y=y - 0.3 * t, f=F, axis=EX, drift=(0.9, -0.3)),
        tracks.reduce(t=t, x=x, y=y, f=F, heading=0.0 * t),
        tracks.reduce(t=t, x=x, y=y, f=F, head_x=x + 3.0, head_y=y),
    ):
        for name in told:
            # 1e-5: t + 1.7e9 s keeps 2e-7 s
            assert getattr(other, name) == pytest.approx(getattr(base, name), rel=1e-5, abs=1e-12), name
    back = tracks.reduce(t=t, x=x, y=y, f=F, axis=(-1.0, 0.0))
    assert (back.U, back.U_low, back.U_high) == pytest.approx((-base.U, -base.U_high, -base.U_low))
    small = tracks.reduce(t=t, x=1e-6 * x, y=1e-6 * y, f=F, axis=EX)
    assert (small.U, small.u_U, small.amplitude) == pytest.approx(
        (1e-6 * base.U, 1e-6 * base.u_U, 1e-6 * base.amplitude)
    )


def test_fitted_axis_points_along_the_velocity_and_only_forward():
    t, x, y = path(3, cycles=20.0, U=-0.4)
    r = tracks.reduce(t=t, x=x, y=y, f=F)
    assert r.axis_from == "velocity" and r.U == pytest.approx(0.4, abs=0.02)
    assert r.axis[0] == pytest.approx(-1.0, abs=0.01) and np.hypot(*r.axis) == pytest.approx(1.0)


def test_uncertainties_of_drift_and_scale_join():
    t, x, y = path(4)
    plain = tracks.reduce(t=t, x=x, y=y, f=F, axis=EX)
    drifting = tracks.reduce(t=t, x=x, y=y, f=F, axis=EX, u_drift=(0.03, 9.0))
    assert drifting.u_U == pytest.approx(np.hypot(plain.u_U, 0.03), rel=0.01)
    scaled = tracks.reduce(t=t, x=x, y=y, f=F, axis=EX, scale_u=0.1)
    assert scaled.u_U == pytest.approx(np.hypot(plain.u_U, 0.1 * plain.U), rel=0.01)
    assert scaled.u_amplitude == pytest.approx(np.hypot(plain.u_amplitude, 0.1 * plain.amplitude), rel=0.01)
    assert scaled.p_zero == plain.p_zero
    assert scaled.u_net_per_cycle == pytest.approx(scaled.u_U / F)


def test_uncertainty_of_the_clock_joins_what_it_tells():
    t, x, y = path(4)
    for known in ({"f": F}, {}):
        plain = tracks.reduce(t=t, x=x, y=y, axis=EX, **known)
        late = tracks.reduce(t=t, x=x, y=y, axis=EX, time_u=0.1, **known)
        assert late.u_U == pytest.approx(np.hypot(plain.u_U, 0.1 * plain.U), rel=0.01)
        assert late.U_high - late.U_low > 1.05 * (plain.U_high - plain.U_low)
        assert (late.amplitude, late.u_amplitude) == (plain.amplitude, plain.u_amplitude)
        assert (late.U, late.f_beat, late.p_zero) == (plain.U, plain.f_beat, plain.p_zero)
        trend, u = plain.steadiness.trend, plain.steadiness.u_trend
        assert late.steadiness.u_trend == pytest.approx(np.hypot(u, 0.2 * trend), rel=1e-9)
        if known:  # the drive's clock tells f, the camera's U
            assert late.u_f_beat == 0.0 and late.u_net_per_cycle == pytest.approx(late.u_U / F)
        else:  # one clock: U/f has no time in it
            assert late.u_f_beat == pytest.approx(np.hypot(plain.u_f_beat, 0.1 * plain.f_beat))
            assert late.u_net_per_cycle == pytest.approx(plain.u_net_per_cycle, rel=1e-9)


def test_drift_from_a_tracer_or_a_still_stretch():
    rng = np.random.default_rng(5)
    t, x, y = path(5, cycles=16.0, U=0.4)
    tracer = drift_of(
        t=t, x=0.2 * t + 0.02 * rng.normal(size=len(t)), y=-0.1 * t + 0.02 * rng.normal(size=len(t))
    )
    assert tracer.velocity == pytest.approx((0.2, -0.1), abs=4.0 * max(tracer.u)) and max(tracer.u) < 0.005
    r = tracks.reduce(t=t, x=x + 0.2 * t, y=y - 0.1 * t, f=F, axis=EX, drift=tracer)
    assert abs(r.U - 0.4) < 4.0 * r.u_U and r.drift == tracer.velocity and r.u_drift == tracer.u
    lead = np.arange(240) / FPS
    joined = np.r_[lead, t + 4.0]
    x = np.r_[0.02 * rng.normal(size=240), x - x[0]] + 0.2 * joined
    y = np.r_[0.02 * rng.normal(size=240), y - y[0]] - 0.1 * joined
    r = tracks.reduce(t=joined, x=x, y=y, f=F, axis=EX, still=(0.0, 3.99))
    assert abs(r.U - 0.4) < 4.0 * r.u_U and r.u_U < 0.03 and r.frames == len(t)


def test_tail_tip_is_told_peak_to_peak_and_relative_to_the_body():
    rng = np.random.default_rng(6)
    t, x, y = path(6)
    tip_x, tip_y = x - 12.0, y + 3.5 * np.cos(2.0 * np.pi * F * t) + 0.05 * rng.normal(size=len(t))
    tip_y[::7] = np.nan
    for known in ({"f": F}, {}):
        r = tracks.reduce(t=t, x=x, y=y, axis=EX, tip_x=tip_x, tip_y=tip_y, **known)
        assert abs(r.A_tip - 7.0) < 4.0 * r.u_A_tip and r.u_A_tip < 0.05
        assert r.frames == len(t)  # a lost tip loses no frame of the body
    assert tracks.reduce(t=t, x=x, y=y, f=F, axis=EX).A_tip is None


def test_outliers_gaps_and_lost_frames_are_counted():
    rng = np.random.default_rng(7)
    t, x, y = path(7, sigma=0.05)
    x[[20, 21, 90, 200]] += (5.0, -8.0, 30.0, 1000.0)
    lost = np.zeros(len(t), bool)
    lost[[40, 41, 42, 150]] = True
    x[160], y[170] = np.nan, np.inf
    order = rng.permutation(np.flatnonzero(~lost))
    r = tracks.reduce(t=t[order], x=x[order], y=y[order], f=F, axis=EX)
    assert (r.rejected, r.gaps, r.lost, r.unreadable) == (4, 4, 6, 2)
    assert r.frames == len(t) - 4 - 6
    assert abs(r.U - 0.4) < 4.0 * r.u_U
    assert r.trace.used.sum() == r.frames and len(r.trace.t) == len(t) - 6


def test_a_jerk_in_every_beat_is_no_outlier():
    t, x, y = path(8, sigma=0.01)
    x = x + 0.5 * (np.round(F * t * FPS / F) % (FPS / F) == 3)  # the same frame of each beat
    assert tracks.reduce(t=t, x=x, y=y, f=F, axis=EX).rejected == 0


def test_start_up_is_trimmed_and_a_steady_start_is_not():
    for resting in (1, 2):
        t, x, y = path(9, cycles=12.0, U=0.0)
        x = x + 0.4 * np.maximum(t - resting / F, 0.0)
        r = tracks.reduce(t=t, x=x, y=y, f=F, axis=EX)
        assert r.trimmed == resting and abs(r.U - 0.4) < 4.0 * r.u_U
        assert r.cycles == pytest.approx(12.0 - resting)
        kept = tracks.reduce(t=t, x=x, y=y, f=F, axis=EX, trim=0)
        assert kept.trimmed == 0.0 and kept.U < r.U - 4.0 * r.u_U
    t, x, y = path(9, cycles=12.0)
    assert tracks.reduce(t=t, x=x, y=y, f=F, axis=EX, trim=3).cycles == pytest.approx(9.0)


def test_steadiness_tells_speed_by_cycle_and_trend():
    t, x, y = path(10, cycles=15.0, U=0.4, sigma=0.02)
    steady = tracks.reduce(t=t, x=x, y=y, f=F, axis=EX)
    assert len(steady.steadiness.per_cycle) == 14
    assert np.mean(steady.steadiness.per_cycle) == pytest.approx(0.4, abs=0.01)
    assert steady.steadiness.p_trend > 0.01
    slowing = tracks.reduce(t=t, x=x - 0.5 * 0.05 * t**2, y=y, f=F, axis=EX)  # 0.05 mm/s2
    assert slowing.trimmed == 0.0
    assert abs(slowing.steadiness.trend + 0.05) < 4.0 * slowing.steadiness.u_trend
    assert slowing.steadiness.p_trend < 1e-6
    assert np.polyfit(np.arange(14) / F, slowing.steadiness.per_cycle, 1)[0] == pytest.approx(-0.05, rel=0.15)


def test_whole_cycles_are_all_counted():
    for seed in range(8):  # a fitted f makes ten cycles 9.99 or 10.01
        t, x, y = path(seed, cycles=10.0, sigma=0.2)
        assert len(tracks.reduce(t=t, x=x, y=y, axis=EX).steadiness.per_cycle) == 9
    t, x, y = path(0, cycles=9.8)
    assert len(tracks.reduce(t=t, x=x, y=y, f=F, axis=EX).steadiness.per_cycle) == 8


def test_a_body_that_does_not_move_at_all_has_no_speed():
    t, _, y = path(23, sigma=0.0)
    for x in (0.0 * t, 0.0 * t + 3.0):
        for known in ({"f": F, "axis": EX}, {"f": F}, {"axis": EX}):
            r = tracks.reduce(t=t, x=x, y=y, **known)
            assert abs(r.U) < 1e-12 and r.p_zero > 0.05 and r.trimmed == 0.0
    r = tracks.reduce(t=t, x=0.0 * t, y=0.0 * t, f=F)
    assert (r.U, r.U_low, r.trimmed) == (0.0, 0.0, 0.0)


def test_a_long_record_is_no_different():
    # 300 cycles are fitted by averages: the same answer as plain least squares under white noise
    t, x, y = path(16, cycles=300.3, sigma=0.1, fps=40.0)
    r = tracks.reduce(t=t, x=x, y=y, f=F, axis=EX)
    line = stats.linregress(t, x - np.cos(2.0 * np.pi * F * t))  # only for its white-noise error's order
    assert abs(r.U - 0.4) < 4.0 * r.u_U
    assert r.u_U == pytest.approx(0.1 / np.sqrt(len(t)) / t.std(), rel=0.35) and r.u_U < line.stderr
    assert r.u_amplitude == pytest.approx(0.1 * np.sqrt(2.0 / len(t)), rel=0.6)
    fitted = tracks.reduce(t=t, x=x, y=y, axis=EX)
    assert abs(fitted.f_beat - F) < 4.0 * fitted.u_f_beat < 1e-3


# --- long records: what is summed in blocks and looked for in parts
# ----------------------------------------------------------------------------------------------------


def test_medians_are_those_of_numpy():
    rng = np.random.default_rng(19)
    for n in (25, 40_000, 40_001, 100_003):
        values = rng.standard_cauchy(n)
        for row in (values, np.round(values), np.zeros(n), np.sin(0.1 * np.arange(n))):
            assert track_rows.median(row) == np.median(row)
    row = np.round(rng.normal(size=20_000), 2)
    near = np.lib.stride_tricks.sliding_window_view(row, 9)  # of nine the fifth is the frame itself
    expected = np.median(np.delete(near, 4, axis=1), axis=1)
    assert np.array_equal(track_cleaning.around(row=row)[4:-4], expected)


@pytest.mark.parametrize("decimals", [15, 3])
def test_rows_are_those_of_cosines_and_powers(decimals):
    # times to the last digit go by a table, those to the millisecond do not; 1e-8: the table's phases are good to
    # 1e-9 cycles
    t = np.delete(np.round(np.arange(50_000) / 30.0, decimals), [7, 20_000, 20_001])
    kept = {"t": t, "dt": 1.0 / 30.0, "origin": 800.0, "unit": 900.0, "f": 1.7}
    rows = track_rows.Rows(**kept, harmonics=2, sloped=True, more=(np.square,))
    X = rows.combined(np.eye(11))
    s, turn = (t - 800.0) / 900.0, 2.0 * np.pi * 1.7 * (t - 800.0)
    beat = [np.cos(turn), np.sin(turn), np.cos(2.0 * turn), np.sin(2.0 * turn)]
    assert X == pytest.approx(np.array([1.0 + 0.0 * s, s, *beat, *(s * one for one in beat), t**2]), abs=1e-8)
    y = np.random.default_rng(20).normal(size=(2, len(t)))
    assert track_rows.least_squares(rows=track_rows.Rows(**kept, harmonics=2), ys=y) == pytest.approx(
        np.linalg.lstsq(X[:6].T, y.T, rcond=None)[0], rel=1e-6, abs=1e-9
    )
    starts = np.arange(0, len(t), 7)
    gram, right, means = track_rows.squares_and_means(rows=rows, ys=y, starts=starts)
    assert np.linalg.solve(gram, right) == pytest.approx(
        np.linalg.lstsq(X[:10].T, y.T, rcond=None)[0], rel=1e-6, abs=1e-9
    )
    ends = [*starts[1:], len(t)]
    expected = [np.vstack([X, y])[:, a:b].mean(axis=1) for a, b in zip(starts, ends, strict=True)]
    assert means == pytest.approx(np.array(expected).T, rel=1e-9, abs=1e-9)


@pytest.mark.parametrize(("f", "hum"), [(1.0, 0.0), (23.4, 0.0), (0.0052, 0.0), (0.0052, 7.0), (0.9, 10.0)])
def test_beat_of_a_very_long_record(f, hum):
    # 80,000 frames: a beat of 4 cycles in all, of many, of hardly three frames, and one beside a hum of the stage
    rng = np.random.default_rng(21)
    t = np.arange(80_000) / 100.0
    kept = rng.random(len(t)) > 0.01
    turn, stage = 2.0 * np.pi * (f * t + 0.3), 0.05 * np.exp(2j * np.pi * hum * t) * (hum > 0.0)
    x = 0.4 * t + np.cos(turn) + 0.1 * rng.normal(size=len(t)) + stage.real
    y = 2.0 * np.sin(turn) + 0.1 * rng.normal(size=len(t)) + stage.imag
    r = tracks.reduce(t=t[kept], x=x[kept], y=y[kept])
    assert abs(r.f_beat - f) < 4.0 * r.u_f_beat and r.u_f_beat < 1e-6
    assert abs(r.U - 0.4) < 4.0 * r.u_U and r.u_U < 1e-4
    assert abs(r.amplitude - 1.0) < 4.0 * r.u_amplitude + 1e-4 and r.u_amplitude < 0.01


@pytest.mark.parametrize("outlying", [0.0, 0.01])
def test_weak_beat_of_a_very_long_record_keeps_step(outlying):
    # seen in a twelfth of the record, where its f is known to some 0.1 cycles of the whole: unless it is fitted to
    # all, the amplitude comes out several u too small. Among outliers it is seen only once these are left out
    rng = np.random.default_rng(26)
    t = np.arange(400_000) / 100.0
    x = 0.4 * t + 0.1 * rng.normal(size=len(t))
    y = 0.03 * np.sin(2.0 * np.pi * 1.3 * t) + 0.1 * rng.normal(size=len(t))
    out = rng.random(len(t)) < outlying
    y[out] += rng.uniform(2.0, 20.0, out.sum()) * rng.choice([-1.0, 1.0], out.sum())
    x[1234] += 1e9 * (outlying > 0.0)
    r = tracks.reduce(t=t, x=x, y=y, axis=(0.0, 1.0))
    assert abs(r.amplitude - 0.03) < 3.0 * r.u_amplitude and r.u_amplitude < 5e-4
    assert abs(r.f_beat - 1.3) < 4.0 * r.u_f_beat and r.u_f_beat < 2e-6
    # of 800,000 normal deviates one is beyond five standard deviations in two records
    expected = out.sum() + (outlying > 0.0 and not out[1234])
    assert expected <= r.rejected <= expected + 4


# --- does the path close?
# ----------------------------------------------------------------------------------------------------


def test_a_reciprocal_stroke_closes_and_a_swimmer_does_not():
    # Purcell 1977: there and back along one path, at whatever rates, leaves no net displacement
    rng = np.random.default_rng(17)
    t = np.arange(900) / FPS
    there_and_back = np.sin(np.pi * np.mod(F * t, 1.0) ** 2) ** 2  # out slowly, back fast
    x, y = 2.0 * there_and_back, 0.7 * there_and_back**2
    x, y = x + 0.02 * rng.normal(size=900), y + 0.02 * rng.normal(size=900)
    closed = tracks.closure(reduction=tracks.reduce(t=t, x=x, y=y, f=F, axis=EX))
    assert closed.closes and abs(closed.net) < closed.bound * closed.excursion
    assert closed.excursion == pytest.approx(np.hypot(2.0, 0.7), rel=0.05)
    assert closed.detection_limit <= closed.bound < 0.003
    said = float(closed.sentence.split("larger than ")[1].split(" %")[0])
    assert closed.sentence == f"no net motion larger than {said:.3g} % of the excursion at 95 %"
    assert closed.bound <= said / 100.0 <= 1.11 * closed.bound
    moving = tracks.closure(reduction=tracks.reduce(t=t, x=x + 0.1 * t, y=y, f=F, axis=EX))
    assert not moving.closes and moving.net == pytest.approx(0.05, abs=0.005)
    assert moving.sentence.startswith("net motion of 2.")


def test_least_motion_that_would_have_been_seen():
    rng = np.random.default_rng(25)
    t = np.arange(900) / FPS
    x = 2.0 * np.sin(2.0 * np.pi * F * t) + 0.02 * rng.normal(size=900)
    y = 0.02 * rng.normal(size=900)
    given, free = (tracks.reduce(t=t, x=x, y=y, f=F, axis=axis) for axis in (EX, None))
    # scipy: 1.96 u of a component, the root of chi-square with two degrees of freedom, 2.45 u, of a length
    for r, seen in ((given, stats.norm.ppf(0.975)), (free, np.sqrt(stats.chi2.ppf(0.95, 2)))):
        found = tracks.closure(reduction=r)
        # 3 %: Student's t with some 400 degrees of freedom in a mixture
        assert found.detection_limit * r.excursion * F == pytest.approx(seen * r.u_U, rel=0.03)
    for share, called in ((0.5, False), (3.0, True)):  # 0.5 and 3 times the limit across the old path
        moved = y + share * tracks.closure(reduction=free).detection_limit * free.excursion * F * t
        assert (tracks.reduce(t=t, x=x, y=moved, f=F).p_zero < 0.05) == called


def test_length_of_a_velocity_starts_at_zero_or_clear_of_it():
    # scipy's inverse of the non-central chi-square gives some 1e-314 where there is none
    for score in np.linspace(1.0, 4.0, 301):
        one = np.ones(1)
        low, high = track_axis.length_interval(speed=Mixture(one, score * one, one, 1e6 * one))
        assert 0.0 <= low < score < high and (low == 0.0 or low > 0.01)
        none = stats.chi2.sf(score**2, 2) > 0.025  # still records as long as this are not that rare
        assert (low == 0.0) == none or abs(score - np.sqrt(stats.chi2.ppf(0.975, 2))) < 0.01


def test_the_report_of_a_swimmer_has_the_digits_that_its_interval_needs():
    t, x, y = path(22, cycles=60.0, sigma=0.002)
    r = tracks.reduce(t=t, x=x, y=y, f=F, axis=EX)
    sentence = tracks.closure(reduction=r).sentence
    net, low, high = [float(word) for word in sentence.split() if word[0].isdigit()][:3]
    assert low < net < high
    in_percent = 100.0 / F / r.excursion
    assert (net, low, high) == pytest.approx(
        [in_percent * U for U in (r.U, r.U_low, r.U_high)], abs=0.1 * (high - low)
    )


# --- refusals
# ----------------------------------------------------------------------------------------------------


def changed(**columns):
    t, x, y = path(18)
    return {"t": t, "x": x, "y": y, "f": F, "axis": EX} | {k: v(t, x, y) for k, v in columns.items()}


@pytest.mark.parametrize(("given", "field", "says"), [
    (changed(x=lambda t, x, y: x[:-1]), "x", "t has 300"),
    (changed(x=lambda t, x, y: x * np.nan), "t", "at least 24"),
    (changed(t=lambda t, x, y: t[:20], x=lambda t, x, y: x[:20], y=lambda t, x, y: y[:20]), "t", "at least 24"),
    (changed(x=lambda t, x, y: np.where((t > 1.0) & (t < 3.2), np.nan, x)), "t", "too much of the record"),
    (changed(x=lambda t, x, y: np.where(np.arange(300) % 5 < 3, np.nan, x)), "t", "lost|too much|few"),
    (changed(t=lambda t, x, y: np.r_[t[:150], t[:150]]), "t", "one clock"),
    (changed(t=lambda t, x, y: np.r_[t[:150], t[:150] + 0.004]), "t", "one clock"),
    (changed(t=lambda t, x, y: t[:75], x=lambda t, x, y: x[:75], y=lambda t, x, y: y[:75]), "t", "three cycles"),
    (changed(x=lambda t, x, y: ["far"] * 300), "x", "column of numbers"),
    (changed(x=lambda t, x, y: np.zeros((300, 2))), "x", "one value a frame"),
    (changed(f=lambda t, x, y: -1.0), "f", "positive frequency"),
    (changed(f=lambda t, x, y: "2 Hz"), "f", "positive frequency"),
    (changed(f=lambda t, x, y: 40.0), "f", "too few for this beat"),
    (changed(axis=lambda t, x, y: (0.0, 0.0)), "axis", "no direction"),
    (changed(axis=lambda t, x, y: (1.0, np.nan)), "axis", "two finite numbers"),
    (changed(axis=lambda t, x, y: None, heading=lambda t, x, y: 3.0 * t), "axis", "turns too far"),
    (changed(drift=lambda t, x, y: 0.1), "drift", "two finite numbers"),
    (changed(u_drift=lambda t, x, y: (-0.1, 0.1)), "u_drift", "two finite numbers"),
    (changed(still=lambda t, x, y: (1.0, 2.0)), "still", "start or the end"),
    (changed(scale_u=lambda t, x, y: -0.1), "scale_u", "relative standard uncertainty"),
    (changed(trim=lambda t, x, y: 8), "trim", "must keep three"),
    (changed(tip_x=lambda t, x, y: x), "tip_y", "one value a frame"),
])  # fmt: skip
def test_what_cannot_be_mended_is_refused_in_one_sentence(given, field, says):
    with pytest.raises(Refusal, match=says) as refused:
        tracks.reduce(**given)
    assert refused.value.field == field
    assert str(refused.value).count("\n") == 0 and str(refused.value).endswith(".")
