"""From facts to the stored row: resolve each run's inputs, then every quantity and number with uncertainty."""

import json
from dataclasses import dataclass

import numpy as np

from labbook.book import resolve
from labbook.book.clock import local
from labbook.book.shelf import Item, Shelf
from labbook.book.stored_view import KEYS, SENTENCES
from labbook.physics import helices, rods, sections
from labbook.registry.catalogue import NUMBERS
from labbook.registry.formula import parse
from labbook.registry.quantities import QUANTITIES, RUN_KEYS, SWIMMER_KEYS
from labbook.registry.spread import Spread
from labbook.registry.typed import DIGITS

BLOCK = 4_000  # rows that stay in the processor's cache
BATCH = 16_000  # rows that a caller hands over at a time

STATED_BY_RIG = ("f", "theta0", "B", "T")


@dataclass
class RunFacts:
    """What was typed on a block of runs, as columns.

    values, u: key -> SI array (NaN absent); digits: key -> bool array, no uncertainty was typed;
    swimmer, fluid, rig: ids (rig 0 for none); days: ordinals of local dates; rotating: a rotating drive.
    """

    values: dict[str, np.ndarray]
    u: dict[str, np.ndarray]
    digits: dict[str, np.ndarray]
    swimmer: np.ndarray
    fluid: np.ndarray
    rig: np.ndarray
    days: np.ndarray
    drive: np.ndarray

    def __len__(self) -> int:
        return len(self.swimmer)

    def slice(self, start: int, stop: int) -> "RunFacts":
        """The facts of some of the runs."""
        part = slice(start, stop)
        return RunFacts(
            *({k: a[part] for k, a in table.items()} for table in (self.values, self.u, self.digits)),
            *(a[part] for a in (self.swimmer, self.fluid, self.rig, self.days, self.drive)),
        )


@dataclass
class Derived:
    """The stored row's contents for a block of runs: floats in stored order, sentences, marks."""

    floats: np.ndarray
    sentences: dict[str, np.ndarray]
    marks: list[str]
    material: np.ndarray  # ids, 0 for none


def facts_from(rows) -> RunFacts:
    """Columns from (swimmer_id, fluid_id, rig_id, at, drive, typed document) rows."""
    n = len(rows)
    keys = (*RUN_KEYS, "T_end")
    values = {k: np.full(n, np.nan) for k in keys}
    u = {k: np.zeros(n) for k in keys}
    digits = {k: np.zeros(n, bool) for k in keys}
    swimmer, fluid, rig, days = (np.zeros(n, np.int64) for _ in range(4))
    drive = np.empty(n, dtype=object)
    ordinals: dict[str, int] = {}
    for i, (swimmer_id, fluid_id, rig_id, at, how, typed) in enumerate(rows):
        swimmer[i], fluid[i], rig[i], drive[i] = swimmer_id, fluid_id, rig_id or 0, how
        if at not in ordinals:
            ordinals[at] = local(at).toordinal()
        days[i] = ordinals[at]
        for key, (_, _, value, spread, origin) in typed.items():
            values[key][i] = value
            u[key][i] = spread
            if origin == DIGITS:
                digits[key][i] = True
    return RunFacts(values, u, digits, swimmer, fluid, rig, days, drive)


def derive(facts: RunFacts, shelf: Shelf) -> Derived:
    """Every resolved quantity and number of the runs with its own and shared standard uncertainty.

    Takes any number of runs; a caller with more than BATCH of them keeps memory small by slicing.
    """
    values, u = dict(facts.values), {k: a.copy() for k, a in facts.u.items()}
    _rig_uncertainties(facts, shelf, values, u)
    _mean_temperature(values, u)
    batch = _batches(facts, shelf, values["T"], u["T"])
    swimmers, rigs = _Gathered(facts.swimmer, shelf.swimmers), _Gathered(facts.rig, shelf.rigs)
    floats = np.empty((len(facts), 3 * len(KEYS)))
    with np.errstate(all="ignore"):
        for rows in _groups(facts, shelf):
            group = shelf.swimmers[int(facts.swimmer[rows[0]])]
            for start in range(0, len(rows), BLOCK):
                block = rows[start : start + BLOCK]
                _fill(floats, block, _spread(block, group, facts, shelf, values, u, batch, swimmers, rigs))
    material = swimmers.pick(slice(None), lambda s: (s.texts["material_id"] or 0, 0.0))[0].astype(np.int64)
    sentences = {f"{k}_from": batch[k].said for k in ("mu", "rho", "lam", "E")}
    return Derived(floats, sentences, _marks(facts, shelf, batch), material)


ABSENT = (np.nan, 0.0)


class _Gathered:
    """Cells of shelf records spread over the runs that refer to them."""

    def __init__(self, ids, items):
        unique, self.which = np.unique(ids, return_inverse=True)
        self.items = [items.get(int(i)) for i in unique]

    def pick(self, block, cell):
        """(values, u) over a block of runs of `cell(record) -> (value, u)`."""
        cells = [cell(item) if item is not None else ABSENT for item in self.items]
        table = np.array(cells, dtype=float).reshape(-1, 2)
        which = self.which[block]
        return table[which, 0], table[which, 1]


