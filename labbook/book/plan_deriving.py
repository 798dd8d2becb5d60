"""Runs that nobody has done yet, derived as if they were logged: for any frequency, fluid and amplitude."""

from collections.abc import Sequence
from math import floor, log10, sqrt

import numpy as np

from labbook.book.absence import why_absent
from labbook.book.derive import Derived, derive
from labbook.book.plan_setting import Plan, day_of
from labbook.book.run_facts import KEYS, RunFacts
from labbook.book.shelf import Item, Reading, Shelf
from labbook.book.stored_view import SENTENCES
from labbook.registry.typed import DIGITS

DIGITS_SET = 3  # significant digits to which a frequency is set
EXACT = 1e-9  # relative: a viscosity that is asked for and not measured


def typed_frequency(f: float) -> str:
    """A frequency as one would set and type it: '0.347 Hz'."""
    return f"{_rounded(f):.{max(0, DIGITS_SET - 1 - floor(log10(f)))}f} Hz"


def as_set(f) -> np.ndarray:
    """Frequencies (Hz) as they would be set, to three digits."""
    return np.array([_rounded(x) if np.isfinite(x) and x > 0 else np.nan for x in np.atleast_1d(f)])


def _rounded(f: float) -> float:
    return float(f"{f:.{DIGITS_SET - 1}e}")


def derived(
    plan: Plan,
    f,
    fluids: Sequence[int] | np.ndarray,
    *,
    shelf: Shelf | None = None,
    swimmers=None,
    theta0=None,
    wanted: tuple[str, ...] = (),
) -> Derived:
    """Every quantity and number, with uncertainty, of planned runs of a swimmer.

    f: Hz; fluids, swimmers: ids in `shelf` (the plan's own where left out); theta0: rad, of each run; these
    broadcast. wanted: these numbers alone. A frequency counts as known to half its third digit, or as well as
    the rig states.
    """
    shelf = shelf or plan.shelf
    swimmers = plan.swimmer.id if swimmers is None else swimmers
    f, fluids, swimmers = np.broadcast_arrays(*map(np.atleast_1d, (np.asarray(f, float), fluids, swimmers)))
    n = len(f)
    typed = plan.draft.typed
    values = {k: np.full(n, typed[k].value if k in typed else np.nan) for k in KEYS}
    u = {k: np.full(n, typed[k].u if k in typed else 0.0) for k in KEYS}
    digits = {k: np.full(n, k in typed and typed[k].origin == DIGITS) for k in KEYS}
    values["f"], digits["f"] = np.array(f), np.full(n, True)
    with np.errstate(all="ignore"):
        last = 10.0 ** (np.floor(np.log10(f)) - DIGITS_SET + 1)
    u["f"] = np.where(np.isfinite(last), 0.5 * last / sqrt(3.0), 0.0)
    if theta0 is not None:
        values["theta0"] = np.broadcast_to(theta0, (n,)).astype(float)
    how = np.empty(n, dtype=object)
    how[:] = plan.drive
    rig = plan.rig.id if plan.rig else 0
    facts = RunFacts(
        values,
        u,
        digits,
        np.array(swimmers, np.int64),
        np.array(fluids, np.int64),
        np.full(n, rig, np.int64),
        np.full(n, day_of(plan), np.int64),
        how,
    )
    return derive(facts, shelf, plan.registry, wanted)


def value(found: Derived, key: str) -> np.ndarray:
    """A key's value, one a run, NaN where absent."""
    return found.of(key)[:, 0]


def u(found: Derived, key: str) -> np.ndarray:
    """A key's standard uncertainty, one a run."""
    own_and_shared = found.of(key)[:, 1:]
    return np.hypot(own_and_shared[:, 0], own_and_shared[:, 1])


def why_not(plan: Plan, found: Derived, i: int, key: str) -> str:
    """Why a planned run has no value of a key: 'needs E: swimmer reed-9 names no material'."""
    values = {k: value(found, k)[i] for k in found.keys} | {f"u_{k}": u(found, k)[i] for k in ("U",)}
    said = {s: found.sentences[s][i] for s in SENTENCES}
    named = (plan.swimmer.code, plan.swimmer.texts["form"], plan.drive)
    return why_absent(values, said, *named, plan.registry).get(key, "it is not defined here")


def fluids_of_viscosity(plan: Plan, mu, rho: float) -> Shelf:
    """The plan's shelf with fluids 1, 2, ... of these viscosities (Pa.s, at the planned T) in place of its own."""
    T = plan.value("T")
    texts = {"kind": "measured", "made": None, "note": None, "retired": False}
    density = {"rho": [f"{rho:.6g}", "kg/m3", float(rho), 0.0, "stated"]}
    fluids = {
        i: Item(
            i,
            f"{m:.3g} Pa.s",
            texts,
            density,
            (Reading("", "mu", float(m), EXACT * float(m), T, 0.0, None, "kept", "stated"),),
        )
        for i, m in enumerate(np.atleast_1d(mu), start=1)
    }
    return Shelf(fluids, plan.shelf.materials, plan.shelf.swimmers, plan.shelf.rigs)
