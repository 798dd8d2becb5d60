"""What each kind of record may hold: its columns, which are required, and the words a column accepts."""

from dataclasses import dataclass

from labbook.errors import Refusal

FLUID_KINDS = ("water", "glycerol-water", "silicone-oil", "measured")
FORMS = ("flexible tail", "rigid tail", "helix", "undulating", "hinged")
SECTIONS = ("rod", "strip", "tube")
DRIVES = (
    "free_head_angle", "free_head_torque", "pivoted_angle", "hinged_heave", "clamped_heave", "field", "motor",
)  # fmt: skip
STATES = ("kept", "void")
READ_FROM = ("mu", "nu", "rho", "lam", "E")


@dataclass(frozen=True)
class Kind:
    """One kind of record.

    texts: columns of plain text, in order; typed: columns holding quantities (column -> key of the
    vocabulary); spreads: columns holding a stated uncertainty (column -> key); words: column -> what it
    accepts; refers: column -> kind of record it names; dates, moments: columns holding those.
    """

    name: str
    sheet: str
    texts: tuple[str, ...]
    required: tuple[str, ...]
    typed: dict[str, str]
    words: dict[str, tuple[str, ...]]
    refers: dict[str, str]
    spreads: dict[str, str]
    dates: tuple[str, ...] = ()
    moments: tuple[str, ...] = ()

    @property
    def columns(self) -> tuple[str, ...]:
        return (*self.texts, *self.typed, *self.spreads)


def _same(*keys: str) -> dict[str, str]:
    return {k: k for k in keys}


KINDS: dict[str, Kind] = {
    k.name: k
    for k in (
        Kind(
            "fluid", "fluids", ("code", "kind", "made", "note"), ("code", "kind"),
            _same("glycerol", "grade", "rho", "lam"), {"kind": FLUID_KINDS}, {}, {}, ("made",),
        ),
        Kind(
            "material", "materials", ("code", "kind", "made", "note"), ("code",), _same("rho_s"), {}, {}, {},
            ("made",),
        ),
        Kind(
            "rig", "rigs", ("code", "kind", "calibrated", "note"), ("code",),
            _same("turns", "radius", "current_to_B", "scale", "fps"), {}, {},
            {"u_f": "f", "u_theta0": "theta0", "u_B": "B", "u_T": "T"}, ("calibrated",),
        ),
        Kind(
            "swimmer", "swimmers", ("code", "form", "material", "section", "parent", "built", "note"),
            ("code", "form", "L_body"),
            _same("L_body", "L_tail", "d", "w", "t", "D", "d_in", "R_helix", "pitch", "b", "b_long", "m_mag"),
            {"form": FORMS, "section": SECTIONS}, {"material": "material", "parent": "swimmer"}, {},
            ("built",),
        ),
        Kind(
            "reading", "readings", ("of", "key", "on", "how", "note"), ("of", "key", "value"),
            {"value": "", "T": "T"}, {"key": READ_FROM}, {}, {}, ("on",),
        ),
        Kind(
            "run", "runs",
            ("code", "swimmer", "fluid", "rig", "at", "by", "drive", "series", "video", "state", "why", "note"),
            ("swimmer", "fluid", "at", "f"),
            {**_same("f", "theta0", "h0", "B", "I_coil", "T"), "T_end": "T",
             **_same("U", "A_tip", "h_wall", "D_tank")},
            {"drive": DRIVES, "state": STATES}, {"swimmer": "swimmer", "fluid": "fluid", "rig": "rig"}, {},
            (), ("at",),
        ),
        Kind(
            "published", "published", ("series", "citation", "x", "x_dialect", "y", "y_dialect", "note"),
            ("series", "citation", "x", "x_value", "y", "y_value"),
            {"x_value": "pure", "y_value": "pure",
             **_same("L_tail", "L_body", "d", "w", "t", "D", "d_in", "R_helix", "pitch")},
            {}, {}, {},
        ),
    )
}  # fmt: skip

SHEETS = {k.sheet: k.name for k in KINDS.values()}
# a sheet may name what an earlier one brings
LOADING_ORDER = ("fluid", "material", "swimmer", "rig", "reading", "run", "published")


def kind(name: str) -> Kind:
    """The kind of a name; Refusal for an unknown one."""
    try:
        return KINDS[name]
    except KeyError:
        raise Refusal("kind", name, "is no kind of record", f"one of {', '.join(KINDS)}") from None
