"""What an act on the registry would change: told beforehand, it must be what the act then does."""

import math

import numpy as np
import pytest

from labbook.book.registry_effects import count_in, dialect_effect, history, takers_of_drag
from labbook.errors import Refusal
from labbook.registry.regime_text import read_regime

SOURCE = "common practice, no source"


def regime(band, second="", name="tried"):
    return read_regime({"name": name, "band": band, "second": second, "source": SOURCE})


@pytest.mark.parametrize(("band", "second", "by_sight"), [
    ("1 < Sp <= 4", "", lambda r: (r["Sp"] > 1) & (r["Sp"] <= 4)),
    ("-1e9 < Re < 100", "", lambda r: (r["Re"] > -1e9) & (r["Re"] < 100)),
    ("Sp > 1", "Re_omega < 0.1", lambda r: (r["Sp"] > 1) & (r["Re_omega"] < 0.1)),
    ("St > 0", "", lambda r: r["St"] > 0),  # absent where U is consistent with zero
])  # fmt: skip
def test_runs_in_a_band_are_counted_before_it_stands(filled, band, second, by_sight):
    tried = regime(band, second)
    found = filled.ask(count_in, tried)
    # the same inequality on the frame of kept runs, by numpy
    assert found == int(by_sight(filled.runs()).sum())
    assert filled.set_regime(tried, why="to see", by="wren") == (0, found)


def test_a_void_run_is_not_counted(filled):
    some = filled.runs(kept=False)
    low, high = some["Sp"].min() * 0.99, some["Sp"].max() * 1.01
    all_of_them = regime(f"{low:.6g} <= Sp <= {high:.6g}")
    assert filled.ask(count_in, all_of_them) == len(filled.runs()["Sp"].dropna())
    assert (some["state"] == "void").any() and some.loc[some["state"] == "void", "Sp"].notna().all()


def test_a_band_on_an_unknown_number_is_not_counted(filled):
    with pytest.raises(Refusal, match="no number has this key"):
        filled.ask(count_in, regime("Sq > 1"))


def test_counting_and_trying_write_nothing(filled, counts):
    before = counts(filled)
    filled.ask(count_in, regime("Sp > 1"))
    filled.ask(dialect_effect, "Sp", {"rate": "f", "power": 1})
    assert counts(filled) == before and filled.registry.house == {}


@pytest.mark.parametrize(("number", "choices"), [
    ("Sp", {"rate": "f"}), ("Sp", {"power": 1, "coefficient": "eight_pi_mu"}), ("Sp", {"length": "L_body"}),
    ("Sp", {"coefficient": "cylinder_two_term"}), ("Re_omega", {"length": "L_body", "rate": "f"}),
    ("St", {"amplitude": "half"}), ("U_scaled", {"rate": "f"}),
])  # fmt: skip
def test_what_is_told_is_what_the_change_then_does(filled, number, choices):
    told = filled.ask(dialect_effect, number, choices)
    done = filled.adopt_dialect(number, choices, why="to see", by="wren")
    # restating against deriving the book again from its facts; 1e-9 is what `labbook check` allows
    for standing, side in ((told.now, done["before"]), (told.then, done["after"])):
        assert math.isclose(standing.lowest, side["lowest"], rel_tol=1e-9)
        assert math.isclose(standing.highest, side["highest"], rel_tol=1e-9)
        assert dict(standing.regimes) == side["regimes"]
    assert told.then.runs == told.now.runs - sum(told.lost.values())


def test_a_factor_moves_the_span(filled):
    told = filled.ask(dialect_effect, "Re_omega", {"rate": "f"})
    # f = omega/(2 pi)
    assert math.isclose(told.then.highest, told.now.highest / (2 * math.pi), rel_tol=1e-12)
    values = filled.runs()["Re_omega"].to_numpy() / (2 * math.pi)
    assert told.then.regimes["creeping"] == int(np.sum(values < 0.1)) != told.now.regimes["creeping"]


def test_runs_that_would_lose_the_number_are_told_with_the_reason(filled):
    told = filled.ask(dialect_effect, "Sp", {"coefficient": "gray_hancock_1955"})
    assert sum(told.lost.values()) == told.now.runs - told.then.runs > 0
    assert "needs a helix pitch" in told.lost


def test_an_empty_book_has_no_span(empty):
    told = empty.ask(dialect_effect, "Sp", {"rate": "f"})
    assert (told.now.runs, told.then.lowest, told.then.regimes["stiff tail"]) == (0, None, 0)


def test_which_other_numbers_follow_the_drag_model(filled):
    assert takers_of_drag(filled.registry, "Sp", {"coefficient": "mu"}) == ()  # the model stays
    assert takers_of_drag(filled.registry, "Sp", {"rate": "f"}) == ()
    others = takers_of_drag(filled.registry, "Sp", {"coefficient": "cylinder_two_term"})
    assert others == ("zeta_ratio", "U_ratio", "F_scaled")
    before = filled.runs()
    filled.adopt_dialect("Sp", {"coefficient": "cylinder_two_term"}, why="to see", by="wren")
    after = filled.runs()
    moved = {
        k for k in filled.registry.numbers if not np.allclose(before[k], after[k], rtol=1e-12, equal_nan=True)
    }
    assert moved == {"Sp", *others}


def test_history_tells_every_version_newest_first(filled):
    filled.set_regime(regime("Sp > 5", name="floppy tail"), why="ours bend later", by="wren")
    filled.withdraw("regime", "floppy tail", why="not used", by="knot")
    filled.adopt_dialect("De", {"rate": "f"}, why="as in the paper", by="sable")
    rows = filled.ask(history, "regime")
    assert [(r["version"], r["by"], r["why"]) for r in rows["floppy tail"]] == [
        (3, "knot", "not used"), (2, "wren", "ours bend later"),
    ]  # fmt: skip
    assert (
        rows["floppy tail"][0]["content"] is None
        and rows["floppy tail"][1]["content"]["bands"][0]["low"] == 5
    )
    assert filled.ask(history, "house")["De"][0]["content"] == {"rate": "f"}
    assert filled.ask(history, "number") == {}
