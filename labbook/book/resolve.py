"""What a run's fluid and material were on its day: viscosity, density, relaxation time, modulus, and from what."""

from dataclasses import dataclass, field
from datetime import date
from functools import partial

import numpy as np

from labbook.book.sets import ReadingSet, nearest, sets_of
from labbook.book.shelf import Item
from labbook.physics import fluids, readings

KELVIN = 273.15
SINGLE_READING_REACH = 1.0  # K around a lone reading without a correlation to carry it
NOMINAL_GRADE = 0.05 / np.sqrt(3)  # a grade on a label: 5 %, rectangular


@dataclass
class Resolved:
    """One property for a block of runs: values, their parts by source, sentences, extrapolation marks.

    value: SI array, NaN where absent; parts: source -> array; said: sentence of each run; beyond: bool array.
    """

    value: np.ndarray
    parts: dict[str, np.ndarray] = field(default_factory=dict)
    said: np.ndarray | None = None
    beyond: np.ndarray | None = None

    @classmethod
    def empty(cls, n: int, why: str) -> "Resolved":
        return cls(np.full(n, np.nan), {}, np.full(n, f"absent: {why}", dtype=object), np.zeros(n, bool))

    def put(self, rows, value, parts, said, beyond) -> None:
        """Write a group of rows; sources that the group lacks stay zero there."""
        self.value[rows] = value
        for source, part in parts.items():
            if source not in self.parts:
                self.parts[source] = np.zeros(len(self.value))
            self.parts[source][rows] = part
        self.said[rows] = said
        self.beyond[rows] = beyond


# ---- density


def density(item: Item, days: np.ndarray, T: np.ndarray, u_T: np.ndarray) -> Resolved:
    """Density (kg/m3) of a fluid: the nearest reading, then the batch's constant, then the correlation."""
    result = Resolved.empty(len(days), f"no density of {item.code}, and no correlation for {kind(item)}")
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
        value, parts = _along(function, T[known], u_T[known], item, composition)
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


def _along(function, T, u_T, item: Item, composition: str | None):
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


# ---- viscosity


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
            value, parts = _along(lambda T: fluids.water_viscosity(T=T), at, spread, item, None)
            parts["mu_model"] = row.u_rel * value
            said = f"viscosity: correlation, {row.name}"
        case "glycerol-water" if item.value("glycerol") is not None:
            row = fluids.GLYCEROL_WATER_VISCOSITY
            value, parts = _along(
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
            nu, parts = _along(lambda T: function(T=T), at, spread, item, None)
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


def kind(item: Item) -> str:
    """The fluid's kind as a sentence needs it."""
    return {"measured": "a measured fluid"}.get(item.texts["kind"], str(item.texts["kind"]))


# ---- relaxation time, modulus


def relaxation_time(item: Item, days: np.ndarray) -> Resolved:
    """Relaxation time (s): the nearest reading, then the batch's constant."""
    result = Resolved.empty(len(days), f"{item.code} has no relaxation time")
    sets = sets_of(item.readings, ("lam",), item.texts["made"])
    if not sets and item.value("lam") is not None:
        result.put(slice(None), item.value("lam"), {"lam": item.u("lam")},
                   f"relaxation time: stated for {item.code}", False)
    _weighted_means(sets, days, "lam", "relaxation time", result)
    return result


def modulus(item: Item, days: np.ndarray) -> Resolved:
    """Young's modulus (Pa): the weighted mean of the set nearest in time."""
    result = Resolved.empty(len(days), f"material {item.code} has no reading of E")
    _weighted_means(sets_of(item.readings, ("E",), item.texts["made"]), days, "E", "modulus", result)
    return result


def _weighted_means(sets, days, source, name, result) -> None:
    chosen = nearest(sets, days)
    for i, group in enumerate(sets):
        rows = np.flatnonzero(chosen == i)
        n = len(group.readings)
        value = np.array([r.value for r in group.readings])
        u = np.array([r.u for r in group.readings])
        weight = 1.0 / u**2 if np.all(u > 0) else np.ones(n)
        mean = float(weight @ value / weight.sum())
        spread = float(weight.sum() ** -0.5) if np.all(u > 0) else float(u.max())
        what = f"mean of {n} readings {group.day}" if n > 1 else f"reading {group.day}"
        result.put(rows, mean, {source: spread}, f"{name}: {what}", False)
