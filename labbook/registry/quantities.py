"""The vocabulary: every quantity with a unit, one row each; one key from form to file, formula and axis."""

import re
from dataclasses import dataclass

from labbook.errors import Refusal

BASE = ("M", "L", "T", "I", "K")  # mass, length, time, current, temperature

Dimension = tuple[float, ...]

NONE: Dimension = (0.0,) * len(BASE)


def dimension(text: str) -> Dimension:
    """Exponents of the base dimensions in a text such as 'M L^-1 T^-1' ('' is dimensionless)."""
    exponents = dict.fromkeys(BASE, 0.0)
    for factor in text.split():
        match = re.fullmatch(r"([A-Z])(?:\^(-?\d+))?", factor)
        if match is None or match[1] not in exponents:
            raise Refusal("dimension", text, f"cannot read {factor!r}", "write e.g. M L^-1 T^-1")
        exponents[match[1]] += float(match[2] or 1)
    return tuple(exponents.values())


def written_dimension(exponents: Dimension) -> str:
    """'M L^-1 T^-1' of the exponents, 'a pure number' where all are zero."""
    parts = [b if e == 1 else f"{b}^{e:g}" for b, e in zip(BASE, exponents, strict=True) if abs(e) > 1e-9]
    return " ".join(parts) or "a pure number"


@dataclass(frozen=True)
class Quantity:
    """One quantity: key, symbol as written, name, SI unit, dimension, accepted units, plausible range in SI.

    of: which record it is typed on ('run', 'fluid', 'material', 'swimmer', 'rig', 'published') or 'derived'.
    sign: 'positive', 'not negative' or 'any'; kind: the plural noun used when a wrong unit is refused.
    formula: for derived quantities that are a formula over the vocabulary.
    """

    key: str
    symbol: str
    name: str
    unit: str
    dim: str
    units: tuple[str, ...] = ()
    low: float = float("-inf")
    high: float = float("inf")
    of: str = "derived"
    sign: str = "positive"
    kind: str = ""
    formula: str = ""

    def __post_init__(self):
        if not self.key.isidentifier():
            raise Refusal("key", self.key, "a key is a plain identifier")
        if self.sign not in ("positive", "not negative", "any"):
            raise Refusal(self.key, self.sign, "sign is positive, not negative or any")
        dimension(self.dim)
        if self.of != "derived" and self.unit not in self.units:
            raise Refusal(self.key, self.unit, "the SI unit is not among the accepted units")

    @property
    def dimension(self) -> Dimension:
        return dimension(self.dim)

    @property
    def one(self) -> str:
        """One of its kind with its article, for refusals: 'a speed', 'an angle'."""
        noun = self.kind or self.name
        return f"{'an' if noun[0] in 'aeiou' else 'a'} {noun}"


LENGTHS = ("m", "mm", "cm", "um", "nm")
FREQUENCIES = ("Hz", "mHz", "kHz", "rpm")
ANGLES = ("rad", "mrad", "deg")
SPEEDS = ("m/s", "mm/s", "um/s", "cm/s", "mm/min", "um/min", "cm/min", "m/min")
FLUXES = ("T", "mT", "uT", "G")
TEMPERATURES = ("K", "degC", "degF")
DENSITIES = ("kg/m3", "g/cm3", "g/mL", "kg/L", "g/L")


def _length(key, symbol, name, of, low=1e-7, high=1.0):
    return Quantity(key, symbol, name, "m", "L", LENGTHS, low, high, of, kind="length")


