"""A fluid's density on a run's day: the nearest reading, the batch's constant, or the correlation."""

import numpy as np

from labbook.book.resolved import Resolved, kind
from labbook.book.sets import ReadingSet, nearest, sets_of
from labbook.book.shelf import Item
from labbook.physics import fluids


def density(item: Item, days: np.ndarray, T: np.ndarray, u_T: np.ndarray) -> Resolved:
    """Density (kg/m3) of a fluid: the nearest reading, then the batch's constant, then the correlation."""
    why = f"no density of {item.code}, and no correlation for {kind(item)}"
    if item.texts["kind"] == "glycerol-water":
        why = f"no density of {item.code}, and its glycerol share is not typed"
    result = Resolved.empty(len(days), why)
    sets = sets_of(item.readings, ("rho",), item.texts["made"])
    if sets:
        chosen = nearest(sets, days)
        for i, group in enumerate(sets):
            rows = np.flatnonzero(chosen == i)
            for one in _nearest_in_T(group, T, rows):
                reading, own_rows = one
                result.put(own_rows, reading.value, {"rho_reading": reading.u},
                           f"density: reading {group.day}", False)
        return result
    if item.value("rho") is not None:
        result.put(slice(None), item.value("rho"), {"rho_batch": item.u("rho")},
                   f"density: stated for {item.code}", False)
        return result
    correlation = _density_correlation(item)
    if correlation is None:
        return result
    row, function, u_rel, composition = correlation
    known = np.flatnonzero(np.isfinite(T))
    result.said[:] = "absent: T was not typed, and the density follows from it"
    if len(known):
        value, parts = along(function, T[known], u_T[known], item, composition)
        parts["rho_model"] = u_rel * value
        result.put(known, value, parts, f"density: correlation, {row.name}", ~row.covers(T=T[known]))
    return result


def _nearest_in_T(group: ReadingSet, T, rows):
    """(reading, rows) for each reading of a set that is nearest in temperature to some of the rows."""
    if len(group.readings) == 1 or not len(rows):
        return [(group.readings[0], rows)]
    at = np.array([r.T if r.T is not None else np.nan for r in group.readings])
    distance = np.abs(T[rows][:, None] - at[None, :])
    which = np.where(np.isnan(distance), np.inf, distance).argmin(axis=1)
    return [(r, rows[which == i]) for i, r in enumerate(group.readings)]


def _density_correlation(item: Item):
    match item.texts["kind"]:
        case "water":
            return fluids.WATER_DENSITY, lambda T: fluids.water_density(T=T), fluids.WATER_DENSITY.u_rel, None
        case "glycerol-water" if item.value("glycerol") is not None:
            return (
                fluids.GLYCEROL_WATER_DENSITY,
                lambda w, T: fluids.glycerol_water_density(w=w, T=T),
                fluids.GLYCEROL_WATER_DENSITY.u_rel,
                "glycerol",
            )
        case "silicone-oil":
            return (
                fluids.SILICONE_OIL_DENSITY,
                lambda T: fluids.silicone_oil_density(T=T),
                fluids.SILICONE_OIL_DENSITY.u_rel,
                None,
            )
    return None


def along(function, T, u_T, item: Item, composition: str | None):
    """Value of a correlation and its parts from T and from the typed composition."""
    if composition is None:
        stepped = function(T + 1e-30j)
        return stepped.real, {"T": stepped.imag / 1e-30 * u_T}
    w, u_w = item.value(composition), item.u(composition)
    stepped = function(w, T + 1e-30j)
    value = stepped.real
    return value, {"T": stepped.imag / 1e-30 * u_T, composition: _composition_slope(function, w, u_w, T) * u_w}


def _composition_slope(function, w, u_w, T):
    """Slope over the composition across w +- u(w), one-sided at the ends, where the derivative is singular."""
    if 0.0 < w < 1.0:
        low, high = max(0.0, w - u_w), min(1.0, w + u_w)
    else:
        low, high = (0.0, max(u_w, 1e-6)) if w <= 0 else (1.0 - max(u_w, 1e-6), 1.0)
    if high == low:
        return np.zeros_like(T)
    return (function(high, T) - function(low, T)) / (high - low)
