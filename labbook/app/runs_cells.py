"""The cells of the table of runs: facts as typed, numbers with their uncertainty, what a track brought said as such."""

import math
from collections.abc import Mapping

import pandas as pd

from labbook.app.record_parts import as_typed
from labbook.registry.quantities import QUANTITIES, RUN_KEYS
from labbook.registry.typed import REDUCED
from labbook.registry.written import SHOWN, shown, written

Units = Mapping[tuple[str, str], str]  # (run, key) -> the unit that was typed before a track took the value's place


def reduced_runs(found: pd.DataFrame) -> list[str]:
    """The codes of the runs of which some value comes from a track."""
    rows = zip(found["code"], found["typed"], strict=True)
    return [code for code, typed in rows if any(entry[4] == REDUCED for entry in typed.values())]


def numeric(
    found: pd.DataFrame, key: str, label: str, before: Units
) -> tuple[str, list[float], dict[float, str]]:
    """(header, SI values, value -> text) of a column; the header has the unit where the column has one.

    Two equal values that are written differently are told apart by the last bit, which no sorting sees.
    """
    values, units = found[key].tolist(), _units(found, key, before)
    there = {one for one, value in zip(units, values, strict=True) if not math.isnan(value)} - {"1"}
    unit = next(iter(there)) if len(there) == 1 else ""
    texts = []
    for value, u, typed, own in zip(values, found[f"u_{key}"], found["typed"], units, strict=True):
        if math.isnan(value):
            texts.append("")
        elif key in RUN_KEYS and key in typed:
            texts.append(_fact(key, value, u, typed[key], own).removesuffix(f" {unit}"))
        elif key in QUANTITIES:
            texts.append(shown(key, value, u).removesuffix(f" {unit}"))
        else:
            texts.append(written(value, u))
    known: dict[float, str] = {}
    for i, text in enumerate(texts):
        while known.get(values[i], text) != text:
            values[i] = math.nextafter(values[i], math.inf)
        if text:
            known[values[i]] = text
    return f"{label} ({unit})" if unit else label, values, known


def _fact(key: str, value: float, u: float, entry: list, unit: str) -> str:
    """A fact as typed, or what its track says of it."""
    return f"reduced {shown(key, value, u, unit)}" if entry[4] == REDUCED else as_typed(entry)


def _units(found: pd.DataFrame, key: str, before: Units) -> list[str]:
    """The unit that each cell of a column is written in, '1' for none."""
    usual = SHOWN.get(key, QUANTITIES[key].unit) if key in QUANTITIES else "1"
    if key not in RUN_KEYS:
        return [usual] * len(found)
    rows = zip(found["code"], found["typed"], strict=True)
    return [
        usual if key not in typed
        else before.get((code, key), usual) if typed[key][4] == REDUCED
        else typed[key][1]
        for code, typed in rows
    ]  # fmt: skip