def _rig_uncertainties(facts, shelf, values, u) -> None:
    """Where the digits alone tell the uncertainty, the rig's stated one is better."""
    for rig_id, rig in shelf.rigs.items():
        here = facts.rig == rig_id
        for key in STATED_BY_RIG:
            stated = rig.typed.get(f"u_{key}")
            if stated is None:
                continue
            rows = here & facts.digits[key]
            size = np.abs(values[key][rows]) if stated[4] == "relative" else 1.0
            u[key][rows] = stated[2] * size
            if key == "T":
                rows = here & facts.digits["T_end"]
                u["T_end"][rows] = stated[2] * (values["T_end"][rows] if stated[4] == "relative" else 1.0)


def _mean_temperature(values, u) -> None:
    """T_end given: T is the mean, and half the difference, rectangular, joins its uncertainty."""
    start, end = values["T"], values["T_end"]
    both = np.isfinite(start) & np.isfinite(end)
    if both.any():
        half = np.abs(end - start)[both] / 2
        # one thermometer: its uncertainty does not shrink by reading it twice
        larger = np.maximum(u["T"][both], u["T_end"][both])
        values["T"] = np.where(both, (start + end) / 2, start)
        u["T"][both] = np.sqrt(larger**2 + half**2 / 3)


def _batches(facts, shelf, T, u_T) -> dict[str, resolve.Resolved]:
    """mu, rho, lam by fluid and E by material, each run by its own day."""
    n = len(facts)
    found = {k: resolve.Resolved.empty(n, "") for k in ("mu", "rho", "lam", "E")}
    for fluid_id in np.unique(facts.fluid):
        rows = np.flatnonzero(facts.fluid == fluid_id)
        item, days = shelf.fluids[int(fluid_id)], facts.days[rows]
        rho = resolve.density(item, days, T[rows], u_T[rows])
        mu = resolve.viscosity(item, days, T[rows], u_T[rows], rho)
        for key, part in (("rho", rho), ("mu", mu), ("lam", resolve.relaxation_time(item, days))):
            found[key].put(rows, part.value, part.parts, part.said, part.beyond)
    for swimmer_id in np.unique(facts.swimmer):
        rows = np.flatnonzero(facts.swimmer == swimmer_id)
        swimmer = shelf.swimmers[int(swimmer_id)]
        material = shelf.materials.get(swimmer.texts["material_id"])
        if material is None:
            found["E"].said[rows] = f"absent: swimmer {swimmer.code} names no material"
        else:
            part = resolve.modulus(material, facts.days[rows])
            found["E"].put(rows, part.value, part.parts, part.said, part.beyond)
    return found


def section_of(swimmer: Item) -> str:
    """The swimmer's section, as stated or as its dimensions tell; '' where neither does."""
    if swimmer.texts["section"]:
        return swimmer.texts["section"]
    has = swimmer.typed
    return "rod" if "d" in has else "tube" if "D" in has else "strip" if "w" in has and "t" in has else ""


def _groups(facts, shelf):
    """Row indices by what changes the arithmetic: section, form and drive."""
    kind_of = {
        i: (section_of(s), s.texts["form"], "L_tail" in s.typed) for i, s in shelf.swimmers.items()
    }
    kinds = sorted(set(kind_of.values()), key=str)
    number = {i: kinds.index(k) for i, k in kind_of.items()}
    ids, which = np.unique(facts.swimmer, return_inverse=True)
    groups = np.array([number[int(i)] for i in ids])[which]
    for k in range(len(kinds)):
        rows = np.flatnonzero(groups == k)
        if len(rows):
            yield rows


def _spread(block, group, facts, shelf, values, u, batch, swimmers, rigs) -> Spread:
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


def _fill(floats, block, spread) -> None:
    columns = np.empty((3 * len(KEYS), len(block)))
    for i, key in enumerate(KEYS):
        three = columns[3 * i : 3 * i + 3]
        three[0] = spread.values[key]
        three[1] = spread.own(key)
        three[2] = spread.shared(key)
        # one absent or undefined value makes all three absent
        absent = ~np.isfinite(three.sum(axis=0))
        if absent.any():
            three[:, absent] = np.nan
    floats[block] = columns.T


def _marks(facts, shelf, batch) -> list[str]:
    """One small JSON text a run: key to list of marks."""
    flags = [("mu", batch["mu"].beyond, "extrapolated"), ("rho", batch["rho"].beyond, "extrapolated")]
    by_rig = {k: [i for i, rig in shelf.rigs.items() if f"u_{k}" in rig.typed] for k in STATED_BY_RIG}
    for key in RUN_KEYS:
        digits = facts.digits[key]
        flags.append((key, digits & ~np.isin(facts.rig, by_rig[key]) if by_rig.get(key) else digits, "from digits"))
    codes = sum(array.astype(np.int64) << i for i, (_, array, _) in enumerate(flags))
    unique, which = np.unique(codes, return_inverse=True)
    texts = [json.dumps({k: [m] for i, (k, _, m) in enumerate(flags) if code >> i & 1}) for code in unique]
    return [texts[i] for i in which]
