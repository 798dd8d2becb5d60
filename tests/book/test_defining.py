"""The group's own registry: numbers added and changed, regimes edited, house dialects adopted, in one act each."""

import math
import sqlite3

import numpy as np
import pytest

from labbook import Book
from labbook.book.asking import Question
from labbook.book.queries import ledger_lines, regime_counts
from labbook.book.registry_rows import versions_of
from labbook.errors import LabbookError, Refusal
from labbook.registry.regimes import Band, Regime

# viscous torque of a rotating sphere: Happel & Brenner, Low Reynolds Number Hydrodynamics (1965). A 1.3 T sphere in
# 5 mT and 1 Pa.s has m B / (8 pi mu b^3) = 862.089 rad/s, whatever its size (physics sheet, recomputed there)
MG = dict(
    key="Mg", name="magnetic to viscous torque", formula="m_mag * B / (8 * pi * mu * b**3 * omega)",
    compares="magnetic to viscous torque on the head", source="own definition",
    example="m_mag = 5.41667e-4 A.m2, B = 5 mT, mu = 1 Pa.s, b = 0.5 mm, f = 68.603 Hz", answer="2.0000", by="knot",
)  # fmt: skip


@pytest.fixture
def book(filled):
    filled.define_number(**MG)
    return filled


def lines(book, act):
    return book.ask(ledger_lines, act=act)


class TestOwnNumber:
    def test_it_is_a_column_of_every_run_that_has_its_inputs(self, book):
        runs = book.runs(kept=False)
        by_hand = runs["m_mag"] * runs["B"] / (8 * np.pi * runs["mu"] * runs["b"] ** 3 * 2 * np.pi * runs["f"])
        assert by_hand.notna().sum() >= 4
        assert runs["Mg"].tolist() == pytest.approx(by_hand.tolist(), rel=1e-12, nan_ok=True)
        assert book.check() == []

    def test_its_uncertainty_is_split_and_follows_from_what_was_measured(self, book):
        runs = book.runs()
        here = runs[runs["Mg"].notna() & (runs["swimmer"] == "reed-1")].iloc[0]
        # first order by hand (JCGM 100:2008, 5.1.2): a product of powers adds its relative parts in quadrature;
        # T enters through mu alone, so the run's own part of mu is that of T
        own = math.hypot(here["u_B"] / here["B"], here["u_f"] / here["f"], here["u_own_mu"] / here["mu"])
        shared = math.hypot(here["u_m_mag"] / here["m_mag"], 3 * here["u_b"] / here["b"],
                            here["u_shared_mu"] / here["mu"])  # fmt: skip
        assert here["u_own_Mg"] / here["Mg"] == pytest.approx(own, rel=1e-9)
        assert here["u_shared_Mg"] / here["Mg"] == pytest.approx(shared, rel=1e-9)

    def test_it_filters_and_a_new_run_has_it_at_once(self, book):
        all_of_them = book.runs()["Mg"].dropna()
        middle = float(all_of_them.median())
        assert len(book.runs(ranges={"Mg": (middle, math.inf)})) == (all_of_them >= middle).sum()
        code = book.record(swimmer="reed-1", fluid="syrup", rig="coil-1", f="0.7 Hz", B="2.00(3) mT", T="22 degC",
                           by="wren", confirm=True)  # fmt: skip
        assert book.sheet(code).values["Mg"] > 0
        assert book.check() == []

    def test_an_amended_swimmer_derives_it_again(self, book):
        before = book.runs(swimmer="reed-1")["Mg"].dropna()
        book.stock("swimmer", code="reed-1", b="1.00(2) mm", why="measured again", by="wren")
        after = book.runs(swimmer="reed-1")["Mg"].dropna()
        assert (after / before).tolist() == pytest.approx([8.0] * len(before), rel=1e-12)
        assert book.check() == []

    def test_another_formula_is_another_version_and_both_are_kept(self, book):
        before = book.runs()["Mg"].dropna()
        changed = {**MG, "formula": "m_mag * B / (4 * pi * mu * b**3 * omega)", "answer": "4.0000"}
        with pytest.raises(Refusal, match="why"):
            book.define_number(**changed)
        assert book.define_number(**changed, why="torque about the rim") == 2
        assert (book.runs()["Mg"].dropna() / before).tolist() == pytest.approx([2.0] * len(before), rel=1e-12)
        kept = book.ask(versions_of, "number", "Mg")
        assert [(v["version"], v["content"]["formula"], v["why"]) for v in kept] == [
            (2, changed["formula"], "torque about the rim"), (1, MG["formula"], None),
        ]  # fmt: skip
        line = lines(book, "amend").iloc[0]
        assert (line["subject"], line["before"]["version"], line["after"]["version"]) == ("Mg", 1, 2)
        assert book.check() == []

    def test_the_same_again_changes_nothing(self, book):
        count = len(book.ask(ledger_lines))
        assert book.define_number(**MG) == 1
        assert len(book.ask(ledger_lines)) == count

    def test_a_book_opened_again_has_it(self, book):
        values = book.runs()["Mg"].tolist()
        book.close()
        with Book.open(book.target) as again:
            assert again.runs()["Mg"].tolist() == pytest.approx(values, rel=0, abs=0, nan_ok=True)
            assert again.registry.versions == {"Mg": 1}

    def test_withdrawn_it_is_gone_and_may_come_back(self, book):
        book.withdraw("number", "Mg", why="nobody reads it", by="wren")
        assert "Mg" not in book.runs() and book.check() == []
        with pytest.raises(Refusal, match="Mg"):
            book.runs(ranges={"Mg": (0, 1)})
        book.record(swimmer="reed-1", fluid="syrup", rig="coil-1", f="0.7 Hz", B="2 mT", T="22 degC", by="wren",
                    confirm=True)  # fmt: skip
        assert book.define_number(**MG) == 3
        assert book.runs()["Mg"].notna().sum() >= 5 and book.check() == []

    def test_one_that_divides_by_U_is_absent_where_U_is_not_different_from_0(self, book):
        book.define_number(
            key="inv_stride", name="beats per length", formula="f * L_body / U", compares="beat to advance",
            source="own definition", example="f = 2 Hz, L_body = 30 mm, U = 12 mm/s", answer="5.00", by="knot",
        )  # fmt: skip
        still = book.runs(fluid="gly85", swimmer="reed-1").iloc[0]
        assert still["U"] == 0 and math.isnan(still["inv_stride"])
        assert book.sheet(still["code"]).why_absent["inv_stride"] == "not defined (U consistent with 0)"

    def test_a_changed_bit_of_it_is_found_by_check(self, book):
        code = book.runs()[book.runs()["Mg"].notna()]["code"].iloc[0]
        book.close()
        with sqlite3.connect(book.target) as raw:
            raw.execute("UPDATE resolved SET Mg = Mg * (1 + 1e-14) WHERE run_id = (SELECT id FROM run WHERE code = ?)", (code,))
        raw.close()
        with Book.open(book.target) as again:
            found = again.check()
        assert len(found) == 1 and found[0].startswith(f"{code}:")


