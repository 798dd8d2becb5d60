"""Linear fits under serially correlated noise: white plus wobble, integrated over what is not known of it.

The residual of a track is modelled as white noise (localisation) plus a first-order autoregressive wobble
in continuous time (Ornstein-Uhlenbeck, correlation exp(-|dt|/tau)), which takes lost frames and uneven
steps as they are; without bound on tau the wobble is a random walk (diffusion). The two unknowns, tau and
the ratio of variances, are not estimated and then taken for true, which makes intervals too short at few
cycles: the restricted likelihood (Patterson & Thompson, Biometrika 58:545, 1971; as a marginal likelihood
Harville, Biometrika 61:383, 1974) is evaluated on a lattice of them, and the answer is the mixture of
Student's t distributions, n - p degrees of freedom each, that this gives. Why not a bootstrap: resampled
blocks know nothing of what is slower than a block, and percentile intervals cover about 70 % at three
cycles. The weights below were chosen for coverage on simulated tracks of 5, 10 and 30 cycles, other ones
than those of the printed table (tests/truth/simulated_tracks.py): tau^-0.75 per unit of ln tau up to one beat,
a random walk for anything slower, none of the ratio, and some for no wobble at all. What five cycles cannot
tell apart, a random walk from a wobble of one beat or white noise from one with a slow wobble of half its size in
it, no method can: there motion is seen in 15 to 20 and in 8 to 12 % of such records, not in 5 %.
"""

import numpy as np
from scipy.linalg import lapack

from labbook.physics.track_mixture import TINY, Mixture

STEP_TAU, STEP_RATIO = 0.5, 1.0  # lattice steps in ln at 300 points or fewer
LOWEST, HIGHEST = 0.003, 1e5  # ratio of wobble to white variance: the lowest is divided by n
WALK_WEIGHT = 1.4  # of a random walk, against one unit of ln tau at its upper end
WALK_TAU = 100.0  # records: a wobble this slow is a random walk
SLOPE_TAU = -0.75
WHITE_WEIGHT = 30.0  # of no wobble at all, against one unit of ln ratio
SAFE = 1e-3  # white variance in units of one frame's, above which the symmetric solver keeps nine digits
ROUNDING = 1e-13  # of the largest value: less residual than that is rounding
DROP = 6.5  # of ln likelihood below its top, where the lattice ends


