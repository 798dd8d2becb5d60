"""Dialects: their choices, formulas, texts and published rows, and what is refused."""

import dataclasses
import itertools
import math

import pytest

from labbook.errors import Refusal
from labbook.physics import rods
from labbook.registry import dialects
from labbook.registry.catalogue import NUMBERS
from labbook.registry.dialects import (
    AT_BIRTH,
    CHOICES,
    DIALECTS,
    completed,
    formula_of,
    read_choices,
    written_choices,
)
from labbook.registry.formula import parse, pure
from labbook.registry.quantities import QUANTITIES

DIMENSIONS = {key: row.dimension for key, row in QUANTITIES.items()}


def every(number):
    """Every combination of a number's options."""
    names = CHOICES[number]
    return [dict(zip(names, options, strict=True)) for options in itertools.product(*names.values())]


def test_the_choices_of_the_sperm_number_are_public():
    # the names and options that the command line and Python promise (issue 3)
    assert CHOICES["Sp"] == {
        "length": ("L_tail", "L_body"),
        "rate": ("omega", "f"),
        "coefficient": (*rods.MODELS, "mu", "four_pi_mu", "eight_pi_mu", "log_slender"),
        "power": (0.25, 1),
    }
    assert AT_BIRTH["Sp"] == {
        "length": "L_tail", "rate": "omega", "coefficient": "cylinder_finite", "power": 0.25,
    }  # fmt: skip


@pytest.mark.parametrize("number", AT_BIRTH)
def test_the_house_at_birth_is_the_catalogues_formula(number):
    assert formula_of(number, {}) == NUMBERS[number].formula
    assert list(AT_BIRTH[number]) == list(CHOICES[number])


@pytest.mark.parametrize("number", AT_BIRTH)
def test_every_dialect_is_a_pure_number_and_reads_back(number):
    formulas = set()
    for chosen in every(number):
        formula = formula_of(number, chosen)
        assert pure(parse(formula, QUANTITIES).dimension(DIMENSIONS)), formula
        formulas.add(formula)
        words = written_choices(number, chosen)
        told = ",".join(part.replace(" ", ":") for part in words.split(", "))
        again, read = read_choices(f"{number}={told}")
        assert (again, completed(number, read)) == (number, chosen)
    # drag models and log_slender share the place of zeta_n
    alike = len(rods.MODELS) if "coefficient" in CHOICES[number] else 0
    assert len(formulas) == len(every(number)) * (4 / (4 + alike) if alike else 1)


@pytest.mark.parametrize(("number", "choices", "formula"), [
    ("Sp", {"rate": "f", "power": 1}, "zeta_n * f * L_tail**4 / EI"),
    ("Sp", {"coefficient": "eight_pi_mu", "length": "L_body"}, "L_body * (8 * pi * mu * omega / EI)**0.25"),
    ("Sp", {"coefficient": "log_slender"}, "L_tail * (zeta_n * omega / EI)**0.25"),
    ("St", {"amplitude": "half"}, "f * (A_tip / 2) / U"),
    ("Sw", {"amplitude": "half", "rate": "f"}, "f * (A_tip / 2) * L_body / nu"),
    ("stride", {"length": "L_tail"}, "U / (f * L_tail)"),
    ("slenderness", {"breadth": "radius"}, "L_tail / a"),
])  # fmt: skip
def test_the_options_take_their_places(number, choices, formula):
    assert formula_of(number, choices) == formula


def test_left_out_choices_are_the_house():
    house = {"coefficient": "mu", "power": "1"}
    assert completed("Sp", {"rate": "f"}, house) == {
        "length": "L_tail", "rate": "f", "coefficient": "mu", "power": 1,
    }  # fmt: skip
    assert completed("Sp", {"coefficient": "lighthill"}, house)["coefficient"] == "lighthill"
    assert completed("Sp", {}) == AT_BIRTH["Sp"]
    completed("Sp", {})["rate"] = "f"
    assert AT_BIRTH["Sp"]["rate"] == "omega", "a copy"


def test_words_say_where_a_dialect_departs_from_the_house():
    assert written_choices("Sp", {}) == written_choices("Sp", AT_BIRTH["Sp"]) == "house"
    assert written_choices("Sp", {"power": 1, "rate": "f"}) == "rate f, power 1"
    house = {"rate": "f"}
    assert written_choices("Sp", {}, house) == "house"
    assert written_choices("Sp", {"rate": "omega"}, house) == "rate omega"


@pytest.mark.parametrize(("text", "read"), [
    ("Sp=rate:f,power:1", ("Sp", {"rate": "f", "power": 1})),
    (" Sp = rate : f , power : 1/4 ", ("Sp", {"rate": "f", "power": 0.25})),
    ("Sp=power:0.25", ("Sp", {"power": 0.25})),
    ("Sp=power:1.0", ("Sp", {"power": 1})),
    ("St=amplitude:half", ("St", {"amplitude": "half"})),
    ("Sp=house", ("Sp", {})),
])  # fmt: skip
def test_choices_are_read_from_text(text, read):
    assert read_choices(text) == read


@pytest.mark.parametrize("text", [
    "Sp", "Sp=", "=rate:f", "Sp=rate", "Sp=rate:", "Sp=:f", "Sp=rate:f,", "Sp=rate:f,,power:1", "",
    "Sp rate:f",
    "Sp=rate:f,rate:omega", "Sp=rate:f;power:1", "Sp=rate:f:omega", "Rho=rate:f", "Sp=speed:f", "Sp=rate:rpm",
    "Sp=power:1/0", "Sp=power:nan", "Sp=power:",
])  # fmt: skip
def test_a_malformed_text_is_refused_in_one_sentence(text):
    with pytest.raises(Refusal) as refused:
        read_choices(text)
    said = str(refused.value)
    assert said.replace("e.g. ", "").count(". ") == 0 and said.endswith(".")
    assert "e.g. Sp=rate:f,power:1" in said or "one of" in said


