"""Runs of a group as points of a trend: logarithms, own and shared errors, and what cannot be used.

Everything behind works in ln x and ln y, where a relative error has one size and a power law is a line.
"""

from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal

NOT_NUMBERS = "without a finite x and y"
NOT_POSITIVE = "with x or y not above zero"
NO_UNCERTAINTY = "without a finite own uncertainty"
NEAR_ZERO = "with x or y less than three own u above zero"  # a logarithm of them has no symmetric error
FARTHEST = 1.0 / 3.0  # relative own u
FLAT = 0.05  # of ln y: with less spread the uncertainty is taken as a share of y


@dataclass(frozen=True, eq=False)
class SharedError:
    """One source of error that several runs have in common.

    owner: (n,) whose error it is (a batch, a fluid, a swimmer, a camera): runs of one owner err together,
    owners independently; x, y: (n,) signed change of x and of y by one standard uncertainty, in their units.
    """

    name: str
    owner: np.ndarray
    x: np.ndarray
    y: np.ndarray


@dataclass(frozen=True, eq=False)
class Points:
    """Usable runs in ln x and ln y.

    x, y, own_x, own_y: (n,), the u relative; shared: parts relative, owner as codes 0 1 2 ...; swimmer: codes
    of the names in swimmers; index: (n,) places in the arrays given; left_out: reason -> number of runs;
    power: u(y) goes as y to this power (0: one absolute u for all, 1: a percentage).
    """

    x: np.ndarray
    y: np.ndarray
    own_x: np.ndarray
    own_y: np.ndarray
    swimmer: np.ndarray
    swimmers: tuple
    shared: tuple[SharedError, ...]
    index: np.ndarray
    left_out: dict
    power: float

    def where(self, *, keep):
        """The points of a mask (n,); swimmers are counted anew, left_out stays."""
        swimmer, swimmers = _codes(np.array(self.swimmers, object)[self.swimmer[keep]])
        shared = tuple(
            SharedError(s.name, _codes(s.owner[keep])[0], s.x[keep], s.y[keep]) for s in self.shared
        )
        return Points(
            self.x[keep],
            self.y[keep],
            self.own_x[keep],
            self.own_y[keep],
            swimmer,
            swimmers,
            shared,
            self.index[keep],
            self.left_out,
            self.power,
        )

    def spans(self, *, source):
        """Whether one owner of a shared source has runs of more than one swimmer."""
        pairs = np.unique(np.column_stack([source.owner, self.swimmer]), axis=0)
        return len(pairs) > len(np.unique(pairs[:, 0]))


def points(*, x, y, u_own_x, u_own_y, swimmer, shared=()) -> Points:
    """Runs as points: x and y (n,) positive, own standard uncertainties (n,) or a number, in the same units.

    swimmer: (n,) identities; shared: SharedErrors of n runs each, their parts zero where a source does not
    reach a run. Runs that are not numbers, not above zero, without uncertainty or within three own u of zero
    are left out and counted. Refuses arrays of unequal length and negative u.
    """
    x, y = np.asarray(x, float), np.asarray(y, float)
    if x.ndim != 1 or x.shape != y.shape:
        raise Refusal("y", y.shape, f"x has the shape {x.shape}", "give one row of x and one of y")
    own_x, own_y = _column("u_own_x", u_own_x, x), _column("u_own_y", u_own_y, x)
    swimmer = _owners("swimmer", swimmer, x)
    sources = [
        (s.name, _owners(s.name, s.owner, x), _column(s.name, s.x, x), _column(s.name, s.y, x))
        for s in shared
    ]
    finite = np.isfinite(x) & np.isfinite(y)
    with np.errstate(invalid="ignore"):
        positive = finite & (x > 0.0) & (y > 0.0)
        for field, u in (("u_own_x", own_x), ("u_own_y", own_y)):
            if np.any(u < 0.0):
                raise Refusal(field, u[u < 0.0][0], "a standard uncertainty is not negative")
    known = positive & np.isfinite(own_x) & np.isfinite(own_y)
    for *_, part_x, part_y in sources:
        known &= np.isfinite(part_x) & np.isfinite(part_y)
    clear = known & (own_x <= FARTHEST * x) & (own_y <= FARTHEST * y)
    counts = {
        NOT_NUMBERS: np.sum(~finite),
        NOT_POSITIVE: np.sum(finite & ~positive),
        NO_UNCERTAINTY: np.sum(positive & ~known),
        NEAR_ZERO: np.sum(known & ~clear),
    }
    x, y, own_x, own_y = x[clear], y[clear], own_x[clear] / x[clear], own_y[clear] / y[clear]
    codes, names = _codes(swimmer[clear])
    parts = tuple(
        SharedError(name, _codes(owner[clear])[0], part_x[clear] / x, part_y[clear] / y)
        for name, owner, part_x, part_y in sources
    )
    left_out = {reason: int(count) for reason, count in counts.items() if count}
    return Points(
        np.log(x),
        np.log(y),
        own_x,
        own_y,
        codes,
        names,
        parts,
        np.flatnonzero(clear),
        left_out,
        _power(np.log(y), own_y),
    )


def _power(ln_y, own_y):
    stated = own_y > 0.0
    if stated.sum() < 3 or np.std(ln_y[stated]) < FLAT:
        return 1.0
    # ln u = constant + power ln y, with u = own_y y
    return float(np.clip(1.0 + np.polyfit(ln_y[stated], np.log(own_y[stated]), 1)[0], 0.0, 1.0))


def _codes(names):
    """(codes 0 1 2 ..., the names as a tuple) of an array of identities, in order of first sight."""
    place = {}
    codes = np.array([place.setdefault(name, len(place)) for name in names], np.intp)
    return codes, tuple(place)


def _column(field, given, x):
    try:
        return np.broadcast_to(np.asarray(given, float), x.shape)
    except (TypeError, ValueError):
        raise Refusal(field, given, f"{len(x)} numbers are needed, one a run") from None


def _owners(field, given, x):
    given = np.asarray(given, object)
    if given.shape != x.shape:
        raise Refusal(field, given.shape, f"{len(x)} identities are needed, one a run")
    return given
