"""The speed budget of the theory: driven tails against one vectorised 4x4 complex solve of the same batch."""

import numpy as np
import pytest
from measured import noted, timed

from labbook.physics import predictions, tails

PAIRS = 100_000  # (swimmer, frequency)
BLOCK = 8_000  # rows that the book derives at a time


def batch(n):
    rng = np.random.default_rng(5)
    Sp = np.exp(rng.uniform(np.log(0.01), np.log(40.0), n))
    return dict(Sp=Sp, head=rng.uniform(0.05, 0.2, n), head_drag=rng.uniform(0.5, 2.0, n))


def solve_of(n):
    """One 4x4 complex system a pair, as a tail's four boundary conditions make."""
    rng = np.random.default_rng(6)
    matrix = rng.normal(size=(n, 4, 4)) + 1j * rng.normal(size=(n, 4, 4))
    right = rng.normal(size=(n, 4, 1)) + 0j
    return lambda: np.linalg.solve(matrix, right)


@pytest.mark.parametrize("drive", tails.DRIVES)
def test_driven_tails(drive):
    pairs, solve = batch(PAIRS), solve_of(PAIRS)
    theirs = timed(solve)
    ours = timed(lambda: tails.response(drive=drive, **pairs))
    noted(f"{PAIRS} tails, {drive} : 4x4 complex solve", ours, min(theirs, timed(solve)), 30)


def test_driven_tails_with_their_slopes():
    pairs, solve = batch(PAIRS), solve_of(PAIRS)
    theirs = timed(solve)
    ours = timed(lambda: tails.response_slopes(drive="free_head_angle", **pairs))
    noted(f"{PAIRS} tails and slopes of every input : 4x4 complex solve", ours, min(theirs, timed(solve)), 30)


def rows_of(n):
    rng = np.random.default_rng(7)
    L, mu = 0.02 * rng.uniform(0.9, 1.1, n), rng.uniform(0.9, 1.1, n)
    typical = dict(b=2e-3, EI=7e-8, theta0=0.2, omega=6.3, a=5e-4, h_wall=0.03, R_helix=2e-3, pitch=8e-3,
                   m_mag=4e-3, B=2e-3, A_tip=0.01, L_body=0.1, nu=1e-6)
    rest = {key: value * rng.uniform(0.9, 1.1, n) for key, value in typical.items()}
    return dict(L_tail=L, mu=mu, zeta_n=2.9 * mu, zeta_t=1.9 * mu, **rest)


@pytest.mark.parametrize(("form", "drive"), [
    ("flexible tail", "free_head_angle"), ("flexible tail", "free_head_torque"), ("helix", "field"),
    ("undulating", "pivoted_angle")])
def test_a_block_of_predictions(form, drive):
    rows, solve = rows_of(BLOCK), solve_of(BLOCK)
    theirs = timed(solve, 25)
    ours = timed(lambda: predictions.predicted(form=form, drive=drive, values=rows), 25)
    theirs = min(theirs, timed(solve, 25))
    noted(f"predict {BLOCK} runs, {form}, {drive} : 4x4 complex solve", ours, theirs, 30)
