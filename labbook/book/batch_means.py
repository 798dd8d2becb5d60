"""A material's modulus and a fluid's relaxation time on a run's day: weighted means of the nearest set."""

import numpy as np

from labbook.book.resolved import Resolved
from labbook.book.sets import nearest, sets_of
from labbook.book.shelf import Item


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
