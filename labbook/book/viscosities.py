"""A fluid's viscosity on a run's day: the nearest set of readings, or the composition's correlation."""

from datetime import date
from functools import partial

import numpy as np

from labbook.book.densities import along, density
from labbook.book.resolved import Resolved, kind
from labbook.book.sets import nearest, sets_of
from labbook.book.shelf import Item
from labbook.physics import fluids, readings

SINGLE_READING_REACH = 1.0  # K around a lone reading without a correlation to carry it
NOMINAL_GRADE = 0.05 / np.sqrt(3)  # a grade on a label: 5 %, rectangular


def viscosity(item: Item, days: np.ndarray, T: np.ndarray, u_T: np.ndarray, rho: Resolved) -> Resolved:
    """Dynamic viscosity (Pa.s) of a fluid: the nearest set of readings, then the composition's correlation."""
    result = Resolved.empty(len(days), "T was not typed, and the viscosity follows from it")
    known = np.flatnonzero(np.isfinite(T))
    if not len(known):
        return result
    sets = sets_of(item.readings, ("mu", "nu"), item.texts["made"])
    if not sets:
        _viscosity_from_composition(item, known, T, u_T, rho, result)
        return result
    chosen = nearest(sets, days)
    for i, group in enumerate(sets):
        rows = known[chosen[known] == i]
        if len(rows):
            _viscosity_from_set(item, group, rows, T, u_T, rho, result)
    return result


def _viscosity_from_set(item, group, rows, T, u_T, rho, result) -> None:
    kinematic = all(r.key == "nu" for r in group.readings)
    entries = group.readings if kinematic else [_as_dynamic(item, r, group.on) for r in group.readings]
    if any(r is None for r in entries):
        result.said[rows] = f"absent: a nu reading of {item.code} needs a density to become mu"
        return
    T_read = np.array([r.T for r in entries])
    arrays = dict(
        T=T_read, value=np.array([r.value for r in entries]), u=np.array([r.u for r in entries]),
        u_T=np.array([r.u_T for r in entries]),
    )  # fmt: skip
    curve = readings.fit(**arrays)
    n = len(entries)
    what = f"{n} readings {group.day}" if n > 1 else f"reading {group.day}"
    correlation = _carrier(item, kinematic) if curve.form == "constant" else None
    at = T[rows]
    if correlation is not None:
        row, function = correlation
        # several readings at one temperature count as one: their weighted mean
        T_one, one, u_one = readings.merge(T=arrays["T"], value=arrays["value"], u=arrays["u"])
        value, slope, u = readings.scaled(
            T=at, value=one, u=u_one, T_read=T_one, correlation=function,
            u_T=np.sqrt(np.mean(arrays["u_T"] ** 2, keepdims=True)),
        )
        mean = "mean of " if n > 1 else ""
        said = f"viscosity: {mean}{what} scaled along the correlation, {row.name}"
        beyond = ~row.covers(T=at)
    else:
        value, slope, u = curve.at(T=at)
        if curve.form == "constant":
            mean = "mean of " if n > 1 else ""
            said = f"viscosity: {mean}{what}, taken as constant"
            beyond = np.abs(at - T_read.mean()) > SINGLE_READING_REACH
        else:
            name = "Andrade" if curve.form == "andrade" else "Vogel-Fulcher-Tammann"
            said = f"viscosity: fit of {what} ({name})"
            beyond = (at < curve.T_low - 1e-6) | (at > curve.T_high + 1e-6)
    parts = {"T": slope * u_T[rows], "mu_readings": u}
    if kinematic:
        value, parts = _times_density(value, parts, rows, rho)
    lacking = "needs a density to become mu" if kinematic else "gives no value at this T"
    said = np.where(np.isnan(value), f"absent: the {'nu' if kinematic else 'mu'} of {item.code} {lacking}", said)
    result.put(rows, value, parts, said.astype(object), beyond)