QUANTITIES: dict[str, Quantity] = {
    q.key: q
    for q in (
        # typed on a run
        Quantity("f", "f", "drive frequency", "Hz", "T^-1", FREQUENCIES, 1e-4, 1e3, "run", kind="frequency"),
        Quantity("theta0", "θ₀", "drive angle amplitude", "rad", "", ANGLES, 1e-3, 1.6, "run", kind="angle"),
        _length("h0", "h₀", "heave amplitude", "run", high=0.1),
        Quantity("U", "U", "speed along the swimming axis, head first positive", "m/s", "L T^-1", SPEEDS,
                 -1.0, 5.0, "run", "any", "speed"),
        Quantity("A_tip", "A_tip", "tail-tip excursion, peak to peak", "m", "L", LENGTHS, 1e-7, 0.5, "run",
                 kind="length"),
        Quantity("T", "T", "fluid temperature", "K", "K", TEMPERATURES, 263.15, 373.15, "run",
                 kind="temperature"),
        Quantity("B", "B", "flux density amplitude", "T", "M T^-2 I^-1", FLUXES, 1e-6, 0.2, "run",
                 "not negative", "flux density"),
        Quantity("I_coil", "I_coil", "coil current amplitude", "A", "I", ("A", "mA"), 1e-4, 50.0, "run",
                 "not negative", "current"),
        _length("h_wall", "h_wall", "distance of the axis to the nearest wall", "run"),
        _length("D_tank", "D_tank", "tube bore", "run", high=5.0),
        # resolved from the fluid
        Quantity("mu", "μ", "dynamic viscosity at the run's temperature", "Pa.s", "M L^-1 T^-1",
                 ("Pa.s", "mPa.s", "uPa.s", "cP", "P"), 1e-4, 2e3, "fluid", kind="viscosity"),
        Quantity("rho", "ρ", "density at the run's temperature", "kg/m3", "M L^-3", DENSITIES, 500.0, 3000.0,
                 "fluid", kind="density"),
        Quantity("nu", "ν", "kinematic viscosity at the run's temperature", "m2/s", "L^2 T^-1",
                 ("m2/s", "mm2/s", "cSt", "St"), 1e-7, 2.0, "fluid", kind="kinematic viscosity",
                 formula="mu / rho"),
        Quantity("lam", "λ", "relaxation time at the run's temperature", "s", "T", ("s", "ms", "us"), 1e-6,
                 1e4, "fluid", "not negative", "time"),
        # resolved from the material
        Quantity("E", "E", "Young's modulus", "Pa", "M L^-1 T^-2",
                 ("Pa", "kPa", "MPa", "GPa", "N/mm2"), 1e3, 4e11, "material", kind="modulus"),
        Quantity("rho_s", "ρ_s", "density of the material", "kg/m3", "M L^-3", DENSITIES, 100.0, 2.2e4,
                 "material", kind="density"),
        # typed on a swimmer
        _length("L_tail", "L_tail", "tail length", "swimmer", 1e-6),
        _length("L_body", "L_body", "overall length", "swimmer", 1e-6),
        _length("d", "d", "rod or wire diameter", "swimmer", high=0.05),
        _length("w", "w", "strip width", "swimmer", high=0.1),
        _length("t", "t", "strip thickness, in the bending direction", "swimmer", high=0.05),
        _length("D", "D", "tube outer diameter", "swimmer", high=0.05),
        _length("d_in", "d_in", "tube inner diameter", "swimmer", high=0.05),
        _length("R_helix", "R_h", "helix radius", "swimmer", high=0.1),
        _length("pitch", "p_h", "helix pitch", "swimmer", high=0.5),
        _length("b", "b", "head radius", "swimmer", high=0.1),
        _length("b_long", "b_long", "long semi-axis of a spheroidal head", "swimmer", high=0.2),
        Quantity("m_mag", "m", "magnetic moment", "A.m2", "L^2 I", ("A.m2", "mA.m2", "uA.m2", "nA.m2", "emu"),
                 1e-16, 10.0, "swimmer", kind="magnetic moment"),
        # typed on a rig
        Quantity("current_to_B", "k_B", "flux density per coil current", "T/A", "M T^-2 I^-2",
                 ("T/A", "mT/A", "uT/A", "G/A"), 1e-6, 1.0, "rig", kind="coil constant"),
        Quantity("turns", "N", "turns of each coil", "1", "", ("1",), 1, 1e5, "rig", kind="count"),
        _length("radius", "R", "coil radius", "rig", 1e-3, 5.0),
        Quantity("scale", "s", "camera scale", "m/px", "L", ("m/px", "mm/px", "um/px", "nm/px"), 1e-9, 1e-2,
                 "rig", kind="scale"),
        Quantity("fps", "fps", "camera frame rate", "1/s", "T^-1", ("1/s", "fps", "Hz"), 0.01, 1e6, "rig",
                 kind="frame rate"),
        # typed on a fluid
        Quantity("glycerol", "w", "glycerol mass fraction", "1", "", ("1", "wt%", "%"), 0.0, 1.0, "fluid",
                 "not negative", "mass fraction"),
        Quantity("grade", "ν₂₅", "nominal kinematic viscosity at 25 degC", "m2/s", "L^2 T^-1",
                 ("m2/s", "mm2/s", "cSt", "St"), 1e-7, 2.0, "fluid", kind="kinematic viscosity"),
        # typed on a published point
        Quantity("pure", "Π", "value of a dimensionless number", "1", "", ("1",), of="published", sign="any",
                 kind="pure number"),
        # derived
        Quantity("omega", "ω", "angular frequency", "rad/s", "T^-1", formula="2 * pi * f"),
        Quantity("I_area", "I", "second moment of area", "m4", "L^4"),
        Quantity("EI", "EI", "bending stiffness", "N.m2", "M L^3 T^-2", formula="E * I_area"),
        Quantity("a", "a", "equivalent radius of the tail", "m", "L"),
        Quantity("zeta_n", "ζ_n", "normal resistive coefficient per length", "Pa.s", "M L^-1 T^-1"),
        Quantity("zeta_t", "ζ_t", "tangential resistive coefficient per length", "Pa.s", "M L^-1 T^-1"),
        Quantity("A22", "A₂₂", "rotational resistance of the helix about its axis", "N.m.s",
                 "M L^2 T^-1", sign="not negative"),
        Quantity("U_model", "U_model", "speed that theory predicts", "m/s", "L T^-1", SPEEDS, sign="any"),
    )
}

RUN_KEYS = tuple(k for k, q in QUANTITIES.items() if q.of == "run")
SWIMMER_KEYS = tuple(k for k, q in QUANTITIES.items() if q.of == "swimmer")
RIG_KEYS = tuple(k for k, q in QUANTITIES.items() if q.of == "rig")
READING_KEYS = ("mu", "nu", "rho", "lam", "E")
# what a run's stored row holds: everything typed on run, swimmer, fluid and material, and what follows
RESOLVED_KEYS = tuple(
    k for k, q in QUANTITIES.items() if q.of not in ("rig", "published") and k not in ("glycerol", "grade")
)


def quantity(key: str) -> Quantity:
    """The row of a key; Refusal for an unknown one."""
    try:
        return QUANTITIES[key]
    except KeyError:
        raise Refusal("key", key, "no quantity has this key", f"one of {', '.join(QUANTITIES)}") from None