@pytest.mark.parametrize(
    ("change", "word"),
    [
        ({"formula": "m_mag * B"}, "M L^2 T^-2 is left over"),
        ({"formula": "m_mag * B / (8 * pi * mu * b**3 * spin)"}, "'spin' is not a key"),
        ({"formula": "exp(f)"}, "calls are not allowed"),
        ({"formula": "f.real"}, "attributes are not allowed"),
        ({"formula": "f**99 / f**99"}, "beyond 12"),
        ({"formula": "U + f"}, "adds L T^-1 to T^-1"),
        ({"answer": "2.01"}, "the worked example gives 2"),
        ({"answer": "about two"}, "no plain number"),
        ({"answer": "2"}, "no better than 5 %"),
        ({"example": "m_mag = 5.41667e-4 A.m2"}, "the worked example lacks"),
        ({"example": "m_mag = 5 m"}, "a magnetic moment is needed"),
        ({"example": "torque = 5 N.m"}, "'key = value with unit'"),
        ({"key": "Sp"}, "is taken"),
        ({"key": "t"}, "is taken"),
        ({"key": "STATE"}, "is taken"),
        ({"key": "u_Mg"}, "looks like an uncertainty"),
        ({"key": "M g"}, "no plain name"),
        ({"source": ""}, "is missing"),
        ({"colour": "red"}, "no such field"),
    ],
)  # fmt: skip
def test_a_number_that_cannot_be_is_refused_in_one_sentence_and_nothing_changes(filled, counts, change, word):
    before, keys = counts(filled), filled.registry.keys
    with pytest.raises(LabbookError) as refused:
        filled.define_number(**{**MG, **change})
    said = str(refused.value)
    assert word in said and said.count("\n") == 0 and said.endswith(".")
    assert (counts(filled), filled.registry.keys) == (before, keys)