def _as_dynamic(item: Item, reading, on: str | None):
    """A reading of mu as it is; one of nu times the density at its own T and day; None without density."""
    if reading.key == "mu":
        return reading
    at = np.array([reading.T])
    day = date.fromisoformat(on).toordinal() if on else 0
    rho = density(item, np.array([day]), at, np.zeros(1)).value[0]
    if not np.isfinite(rho):
        return None
    return type(reading)(
        reading.code, "mu", reading.value * rho, reading.u * rho, reading.T, reading.u_T, reading.on,
        reading.state, reading.origin,
    )  # fmt: skip


def _times_density(nu, parts, rows, rho: Resolved):
    """mu = nu rho with the parts of both."""
    density_here = rho.value[rows]
    joined = {source: part * density_here for source, part in parts.items()}
    for source, part in rho.parts.items():
        joined[source] = joined.get(source, 0.0) + nu * part[rows]
    return nu * density_here, joined


def _carrier(item: Item, kinematic: bool):
    """(row, function of T) of the kind's viscosity against temperature, or None."""
    match item.texts["kind"]:
        case "water":
            row = fluids.WATER_VISCOSITY
            mu, rho = fluids.water_viscosity, fluids.water_density
        case "glycerol-water" if item.value("glycerol") is not None:
            w = item.value("glycerol")
            row = fluids.GLYCEROL_WATER_VISCOSITY
            mu = partial(fluids.glycerol_water_viscosity, w=w)
            rho = partial(fluids.glycerol_water_density, w=w)
        case "silicone-oil" if (item.value("grade") or 1.0) >= fluids.LOWEST_SILICONE_GRADE * (1 - 1e-9):
            row = fluids.SILICONE_OIL_VISCOSITY
            # only the shape of the curve is used, so any grade serves
            nu = partial(fluids.silicone_oil_kinematic_viscosity, nu25=item.value("grade") or 1e-3)
            if kinematic:
                return row, nu
            return row, lambda T: nu(T=T) * fluids.silicone_oil_density(T=T)
        case _:
            return None
    return row, (lambda T: mu(T=T) / rho(T=T)) if kinematic else mu


def _viscosity_from_composition(item, known, T, u_T, rho, result) -> None:
    at, spread = T[known], u_T[known]
    match item.texts["kind"]:
        case "water":
            row = fluids.WATER_VISCOSITY
            value, parts = along(lambda T: fluids.water_viscosity(T=T), at, spread, item, None)
            parts["mu_model"] = row.u_rel * value
            said = f"viscosity: correlation, {row.name}"
        case "glycerol-water" if item.value("glycerol") is not None:
            row = fluids.GLYCEROL_WATER_VISCOSITY
            value, parts = along(
                lambda w, T: fluids.glycerol_water_viscosity(w=w, T=T), at, spread, item, "glycerol"
            )
            parts["mu_model"] = fluids.glycerol_water_viscosity_u(w=item.value("glycerol")) * value
            said = f"viscosity: correlation, {row.name} at {item.value('glycerol') * 100:.4g} wt%"
        case "silicone-oil" if item.value("grade") is not None:
            row = fluids.SILICONE_OIL_VISCOSITY
            grade = item.value("grade")
            if grade < fluids.LOWEST_SILICONE_GRADE * (1 - 1e-9):
                result.said[known] = f"absent: {item.code} is thinner than 100 cSt and needs readings"
                return
            function = partial(fluids.silicone_oil_kinematic_viscosity, nu25=grade)
            nu, parts = along(lambda T: function(T=T), at, spread, item, None)
            nominal = item.typed["grade"][4] == "digits"
            parts["grade"] = nu * (NOMINAL_GRADE if nominal else item.u("grade") / grade)
            value, parts = _times_density(nu, parts, known, rho)
            said = f"viscosity: nominal grade of {item.code} along the standard curve"
        case "glycerol-water":
            result.said[known] = f"absent: {item.code} has no reading and its glycerol share is not typed"
            return
        case "silicone-oil":
            result.said[known] = f"absent: {item.code} has no reading and its grade is not typed"
            return
        case _:
            result.said[known] = f"absent: {item.code} has no viscosity reading, and {kind(item)} needs one"
            return
    result.put(known, value, parts, said, ~row.covers(T=at))