class NoiseFit:
    """Coefficients of y = X beta + noise with the noise integrated out.

    t: s, rising, n points; averaged: (frames to a point, frame interval in s); counts: frames there; X: (n,
    p); y: (n,); more: (n, q) further columns that `extra` can add to X one at a time; slowest: longest tau
    in s before a random walk; finest: shortest; walk_weight: of the random walk, in units of ln tau at its
    upper end.
    """

    def __init__(self, *, t, counts, averaged, X, y, slowest, finest, more=None, walk_weight=WALK_WEIGHT):
        root = np.sqrt(counts)
        self._p, self._n = X.shape[1], len(t)
        q, self._R = np.linalg.qr(X * root[:, None])
        extent, y = np.abs(y).max(), y * root
        self._beta0 = q.T @ y
        y = y - q @ self._beta0
        self._unit = max(float(np.sqrt(y @ y / self._n)), ROUNDING * extent, TINY)
        self._least = max(self._n * (ROUNDING * extent / self._unit) ** 2, TINY)
        columns = [q, (y / self._unit)[:, None]]
        self._more = 0 if more is None else more.shape[1]
        if self._more:
            more = more * root[:, None]
            more = more - q @ (q.T @ more)
            self._size = np.linalg.norm(more, axis=0)
            columns.insert(1, more / self._size)
        self._Z = np.asfortranarray(np.hstack(columns) / root[:, None])
        self._t, self._white, self._T, self._averaged = t, 1.0 / counts, t[-1] - t[0], averaged
        shrink = min(1.0, np.sqrt(300.0 / self._n))
        self._h, self._k = STEP_TAU * shrink, STEP_RATIO * shrink
        self._slowest, self._walk_weight = slowest, walk_weight
        self._walk = max(WALK_TAU, 3.0 * slowest / self._T)
        self._rows = int(max(0.0, np.log(slowest / finest)) / self._h)
        self._cols = int(np.log(HIGHEST * self._n / LOWEST) / self._k)
        self._memo = {}
        self._wobble = {}
        nodes = set(self._fill(more=False))
        if self._more:
            nodes |= set(self._fill(more=True))
        self._nodes = sorted(nodes)
        self._grams = np.stack([self._memo[node][0] for node in self._nodes])
        self._base = self._solve(range(self._p))

    # --- what is asked of it

    def figure(self, direction) -> Mixture:
        """What is known of direction . beta; direction: (p,)."""
        a = np.linalg.solve(self._R.T, np.asarray(direction, float))
        weight, beta, factor, variance = self._base
        v = np.linalg.solve(factor, np.broadcast_to(a[:, None], (len(factor), self._p, 1)))[..., 0]
        centre = a @ self._beta0 + self._unit * (beta @ a)
        scale = self._unit * np.sqrt(variance * np.sum(v * v, axis=1))
        return self._mixture(weight, centre, scale, self._p)

    def coefficients(self):
        """Posterior mean of beta, (p,)."""
        return np.linalg.solve(self._R, self._beta0 + self._unit * (self._base[0] @ self._base[1]))

    def extra(self, which) -> Mixture:
        """What is known of the coefficient of further column `which` when it alone is added to X."""
        used = [*range(self._p), self._p + which]
        weight, beta, factor, variance = self._solve(used)
        unit = self._unit / self._size[which]
        return self._mixture(
            weight, unit * beta[:, -1], unit * np.sqrt(variance) / factor[:, -1, -1], self._p + 1
        )

    # --- the lattice: row -1 is the random walk, row i has tau = slowest exp(-i h);
    # column j has ratio HIGHEST exp(-j k)

    def _prior(self, node):
        i, j = node
        tau = np.log(self._walk_weight) if i < 0 else np.log(self._h) - SLOPE_TAU * i * self._h
        return tau + (np.log1p(WHITE_WEIGHT / self._k) if j == self._cols else 0.0)

    def _inside(self, node):
        return -1 <= node[0] <= self._rows and 0 <= node[1] <= self._cols

    def _fill(self, more):
        """Lattice points within DROP of the best: coarse search, climb with halved strides, then flood.

        more: whether all further columns are in the model. The random walk is searched by itself: its peak
        may stand apart from that of a short wobble.
        """

        def height(node):
            return self._gram(node)[2 + more]

        def climb(best, stride, moves):
            while stride:
                around = [(best[0] + a * stride, best[1] + b * stride) for a in moves for b in (-1, 0, 1)]
                better = max((node for node in around if self._inside(node)), key=height)
                best, stride = (better, stride) if better != best else (best, stride // 2)
            return best

        stride = 4 if self._n <= 300 else 6
        cols = range(1, self._cols + 1, stride + 1)
        rows = sorted({*range(0, self._rows + 1, stride), self._rows})
        wobble = climb(max(((i, j) for i in rows for j in cols), key=height), stride, (-1, 0, 1))
        walk = climb(max(((-1, j) for j in cols), key=height), stride, (0,))
        top, kept, front = max(height(wobble), height(walk)), {}, [wobble, walk]
        while front:
            node = front.pop()
            if node in kept or not self._inside(node):
                continue
            kept[node] = height(node)
            top = max(top, kept[node])
            if kept[node] > top - DROP:
                i, j = node
                front += [(i + 1, j), (i - 1, j), (i, j + 1), (i, j - 1)]
        return [node for node, value in kept.items() if value > top - DROP]

    def _solve(self, used):
        """(weights, beta, Cholesky factors, residual variances) of a sub-model on all lattice points."""
        used, y = list(used), self._p + self._more
        A, b = self._grams[:, used][:, :, used], self._grams[:, used, y]
        factor = np.linalg.cholesky(A)
        v = np.linalg.solve(factor, b[..., None])[..., 0]
        beta = np.linalg.solve(np.swapaxes(factor, 1, 2), v[..., None])[..., 0]
        rss = np.maximum(self._grams[:, y, y] - np.sum(v * v, axis=1), self._least)
        free = self._n - len(used)
        height = np.array([self._prior(node) - 0.5 * self._memo[node][1] for node in self._nodes])
        height += -np.log(np.diagonal(factor, axis1=1, axis2=2)).sum(axis=1) - 0.5 * free * np.log(rss)
        weight = np.exp(height - height.max())
        return weight / weight.sum(), beta, factor, rss / free

    def _mixture(self, weight, centre, scale, used):
        dof = np.full(len(weight), float(self._n - used))
        return Mixture(weight, centre, np.maximum(scale, TINY), dof)

    def _gram(self, node):
        """(Z' S^-1 Z, ln det S, ln likelihood of X, of X and all further columns), S = white + ratio K.

        K^-1 is tridiagonal, so S^-1 = K^-1 (white K^-1 + ratio)^-1 takes one tridiagonal factorisation:
        linear in n, exact for uneven steps.
        """
        if node not in self._memo:
            i, j = node
            diagonal, beside, log_det, reach, own = self._inverse(i)
            ratio = HIGHEST * np.exp(-j * self._k) * (self._walk if i < 0 else 1.0)
            gram, log_whole = self._weighed(self._white + ratio * own, ratio * reach, diagonal, beside)
            log_det += log_whole
            factor, _ = lapack.dpotrf(gram[:-1, :-1], lower=1)
            v, _ = lapack.dtrtrs(factor, gram[:-1, -1], lower=1)
            ln, heights = np.log(np.diagonal(factor)), []
            for used in (self._p, self._p + self._more):
                rss = max(gram[-1, -1] - v[:used] @ v[:used], self._least)
                free = 0.5 * (self._n - used)
                heights.append(self._prior(node) - 0.5 * log_det - ln[:used].sum() - free * np.log(rss))
            self._memo[node] = gram, log_det, *heights
        return self._memo[node]

    def _weighed(self, white, ratio, diagonal, beside):
        """(Z' S^-1 Z, ln det S less ln det K) for S = white + ratio K, of which K^-1 is given by its
        diagonals."""
        if white.min() > SAFE:  # symmetric: half the work
            root = np.sqrt(white)
            Z = self._Z / root[:, None]
            d, e, _ = lapack.dpttrf(diagonal * white + ratio, beside * root[1:] * root[:-1])
            solved, _ = lapack.dpttrs(d, e, Z)
            return Z.T @ Z - ratio * (Z.T @ solved), np.log(d).sum()
        solver = lapack.dgttrf(white[1:] * beside, white * diagonal + ratio, white[:-1] * beside)
        solved, _ = lapack.dgttrs(*solver[:5], self._Z)
        weighed = diagonal[:, None] * solved
        weighed[:-1] += beside[:, None] * solved[1:]
        weighed[1:] += beside[:, None] * solved[:-1]
        return self._Z.T @ weighed, np.log(np.abs(solver[1])).sum()

    def _inverse(self, i):
        """Of the wobble of row i: K^-1 (diagonal, beside), ln det K, and what averaging m frames makes of it.

        The mean over m frames keeps exp(-|dt|/tau) between points, times `reach`, and has that plus `own`
        (negative) at each point: a wobble plus a negative white noise, exactly.
        """
        if i not in self._wobble:
            tau = self._walk * self._T if i < 0 else self._slowest * np.exp(-i * self._h)
            step = np.diff(self._t) / tau
            rho, free = np.exp(-step), -np.expm1(-2.0 * step)
            diagonal = np.ones(self._n)
            diagonal[1:] = 1.0 / free
            diagonal[:-1] += rho**2 / free
            m, a = self._averaged
            a, lag = a / tau, np.arange(1, m)
            reach = (np.sinh(0.5 * m * a) / (m * np.sinh(0.5 * a))) ** 2
            own = (m + 2.0 * np.sum((m - lag) * np.exp(-a * lag))) / m**2 - reach
            self._wobble[i] = diagonal, -rho / free, np.log(free).sum(), reach, own
        return self._wobble[i]