class TestRegimes:
    def test_a_regime_on_two_numbers_holds_both_bands(self, filled):
        both = Regime("slow and floppy", (Band("Re_omega", high=2.0, high_closed=False), Band("Sp", 5.0)), "own", "sky")
        before, after = filled.set_regime(both, why="the corner we look for", by="wren")
        runs = filled.runs()
        by_hand = ((runs["Re_omega"] < 2.0) & (runs["Sp"] >= 5.0)).sum()
        assert (before, after) == (0, by_hand) and 0 < by_hand < len(runs)
        assert len(filled.runs(regime="slow and floppy")) == by_hand
        assert sum("slow and floppy" in filled.sheet(c).regimes for c in runs["code"]) == by_hand

    def test_an_edited_band_recounts_and_the_ledger_remembers(self, filled):
        wider = Regime("creeping", (Band("Re_omega", high=1.0, high_closed=False),), "group decision")
        filled.set_regime(wider, why="our fluids are never thinner", by="wren")
        assert filled.ask(regime_counts, Question())["creeping"] == (filled.runs()["Re_omega"] < 1.0).sum()
        line = lines(filled, "amend").iloc[0]
        assert line["before"]["bands"] == "Re_omega < 0.1" and line["after"]["bands"] == "Re_omega < 1"
        assert [v["version"] for v in filled.ask(versions_of, "regime", "creeping")] == [2]

    def test_withdrawn_it_is_no_regime_any_more(self, filled):
        filled.withdraw("regime", "cruising", why="we have no fish", by="wren")
        assert "cruising" not in filled.ask(regime_counts, Question())
        with pytest.raises(Refusal, match="cruising"):
            filled.runs(regime="cruising")

    def test_one_on_an_unknown_number_is_refused(self, filled):
        with pytest.raises(Refusal, match="no number has this key"):
            filled.set_regime(Regime("odd", (Band("Bo", 1.0),), "own"), why="try", by="wren")

    def test_a_number_that_carries_a_regime_is_not_withdrawn(self, book):
        book.set_regime(Regime("driven", (Band("Mg", 1.0),), "own"), why="try", by="wren")
        with pytest.raises(Refusal, match="driven"):
            book.withdraw("number", "Mg", why="tidy", by="wren")


class TestHouseDialect:
    def test_it_derives_the_book_again_and_says_before_and_after(self, filled):
        runs = filled.runs()
        told = filled.adopt_dialect("Sp", {"rate": "f", "power": 1}, why="as the paper we compare with", by="wren")
        now = filled.runs()
        # zeta_n f L^4/EI is Sp^4/(2 pi)
        assert now["Sp"].tolist() == pytest.approx((runs["Sp"] ** 4 / (2 * np.pi)).tolist(), rel=1e-12, nan_ok=True)
        assert told["before"]["highest"] == runs["Sp"].max() and told["after"]["highest"] == now["Sp"].max()
        assert told["after"]["regimes"]["floppy tail"] == (now["Sp"] > 4).sum()
        line = lines(filled, "adopt").iloc[0]
        assert line["after"]["choices"]["rate"] == "f" and line["before"]["choices"]["rate"] == "omega"
        assert filled.check() == []

    @pytest.mark.parametrize("choices", [{"coefficient": "mu"}, {"coefficient": "spheroid_asymptotic"},
                                         {"coefficient": "log_slender"}, {"length": "L_body", "power": 1}])  # fmt: skip
    def test_adopting_gives_what_restating_shows_uncertainties_too(self, filled, choices):
        shown = filled.runs(dialects={"Sp": choices}, columns=("Sp",))
        filled.adopt_dialect("Sp", choices, why="try", by="wren")
        stored = filled.runs(columns=("Sp",))
        for column in ("Sp", "u_Sp", "u_own_Sp", "u_shared_Sp"):
            assert stored[column].tolist() == pytest.approx(shown[column].tolist(), rel=1e-9, nan_ok=True), column
        assert filled.runs(dialects={"Sp": {}}).attrs["dialects"]["Sp"].startswith("house: ")
        assert filled.check() == []

    def test_one_that_needs_a_pitch_is_refused(self, filled, counts):
        before = counts(filled)
        with pytest.raises(Refusal, match="pitch"):
            filled.adopt_dialect("Sp", {"coefficient": "lighthill"}, why="try", by="wren")
        with pytest.raises(Refusal, match="already"):
            filled.adopt_dialect("Sp", {}, why="try", by="wren")
        assert counts(filled) == before


