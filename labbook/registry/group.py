"""A group's registry as one value: the numbers at birth and its own, its regimes, its house dialects."""

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property, lru_cache

from labbook.errors import Refusal
from labbook.physics import rods
from labbook.registry.catalogue import NUMBERS, Number
from labbook.registry.dialects import AT_BIRTH, completed, formula_of
from labbook.registry.formula import parse
from labbook.registry.quantities import QUANTITIES, RESOLVED_KEYS
from labbook.registry.regimes import REGIMES, Regime


@dataclass(frozen=True)
class Registry:
    """What every stored number of a book follows from.

    own: key -> the number a group added, in its present version; versions: key -> which version that is;
    regimes: name -> band; house: number -> the choices where the group's house dialect departs from the one
    at birth.
    """

    own: Mapping[str, Number] = field(default_factory=dict)
    versions: Mapping[str, int] = field(default_factory=dict)
    regimes: Mapping[str, Regime] = field(default_factory=lambda: dict(REGIMES))
    house: Mapping[str, Mapping[str, object]] = field(default_factory=dict)

    @cached_property
    def numbers(self) -> dict[str, Number]:
        """Every number by key, in the group's house dialect, its own ones last."""
        spoken = {k: _spoken(n, self.house[k]) if self.house.get(k) else n for k, n in NUMBERS.items()}
        return spoken | dict(self.own)

    @cached_property
    def keys(self) -> tuple[str, ...]:
        """The keys of the stored view: resolved quantities, numbers at birth, own numbers."""
        return (*RESOLVED_KEYS, *self.numbers)

    @property
    def coefficient(self) -> str:
        """What stands for zeta_n: a drag model's key or log_slender; multiples of mu leave the model alone."""
        chosen = self.choices("Sp")["coefficient"]
        return chosen if chosen in (*rods.MODELS, "log_slender") else rods.HOUSE_MODEL

    def choices(self, number: str) -> dict[str, object]:
        """The group's house dialect of a number, every choice named; {} for a number without dialects."""
        return completed(number, self.house.get(number, {})) if number in AT_BIRTH else {}

    def number(self, key: str) -> Number:
        """The row of a key; Refusal for an unknown one."""
        if key not in self.numbers:
            raise Refusal("key", key, "no number has this key", f"one of {', '.join(self.numbers)}")
        return self.numbers[key]

    def regime(self, name: str) -> Regime:
        """The regime of a name; Refusal for an unknown one."""
        if name not in self.regimes:
            raise Refusal("regime", name, "no regime has this name", f"one of {', '.join(self.regimes)}")
        return self.regimes[name]

    def unit(self, key: str) -> str:
        """The SI unit of a key of the stored view; numbers have unit 1."""
        return QUANTITIES[key].unit if key in QUANTITIES else "1"

    @cached_property
    def fingerprint(self) -> str:
        """Digest of everything that the stored values follow from: keys, formulas, house dialects."""
        told = [[k, q.unit, q.formula] for k, q in QUANTITIES.items()]
        told += [[k, n.formula, n.not_zero, list(n.only_drives)] for k, n in self.numbers.items()]
        told.append(["coefficient", self.coefficient])
        return hashlib.sha256(json.dumps(told).encode()).hexdigest()


@lru_cache(maxsize=1)
def at_birth() -> Registry:
    """The registry of a new book."""
    return Registry()


# a silicone rod of 24 mm in 1 Pa.s at 2 Hz, for the inputs that a number's own worked example does not need
_STANDARD = dict(L_body=0.024, L_tail=0.020, a=5e-4, mu=1.0, rho=970.0, nu=1 / 970.0, f=2.0,
                 omega=12.566370614359172, EI=7.3631078e-8, A_tip=2e-3, U=1e-4, lam=0.5)  # fmt: skip


def _spoken(number: Number, choices: Mapping[str, object]) -> Number:
    """A number at birth in another house dialect: same source, formula and worked example restated."""
    formula = formula_of(number.key, completed(number.key, choices))
    example = _STANDARD | dict(number.example)
    answer = float(parse(formula, QUANTITIES).value(example))
    told = "; ".join(f"{name}: {option}" for name, option in completed(number.key, choices).items())
    return replace(number, formula=formula, example=example, answer=answer, dialect=told)
