"""The swimmer's share of a number: the factor that its dimensions make up, in any dialect, and its slopes.

Every number with dialects is a product of what the run, fluid and material bring and of what the swimmer's
dimensions bring. The share is a dialect's formula with all else set to 1, omega to 2 pi (f to 1).
"""

import math
from collections.abc import Mapping
from functools import lru_cache

import numpy as np

from labbook.physics import sections
from labbook.registry.dialects import MULTIPLES, coefficient, formula_of
from labbook.registry.formula import parse
from labbook.registry.quantities import QUANTITIES
from labbook.registry.spread import STEP

DIMENSIONS = ("L_tail", "L_body", "d", "w", "t", "D", "d_in", "R_helix", "pitch")
_ONES = dict.fromkeys(QUANTITIES, 1.0) | {"omega": 2.0 * math.pi}
_SECTION = ("d", "w", "t", "D", "d_in")

Dimensions = Mapping[str, np.ndarray]


def exchanged(old: Mapping[str, object], new: Mapping[str, object]) -> tuple[str, ...]:
    """The choices by which two dialects differ and for which the swimmer's dimensions are needed."""
    names = [name for name in ("length", "coefficient") if old.get(name) != new.get(name)]
    if "coefficient" in names and {old["coefficient"], new["coefficient"]} <= set(MULTIPLES):
        names.remove("coefficient")
    return tuple(names)


def share(number: str, choices: Mapping[str, object], dims: Dimensions, only: tuple[str, ...] | None = None):
    """The swimmer's share of a number in a dialect, every choice named.

    dims: SI arrays, real or complex, of all DIMENSIONS; only: names of choices (length, coefficient) whose
    factors alone are wanted, all others being 1. NaN where a dimension is missing or the tail is too stout.
    """
    wanted = ("length", "coefficient", "section") if only is None else only
    given = dict(_ONES)
    with np.errstate(all="ignore"):
        if "length" in wanted:
            given |= {key: dims[key] for key in ("L_tail", "L_body")}
        if "section" in wanted:
            given["EI"], given["a"] = _section(dims)
        if "coefficient" in wanted and "coefficient" in choices:
            given["zeta_n"] = drag(choices["coefficient"], dims)
        return np.asarray(_parsed(formula_of(number, choices)).value(given))


def drag(name: str, dims: Dimensions):
    """A resistive coefficient per viscosity, for swimmers of any section; a helix is one wave per pitch."""
    strip = kinds(dims)[2]
    with np.errstate(all="ignore"):
        inputs = {"L_tail": dims["L_tail"], "a": _section(dims)[1], "mu": 1.0, "wavelength": dims["pitch"]}
        if name == "lighthill":  # whose wave is measured along the filament
            inputs["wavelength"] = np.sqrt(dims["pitch"] ** 2 + (2.0 * math.pi * dims["R_helix"]) ** 2)
        inputs |= {key: np.where(strip, dims[key], np.nan) for key in ("w", "t")}
        return coefficient(name, inputs)


def kinds(dims: Dimensions) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Which swimmers are rods, tubes, strips: by the dimensions they have, looked for in this order."""
    rod = np.isfinite(dims["d"])
    tube = ~rod & np.isfinite(dims["D"])
    return rod, tube, ~rod & ~tube & np.isfinite(dims["w"]) & np.isfinite(dims["t"])


def _section(dims):
    """(second moment, equivalent radius) of each swimmer."""
    rod, tube, _ = kinds(dims)
    d, w, t, D, d_in = (dims[key] for key in _SECTION)
    second_moment = np.where(
        rod, sections.rod_second_moment(d=d),
        np.where(tube, sections.tube_second_moment(D=D, d_in=d_in), sections.strip_second_moment(w=w, t=t)),
    )  # fmt: skip
    radius = np.where(
        rod, sections.rod_radius(d=d),
        np.where(tube, sections.tube_radius(D=D), sections.strip_radius(w=w, t=t)),
    )  # fmt: skip
    return second_moment, radius


def needed(number: str, choices: Mapping[str, object]) -> tuple[str, ...]:
    """The dimensions that a number's share depends on in a dialect."""
    keys = set(_parsed(formula_of(number, choices)).keys)
    found = {"L_tail", "L_body"} & keys
    if keys & {"EI", "a", "zeta_n"}:
        found |= set(_SECTION)
    if "zeta_n" in keys:
        found |= {"L_tail", "R_helix", "pitch"}
    return tuple(key for key in DIMENSIONS if key in found)


def shared_parts(number: str, choices: Mapping[str, object], dims: Dimensions, u: Dimensions, one_length):
    """{source: relative part} of a share: (d ln share / d source) u(source), one source a dimension.

    u: standard uncertainty by dimension; one_length: where the tail's length is the body's, one source.
    """
    parts = {}
    for key in needed(number, choices):
        relative = np.where(u[key] > 0, u[key] / dims[key], 0.0)
        if not relative.any():
            continue
        stepped = share(number, choices, {**dims, key: dims[key] * (1.0 + 1j * STEP)})
        if np.iscomplexobj(stepped):
            parts[key] = stepped.imag / stepped.real / STEP * relative
    if "L_tail" in parts and np.any(one_length):
        own = parts["L_tail"]
        parts["L_body"] = parts.get("L_body", 0.0) + np.where(one_length, own, 0.0)
        parts["L_tail"] = np.where(one_length, 0.0, own)
    return parts


@lru_cache(maxsize=256)
def _parsed(text: str):
    return parse(text, QUANTITIES)
