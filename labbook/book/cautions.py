"""Cautions: what to mind with magnets, coils, light, fluids, casting and samples, and which stands where."""

_DEFERS = "Your local rules and the responsible safety officer decide."

CAUTIONS = {
    "magnets": (
        "Magnets: strong ones snap together and pinch; keep them away from pacemakers and other implants, "
        f"tools, cards and balances. {_DEFERS}"
    ),
    "coils": (
        "Coils: the heat grows with the square of the current and warms the bath too; check coil temperature "
        f"and insulation, and switch off before touching terminals. {_DEFERS}"
    ),
    "light": (
        "Lasers and strong light: block stray beams and mirrors at eye height, wear the eyewear that fits "
        f"the class and wavelength, mind flicker. {_DEFERS}"
    ),
    "drives": f"Motors: keep hair, sleeves and cables out of moving parts; cut the power first. {_DEFERS}",
    "solvents": (
        "Solvents: read the safety data sheet first, ventilate, keep away from flames, wear the gloves it "
        f"names, collect the waste. {_DEFERS}"
    ),
    "oils": (
        "Silicone oils: spills stay slippery, wipe them at once; none goes down the drain, and none near "
        f"surfaces that must bond. {_DEFERS}"
    ),
    "casting": (
        "Casting: uncured silicone, resin and their hardeners irritate skin and lungs; gloves, ventilation, "
        f"and the safety data sheet. {_DEFERS}"
    ),
    "biological": (
        "Biological samples: work at the containment that applies to them, disinfect rig and tank, autoclave "
        f"or collect the waste. {_DEFERS}"
    ),
}

# which caution stands where a kind of record is added
ADDED = {
    "fluid": ("solvents", "oils", "biological"),
    "material": ("casting", "solvents"),
    "swimmer": ("magnets",),
    "rig": ("magnets", "coils", "light", "drives"),
}


def of_fluid(kind: str) -> tuple[str, ...]:
    """The cautions where a fluid of a kind is chosen."""
    match kind:
        case "silicone-oil":
            return ("oils",)
        case "water":
            return ("biological",)
        case "measured":
            return ("solvents", "biological")
    return ("solvents",)


def of_rig(cells) -> tuple[str, ...]:
    """The cautions where a rig is chosen; cells: its columns as typed."""
    kind = str(cells.get("kind", "")).lower()
    coils = any(cells.get(c) for c in ("current_to_B", "turns")) or "coil" in kind
    motor = "motor" in kind or not coils
    return (*(("magnets", "coils") if coils else ()), *(("drives",) if motor else ()), "light")


def at_the_bench(fluid_kind: str, rig_cells) -> tuple[str, ...]:
    """The cautions of a trial with this fluid and this rig ({} for none)."""
    return tuple(dict.fromkeys((*(of_rig(rig_cells) if rig_cells else ()), *of_fluid(fluid_kind))))


def of_record(kind: str, cells) -> tuple[str, ...]:
    """The cautions where a record of the shelf is opened."""
    if kind == "fluid":
        return of_fluid(cells.get("kind", ""))
    if kind == "rig":
        return of_rig(cells)
    if kind == "swimmer":
        return ("magnets",) if cells.get("m_mag") or cells.get("b") else ()
    return ("casting",)
