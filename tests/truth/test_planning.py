"""Roots, start-up times and designs of runs, against scipy, a finite-difference beam, packings and Elfving."""

from itertools import combinations

import numpy as np
import pytest
from scipy.optimize import brentq, linprog

from labbook.errors import Refusal
from labbook.physics.designs import maximin, nearest, pin_top, top_of_parabola
from labbook.physics.roots import power_like_root
from labbook.physics.settling import BEATS, FIRST_MODE, LEFT, settling

# ---- roots


@pytest.mark.parametrize(
    "function",
    [
        lambda x: 3.0 * x**0.25,
        lambda x: x**4 / (1.0 + x),
        lambda x: np.log1p(x),
        lambda x: 1.0 / (x * (1.0 + x * x)),
        lambda x: np.where(x < 1.0, x**0.1, x**7),
    ],
)
@pytest.mark.parametrize("target", [1e-2, 0.7, 3.0])
def test_a_root_is_where_scipy_finds_it(function, target):
    low, high = 1e-30, 1e30
    found = power_like_root(function=function, target=target, low=low, high=high)[0]
    sought = brentq(
        lambda z: float(np.log(function(np.exp(z)) / target)), np.log(low), np.log(high), xtol=1e-13
    )
    # ln x is known to the spacing of floats near its size, about 1e-14
    assert np.log(found) == pytest.approx(sought, abs=1e-10)


def test_many_roots_at_once_and_a_power_law_in_a_few_calls():
    calls = []

    def number(f):
        calls.append(len(f))
        return 2.5 * np.array([1.0, 3.0, 9.0]) * f**0.25

    found = power_like_root(function=number, target=[2.0, 2.0, 40.0], low=1e-15, high=1e15)
    assert number(found) == pytest.approx([2.0, 2.0, 40.0], rel=1e-11)
    assert len(calls) <= 6, "a straight line in the logarithms is found by the first secant"


def test_what_is_not_bracketed_has_no_root_and_an_empty_bracket_is_refused():
    found = power_like_root(
        function=lambda x: np.where(x > 0, [1.0, 1.0, np.nan] * x, x),
        target=[0.5, 50.0, 0.5],
        low=0.1,
        high=10.0,
    )
    assert found[0] == pytest.approx(0.5) and np.isnan(found[1:]).all()
    with pytest.raises(Refusal, match="is empty"):
        power_like_root(function=np.sqrt, target=1.0, low=2.0, high=1.0)


# ---- start-up


def test_the_slowest_mode_of_a_clamped_tail_by_finite_differences():
    # zeta h_t = -EI h_xxxx on (0, 1), h = h' = 0 at 0 and h'' = h''' = 0 at 1, EI = zeta = 1: h_xx at the
    # nodes with # ghost nodes for the clamp, then its transpose, is the square of a symmetric operator; no
    # beam formula enters
    n = 400
    dx = 1.0 / n
    bend = np.zeros((n, n))  # curvature at nodes 0..n-1 of h at nodes 1..n
    bend[0, 0] = 2.0  # h(-1) = h(1), h(0) = 0
    for i in range(1, n):
        bend[i, i] += 1.0
        bend[i, i - 1] -= 2.0
        if i > 1:
            bend[i, i - 2] += 1.0
    weight = np.ones(n)
    weight[0] = 0.5  # half a cell at the clamp
    mass = np.ones(n)
    mass[-1] = 0.5  # half a cell at the free end
    rate = np.linalg.eigvalsh((bend.T * weight) @ bend / np.sqrt(np.outer(mass, mass)))[0] / dx**4
    assert FIRST_MODE**4 == pytest.approx(rate, rel=1e-4)  # the differences are off by order dx^2
    # a tail of 1 m with zeta_n/EI = 1: exp(-rate t) falls to LEFT
    t = settling(f=1.0, L_tail=1.0, nu=1.0, zeta_n=1.0, EI=1.0).t_elastic
    assert np.exp(-rate * t) == pytest.approx(LEFT, rel=1e-2)


def test_start_up_times_by_hand():
    # 20 mm in 1000 cSt: (0.02)^2/1e-3 = 0.4 s; a wall at 50 mm: 2.5 s; three beats at 2 Hz: 1.5 s
    found = settling(f=2.0, L_tail=0.02, nu=1e-3, zeta_n=3.0, EI=7.4e-8, reach=0.05)
    assert (found.t_tail, found.t_tank, found.t_beats) == pytest.approx((0.4, 2.5, BEATS / 2.0))
    assert found.total == pytest.approx(2.5)
    # 12.362 = 1.8751^4; 3 x 0.02^4/(12.362 x 7.4e-8) x ln 100 = 2.416 s, and a tenth of it for a stiffer tail
    assert found.t_elastic == pytest.approx(2.416, rel=1e-3)
    assert settling(f=2.0, L_tail=0.02, nu=1e-3, zeta_n=3.0, EI=7.4e-7).total == pytest.approx(1.5), (
        "no wall known"
    )


# ---- maximin


GRID = np.array([(x, y) for x in np.linspace(0, 1, 21) for y in np.linspace(0, 1, 21)])
NONE = np.empty((0, 2))


