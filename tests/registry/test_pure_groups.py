"""Suggested pure groups: as many as Buckingham's theorem says, each proved pure, all independent."""

import math
import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS, Number
from labbook.registry.formula import LARGEST_EXPONENT, parse, pure
from labbook.registry.pure_groups import MOST_KEYS, how_many, suggested
from labbook.registry.quantities import QUANTITIES
from labbook.registry.units import pure_products

DIMENSIONS = {key: row.dimension for key, row in QUANTITIES.items()}


def expected_number(keys):
    """n less the rank of the dimensional matrix, which numpy finds."""
    if not keys:
        return 0
    return len(keys) - int(np.linalg.matrix_rank(np.array([DIMENSIONS[key] for key in keys])))


def own(key, formula, example, answer):
    return {key: Number(key, key, "made up", formula, "this to that", "own definition", example, answer)}


def chosen(text, **more):
    """The suggestions for 'key key key'."""
    return suggested(text.split(), **more)


def formulas(text, **more):
    return [group.formula for group in chosen(text, **more)]


def test_the_drag_of_buckingham():
    # Buckingham, Phys. Rev. 4:345 (1914): density, speed, length and viscosity allow one number, D S rho/mu
    (group,) = suggested(["rho", "U", "L_body", "mu"])
    assert group.formula == "rho * U * L_body / mu"
    assert dict(group.exponents) == {"rho": 1, "U": 1, "L_body": 1, "mu": -1}
    assert group.also == ("Re",) and group.note == ""


@pytest.mark.parametrize(("keys", "texts"), [
    # by hand from the SI units
    ("L_tail EI omega zeta_n", ["zeta_n * omega * L_tail**4 / EI"]),
    ("mu E lam", ["lam * E / mu"]),
    ("b h_wall", ["b / h_wall"]),
    ("A_tip U f", ["f * A_tip / U"]),
    ("L_body f U", ["U / (f * L_body)"]),
    ("nu omega L_tail", ["omega * L_tail**2 / nu"]),
    ("theta0", ["theta0"]),
    ("L_tail theta0 omega U", ["U / (omega * L_tail * theta0**2)", "theta0"]),
    # T alone carries a temperature, and a speed and a length make no number
    ("T", []), ("U L_tail T", []), ("", []),
    ("rho rho_s T", ["rho / rho_s"]),
])  # fmt: skip
def test_groups_by_hand(keys, texts):
    assert formulas(keys) == texts


def test_the_catalogue_is_recognised_in_other_words():
    # Sp to the fourth, with E I for EI and f for omega, is a constant away from the house's
    named = {group.formula: group.also for group in chosen("E I_area L_tail zeta_n f")}
    assert named["zeta_n * f * L_tail**4 / (E * I_area)"] == ("Sp",)
    assert chosen("rho omega L_tail mu")[0].also == ("Re_omega", "Wo")


def test_a_group_that_is_the_same_for_all_runs_says_so_and_comes_last():
    *_, last = chosen("f omega U L_body")
    assert (last.formula, last.note) == ("omega / f", "always 6.28319, since omega is 2 * pi * f")
    assert last.also == ()
    two = chosen("rho mu nu U L_body")
    assert two[1].formula == "rho * nu / mu" and two[1].note == "always 1, since nu is mu / rho"
    assert two[0].also == ("Re",)


def test_groups_differ_in_more_than_a_constant():
    # f and omega, mu and nu: each pair would give the same number twice
    groups = chosen("f omega rho mu nu U L_body")
    assert sum(bool(g.note) for g in groups) == 2
    values = np.random.default_rng(4).uniform(1, 2, (30, 4))
    logs = []
    for f, rho, mu, U in values:
        inputs = {"f": f, "omega": 2 * math.pi * f, "rho": rho, "mu": mu, "nu": mu / rho, "U": U}
        inputs["L_body"] = f + mu
        logs.append([math.log(parse(g.formula, QUANTITIES).value(inputs)) for g in groups if not g.note])
    varying = np.array(logs) - np.mean(logs, axis=0)
    assert np.linalg.matrix_rank(varying) == len(groups) - 2


def test_the_groups_own_numbers_are_known_too():
    heavy = own("heavy", "(rho_s / rho)**2", {"rho_s": 8000.0, "rho": 1000.0}, 64.0)
    (group,) = suggested(["rho_s", "rho"], NUMBERS | heavy)
    assert (group.formula, group.also) == ("rho_s / rho", ("heavy",))  # smallest exponents, their way up


