"""The group's numbers at birth, one row each: formula, what it compares, source, worked example, answer."""

import math
from collections.abc import Mapping
from dataclasses import dataclass, field, fields

from labbook.errors import Refusal
from labbook.registry.formula import Formula, parse, pure
from labbook.registry.quantities import QUANTITIES, written_dimension


@dataclass(frozen=True)
class Number:
    """A dimensionless number; construction proves it pure and recomputes its worked example.

    formula: text over the vocabulary; dialect: the choices it stands for, as shown beside it;
    example: SI inputs; answer: the example's value as the source gives it; tolerance: relative, from the
    digits of the answer. not_zero: the key whose value must differ from zero (|x| > 2 u) for the number
    to be defined. only_drives: the drives it is defined for (empty: all).
    Errors: Refusal where the formula is not pure, the example lacks an input or disagrees.
    """

    key: str
    symbol: str
    name: str
    formula: str
    compares: str
    source: str
    example: Mapping[str, float]
    answer: float
    tolerance: float = 1e-3
    dialect: str = ""
    signed: bool = False
    not_zero: str = ""
    only_drives: tuple[str, ...] = ()
    parsed: Formula = field(init=False, repr=False)

    def __post_init__(self):
        if not self.key.isidentifier() or self.key in QUANTITIES:
            raise Refusal("key", self.key, "a number's key is a new plain identifier")
        if not (self.source.strip() and self.compares.strip() and self.name.strip()):
            raise Refusal(self.key, None, "a number needs a name, what it compares and a source")
        parsed = parse(self.formula, QUANTITIES)
        object.__setattr__(self, "parsed", parsed)
        if not parsed.keys:
            raise Refusal("formula", self.formula, "holds no quantity", "write e.g. rho * U * L_body / mu")
        left_over = parsed.dimension({k: q.dimension for k, q in QUANTITIES.items()})
        if not pure(left_over):
            raise Refusal(
                "formula", self.formula, f"not a pure number: {written_dimension(left_over)} is left over"
            )
        missing = [k for k in parsed.keys if k not in self.example]
        if missing:
            raise Refusal("example", None, f"the worked example lacks {', '.join(missing)}")
        if not 0 < self.tolerance <= 0.05:
            raise Refusal(self.key, self.tolerance, "the example's tolerance must lie in 0 to 5 %")
        try:
            found = float(parsed.value(self.example))
        except (ArithmeticError, TypeError, ValueError):
            raise Refusal("formula", self.formula, "has no value for the worked example") from None
        if not math.isclose(found, self.answer, rel_tol=self.tolerance):
            raise Refusal(
                "answer", self.answer, f"the worked example gives {found:.6g}",
                "mend formula, example or answer",
            )

    @property
    def inputs(self) -> tuple[str, ...]:
        """The keys of its formula, in order of first appearance."""
        return self.parsed.keys

    def content(self) -> dict:
        """The row as plain JSON-able values, its key aside; `Number(key, **content)` makes it again."""
        told = {f.name: getattr(self, f.name) for f in fields(self) if f.init and f.name != "key"}
        return told | {"example": dict(self.example), "only_drives": list(self.only_drives)}


ROTATING_DRIVES = ("field", "motor")

