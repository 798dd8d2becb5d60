"""What stands behind a run's predicted speed, in words: the model, its source, and where it leaves its range."""

from collections.abc import Mapping
from dataclasses import asdict, dataclass

import numpy as np

from labbook.book.block_model import model_for
from labbook.physics import rods
from labbook.physics.prediction_doubts import reasons
from labbook.physics.predictions import predicted
from labbook.registry.group import Registry


@dataclass(frozen=True)
class Prediction:
    """The model of a run's form and drive, in a sentence; doubts: where this run leaves its checked range.

    A_tip, theta: predicted excursion of the tip, peak to peak, m, and angle amplitude at the base, rad, of a tail;
    Sp: of the model's own zeta_n. None where there is none.
    """

    says: str
    source: str
    doubts: tuple[str, ...]
    A_tip: float | None
    theta: float | None
    Sp: float | None

    def row(self) -> dict:
        """As plain values, for JSON."""
        return asdict(self) | {"doubts": list(self.doubts)}


def prediction_of(form: str, drive: str, values: Mapping, registry: Registry) -> Prediction:
    """The Prediction of a run with these values (SI by key, None where absent)."""
    model = model_for(form, drive, registry.coefficient)
    if not model.steps:
        return Prediction(model.says, model.source, (), None, None, None)
    known = {k: np.nan if v is None else v for k, v in values.items()}
    found = known | predicted(form=form, drive=drive, values=known)
    drag = registry.coefficient if registry.coefficient in rods.MODELS else rods.HOUSE_MODEL
    doubts = reasons(form=form, drive=drive, values=found, drag_model=drag) if np.isfinite(found["U_model"]) else []
    told = (_plain(found.get(key)) for key in ("A_tip_model", "theta_model", "Sp_model"))
    return Prediction(model.says, model.source, tuple(doubts), *told)


def _plain(value) -> float | None:
    return None if value is None or not np.isfinite(value) else float(value)
