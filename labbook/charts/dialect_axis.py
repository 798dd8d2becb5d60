"""The sperm number on an axis in another dialect: values and spreads restated, and the axis title."""

import numpy as np
import pandas as pd

from labbook.charts.axes import HOUSE as HOUSE_WORDS
from labbook.charts.axes import written_formula
from labbook.registry.dialects import CHOICES, DIALECTS, HOUSE, Dialect, completed, restated
from labbook.registry.formula import parse
from labbook.registry.quantities import QUANTITIES

INPUTS = ("L_tail", "L_body", "zeta_n", "a", "mu", "w", "t")  # what a restating may need


def dialects() -> dict[str, Dialect]:
    """The dialects of the sperm number by the words that name them, the house's first."""
    return {words(d): d for d in DIALECTS}


def words(dialect: Dialect) -> str:
    """'house', or where a dialect departs from it: 'rate f, zeta_n mu'."""
    chosen = completed(dialect.choices)
    said = {"coefficient": "zeta_n"}
    parts = [f"{said.get(n, n)} {chosen[n]}" for n in CHOICES if chosen[n] != HOUSE[n]]
    return ", ".join(parts) or "house"


def dialect_title(dialect: Dialect) -> str:
    """The axis title: the dialect's formula, and which coefficient stands for zeta_n in it."""
    formula = written_formula(parse(dialect.formula, QUANTITIES).tree)
    if dialect.choices:
        coefficient = completed(dialect.choices)["coefficient"]
        tail = f"ζ_n of {coefficient}" if "ζ_n" in formula else "not the house dialect"
    else:
        tail = HOUSE_WORDS
    return f"Sp = {formula}, {tail}"


def restated_frame(frame: pd.DataFrame, dialect: Dialect) -> pd.DataFrame:
    """A frame whose Sp and u_ columns of Sp are restated; it must hold INPUTS. To first order in u."""
    house = frame["Sp"].to_numpy(dtype=float)
    spoken = restated(house, choices=dialect.choices, inputs=frame)
    with np.errstate(invalid="ignore", divide="ignore"):
        slope = spoken / house * (completed(dialect.choices)["power"] / HOUSE["power"])
    spreads = {c: frame[c] * slope for c in ("u_Sp", "u_own_Sp", "u_shared_Sp") if c in frame.columns}
    return frame.assign(Sp=spoken, **spreads)
