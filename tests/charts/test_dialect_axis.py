"""Numbers on an axis in another dialect: words, labels and titles."""

import pytest

from labbook.charts.dialect_axis import axis_words, dialect_label, dialect_title, dialects
from labbook.registry.catalogue import Number
from labbook.registry.dialects import AT_BIRTH, DIALECTS, formula_of
from labbook.registry.group import Registry, at_birth


def test_every_dialect_has_words_and_a_title_of_its_own():
    for number in AT_BIRTH:
        named = dialects(number)
        rows = [row for row in DIALECTS if row.of == number]
        assert len(named) == len({str(row.choices) for row in rows} | {"{}"}) and next(iter(named)) == "house"
        titles = [dialect_title(number, choices) for choices in named.values()]
        assert len(set(titles)) == len(titles)
        assert titles[0].endswith(", house dialect") and not any("house" in t for t in titles[1:])
    assert dialects("wall") == {"house": {}}
    assert dialect_title("wall", {}).endswith(", house dialect")


def test_the_words_follow_the_house():
    house = {"rate": "f", "power": 1}
    named = dialects("Sp", house)
    assert next(iter(named)) == "house" and named["house"]["rate"] == "f"
    # the dialect at birth is now one of the others
    assert named["rate omega, power 0.25"] == AT_BIRTH["Sp"]


@pytest.mark.parametrize(("number", "choices", "title"), [
    ("Sp", {}, "Sp = L_tail (ζ_n ω/EI)^(1/4), house dialect"),
    ("Sp", {"rate": "f", "power": 1}, "Sp = ζ_n f L_tail⁴/EI, dialect rate f, power 1"),
    ("Sp", {"coefficient": "lighthill"}, "Sp = L_tail (ζ_n ω/EI)^(1/4), dialect coefficient lighthill"),
    ("St", {"amplitude": "half"}, "St = f (A_tip/2)/U, dialect amplitude half"),
    ("stride", {"length": "L_tail"}, "stride length U/(f L_tail), dialect length L_tail"),
    ("slenderness", {"breadth": "radius"}, "slenderness L_tail/a, dialect breadth radius"),
])  # fmt: skip
def test_a_title_says_formula_and_dialect(number, choices, title):
    assert dialect_title(number, choices) == title


@pytest.mark.parametrize(("number", "choices", "label"), [
    ("Sp", {}, "Sp"),
    ("Sp", {"rate": "f", "power": 1}, "Sp (rate f, power 1)"),
    ("stride", {"length": "L_tail"}, "U/(f L_tail) (length L_tail)"),
    ("wall", {}, "b/h"),
])  # fmt: skip
def test_a_label_says_the_dialect(number, choices, label):
    assert dialect_label(number, choices) == label


def test_a_title_in_the_groups_own_house():
    house = {"rate": "f", "power": 1}
    assert dialect_title("Sp", {}, house) == "Sp = ζ_n f L_tail⁴/EI, house dialect (rate f, power 1)"
    title = dialect_title("Sp", AT_BIRTH["Sp"], house)
    assert title == "Sp = L_tail (ζ_n ω/EI)^(1/4), dialect as at birth"
    assert formula_of("Sp", {}, house) == "zeta_n * f * L_tail**4 / EI"


@pytest.mark.parametrize(("choices", "label"), [
    ({}, "U/(f L_tail θ₀²)"), ({"rate": "omega"}, "U/(ω L_tail θ₀²) (rate omega)"),
])  # fmt: skip
def test_a_symbol_that_is_a_formula_follows_the_groups_own_house(choices, label):
    assert dialect_label("U_scaled", choices, {"rate": "f"}) == label


def test_the_words_of_two_axes_say_dialect_or_house_or_version():
    own = Number("Lm", "Lm", "slimness", "L_tail / L_body", "tail to body", "own", {"L_tail": 2.0, "L_body": 4.0}, 0.5)
    registry = Registry(own={"Lm": own}, versions={"Lm": 3}, house={"Re": {"length": "L_tail"}})
    said = axis_words(("Sp", "Lm", "U", "Sp"), {"Sp": {"power": 1}}, registry)
    assert said == ("Sp = ζ_n ω L_tail⁴/EI, dialect power 1. "
                    "Lm = L_tail/L_body, slimness, the group's own number, version 3.")  # fmt: skip
    assert axis_words(("Re",), {}, registry) == "Re = ρ U L_tail/μ, house dialect (length L_tail)."
    assert axis_words(("U", "T"), {}, at_birth()) == ""
