"""Axis titles, domains and ticks."""

import math

import pytest

from labbook.charts import axes
from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS
from labbook.registry.formula import parse
from labbook.registry.quantities import QUANTITIES


def test_a_number_says_symbol_definition_and_dialect():
    # the wording agreed in the brief of this room
    assert axes.title("Sp") == "Sp = L_tail (ζ_n ω/EI)^(1/4), house dialect"
    assert axes.title("Re_omega") == "Re_ω = ρ ω L_tail²/μ, house dialect"
    assert axes.title("U_scaled") == "scaled speed U/(ω L_tail θ₀²), house dialect"
    assert axes.title("Sp", dialect="f in place of ω").endswith(", f in place of ω")


def test_a_quantity_says_symbol_name_and_unit():
    assert axes.title("U").startswith("U speed along the swimming axis") and axes.title("U").endswith("(m/s)")
    assert axes.title("mu").endswith("(Pa s)")
    assert axes.title("rho").endswith("(kg/m³)")
    assert axes.title("I_area").endswith("(m⁴)")


@pytest.mark.parametrize("key", [*NUMBERS, *QUANTITIES])
def test_every_key_has_a_title_with_its_symbol(key):
    assert axes.label(key) in axes.title(key)


def test_an_unknown_key_is_refused():
    with pytest.raises(Refusal, match="nonsense"):
        axes.title("nonsense")


@pytest.mark.parametrize(
    ("formula", "text"),
    [
        ("rho * U / (mu * d)", "ρ U/(μ d)"),
        ("(f + omega) * d", "(f + ω) d"),
        ("f - (omega - lam)", "f − (ω − λ)"),
        ("rho / mu * U", "(ρ/μ) U"),
        ("(f * lam)**2", "(f λ)²"),
        ("2 * pi * f", "2π f"),
        ("d**-1", "d⁻¹"),
    ],
)
def test_a_written_formula_keeps_its_meaning(formula, text):
    assert axes.written_formula(parse(formula, QUANTITIES).tree) == text


def test_titles_break_outside_brackets_and_lose_nothing():
    title = axes.title("f_ratio")
    for longest in (12, 20, 30, 200):
        lines = axes.title_lines(title, longest)
        assert " ".join(lines) == title
        assert all(line.count("(") == line.count(")") for line in lines)


@pytest.mark.parametrize("values", [[0.5, 11], [1e-6, 2e-2], [3.0], [5.0, 5.1], [1e-9, 1e6], [0.999, 1.001]])
def test_a_log_domain_has_no_empty_decade(values):
    low, high = axes.log_domain([*values, 0.0, -4.0, math.nan, math.inf])
    assert low < min(values) and high > max(values)
    # the padding on one side is 4 % of the span or a sixth of a decade: under half a decade in all
    pad = max(0.041 * math.log10(max(values) / min(values)), 1 / 6 + 1e-9)
    assert math.log10(min(values) / low) <= pad and math.log10(high / max(values)) <= pad


def test_log_ticks_on_short_and_long_axes():
    assert axes.log_ticks(1, 9) == [1, 2, 3, 4, 6]
    assert axes.log_ticks(0.45, 14) == [0.5, 1, 2, 5, 10]
    assert axes.log_ticks(1e-4, 0.03) == [1e-4, 3e-4, 1e-3, 3e-3, 1e-2, 3e-2]
    long = axes.log_ticks(1e-12, 1e12)
    assert len(long) <= 9 and all(abs(math.log10(v) - round(math.log10(v))) < 1e-9 for v in long)
    # where 1 2 3 would leave a bare axis, evenly spaced values stand in
    assert axes.log_ticks(290, 300) == [290, 292, 294, 296, 298, 300]


@pytest.mark.parametrize(("low", "high"), [(0.9, 1.3), (2e-5, 3e-5), (1, 1000), (0.03, 0.2), (7.9, 8.4)])
def test_every_axis_has_ticks_inside(low, high):
    for ticks in (axes.log_ticks(low, high), axes.linear_ticks(low, high)):
        assert 3 <= len(ticks) <= 12
        assert low <= min(ticks) and max(ticks) <= high
        assert len({axes.tick_label(t) for t in ticks}) == len(ticks)


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.001, "0.001"),
        (3e-4, "3×10⁻⁴"),
        (1e-4, "10⁻⁴"),
        (2500.0, "2500"),
        (1e5, "10⁵"),
        (0.0, "0"),
        (-0.02, "−0.02"),
        (-1e-5, "−10⁻⁵"),
        (-2e-5, "−2×10⁻⁵"),
    ],
)
def test_tick_labels(value, text):
    assert axes.tick_label(value) == text


def test_a_definition_too_long_for_an_axis_stands_in_the_caption_alone():
    title, caption = axes.title("F_scaled"), axes.house_words(["F_scaled"])
    assert title == "scaled push F/(Δζ ω L_tail² θ₀²), house dialect"
    assert "ζ_t L_tail + 6π μ b" in caption and "sphere of radius b" in caption
    assert "=" in axes.title("Sp") and "L_tail" in axes.title("Sp"), "the others keep theirs"