def least(points):
    return min(np.hypot(*(np.subtract(a, b))) for a, b in combinations(points, 2))


# largest smallest distance of n points in the unit square, the packing of n equal circles: Schaer, Can. Math.
# Bull. 8:273 # (1965), and elementary geometry for 4 and 5
@pytest.mark.parametrize(("n", "best"), [(2, np.sqrt(2.0)), (4, 1.0), (5, np.sqrt(0.5)), (9, 0.5)])
def test_points_in_the_unit_square_lie_as_far_apart_as_the_best_packing(n, best):
    chosen = GRID[maximin(candidates=GRID, taken=NONE, n=n)]
    assert least(chosen) == pytest.approx(best)


def test_within_a_factor_two_of_every_other_choice():
    # Gonzalez 1985; all subsets are tried. Exchange may only better it
    rng = np.random.default_rng(7)
    for _ in range(20):
        places, taken = rng.random((14, 2)), rng.random((3, 2))
        index = maximin(candidates=places, taken=taken, n=3)
        assert len(set(index)) == 3

        def worth(rows, places=places, taken=taken):
            return min(least(places[list(rows)]), nearest(places[list(rows)], taken).min())

        best = max(worth(rows) for rows in combinations(range(14), 3))
        assert worth(index) >= 0.5 * best * (1 - 1e-12)


def test_a_gap_is_filled_in_its_middle_and_candidates_that_are_taken_are_not_chosen():
    line = np.column_stack([np.linspace(0, 1, 11), np.zeros(11)])
    assert maximin(candidates=line, taken=[(0, 0), (1, 0)], n=1).tolist() == [5]
    assert maximin(candidates=line[[0, 10]], taken=[(0, 0), (1, 0)], n=2).tolist() == []
    assert len(maximin(candidates=line[:3], taken=NONE, n=9)) == 3
    with pytest.raises(Refusal, match="how many"):
        maximin(candidates=line, taken=NONE, n=0)


# ---- the top of a parabola


def test_the_top_of_a_parabola_and_of_none():
    x = np.linspace(-1, 1, 30)
    top, c = top_of_parabola(x=x, y=3.0 - 2.0 * (x - 0.3) ** 2, u=np.full(30, 0.1), window=0.5)
    assert top == pytest.approx(0.3) and c[2] == pytest.approx(-2.0)
    assert top_of_parabola(x=x, y=x, u=np.full(30, 0.1), window=0.5) is None, (
        "the highest run is the last one"
    )
    assert top_of_parabola(x=x, y=x * x, u=np.full(30, 0.1), window=0.5) is None
    assert top_of_parabola(x=x[:3], y=-(x[:3] ** 2), u=np.full(3, 0.1), window=0.5) is None


def elfving(candidates, c):
    """n times the variance of c . beta by the best design in shares (Elfving, Ann. Math. Stat. 23:255, 1952).

    c = r * a point on the boundary of the hull of +-rows: the least sum of |weights| with rows . weights = c.
    """
    rows = np.vander(candidates, 3, increasing=True)
    both = np.vstack([rows, -rows])
    found = linprog(np.ones(len(both)), A_eq=both.T, b_eq=c, bounds=(0, None))
    return found.fun**2


@pytest.mark.parametrize("top", [0.0, 0.2, -0.35])
def test_no_design_is_better_than_elfvings_and_ours_nearly_reaches_it(top):
    x, n, u, curvature = np.linspace(-1, 1, 41), 24, 0.05, -3.0
    chosen, u_top = pin_top(
        top=top, curvature=curvature, known_x=[], known_u=[], candidates=x, u=np.full(41, u), n=n
    )
    best = elfving(x, np.array([0.0, 1.0, 2.0 * top])) * u**2 / n / (2.0 * curvature) ** 2
    rows = np.vander(x[chosen], 3, increasing=True) / u
    c = np.array([0.0, 1.0, 2.0 * top]) / (-2.0 * curvature)
    assert u_top[-1] ** 2 == pytest.approx(c @ np.linalg.pinv(rows.T @ rows) @ c, rel=1e-5)
    # whole runs in place of shares of runs cost a little: 24 of them, so a few per cent
    assert best * (1 - 1e-6) <= u_top[-1] ** 2 <= best * 1.05
    assert np.isinf(u_top[0]), "nothing is known before the first run"


def test_a_run_is_set_against_those_that_are_there():
    # ten runs on one side of the top tell its slope no better than the other side would: the new ones go
    # there
    known = np.full(10, -1.0)
    x = np.linspace(-1, 1, 41)
    chosen, u_top = pin_top(
        top=0.0,
        curvature=-1.0,
        known_x=known,
        known_u=np.full(10, 0.1),
        candidates=x,
        u=np.full(41, 0.1),
        n=4,
    )
    assert (x[chosen] > 0.0).all() and u_top[-1] < 0.1
    with pytest.raises(Refusal, match="no top"):
        pin_top(top=0.0, curvature=1.0, known_x=[], known_u=[], candidates=x, u=np.full(41, 0.1), n=4)
