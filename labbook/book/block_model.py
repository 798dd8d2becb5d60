"""The predicted speed of one block of runs alike in form and drive: the model's steps, with parts by source."""

import numpy as np

from labbook.physics import rods
from labbook.physics.prediction_steps import Model, Step
from labbook.physics.predictions import model_of
from labbook.registry.spread import Spread

PREDICTED = "U_model"
SOURCE = "theory"  # of the part that the model's own standard uncertainty makes


def model_for(form: str, drive: str, coefficient: str) -> Model:
    """The model of a form and drive as the book can use it: of a tail only where one drag model gives both zetas."""
    model = model_of(form=form, drive=drive)
    if "zeta_t" in model.needs and coefficient not in rods.MODELS:
        return Model("none", f"no model: {coefficient} gives zeta_n alone, and a tail's speed needs zeta_t beside it")
    return model


def predict(spread: Spread, model: Model) -> None:
    """Enter U_model, NaN where there is no model or something that it needs is missing."""
    if not model.steps or any(not np.isfinite(spread.values[key]).any() for key in model.needs):
        spread.measured(PREDICTED, np.full(len(spread.values["f"]), np.nan), 0.0)
        return
    for step in _needed(model):
        spread.follow(step.gives, step.function, step.takes, step.slopes)
    if model.own_u is not None:
        spread.parts[PREDICTED][SOURCE] = model.own_u(spread.values)


def _needed(model: Model) -> list[Step]:
    """The steps that the speed follows from, in order."""
    steps, wanted = [], {PREDICTED}
    for step in reversed(model.steps):
        if wanted & set(step.gives):
            steps.append(step)
            wanted |= set(step.takes)
    return steps[::-1]
