"""The sperm number's dialects, one row each, and the call that restates a house value in another dialect."""

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal
from labbook.physics import rods
from labbook.registry.formula import parse, pure
from labbook.registry.quantities import QUANTITIES, written_dimension

HOUSE = {"length": "L_tail", "rate": "omega", "coefficient": rods.HOUSE_MODEL, "power": 0.25}

# coefficients that papers put in place of zeta_n, as multiples of mu; log_slender is 4 pi mu/ln(L_tail/a)
_MULTIPLES = {"mu": 1.0, "four_pi_mu": 4.0 * math.pi, "eight_pi_mu": 8.0 * math.pi}

CHOICES = {
    "length": ("L_tail", "L_body"),
    "rate": ("omega", "f"),
    "coefficient": (*rods.MODELS, *_MULTIPLES, "log_slender"),
    "power": (0.25, 1),
}


def completed(choices: Mapping[str, object]) -> dict[str, object]:
    """The choices with the house's where one is left out; Refusal for an unknown choice."""
    for name, chosen in choices.items():
        if name not in CHOICES:
            raise Refusal("dialect", name, "is not a choice", f"one of {', '.join(CHOICES)}")
        if chosen not in CHOICES[name]:
            raise Refusal(name, chosen, "is not a choice", f"one of {', '.join(map(str, CHOICES[name]))}")
    return HOUSE | dict(choices)


def coefficient(name: str, inputs: Mapping[str, object]):
    """A dialect's resistive coefficient, always with L_tail.

    inputs: SI values or arrays of L_tail, a, mu; w and t of a strip; wavelength for the two models that need
    it. Answer in Pa.s. Errors: Refusal for a missing input.
    """
    if name in _MULTIPLES:
        return _MULTIPLES[name] * _input(inputs, "mu")
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


def restated(value, *, choices: Mapping[str, object], inputs: Mapping[str, object]):
    """House sperm numbers in another dialect.

    value: scalar or array of house values; choices: some of length, rate, coefficient, power (the rest are
    the house's); inputs: SI scalars or arrays of what the change needs: L_tail and L_body for a length; the
    house's zeta_n and what `coefficient` needs for a coefficient. A frame will do. NaN stays NaN.
    Errors: Refusal for an unknown choice or a missing input.
    """
    chosen = completed(choices)
    answer = np.asarray(value, dtype=float)
    if chosen["length"] != HOUSE["length"]:
        answer = answer * (_input(inputs, chosen["length"]) / _input(inputs, HOUSE["length"]))
    ratio = 1.0
    if chosen["rate"] != HOUSE["rate"]:
        ratio = ratio / (2.0 * math.pi)
    if chosen["coefficient"] != HOUSE["coefficient"]:
        ratio = ratio * (coefficient(chosen["coefficient"], inputs) / _input(inputs, "zeta_n"))
    answer = answer * ratio**0.25
    return answer if chosen["power"] == HOUSE["power"] else answer**4


def _input(inputs, key):
    if key not in inputs:
        raise Refusal(key, None, "is needed to restate the sperm number")
    return np.asarray(inputs[key], dtype=float)


