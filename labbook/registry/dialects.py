"""Dialects: the choices by which papers define a number differently, their formulas, and published rows."""

import math
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from labbook.errors import Refusal
from labbook.physics import rods
from labbook.registry.formula import parse, pure
from labbook.registry.published_dialects import PUBLISHED
from labbook.registry.quantities import QUANTITIES, written_dimension

# coefficients that papers put in place of zeta_n, as multiples of mu; log_slender is 4 pi mu/ln(L_tail/a)
MULTIPLES = {"mu": 1.0, "four_pi_mu": 4.0 * math.pi, "eight_pi_mu": 8.0 * math.pi}

# choice -> option -> the text that takes the choice's place; a drag model's value stands as zeta_n
_OPTIONS: dict[str, dict[object, str]] = {
    "length": {"L_tail": "L_tail", "L_body": "L_body"},
    "rate": {"omega": "omega", "f": "f"},
    "amplitude": {"peak_to_peak": "A_tip", "half": "(A_tip / 2)"},
    "breadth": {"diameter": "(2 * a)", "radius": "a"},
    "coefficient": {
        **dict.fromkeys(rods.MODELS, "zeta_n"),
        "mu": "mu", "four_pi_mu": "4 * pi * mu", "eight_pi_mu": "8 * pi * mu", "log_slender": "zeta_n",
    },
    "power": {
        0.25: "{length} * ({coefficient} * {rate} / EI)**0.25",
        1: "{coefficient} * {rate} * {length}**4 / EI",
    },
}  # fmt: skip

_TEMPLATES = {
    "Re": "rho * U * {length} / mu",
    "Re_omega": "rho * {rate} * {length}**2 / mu",
    "Wo": "{length} * ({rate} / nu)**0.5",
    "Sp": "{power}",
    "St": "{rate} * {amplitude} / U",
    "Sw": "{rate} * {amplitude} * {length} / nu",
    "stride": "U / ({rate} * {length})",
    "U_scaled": "U / ({rate} * {length} * theta0**2)",
    "De": "lam * {rate}",
    "Mn": "m_mag * B * {length} / EI",
    "slenderness": "{length} / {breadth}",
}

AT_BIRTH: dict[str, dict[str, object]] = {
    "Re": {"length": "L_body"},
    "Re_omega": {"length": "L_tail", "rate": "omega"},
    "Wo": {"length": "L_tail", "rate": "omega"},
    "Sp": {"length": "L_tail", "rate": "omega", "coefficient": rods.HOUSE_MODEL, "power": 0.25},
    "St": {"rate": "f", "amplitude": "peak_to_peak"},
    "Sw": {"length": "L_body", "rate": "omega", "amplitude": "peak_to_peak"},
    "stride": {"length": "L_body", "rate": "f"},
    "U_scaled": {"length": "L_tail", "rate": "omega"},
    "De": {"rate": "omega"},
    "Mn": {"length": "L_tail"},
    "slenderness": {"length": "L_tail", "breadth": "diameter"},
}

CHOICES: dict[str, dict[str, tuple]] = {
    number: {name: tuple(_OPTIONS[name]) for name in house} for number, house in AT_BIRTH.items()
}

Choices = Mapping[str, object]


def completed(number: str, choices: Choices, house: Choices | None = None) -> dict[str, object]:
    """Every choice of a number: the ones given, else the house's, else those at birth.

    Options may be texts ('1', '0.25'). Errors: Refusal for an unknown number, choice or option.
    """
    if number not in CHOICES:
        raise Refusal("dialect", number, "no number of this key has dialects", f"one of {', '.join(CHOICES)}")
    chosen = dict(AT_BIRTH[number])
    for given in (house or {}, choices):
        if not isinstance(given, Mapping):
            reason = "is no mapping of choices"
            raise Refusal(f"dialect of {number}", given, reason, "give e.g. {'rate': 'f'}")
        chosen |= {name: _option(number, name, option) for name, option in given.items()}
    return chosen


def _option(number: str, name: str, given: object) -> object:
    options = CHOICES[number].get(name)
    if options is None:
        remedy = f"one of {', '.join(CHOICES[number])}"
        raise Refusal(f"dialect of {number}", name, "is no choice of this number", remedy)
    for option in options:
        if str(given).strip() == option or (not isinstance(option, str) and _number(given) == option):
            return option
    raise Refusal(f"{name} of {number}", given, "is not an option", f"one of {', '.join(map(str, options))}")


def _number(given: object) -> Fraction | None:
    try:
        return Fraction(str(given).strip())
    except (ValueError, ZeroDivisionError):
        return None


def formula_of(number: str, choices: Choices, house: Choices | None = None) -> str:
    """A dialect's formula as text over the vocabulary; a drag model or log_slender stands as zeta_n in it."""
    chosen = completed(number, choices, house)
    texts = {name: _OPTIONS[name][option] for name, option in chosen.items()}
    return _TEMPLATES[number].format(**texts).format(**texts)  # twice: a power's text has places of its own


