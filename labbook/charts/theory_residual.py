"""The line of no residual: measured over predicted speed is 1, with the models' own uncertainty around it."""

import numpy as np
import pandas as pd

from labbook.charts.theory import NOTHING, Theory
from labbook.physics.predictions import DRIVES, FORMS, model_of, predicted

RATIO = "U_ratio"
TEXTS = ("drive", "form")


def inputs() -> tuple[str, ...]:
    """The keys that the models' own uncertainties follow from, RATIO among them."""
    models = [model_of(form=form, drive=drive) for form in FORMS for drive in DRIVES]
    return (RATIO, *dict.fromkeys(key for model in models for key in (*model.needs, *model.may)))


def residual_line(runs: pd.DataFrame, low: float, high: float) -> Theory:
    """The line y = 1 from low to high, with a band for each form among some runs whose model has a stated u.

    runs: a row a run with TEXTS and inputs() in SI. A band is 1 u of the model alone, the root mean square
    over the runs of its form; the band of one form lies on that of another.
    """
    rows = runs[runs[RATIO].notna()]
    if rows.empty:
        return Theory(
            NOTHING,
            why="no run found has a measured and a predicted speed: each run's sheet says what is missing",
        )
    variances: dict[str, list[np.ndarray]] = {}
    for (form, drive), part in rows.groupby(["form", "drive"]):
        values = {key: part[key].to_numpy(dtype=float) for key in inputs()}
        found = predicted(form=form, drive=drive, values=values)
        none = np.full(len(part), np.nan)
        variances.setdefault(form, []).append(
            (found.get("u_own_model", none) / found.get("U_model", none)) ** 2
        )
    pooled = {form: np.concatenate(several) for form, several in variances.items()}
    shares = {
        form: float(np.sqrt(np.nanmean(v))) if np.isfinite(v).any() else np.nan for form, v in pooled.items()
    }
    stated = {form: share for form, share in shares.items() if np.isfinite(share)}
    drawn = [
        {"x": x, "y": 1.0, "low": 1.0 - share, "high": 1.0 + share, "family": "", "band": form}
        for form, share in (stated or {"": np.nan}).items()
        for x in (low, high)
    ]
    label = "theory: measured speed is the predicted one"
    return Theory(pd.DataFrame(drawn).assign(label=label), tuple(_words(stated, shares)))


def _words(stated, shares) -> list[str]:
    said = []
    if stated:
        told = ", ".join(f"{100 * share:.2g} % for {_one(form)}" for form, share in stated.items())
        said.append(f"Band at 1: 1 u of the model itself, {told}")
    silent = [_one(form) for form in shares if form not in stated]
    if silent:
        said.append(f"The model for {' and '.join(silent)} has no stated u")
    return said


def _one(form: str) -> str:
    return {"undulating": "an undulating body", "hinged": "a hinged body"}.get(form, f"a {form}")
