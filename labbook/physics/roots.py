"""Bracketed roots of many equations at once: which input makes a rising or falling answer meet its target."""

from collections.abc import Callable

import numpy as np

from labbook.errors import Refusal

ROUNDS = 60
CLOSE = 1e-12  # of the logarithm of the answer
NARROW = 1e-14  # of the logarithm of x: a bracket that cannot shrink any more


def power_like_root(*, function: Callable, target, low, high) -> np.ndarray:
    """The x in [low, high] at which function(x) = target, elementwise; NaN where the ends do not bracket it.

    function takes an array and gives one, positive, element by element; low, high, target: positive,
    broadcast to one dimension. Sought in ln x against ln answer, where a power law is a straight line and is
    found at once. An end without an answer (NaN) brackets nothing. Refuses an empty bracket. Method:
    bisection with inverse quadratic interpolation, Chandrupatla, Adv. Eng. Softw. 28:145 (1997).
    """
    low, high, target = (
        np.array(v, float) for v in np.broadcast_arrays(*map(np.atleast_1d, (low, high, target)))
    )
    if np.any(low >= high) or np.any(low <= 0.0):
        raise Refusal("bracket", f"{low.min():g} to {high.max():g}", "is empty", "give 0 < low < high")

    def off(ln_x):
        return np.log(function(np.exp(ln_x))) - np.log(target)

    with np.errstate(all="ignore"):
        a, b = np.log(low), np.log(high)
        fa, fb = off(a), off(b)
        bracketed = np.isfinite(fa) & np.isfinite(fb) & (fa * fb <= 0.0)
        if not bracketed.any():
            return np.full(target.shape, np.nan)
        c, fc = a, fa
        share = np.clip(_or_half(fa / (fa - fb)), 0.0, 1.0)  # of the way from a to b: at first the secant
        for _ in range(ROUNDS):
            x = a + share * (b - a)
            fx = off(x)
            same = np.sign(fx) == np.sign(fa)
            c, fc = np.where(same, a, b), np.where(same, fa, fb)
            b, fb = np.where(same, b, a), np.where(same, fb, fa)
            a, fa = x, fx
            done = (np.fmin(np.abs(fa), np.abs(fb)) <= CLOSE) | (np.abs(a - b) <= NARROW)
            if np.all(done | ~bracketed):
                break
            share = _share(a, fa, b, fb, c, fc)
        return np.where(bracketed, np.exp(np.where(np.abs(fa) <= np.abs(fb), a, b)), np.nan)


def _share(a, fa, b, fb, c, fc):
    """Where between a, the newest, and b: by inverse quadratic interpolation where trusted, else halfway."""
    xi, phi = (a - b) / (c - b), (fa - fb) / (fc - fb)
    trusted = (phi**2 < xi) & ((1.0 - phi) ** 2 < 1.0 - xi)
    share = fa / (fb - fa) * fc / (fb - fc) + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
    least = 1e-10  # of the bracket: a point on one of its ends teaches nothing
    return np.clip(_or_half(np.where(trusted, share, 0.5)), least, 1.0 - least)


def _or_half(share):
    return np.where(np.isfinite(share), share, 0.5)
