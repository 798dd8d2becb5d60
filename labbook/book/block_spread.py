"""The arithmetic of one block of runs alike in section and form: every value with its parts by source."""

import numpy as np

from labbook.book.shelf import Item
from labbook.physics import helices, rods, sections
from labbook.registry.catalogue import NUMBERS
from labbook.registry.formula import parse
from labbook.registry.quantities import QUANTITIES, RUN_KEYS, SWIMMER_KEYS
from labbook.registry.spread import Spread

ABSENT = (np.nan, 0.0)


def distinct(ids: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(the ids that occur, ascending, and which of them each is): np.unique for small counts, without sorting."""
    occur = np.flatnonzero(np.bincount(ids))
    place = np.empty(occur[-1] + 1, np.int64)
    place[occur] = np.arange(len(occur))
    return occur, place[ids]


class Gathered:
    """Cells of shelf records spread over the runs that refer to them."""

    def __init__(self, ids, items):
        unique, self.which = distinct(ids)
        self.items = [items.get(int(i)) for i in unique]

    def pick(self, block, cell):
        """(values, u) over a block of runs of `cell(record) -> (value, u)`."""
        cells = [cell(item) if item is not None else ABSENT for item in self.items]
        table = np.array(cells, dtype=float).reshape(-1, 2)
        which = self.which[block]
        return table[which, 0], table[which, 1]


def section_of(swimmer: Item) -> str:
    """The swimmer's section, as stated or as its dimensions tell; '' where neither does."""
    if swimmer.texts["section"]:
        return swimmer.texts["section"]
    has = swimmer.typed
    return "rod" if "d" in has else "tube" if "D" in has else "strip" if "w" in has and "t" in has else ""


def spread_of(block, group, facts, shelf, values, u, batch, swimmers, rigs) -> Spread:
    spread = Spread()
    n = len(block)
    for key in RUN_KEYS:
        spread.measured(key, values[key][block], u[key][block])
    _flux_density(spread, block, rigs)
    _swimmer_lengths(spread, block, swimmers, group)
    for key in ("mu", "rho", "lam", "E"):
        spread.values[key] = batch[key].value[block]
        spread.parts[key] = {s: p[block] for s, p in batch[key].parts.items()}
    spread.measured("rho_s", *swimmers.pick(block, lambda s: _material_cell(shelf, s, "rho_s")))
    section = section_of(group)
    for key in ("omega", "nu"):
        _by_formula(spread, key, QUANTITIES[key].formula)
    _section(spread, section, n)
    _by_formula(spread, "EI", QUANTITIES["EI"].formula)
    _drag(spread, section)
    _helix(spread, group.texts["form"], n)
    for key, row in NUMBERS.items():
        spread.follow((key,), _keyworded(row.parsed), row.inputs)
    _undefined(spread, facts.drive[block])
    return spread


def _keyworded(parsed):
    return lambda **inputs: parsed.value(inputs)


def _by_formula(spread, key, text) -> None:
    parsed = parse(text, QUANTITIES)
    spread.follow((key,), _keyworded(parsed), parsed.keys)


def _flux_density(spread, block, rigs) -> None:
    """B = current_to_B I_coil where B was not typed."""
    constant, u_constant = rigs.pick(block, lambda rig: _cell(rig, "current_to_B"))
    missing = ~np.isfinite(spread.values["B"])
    current = spread.values["I_coil"]
    if not (missing & np.isfinite(current) & np.isfinite(constant)).any():
        return
    parts = spread.parts["B"]
    spread.values["B"] = np.where(missing, constant * current, spread.values["B"])
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
        spread.values[key] = value
        # a dimension that no swimmer of the block has is no source of anything
        spread.parts[key] = {key: u} if np.isfinite(value).any() else {}
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


def _drag(spread, section) -> None:
    """Resistive coefficients by the house drag model; a strip that bends in t moves broadside."""
    model = rods.HOUSE_MODEL
    if section == "strip":
        inputs = ("mu", "L_tail", "w", "t")

        def function(mu, L_tail, w, t):
            return rods.resistive_coefficients(
                model=model, L=L_tail, a=sections.strip_radius(w=w, t=t), mu=mu, flatness=t / (w + t)
            )

    else:
        inputs = ("mu", "L_tail", "a")

        def function(mu, L_tail, a):
            return rods.resistive_coefficients(model=model, L=L_tail, a=a, mu=mu)

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


def _undefined(spread, drives) -> None:
    """Numbers that are absent by rule: a divisor consistent with zero, a drive they are not made for."""
    for key, row in NUMBERS.items():
        absent = np.zeros(len(drives), bool)
        if row.not_zero:
            spread_u = np.hypot(spread.own(row.not_zero), spread.shared(row.not_zero))
            absent |= np.abs(spread.values[row.not_zero]) <= 2 * spread_u
        if row.only_drives:
            absent |= ~np.isin(drives.astype(str), row.only_drives)
        if absent.any():
            spread.values[key] = np.where(absent, np.nan, spread.values[key])
