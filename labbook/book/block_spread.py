"""The arithmetic of one block of runs alike in section and form: every value with its parts by source."""

import numpy as np

from labbook.book.block_model import PREDICTED, model_for, predict
from labbook.book.gathering import ABSENT, BATCH_KEYS, Gathering
from labbook.book.shelf import Item
from labbook.physics import helices, rods, sections
from labbook.registry.dialects import coefficient
from labbook.registry.formula import parse
from labbook.registry.group import Registry
from labbook.registry.quantities import QUANTITIES, RUN_KEYS, SWIMMER_KEYS
from labbook.registry.spread import Spread


def section_of(swimmer: Item) -> str:
    """The swimmer's section, as stated or as its dimensions tell; '' where neither does."""
    if swimmer.texts["section"]:
        return swimmer.texts["section"]
    has = swimmer.typed
    return "rod" if "d" in has else "tube" if "D" in has else "strip" if "w" in has and "t" in has else ""


# what the resolved keys follow from, beside the formulas of their own rows
FOLLOWS = {
    "omega": ("f",), "nu": ("mu", "rho"), "EI": ("E", "I_area"), "zeta_n": ("mu", "L_tail", "a"),
    "zeta_t": ("mu", "L_tail", "a"), "A22": ("R_helix", "pitch", "L_tail", "a", "mu"),
    "U_model": ("omega", "L_tail", "EI", "zeta_n", "zeta_t", "a", "mu", "nu", "theta0", "h0", "m_mag", "B", "b", "b_long",
                "h_wall", "D_tank", "R_helix", "pitch", "A_tip", "L_body"),
}  # fmt: skip


def needed(registry: Registry, wanted: tuple[str, ...]) -> frozenset[str]:
    """Every key that some numbers follow from, themselves included; all keys where none is named."""
    if not wanted:
        return frozenset((*registry.keys, "A22"))
    found, waiting = set(), list(wanted)
    while waiting:
        key = waiting.pop()
        if key not in found:
            found.add(key)
            waiting += registry.numbers[key].inputs if key in registry.numbers else FOLLOWS.get(key, ())
            waiting += ("rho",) if key == "mu" else ()  # a viscosity may be read as nu
    return frozenset(found)


def spread_of(gathered: Gathering, block, registry: Registry, wanted: tuple[str, ...] = ()) -> Spread:
    """The values and parts of a block of runs alike in section, form and drive.

    block: their row indices; wanted: only what these numbers follow from.
    """
    group = gathered.shelf.swimmers[int(gathered.facts.swimmer[block[0]])]
    spread = measured_of(gathered, block, group)
    drive = str(gathered.facts.drive[block[0]])
    follow(spread, group, drive, registry, needed(registry, wanted))
    undefined(spread, drive, registry, wanted)
    return spread


def measured_of(gathered: Gathering, block, group: Item) -> Spread:
    """What was measured, set, read or looked up for a block of runs: everything that the rest follows from."""
    spread = Spread()
    for key in RUN_KEYS:
        _measured(spread, key, gathered.values[key][block], gathered.u[key][block])
    _camera_scale(spread, block, gathered.facts.scale_u)
    _flux_density(spread, block, gathered.rigs)
    _swimmer_lengths(spread, block, gathered.swimmers, group)
    for key in BATCH_KEYS:
        spread.values[key] = gathered.batch[key].value[block]
        spread.parts[key] = {s: p[block] for s, p in gathered.batch[key].parts.items()}
    densities = gathered.swimmers.pick(block, lambda s: _material_cell(gathered.shelf, s, "rho_s"))
    spread.measured("rho_s", *densities)
    return spread


def follow(spread: Spread, group: Item, drive: str, registry: Registry, keys: frozenset[str]) -> None:
    """Enter those of `keys` that follow from what was measured: resolved quantities, then numbers."""
    section, form, n = section_of(group), group.texts["form"], len(spread.values["f"])
    for key in ("omega", "nu"):
        if key in keys:
            _by_formula(spread, key, QUANTITIES[key].formula)
    if keys & {"I_area", "a"}:
        _section(spread, section, n)
    if "EI" in keys:
        _by_formula(spread, "EI", QUANTITIES["EI"].formula)
    if keys & {"zeta_n", "zeta_t"}:
        _drag(spread, section, registry.coefficient)
    if "A22" in keys:
        _helix(spread, form, n)
    if PREDICTED in keys:
        predict(spread, model_for(form, drive, registry.coefficient))
    for key, row in registry.numbers.items():
        if key in keys:
            spread.follow((key,), _keyworded(row.parsed), row.inputs)


def _measured(spread, key, value, u) -> None:
    """Enter what was measured on some run of the block; what was on none is no source of anything."""
    spread.measured(key, value, u)
    if not np.isfinite(value).any():
        spread.parts[key] = {}


def _keyworded(parsed):
    return lambda **inputs: parsed.value(inputs)


