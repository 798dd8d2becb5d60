"""Dialects told to people: what each choice and option means, and a worked case restated."""

from collections.abc import Mapping

from labbook.physics import rods
from labbook.registry.dialects import CHOICES, Choices, Dialect, coefficient, completed, formula_of
from labbook.registry.formula import parse
from labbook.registry.quantities import QUANTITIES

CHOICE_WORDS = {
    "length": "which length",
    "rate": "angular rate or frequency",
    "amplitude": "excursion of the tip",
    "breadth": "breadth of the tail",
    "coefficient": "resistive coefficient",
    "power": "which power",
}
_OPTION_WORDS = {
    ("length", "L_tail"): "tail length",
    ("length", "L_body"): "overall length",
    ("rate", "omega"): "ω = 2π f",
    ("rate", "f"): "beats per second, no 2π",
    ("amplitude", "peak_to_peak"): "A_tip, from side to side",
    ("amplitude", "half"): "A_tip/2, from the midline",
    ("breadth", "diameter"): "2a",
    ("breadth", "radius"): "a",
    ("coefficient", "mu"): "the viscosity alone",
    ("coefficient", "four_pi_mu"): "4π μ",
    ("coefficient", "eight_pi_mu"): "8π μ",
    ("coefficient", "log_slender"): "4π μ/ln(L_tail/a)",
    ("power", 0.25): "quarter power, a ratio of lengths",
    ("power", 1): "first power, viscous to elastic force",
}


def option_words(choice: str, option: object) -> str:
    """What an option of a choice means; '' for one that is not known."""
    if choice == "coefficient" and option in rods.MODELS:
        model = rods.MODELS[option]
        return model.name + (", needs a helix pitch" if model.needs_wavelength else "")
    return _OPTION_WORDS.get((choice, option), "")


def dialect_words(choices: Choices) -> str:
    """Every choice with its option: 'length L_tail, rate omega'."""
    return ", ".join(f"{name} {option}" for name, option in choices.items())


def value_in(row: Dialect, choices: Choices) -> float:
    """The worked case of a published row in another dialect of its number; NaN where the case lacks an input.

    choices: what they leave out is as at birth.
    """
    chosen = completed(row.of, choices)
    spoken: Mapping[str, float] = row.example
    if chosen.get("coefficient", rods.HOUSE_MODEL) != rods.HOUSE_MODEL:
        if "wavelength" not in spoken and _needs_wavelength(chosen["coefficient"]):
            return float("nan")
        spoken = {**spoken, "zeta_n": float(coefficient(chosen["coefficient"], spoken))}
    formula = parse(formula_of(row.of, chosen), QUANTITIES)
    return float(formula.value(spoken)) if all(k in spoken for k in formula.keys) else float("nan")


def _needs_wavelength(option: object) -> bool:
    return option in rods.MODELS and rods.MODELS[option].needs_wavelength


def case_words(row: Dialect) -> str:
    """A published row's worked case in SI, 'L_tail 0.02 m, a 0.0005 m': what its number's dialects take."""
    parts = []
    for key in sorted(_taken(row.of), key=list(row.example).index):
        unit = QUANTITIES[key].unit
        parts.append(f"{QUANTITIES[key].symbol} {row.example[key]:.5g}{'' if unit == '1' else ' ' + unit}")
    return ", ".join(parts)


def _taken(number: str) -> set[str]:
    """What the dialects of a number take, the measured inputs of zeta_n in its place."""
    dialects = [{name: option} for name, options in CHOICES[number].items() for option in options]
    keys = {key for one in dialects for key in parse(formula_of(number, one), QUANTITIES).keys}
    return keys - {"zeta_n"} | ({"L_tail", "a", "mu"} if "zeta_n" in keys else set())