def test_a_known_number_is_met_in_the_words_that_are_chosen():
    # the group's number wants f and EI; omega, E and I_area are chosen, and theta0 beside them
    example = {"f": 1.0, "theta0": 0.5, "zeta_n": 2.0, "L_tail": 1.0, "EI": 4.0}
    bent = own("bent", "f * zeta_n * L_tail**4 / (EI * theta0)", example, 1.0)
    found = formulas("omega theta0 zeta_n L_tail E I_area", numbers=bent)
    assert found[0] == "zeta_n * omega * L_tail**4 / (E * theta0 * I_area)"
    # nu for mu/rho, and the group's way up
    inverse = own("inverse", "mu / (rho * U * L_body)", {"mu": 1.0, "rho": 1.0, "U": 1.0, "L_body": 2.0}, 0.5)
    assert formulas("nu U L_body", numbers=inverse) == ["nu / (U * L_body)"]
    assert formulas("nu U L_body") == ["U * L_body / nu"]


def test_exponents_that_no_formula_may_hold_become_roots():
    # a pure product of these five needs the power 16 (by a search over the vocabulary); formulas stop at 12
    (group,) = suggested(["B", "rho", "E", "current_to_B", "A22"])
    assert any(p.denominator > 1 for _, p in group.exponents) and "**(" in group.formula
    assert pure(parse(group.formula, QUANTITIES).dimension(DIMENSIONS))


def test_the_order_of_choosing_does_not_matter():
    keys = ["rho", "U", "L_body", "mu", "zeta_n", "EI", "omega", "A_tip"]
    found = [formulas(" ".join(np.random.default_rng(seed).permutation(keys))) for seed in range(6)]
    assert all(one == found[0] for one in found)


@given(st.lists(st.sampled_from(sorted(QUANTITIES)), max_size=8))
@settings(max_examples=150, deadline=None)
def test_every_suggestion_is_pure_and_new(keys):
    distinct = list(dict.fromkeys(keys))
    groups = suggested(keys)
    assert len(groups) == how_many(keys) == expected_number(distinct)
    rows = []
    for group in groups:
        parsed = parse(group.formula, QUANTITIES)
        assert set(parsed.keys) <= set(distinct) and set(parsed.keys) == {key for key, _ in group.exponents}
        assert pure(parsed.dimension(DIMENSIONS))
        powers = dict(group.exponents)
        assert all(p and abs(p) <= LARGEST_EXPONENT for p in powers.values())
        if all(p.denominator == 1 for p in powers.values()):
            assert math.gcd(*(int(p) for p in powers.values())) == 1
        # the text and the exponents say the same
        values = {key: 1.0 + 0.1 * i for i, key in enumerate(parsed.keys)}
        product = math.prod(values[k] ** float(p) for k, p in powers.items())
        assert parsed.value(values) == pytest.approx(product, rel=1e-9)
        rows.append([float(powers.get(key, 0)) for key in distinct])
    assert not rows or np.linalg.matrix_rank(np.array(rows)) == len(rows)


@given(st.lists(st.sampled_from(sorted(QUANTITIES)), max_size=10, unique=True))
@settings(max_examples=150, deadline=None)
def test_pint_finds_as_many_products_as_the_rank_leaves(keys):
    products = pure_products(keys)
    assert len(products) == expected_number(keys)
    for powers in products:
        left = sum(float(p) * np.array(DIMENSIONS[key]) for key, p in powers.items())
        assert left == pytest.approx(np.zeros(5), abs=1e-9)


def test_a_pixel_counts_for_nothing():
    (powers,) = pure_products(["scale", "L_tail"])
    assert set(powers) == {"scale", "L_tail"} and abs(powers["scale"]) == 1 and sum(powers.values()) == 0


def test_an_unknown_or_a_thirteenth_quantity_is_refused():
    with pytest.raises(Refusal, match="no quantity has this key"):
        suggested(["rho", "speed"])
    with pytest.raises(Refusal, match="no quantity has this key"):
        pure_products(["rho", "speed"])
    with pytest.raises(Refusal, match="choose fewer"):
        suggested(list(QUANTITIES)[: MOST_KEYS + 1])
    assert len(suggested(["rho", "rho", "rho_s"])) == 1


def test_twelve_quantities_of_many_kinds_are_quick_enough_for_a_page():
    keys = ["rho", "mu", "E", "U", "f", "B", "m_mag", "I_coil", "L_tail", "A22", "EI", "lam"]
    started = time.perf_counter()
    groups = suggested(keys)
    spent = time.perf_counter() - started
    assert len(groups) == expected_number(keys) == 8
    assert spent < 20  # a few tenths of a second here; a search that doubled with each key would not end