@pytest.mark.parametrize(("number", "choices", "reason"), [
    ("Sp", {"lenght": "L_body"}, "one of length, rate, coefficient, power"),
    ("Sp", {"length": "b"}, "one of L_tail, L_body"),
    ("Sp", {"rate": "rpm"}, "one of omega, f"),
    ("Sp", {"power": 2}, "one of 0.25, 1"),
    ("Sp", {"power": None}, "one of 0.25, 1"),
    ("Sp", {"coefficient": "zeta_t"}, "one of spheroid_asymptotic, cylinder_two_term"),
    ("Sp", {"rate": ["f"]}, "one of omega, f"),
    ("Sp", "rate:f", "give e.g. {'rate': 'f'}"),
    ("Re", {"rate": "f"}, "one of length"),
    ("wall", {}, "one of Re, Re_omega, Wo, Sp"),
])  # fmt: skip
def test_an_unknown_choice_is_refused(number, choices, reason):
    for call in (completed, formula_of, written_choices):
        with pytest.raises(Refusal) as refused:
            call(number, choices)
        assert reason in str(refused.value)


def test_an_unknown_choice_of_the_house_is_refused():
    with pytest.raises(Refusal, match="one of omega, f"):
        completed("Sp", {}, {"rate": "rpm"})


def test_a_strip_keeps_its_flatness_in_another_drag_model():
    # Batchelor 1970: t/(w+t) - 1/2 joins the denominator, 4 pi mu/(ln(L/a) + 1/2 + t/(w+t) - 1/2)
    strip = dict(L_tail=0.02, mu=1.0, w=2e-3, t=2e-4, a=5.5e-4)
    expected = 4 * math.pi / (math.log(0.02 / 5.5e-4) + 0.2 / 2.2)
    assert dialects.coefficient("spheroid_asymptotic", strip) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize(("name", "zeta_n"), [
    ("mu", 2.0), ("four_pi_mu", 25.13274), ("eight_pi_mu", 50.26548),  # 2, 8 pi and 16 pi Pa.s
    # Sp^4 goes as the coefficient: from 4 pi mu to 4 pi mu/ln(40) at L/a = 40
    ("log_slender", 25.13274 / 3.688879),
])  # fmt: skip
def test_coefficients_that_are_no_drag_model(name, zeta_n):
    rod = dict(L_tail=0.02, a=5e-4, mu=2.0)
    assert dialects.coefficient(name, rod) == pytest.approx(zeta_n, rel=1e-6)  # seven figures


def test_models_of_a_wave_need_its_length():
    rod = dict(L_tail=0.02, a=5e-4, mu=1.0)
    with pytest.raises(Refusal, match="wavelength"):
        dialects.coefficient("lighthill", rod)
    # Lighthill 1976 at wavelength/a = 100: 3.70649, recomputed; six figures
    assert dialects.coefficient("lighthill", rod | {"wavelength": 0.05}) == pytest.approx(3.70649, abs=5e-6)
    with pytest.raises(Refusal) as refused:
        dialects.coefficient("log_slender", {"L_tail": 0.02, "mu": 1.0})
    assert refused.value.field == "a"


@pytest.mark.parametrize("number", AT_BIRTH)
def test_every_choice_is_spoken_somewhere(number):
    rows = [row for row in DIALECTS if row.of == number]
    assert rows
    house = AT_BIRTH[number]
    spoken = {n: {house[n], *(row.choices[n] for row in rows if n in row.choices)} for n in house}
    unspoken = {name: set(CHOICES[number][name]) - spoken[name] for name in CHOICES[number]}
    waves = {key for key, row in rods.MODELS.items() if row.needs_wavelength}  # worked in the tests above
    assert all(missing == (waves if name == "coefficient" else set()) for name, missing in unspoken.items())


def test_no_dialect_is_there_twice():
    told = [(row.of, written_choices(row.of, row.choices)) for row in DIALECTS]
    assert len(set(told)) == len(told)
    assert sum(of == "Sp" for of, _ in told) == 10


@pytest.mark.parametrize(("change", "reason"), [
    (dict(of="wall"), "no number of this key has dialects"),
    (dict(source=" "), "needs a source"),
    (dict(formula="L_tail * (zeta_n * omega / EI)**0.5"), "is left over"),
    (dict(formula="2 * L_tail * (zeta_n * omega / EI)**0.25"), "the worked example gives"),
    (dict(formula="b / h_wall"), "the worked example lacks b, h_wall"),
    (dict(answer=1.0), "the worked example gives"),
    (dict(tolerance=0.5), "tolerance"),
    (dict(choices={"rate": "cycles"}), "is not an option"),
    # formula and answer agree, the choices say another thing
    (dict(choices={"rate": "f"}), "the choices give"),
    (dict(choices={"length": "L_body"}), "the choices give"),
    # off by less than the answer's digits can tell
    (dict(formula="1.000001 * L_tail * (zeta_n * omega / EI)**0.25"), "the choices give"),
])  # fmt: skip
def test_a_bad_row_is_refused(change, reason):
    with pytest.raises(Refusal) as refused:
        dataclasses.replace(DIALECTS[0], **change)
    assert reason in str(refused.value)
