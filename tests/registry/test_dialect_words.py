"""Dialects told to people: every option has words, worked cases restated."""

import math

import pytest

from labbook.registry.dialect_words import (
    CHOICE_WORDS,
    case_words,
    dialect_words,
    option_words,
    value_in,
)
from labbook.registry.dialects import AT_BIRTH, CHOICES, DIALECTS

NEED_A_PITCH = ("gray_hancock_1955", "lighthill")


def test_every_choice_and_option_has_words():
    for number, choices in CHOICES.items():
        for choice, options in choices.items():
            assert CHOICE_WORDS[choice]
            words = [option_words(choice, option) for option in options]
            assert all(words) and len(set(words)) == len(words), (number, choice)
    assert option_words("coefficient", "lighthill").endswith("needs a helix pitch")
    assert option_words("coefficient", "none") == ""


def test_a_dialect_in_words():
    assert dialect_words(AT_BIRTH["St"]) == "rate f, amplitude peak_to_peak"


# the published rows' answers are from outside (registry/published_dialects.py names each)
@pytest.mark.parametrize("row", DIALECTS, ids=lambda r: f"{r.of} {r.choices}")
def test_a_worked_case_gives_its_answer_in_its_own_dialect(row):
    assert math.isclose(value_in(row, row.choices), row.answer, rel_tol=row.tolerance)
    assert case_words(row)


def test_a_worked_case_gives_another_rows_answer_in_that_rows_dialect():
    rows = [r for r in DIALECTS if r.of == "Sp"]
    assert len(rows) > 5
    for row in rows:  # one rod for all of Sp's rows, so any of them restates to any other
        assert math.isclose(value_in(rows[0], row.choices), row.answer, rel_tol=row.tolerance)


def test_one_case_serves_all_rows_of_a_number():
    for number in AT_BIRTH:
        assert len({case_words(row) for row in DIALECTS if row.of == number}) <= 1


def test_a_rod_has_no_value_in_a_helixs_dialect():
    row = DIALECTS[0]
    for option in NEED_A_PITCH:
        assert math.isnan(value_in(row, {"coefficient": option}))


def test_a_case_is_told_with_units_and_without_what_no_dialect_takes():
    assert case_words(DIALECTS[0]) == (
        "L_tail 0.02 m, L_body 0.024 m, a 0.0005 m, μ 1 Pa.s, f 2 Hz, ω 12.566 rad/s, EI 7.3631e-08 N.m2"
    )
