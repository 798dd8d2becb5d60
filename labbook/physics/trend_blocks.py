"""Normal equations of runs in blocks, one a swimmer, with each swimmer's own shifts integrated out.

y = X beta + A_s b_s + noise: beta is common to all (its last entries may carry statements, each a datum of
size one about zero), b_s normal with standard deviations that are stated or on trial.
"""

from dataclasses import dataclass

import numpy as np

ROUNDING = 1e-12


@dataclass(frozen=True, eq=False)
class Solved:
    """beta; total and blocks (S, P, P): information; rights (S, P); inner (S, L, L), size (L,): of the
    swimmers' own shifts; likelihood: restricted, in ln, but for a constant."""

    beta: np.ndarray
    total: np.ndarray
    blocks: np.ndarray
    rights: np.ndarray
    inner: np.ndarray
    size: np.ndarray
    likelihood: float


class Blocks:
    """common (n, P), of which the last `stated` columns carry a statement; own (n, L), of which the last two
    have the sizes on trial, the others size one; y (n,); w (n,): inverse variance; rows: indices of each
    swimmer's runs."""

    def __init__(self, *, common, own, y, w, rows, stated):
        self._common, self._own, self._y, self._w, self._rows = common, own, y, w, rows
        self._prior = np.zeros(common.shape[1])
        self._prior[common.shape[1] - stated :] = 1.0
        root = np.sqrt(w)[:, None] * np.column_stack([common, own, y])
        self._grams = np.stack([root[r].T @ root[r] for r in rows])
        self._lnw = float(np.log(w).sum())

    def solve(self, *, tau) -> Solved:
        """The fit with (tau_x, tau_y) between swimmers."""
        P, L, M = self._common.shape[1], self._own.shape[1], self._grams
        size = np.concatenate([np.ones(L - 2), tau])
        inner = np.eye(L) + size[:, None] * M[:, P : P + L, P : P + L] * size
        side = size[:, None] * np.concatenate([M[:, P : P + L, :P], M[:, P : P + L, -1:]], axis=2)
        gone = np.swapaxes(side, 1, 2) @ np.linalg.solve(inner, side)
        blocks = M[:, :P, :P] - gone[:, :P, :P]
        rights = M[:, :P, -1] - gone[:, :P, -1]
        total, right = blocks.sum(axis=0) + np.diag(self._prior), rights.sum(axis=0)
        total = total + ROUNDING * np.diag(1.0 + np.diag(total))
        beta = np.linalg.solve(total, right)
        square = M[:, -1, -1].sum() - gone[:, -1, -1].sum() - right @ beta
        volume = np.linalg.slogdet(inner)[1].sum() + np.linalg.slogdet(total)[1]
        return Solved(beta, total, blocks, rights, inner, size, float(-0.5 * (volume + square - self._lnw)))

    def likeliest(self, *, tau_x, tau_y, start):
        """The pair of two ladders with the highest restricted likelihood, by turns from a start."""
        tau = start
        for _ in range(2):
            tau = (tau[0], max(tau_y, key=lambda ty: self.solve(tau=(tau[0], ty)).likelihood))
            tau = (max(tau_x, key=lambda tx: self.solve(tau=(tx, tau[1])).likelihood), tau[1])
        return tau

    def residuals(self, solved):
        """(n,) of the runs, without the swimmers' own shifts."""
        left = self._y - self._common @ solved.beta
        for r, inner in zip(self._rows, solved.inner, strict=True):
            A = self._own[r] * solved.size
            left[r] -= A @ np.linalg.solve(inner, A.T @ (self._w[r] * left[r]))
        return left

    def leverage(self, solved):
        """(n,): the share of each run's own noise that the fit follows."""
        share = np.empty(len(self._y))
        whole = np.linalg.inv(solved.total)
        for r, inner in zip(self._rows, solved.inner, strict=True):
            A, w = self._own[r] * solved.size, self._w[r]
            back = np.linalg.solve(inner, A.T * w)
            X = self._common[r] - A @ (back @ self._common[r])
            share[r] = w * (
                np.sum(A * np.linalg.solve(inner, A.T).T, axis=1) + np.sum((X @ whole) * X, axis=1)
            )
        return share