NUMBERS: dict[str, Number] = {
    n.key: n
    for n in (
        Number(
            "Re", "Re", "Reynolds number", "rho * U * L_body / mu",
            "inertia of the swum flow to viscosity", "ISO 80000-11:2019, 11-4.1; Purcell 1977",
            # bull sperm, 60 um at 100 um/s in water: from memory
            dict(rho=1000.0, U=100e-6, L_body=60e-6, mu=1e-3), 6e-3, signed=True,
            dialect="length: L_body",
        ),
        Number(
            "Re_omega", "Re_ω", "oscillatory Reynolds number", "rho * omega * L_tail**2 / mu",
            "unsteady inertia to viscosity", "Lauga & Powers, Rep. Prog. Phys. 72:096601 (2009)",
            dict(rho=970.0, omega=2 * math.pi * 2.0, L_tail=0.020, mu=1.0), 4.875752, 1e-6,
            dialect="rate: omega; length: L_tail",
        ),
        Number(
            "Wo", "Wo", "Womersley number", "L_tail * (omega / nu)**0.5",
            "tail length to the thickness of the oscillating viscous layer",
            "Womersley, J. Physiol. 127:553 (1955); the square is Re_omega",
            # L over the penetration depth 12.80926 mm, times sqrt 2
            dict(L_tail=0.020, omega=2 * math.pi * 2.0, nu=1.0 / 970.0), 0.020 / 12.80926e-3 * math.sqrt(2),
            1e-6, dialect="rate: omega; length: L_tail",
        ),
        Number(
            "Sp", "Sp", "sperm number", "L_tail * (zeta_n * omega / EI)**0.25",
            "viscous to elastic forces on a beating tail",
            "Wiggins & Goldstein, Phys. Rev. Lett. 80:3879 (1998); "
            "Lowe, Phil. Trans. R. Soc. B 358:1543 (2003)",
            # L 20 mm, d 1 mm, E 1.5 MPa, mu 1 Pa.s, 2 Hz, spheroid coefficient; recomputed independently
            dict(L_tail=0.020, zeta_n=2.99994, omega=2 * math.pi * 2.0, EI=7.3631078e-8), 3.00847, 1e-5,
            dialect="length: L_tail; rate: omega; coefficient: zeta_n of the house drag model; power: 1/4",
        ),
        Number(
            "St", "St", "Strouhal number", "f * A_tip / U",
            "tip speed to swimming speed",
            "Taylor, Nudds & Thomas, Nature 425:707 (2003); ISO 80000-11:2019, 11-4.22 writes Sr",
            # Bainbridge's relation V = L(3f-4)/4 for L = 0.30 m, f = 10 Hz, A = 0.2 L: from memory
            dict(f=10.0, A_tip=0.06, U=1.95), 0.308, signed=True, not_zero="U",
            dialect="amplitude: A_tip peak to peak; rate: f",
        ),
        Number(
            "Sw", "Sw", "swimming number", "omega * A_tip * L_body / nu",
            "tip speed times body length to kinematic viscosity",
            "Gazzola, Argentina & Mahadevan, Nature Physics 10:758 (2014)",
            dict(omega=2 * math.pi, A_tip=0.01, L_body=0.1, nu=1e-6), 6283.185, 1e-6,
            dialect="rate: omega; amplitude: A_tip peak to peak",
        ),
        Number(
            "stride", "U/(f L_body)", "stride length", "U / (f * L_body)",
            "distance swum per beat to body length", "Videler, Fish Swimming (1993)",
            # Bainbridge's relation again: 0.65 lengths a beat
            dict(U=1.95, f=10.0, L_body=0.30), 0.65, signed=True, dialect="rate: f; length: L_body",
        ),
        Number(
            "U_scaled", "U/(ω L_tail θ₀²)", "scaled speed", "U / (omega * L_tail * theta0**2)",
            "speed to the small-angle scale of a driven tail",
            "Wiggins & Goldstein, Phys. Rev. Lett. 80:3879 (1998); Lauga, Phys. Rev. E 75:041916 (2007)",
            dict(U=7.43970681e-5, omega=2 * math.pi, L_tail=0.030, theta0=0.3), 4.38547e-3, 1e-5, signed=True,
            dialect="rate: omega; length: L_tail",
        ),
        Number(
            "De", "De", "Deborah number", "lam * omega",
            "relaxation time of the fluid to the time of a beat", "ISO 80000-11:2019, 11-7.8",
            dict(lam=0.5, omega=2 * math.pi), math.pi, 1e-9, dialect="rate: omega",
        ),
        Number(
            "Mn", "Mn", "magnetoelastic number", "m_mag * B * L_tail / EI",
            "magnetic torque on the head to the tail's elastic torque",
            "magnet-headed definition, after Dreyfus et al., Nature 437:862 (2005), "
            "whose filament is magnetic",
            # 1 mm sphere of 1.3 T in 5 mT: torque 2.70833e-6 N.m
            dict(m_mag=5.41667e-4, B=5e-3, L_tail=0.020, EI=7.3631078e-8), 2.70833e-6 * 0.020 / 7.3631078e-8,
            1e-5, dialect="length: L_tail",
        ),
        Number(
            "f_ratio", "f/f_stepout", "drive to step-out frequency",
            "2 * pi * f * (8 * pi * mu * b**3 + A22) / (m_mag * B)",
            "viscous torque of the rotating swimmer to the largest magnetic torque",
            "torque balance, e.g. Ishiyama et al., Sens. Actuators A 91:141 (2001)",
            # a 1.3 T sphere in 5 mT and 1 Pa.s steps out at 137.206 Hz, whatever its size: here at half of
            # it, so that a stray square shows
            dict(f=137.206 / 2, mu=1.0, b=0.5e-3, A22=0.0, m_mag=5.41667e-4, B=5e-3), 0.5, 1e-4,
            dialect="rotating drive", only_drives=ROTATING_DRIVES,
        ),
        Number(
            "zeta_ratio", "ζ_n/ζ_t", "drag anisotropy", "zeta_n / zeta_t",
            "broadside to lengthwise resistance of the tail",
            "Tirado & Garcia de la Torre, J. Chem. Phys. 71:2581 (1979)",
            dict(zeta_n=2.30743, zeta_t=1.42542), 1.61877, 1e-5, dialect="house drag model",
        ),
        Number(
            "slenderness", "L/2a", "slenderness", "L_tail / (2 * a)",
            "tail length to its equivalent diameter", "common practice, no source",
            dict(L_tail=0.020, a=5e-4), 20.0, 1e-9, dialect="length: L_tail",
        ),
        Number(
            "wall", "b/h", "wall closeness", "b / h_wall",
            "head radius to the distance of the nearest wall",
            "Happel & Brenner, Low Reynolds Number Hydrodynamics (1965)",
            dict(b=2e-3, h_wall=0.02), 0.1, 1e-9, dialect="head radius: b",
        ),
        Number(
            "U_ratio", "U/U_model", "measured to predicted speed", "U / U_model",
            "what was seen to what linear theory says of this swimmer",
            "Lauga, Phys. Rev. E 75:041916 (2007), for tails; the run's sheet names the model of its form and drive",
            # the nonlinear simulation of the SI case to its linear speed, which is 0.85 % high there (up to 3 % at
            # 0.3 rad near the maximum: physics.tails.THETA0_CHECKED)
            dict(U=7.37698e-5, U_model=7.43970681e-5), 1 / 1.0085, 1e-4, signed=True,
        ),
        Number(
            "F_scaled", "F/(Δζ ω L_tail² θ₀²)", "scaled push",
            "U * (zeta_t * L_tail + 6 * pi * mu * b)"
            " / ((zeta_n - zeta_t) * omega * L_tail**2 * theta0**2)",
            "the push that the speed tells of to the small-angle push of a tail: swimmers of other heads and drag"
            " ratios come closer together than by U_scaled, not onto one curve",
            "Wiggins & Goldstein, Phys. Rev. Lett. 80:3879 (1998); Stokes's drag of a sphere as the head",
            # L 30 mm, d 1 mm, b 2 mm, 1 Pa.s, 1 Hz, 0.3 rad: push 6.70625393e-6 N, recomputed independently
            dict(U=7.43970681e-5, zeta_t=1.7480754, zeta_n=2.73518245, L_tail=0.030, mu=1.0, b=2e-3,
                 omega=2 * math.pi, theta0=0.3),
            6.70625393e-6 / ((2.73518245 - 1.7480754) * 2 * math.pi * (0.030 * 0.3) ** 2), 1e-6, signed=True,
            dialect="rate: omega; length: L_tail; head: sphere of radius b", only_drives=("free_head_angle",),
        ),
    )
}


def number(key: str) -> Number:
    """The row of a key; Refusal for an unknown one."""
    try:
        return NUMBERS[key]
    except KeyError:
        raise Refusal("key", key, "no number has this key", f"one of {', '.join(NUMBERS)}") from None