def _by_formula(spread, key, text) -> None:
    parsed = parse(text, QUANTITIES)
    spread.follow((key,), _keyworded(parsed), parsed.keys)


def _camera_scale(spread, block, scale_u) -> None:
    """Lengths from tracks have a part from the camera's scale, which all runs of the rig share."""
    for key, relative in scale_u.items():
        here = relative[block]
        if here.any():
            spread.parts[key]["scale"] = here * np.nan_to_num(spread.values[key])


def _flux_density(spread, block, rigs) -> None:
    """B = current_to_B I_coil where B was not typed."""
    constant, u_constant = rigs.pick(block, lambda rig: _cell(rig, "current_to_B"))
    missing = ~np.isfinite(spread.values["B"])
    current = spread.values["I_coil"]
    if not (missing & np.isfinite(current) & np.isfinite(constant)).any():
        return
    parts = spread.parts["B"]
    spread.values["B"] = np.where(missing, constant * current, spread.values["B"])
    if "B" in parts:
        parts["B"] = np.where(missing, 0.0, parts["B"])
    parts["I_coil"] = np.where(missing, constant * spread.parts["I_coil"]["I_coil"], 0.0)
    parts["current_to_B"] = np.where(missing, current * u_constant, 0.0)


def _cell(item: Item, key: str):
    return (item.typed[key][2], item.typed[key][3]) if key in item.typed else ABSENT


def _material_cell(shelf, swimmer, key):
    material = shelf.materials.get(swimmer.texts["material_id"])
    return _cell(material, key) if material is not None else ABSENT


def _swimmer_lengths(spread, block, swimmers, group) -> None:
    for key in SWIMMER_KEYS:
        value, u = swimmers.pick(block, lambda s, key=key: _cell(s, key))
        _measured(spread, key, value, u)
    if group.texts["form"] == "undulating" and "L_tail" not in group.typed:
        spread.values["L_tail"] = spread.values["L_body"]
        spread.parts["L_tail"] = dict(spread.parts["L_body"])


_SECTIONS = {
    "rod": (("d",), lambda d: (sections.rod_second_moment(d=d), sections.rod_radius(d=d))),
    "strip": (
        ("w", "t"), lambda w, t: (sections.strip_second_moment(w=w, t=t), sections.strip_radius(w=w, t=t)),
    ),
    "tube": (
        ("D", "d_in"),
        lambda D, d_in: (sections.tube_second_moment(D=D, d_in=d_in), sections.tube_radius(D=D)),
    ),
}  # fmt: skip


def _section(spread, section, n) -> None:
    if section in _SECTIONS:
        inputs, function = _SECTIONS[section]
        spread.follow(("I_area", "a"), function, inputs)
    else:
        for key in ("I_area", "a"):
            spread.measured(key, np.full(n, np.nan), np.zeros(n))


def _drag(spread, section, coefficient_name) -> None:
    """Resistive coefficients by the house drag model; a strip that bends in t moves broadside."""
    inputs = ("mu", "L_tail", "w", "t") if section == "strip" else ("mu", "L_tail", "a")
    model = coefficient_name if coefficient_name in rods.MODELS else rods.HOUSE_MODEL

    def function(mu, L_tail, a=None, w=None, t=None):
        flatness = 0.5 if w is None else t / (w + t)
        a = a if w is None else sections.strip_radius(w=w, t=t)
        zeta_n, zeta_t = rods.resistive_coefficients(model=model, L=L_tail, a=a, mu=mu, flatness=flatness)
        if coefficient_name != model:
            zeta_n = coefficient(coefficient_name, dict(L_tail=L_tail, a=a, mu=mu))
        return zeta_n, zeta_t

    spread.follow(("zeta_n", "zeta_t"), function, inputs)


def _helix(spread, form, n) -> None:
    if form == "helix":
        spread.follow(
            ("A22",),
            lambda R_helix, pitch, L_tail, a, mu: helices.resistance(
                R=R_helix, pitch=pitch, L=L_tail, a=a, mu=mu
            )[2],
            ("R_helix", "pitch", "L_tail", "a", "mu"),
        )
    else:
        spread.values["A22"], spread.parts["A22"] = np.zeros(n), {}


def undefined(spread: Spread, drive: str, registry: Registry, wanted: tuple[str, ...] = ()) -> None:
    """Numbers that are absent by rule: a divisor consistent with zero, a drive they are not made for."""
    for key in wanted or registry.numbers:
        row = registry.numbers[key]
        absent = np.zeros(len(spread.values["f"]), bool)
        if row.not_zero:
            spread_u = np.hypot(spread.own(row.not_zero), spread.shared(row.not_zero))
            absent |= np.abs(spread.values[row.not_zero]) <= 2 * spread_u
        if row.only_drives and drive not in row.only_drives:
            absent[:] = True
        if absent.any():
            spread.values[key] = np.where(absent, np.nan, spread.values[key])
