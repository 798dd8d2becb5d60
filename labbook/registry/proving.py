"""What a page shows while a formula is typed: the proof that it is pure, and its slopes at one run."""

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from labbook.errors import Refusal
from labbook.registry.formula import Formula, parse, pure
from labbook.registry.quantities import QUANTITIES, Quantity, written_dimension
from labbook.registry.spread import STEP


@dataclass(frozen=True)
class Proof:
    """Whether a text is a pure number, and if not, why.

    formula: the checked tree where the text can be read; keys: its inputs; left_over: the dimension that
    remains, such as 'L T^-1' ('' where none does, or it cannot be said); refusal: what forbids the text.
    """

    text: str
    formula: Formula | None = None
    keys: tuple[str, ...] = ()
    left_over: str = ""
    refusal: Refusal | None = None

    @property
    def is_pure(self) -> bool:
        return self.formula is not None and self.refusal is None and not self.left_over

    @property
    def sentence(self) -> str:
        """What the page says: 'a pure number', what is left over, or why the text is refused."""
        if self.refusal is not None:
            tail = f"; {self.refusal.remedy}" if self.refusal.remedy else ""
            return f"{self.refusal.reason}{tail}"
        return f"not a pure number: {self.left_over} is left over" if self.left_over else "a pure number"


def proof(text: str | None, vocabulary: Mapping[str, Quantity] = QUANTITIES) -> Proof:
    """The proof of any text over a vocabulary; it never raises."""
    formula = None
    try:
        formula = parse(text or "", vocabulary)
        if not formula.keys:
            raise Refusal("formula", text, "holds no quantity", "write e.g. rho * U * L_body / mu")
        left_over = formula.dimension({key: vocabulary[key].dimension for key in formula.keys})
    except Refusal as refusal:
        return Proof(text or "", formula, formula.keys if formula else (), refusal=refusal)
    return Proof(formula.text, formula, formula.keys, "" if pure(left_over) else written_dimension(left_over))


class Sensitivity(NamedTuple):
    """How a formula answers to one input at one run.

    slope: dy/dx in SI; relative_slope: d ln y/d ln x, the exponent of a product of powers (nan where y is 0);
    contribution: |slope| u(x), nan where u is not known.
    """

    key: str
    slope: float
    relative_slope: float
    contribution: float


def sensitivities(
    formula: Formula, values: Mapping[str, float | None], u: Mapping[str, float | None]
) -> list[Sensitivity]:
    """The formula's sensitivities at the SI values of one run, in its inputs' order.

    The contributions are those of the formula's own inputs (JCGM 100:2008, 5.1.3); inputs that follow from
    the same reading are correlated, so their squares need not add up to the number's variance.
    Errors: Refusal that names the inputs the run lacks, or where the formula has no value there.
    """
    lacking = [key for key in formula.keys if _absent(values.get(key))]
    if lacking:
        raise Refusal("formula", formula.text, f"this run lacks {', '.join(lacking)}")
    inputs = {key: np.float64(values[key]) for key in formula.keys}
    with np.errstate(all="ignore"):
        value = float(formula.value(inputs))
        if not math.isfinite(value):
            raise Refusal(
                "formula", formula.text, "has no value for this run",
                "it divides by 0, roots a negative value or grows beyond all bounds",
            )  # fmt: skip
        return [_sensitivity(formula, key, inputs, value, u.get(key)) for key in formula.keys]


def _sensitivity(formula: Formula, key: str, inputs: dict, value: float, u: float | None) -> Sensitivity:
    x = float(inputs[key])
    slope = _slope(formula, key, inputs, STEP * (abs(x) or 1.0))
    if x == 0 and not math.isclose(slope, _slope(formula, key, inputs, STEP / 4), rel_tol=1e-9, abs_tol=STEP):
        slope = math.inf  # a root at 0 rises straight up
    relative = slope * x / value if value else math.nan
    return Sensitivity(key, slope, relative, math.nan if _absent(u) else abs(slope) * float(u))


def _slope(formula: Formula, key: str, inputs: dict, step: float) -> float:
    stepped = formula.value(inputs | {key: inputs[key] + 1j * step})
    return float(np.imag(stepped)) / step


def _absent(value: float | None) -> bool:
    return value is None or math.isnan(value)