class TestDialectsOfAFrame:
    def test_a_frame_says_its_dialect_and_why_a_run_has_none(self, filled):
        runs = filled.runs(dialects={"Sp": {"coefficient": "lighthill"}})
        assert runs.attrs["dialects"] == {"Sp": "coefficient lighthill"}
        house = filled.runs()
        lost = [code for code, why in zip(runs["code"], runs.attrs["lost"]["Sp"], strict=True) if why]
        assert set(lost) == set(house[house["Sp"].notna() & (house["swimmer"] != "screw-1")]["code"])
        assert set(filter(None, runs.attrs["lost"]["Sp"])) == {"needs a helix pitch"}

    def test_ranges_and_regimes_stay_in_the_house_dialect(self, filled):
        house = filled.runs(regime="working tail", ranges={"Sp": (1, 3)})
        spoken = filled.runs(regime="working tail", ranges={"Sp": (1, 3)}, dialects={"Sp": {"power": 1}})
        assert spoken["code"].tolist() == house["code"].tolist() and len(house)
        assert spoken["Sp"].tolist() == pytest.approx((house["Sp"] ** 4).tolist(), rel=1e-12)

    def test_an_unknown_choice_is_refused(self, filled):
        for dialects in ({"Sp": {"rate": "Hz"}}, {"Sp": {"speed": "f"}}, {"Mn": {"rate": "f"}}, {"wall": {}}):
            with pytest.raises(Refusal, match="one of"):
                filled.runs(dialects=dialects)

    def test_each_run_keeps_its_own_number_whatever_the_order_of_logging(self, filled):
        filled.record(swimmer="reed-1", fluid="syrup", f="3 Hz", T="22 degC", at="2026-03-01T08:00", by="wren", confirm=True)
        house = dict(zip(filled.runs()["code"], filled.runs()["Sp"], strict=True))
        for sheet in filled.sheets(Question(), dialects={"Sp": {"power": 1}}):
            code, value = sheet.texts["code"], sheet.values["Sp"]
            assert (value is None) == math.isnan(house[code])
            assert value is None or value == pytest.approx(house[code] ** 4, rel=1e-12)


class TestWhatAReviewFound:
    def test_a_formula_without_a_quantity_is_no_number(self, filled):
        with pytest.raises(Refusal, match="holds no quantity"):
            filled.define_number(**{**MG, "formula": "pi", "example": "f = 1 Hz", "answer": "3.1416"})

    def test_a_withdrawn_key_may_come_back_in_other_capitals(self, book):
        book.withdraw("number", "Mg", why="tidy", by="wren")
        book.define_number(**{**MG, "key": "mg"})
        assert book.runs()["mg"].notna().sum() >= 4 and book.check() == []
        book.close()
        with Book.open(book.target) as again:
            assert again.check() == [] and "mg" in again.runs()

    @pytest.mark.parametrize(
        ("change", "word"),
        [({"answer": "1e999"}, "too large"), ({"formula": "m_mag^2"}, r"\*\* for powers"),
         ({"formula": "1e999 * f / f"}, "too large"), ({"example": "f = 1 Hz, f = 2 Hz"}, "stands twice"),
         ({"name": "left\u202eright"}, "readable"), ({"name": "nul\0"}, "readable")],
    )  # fmt: skip
    def test_odd_texts_are_refused_in_words(self, filled, change, word):
        with pytest.raises(LabbookError, match=word):
            filled.define_number(**{**MG, **change})

    def test_an_empty_reason_is_none(self, book):
        with pytest.raises(Refusal, match="why"):
            book.define_number(**{**MG, "formula": "2 * m_mag * B / (8 * pi * mu * b**3 * omega)", "answer": "4.0000"}, why=" ")

    def test_regimes_that_differ_by_capitals_are_one(self, filled):
        with pytest.raises(Refusal, match="capitals alone"):
            filled.set_regime(Regime("Working Tail", (Band("Sp", 1.0, 2.0),), "own"), why="try", by="wren")

    def test_a_frame_of_a_changed_house_says_which_house(self, filled):
        assert filled.runs().attrs["dialects"] == {}
        filled.adopt_dialect("Sp", {"coefficient": "spheroid_asymptotic"}, why="as theory", by="wren")
        assert filled.runs().attrs["dialects"] == {"Sp": "house: coefficient spheroid_asymptotic"}
        assert filled.sheet("R-0001").row()["dialects"] == {"Sp": "house: coefficient spheroid_asymptotic"}
        back = filled.runs(dialects={"Sp": {"coefficient": "cylinder_finite"}})
        assert back.attrs["dialects"] == {"Sp": "as at birth"}
        line = lines(filled, "adopt").iloc[0]
        assert "zeta_ratio" in line["after"]["changed with it"]