def read_choices(text: str) -> tuple[str, dict[str, object]]:
    """('Sp', {'rate': 'f', 'power': 1}) of 'Sp=rate:f,power:1', ('Sp', {}) of 'Sp=house'.

    Errors: Refusal for a text of another form, an unknown number, choice or option, or a choice made twice.
    """
    number, equals, rest = (part.strip() for part in text.partition("="))
    pairs = [] if rest == "house" else [part.partition(":") for part in rest.split(",")]
    names = [name.strip() for name, _, _ in pairs]
    if not equals or not all(name.strip() and colon and option.strip() for name, colon, option in pairs):
        raise Refusal("dialect", text, "cannot be read", "write e.g. Sp=rate:f,power:1 or Sp=house")
    if len(set(names)) < len(names):
        raise Refusal("dialect", text, "makes a choice twice", "write e.g. Sp=rate:f,power:1")
    chosen = completed(number, dict(zip(names, (option for _, _, option in pairs), strict=True)))
    return number, {name: chosen[name] for name in names}


def written_choices(number: str, choices: Choices, house: Choices | None = None) -> str:
    """'rate f, power 1': where a dialect departs from the house; 'house' where it does not."""
    at_home, chosen = completed(number, {}, house), completed(number, choices, house)
    return ", ".join(f"{n} {o}" for n, o in chosen.items() if o != at_home[n]) or "house"


def coefficient(name: str, inputs: Mapping[str, object]):
    """A dialect's resistive coefficient, always with L_tail.

    inputs: SI values or arrays (real or complex) of L_tail, a, mu; w and t of a strip; wavelength for the
    two models that need it. Answer in Pa.s. Errors: Refusal for a missing input.
    """
    if name in MULTIPLES:
        return MULTIPLES[name] * _input(inputs, "mu")
    L, a, mu = (_input(inputs, key) for key in ("L_tail", "a", "mu"))
    if name == "log_slender":
        return 4.0 * math.pi * mu / np.log(L / a)
    flatness = 0.5
    if "w" in inputs and "t" in inputs:
        w, t = _input(inputs, "w"), _input(inputs, "t")
        flatness = np.where(np.isnan(w) | np.isnan(t), 0.5, t / (w + t))
    return rods.resistive_coefficients(
        model=name, L=L, a=a, mu=mu, flatness=flatness, wavelength=inputs.get("wavelength")
    )[0]


def _input(inputs, key):
    if key not in inputs:
        raise Refusal(key, None, "is needed for this resistive coefficient")
    return np.asarray(inputs[key])


@dataclass(frozen=True)
class Dialect:
    """An alternative definition of a number; construction proves it pure and recomputes its worked example.

    of: the number; choices: where it departs from the house at birth; formula: text over the vocabulary, in
    which zeta_n stands for the chosen coefficient; example: SI inputs with the zeta_n of the house at birth;
    answer: from outside; tolerance: relative, from the digits of the answer.
    Errors: Refusal where the formula is not pure, or formula, choices and answer disagree.
    """

    of: str
    choices: Choices
    formula: str
    source: str
    example: Mapping[str, float]
    answer: float
    tolerance: float = 1e-5

    def __post_init__(self):
        field = f"dialect of {self.of}"
        chosen = completed(self.of, self.choices)
        if not self.source.strip():
            raise Refusal(field, self.formula, "a dialect needs a source")
        if not 0 < self.tolerance <= 1e-2:
            raise Refusal(field, self.tolerance, "the example's tolerance must lie in 0 to 1 %")
        written = parse(self.formula, QUANTITIES)
        left_over = written.dimension({key: row.dimension for key, row in QUANTITIES.items()})
        if not pure(left_over):
            reason = f"not a pure number: {written_dimension(left_over)} is left over"
            raise Refusal(field, self.formula, reason)
        spoken = dict(self.example)
        if chosen.get("coefficient", rods.HOUSE_MODEL) != rods.HOUSE_MODEL:
            spoken["zeta_n"] = float(coefficient(chosen["coefficient"], self.example))
        built = parse(formula_of(self.of, chosen), QUANTITIES)
        missing = [key for key in dict.fromkeys((*written.keys, *built.keys)) if key not in spoken]
        if missing:
            raise Refusal(field, self.formula, f"the worked example lacks {', '.join(missing)}")
        found, again = written.value(spoken), built.value(spoken)
        if not math.isclose(found, self.answer, rel_tol=self.tolerance):
            raise Refusal(field, self.answer, f"the worked example gives {found:.6g}")
        if not math.isclose(found, again, rel_tol=1e-12):
            raise Refusal(field, self.formula, f"the choices give {again:.6g}, the formula {found:.6g}")


DIALECTS: tuple[Dialect, ...] = tuple(Dialect(*row) for row in PUBLISHED)