@dataclass(frozen=True)
class Dialect:
    """An alternative definition of a number; construction proves it pure and recomputes its worked example.

    of: the number; choices: where it departs from the house; formula: text over the vocabulary, in which
    zeta_n stands for the chosen coefficient; example: SI inputs with the house's zeta_n; answer: from
    outside; tolerance: relative, from the digits of the answer.
    Errors: Refusal where the formula is not pure, or formula, restated house value and answer disagree.
    """

    of: str
    choices: Mapping[str, object]
    formula: str
    source: str
    example: Mapping[str, float]
    answer: float
    tolerance: float = 1e-5

    def __post_init__(self):
        field = f"dialect of {self.of}"
        if self.of != "Sp":
            raise Refusal("dialect", self.of, "only the sperm number has dialects")
        if not self.source.strip():
            raise Refusal(field, self.formula, "a dialect needs a source")
        if not 0 < self.tolerance <= 1e-2:
            raise Refusal(field, self.tolerance, "the example's tolerance must lie in 0 to 1 %")
        chosen = completed(self.choices)
        parsed = parse(self.formula, QUANTITIES)
        left_over = parsed.dimension({key: row.dimension for key, row in QUANTITIES.items()})
        if not pure(left_over):
            reason = f"not a pure number: {written_dimension(left_over)} is left over"
            raise Refusal(field, self.formula, reason)
        spoken = dict(self.example)
        if chosen["coefficient"] != HOUSE["coefficient"]:
            spoken["zeta_n"] = float(coefficient(chosen["coefficient"], self.example))
        missing = [key for key in parsed.keys if key not in spoken]
        if missing:
            raise Refusal(field, self.formula, f"the worked example lacks {', '.join(missing)}")
        found = parsed.value(spoken)
        if not math.isclose(found, self.answer, rel_tol=self.tolerance):
            raise Refusal(field, self.answer, f"the worked example gives {found:.6g}")
        house = parse(_HOUSE_FORMULA, QUANTITIES).value(self.example)
        again = restated(house, choices=self.choices, inputs=self.example)
        if not math.isclose(found, again, rel_tol=1e-12):
            raise Refusal(field, self.formula, f"the choices give {again:.6g}, the formula {found:.6g}")


_HOUSE_FORMULA = "L_tail * (zeta_n * omega / EI)**0.25"
_TRADE = "common practice, no source"
_SPHEROID = "Wiggins & Goldstein, Phys. Rev. Lett. 80:3879 (1998), with the slender-spheroid coefficient"

# A silicone rod of 1.5 MPa in 1 Pa.s: L 20 mm, d 1 mm, 2 Hz; zeta_n by the finite-cylinder fit at L/d = 20,
# written out from Tirado & Garcia de la Torre, J. Chem. Phys. 71:2581 (1979). The body is 24 mm long.
_ROD = dict(
    L_tail=0.020, L_body=0.024, a=5e-4, mu=1.0, f=2.0, omega=4.0 * math.pi, EI=7.3631078e-8,
    zeta_n=4.0 * math.pi / (math.log(20.0) + 0.839 + 0.185 / 20.0 + 0.233 / 400.0),
)  # fmt: skip


def _row(choices, formula, source, answer, tolerance=1e-5):
    return Dialect("Sp", choices, formula, source, _ROD, answer, tolerance)


# the answers were recomputed independently; five or six figures, so 1e-5 (2e-5 for five)
DIALECTS: tuple[Dialect, ...] = (
    _row({}, _HOUSE_FORMULA,
         "Tirado & Garcia de la Torre, J. Chem. Phys. 71:2581 (1979), for zeta_n", 3.07367),
    _row({"coefficient": "spheroid_asymptotic"}, _HOUSE_FORMULA, _SPHEROID, 3.00847),
    _row({"coefficient": "cylinder_two_term"}, _HOUSE_FORMULA,
         "Cox, J. Fluid Mech. 44:791 (1970), for zeta_n", 3.06623),
    _row({"coefficient": "log_slender"}, _HOUSE_FORMULA, _TRADE, 3.10560),
    _row({"coefficient": "mu"}, "L_tail * (mu * omega / EI)**0.25", _TRADE, 2.28595),
    _row({"coefficient": "four_pi_mu"}, "L_tail * (4 * pi * mu * omega / EI)**0.25", _TRADE, 4.30397),
    _row({"coefficient": "eight_pi_mu"}, "L_tail * (8 * pi * mu * omega / EI)**0.25", _TRADE, 5.11832),
    _row({"coefficient": "spheroid_asymptotic", "rate": "f"}, "L_tail * (zeta_n * f / EI)**0.25",
         _TRADE, 1.90020),
    _row({"coefficient": "spheroid_asymptotic", "power": 1}, "zeta_n * omega * L_tail**4 / EI", _TRADE,
         81.918, 2e-5),
    # the house answer times 24/20
    _row({"length": "L_body"}, "L_body * (zeta_n * omega / EI)**0.25", _TRADE, 3.688404),
)
