"""The runs behind a theory, and the curve's band against what the book derives run by run."""

import numpy as np
import pytest

from labbook.book import theory_runs as module
from labbook.book.asking import Question
from labbook.book.theory_runs import theory_runs
from labbook.charts import theory


def test_the_newest_runs_with_what_the_curves_take(filled):
    found = filled.ask(theory_runs, Question(), theory.INPUTS, theory.TEXTS, group="fluid")
    assert {*theory.INPUTS, *theory.TEXTS, "fluid", "u_shared_mu"} <= set(found.columns)
    assert len(found) == 9 and set(found["form"]) == {"flexible tail", "undulating", "helix"}
    bare = filled.ask(theory_runs, Question(swimmers=("reed-1",)), ("mu",), ("drive",), spread=False)
    assert set(bare["drive"]) == {"free_head_angle"} and "u_mu" not in bare.columns


def test_a_named_swimmer_without_a_new_run_is_looked_up(filled, monkeypatch):
    monkeypatch.setattr(module, "NEWEST", 3)
    wanted = dict(keys=("mu",), texts=theory.TEXTS, spread=False)
    names = ("ribbon-1", "reed-1")
    found = filled.ask(theory_runs, Question(), group="swimmer", names=names, **wanted)
    assert set(names) <= set(found["swimmer"]) and len(found) == 4
    assert len(filled.ask(theory_runs, Question(), group="fluid", names=("gly85",), **wanted)) == 3
    # and only what the question finds
    some = Question(fluids=("syrup",))
    assert "ribbon-1" not in set(filled.ask(theory_runs, some, group="swimmer", names=names, **wanted)["swimmer"])


@pytest.mark.parametrize("swimmer", ["reed-1", "ribbon-1", "pipe-1"])
def test_curve_and_band_are_the_stored_prediction_and_its_shared_part(filled, swimmer):
    # rod, strip and tube: the book derives each run from its own facts, the curve from the medians of them
    keys = ("Sp", "U_model", "omega", "theta0", "L_tail")
    runs = filled.frame(Question(swimmers=(swimmer,), fluids=("syrup", "gly85", "oil-5k")), keys=keys, texts=("code", "fluid"))
    run = runs[runs["fluid"] != "gly85"].iloc[0] if swimmer == "reed-1" else runs.iloc[0]
    one = Question(swimmers=(swimmer,), fluids=(run["fluid"],))
    found = theory.tail_curves(filled.ask(theory_runs, one, theory.INPUTS, theory.TEXTS), run["Sp"], 2 * run["Sp"])
    first = found.frame.iloc[0]
    scale = run["omega"] * run["L_tail"] * run["theta0"] ** 2
    assert first["y"] * scale == pytest.approx(run["U_model"], rel=1e-9)
    # the middle of a swimmer's runs: their temperatures differ a little, and the readings' u with them
    rel = 1e-6 if swimmer != "reed-1" else 0.05
    assert (first["high"] - first["low"]) / 2 * scale == pytest.approx(run["u_shared_U_model"], rel=rel)
    assert np.isfinite(run["u_shared_U_model"])
