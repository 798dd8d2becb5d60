"""What a reduced track says: a row for JSON and CSV, a report for the bench, a line among many."""

import math
from collections.abc import Iterable, Sequence
from dataclasses import fields

import numpy as np
import pandas as pd

from labbook.book.reduced_cells import handy, handy_unit
from labbook.cli_print import aligned
from labbook.cli_reduce_many import Reduced
from labbook.exchange.outward import frame_as_csv
from labbook.physics.track_paths import FreePath
from labbook.physics.tracks import Closure, Reduction, closure
from labbook.registry.units import from_si
from labbook.registry.written import written

KEYS = (
    "U", "u_U", "U_low", "U_high", "f_beat", "u_f_beat", "amplitude", "u_amplitude", "net_per_cycle",
    "u_net_per_cycle", "p_zero", "A_tip", "u_A_tip", "cycles", "frames", "gaps", "axis", "drift",
)  # fmt: skip
MORE = ("u_drift", "axis_from", "trimmed", "rejected", "lost", "duplicates", "unreadable", "excursion")
UNITS = {
    **dict.fromkeys(("U", "U_low", "U_high", "drift_x", "drift_y", "slowest_cycle", "fastest_cycle"), "m/s"),
    **dict.fromkeys(("amplitude", "net_per_cycle", "A_tip", "excursion"), "m"), "f_beat": "Hz",
    **dict.fromkeys(("steadiness_trend", "steadiness_u_trend"), "m/s2"),
    **dict.fromkeys(("free_path_D", "free_path_u_D"), "m2/s"), **dict.fromkeys(("free_path_v", "free_path_u_v"), "m/s"),
    **dict.fromkeys(("free_path_tau", "free_path_u_tau"), "s"),
    **dict.fromkeys(("free_path_curvature", "free_path_u_curvature"), "1/m"),
}  # fmt: skip
PARTS = {  # of a row, and which of their figures a line of CSV has
    "steadiness": ("trend", "u_trend", "p_trend"),
    "closure": ("ratio", "bound", "detection_limit", "closes"),
    "free_path": ("D", "u_D", "v", "u_v", "tau", "u_tau", "Pe", "curvature", "u_curvature"),
}


def row(done: Reduced) -> dict:
    """The figures of one track by the names of physics.tracks.Reduction, SI, null where absent, then more.

    closure: of the path, where there is a beat; free_path: of a path without one.
    """
    r = done.reduction
    found = {key: _plain(getattr(r, key)) for key in (*KEYS, *MORE)}
    parts = {"steadiness": r.steadiness, "closure": closed(r), "free_path": done.path}
    return found | {name: None if part is None else _fields(part) for name, part in parts.items()}


def closed(r: Reduction) -> Closure | None:
    """Whether the path closes; None without a beat to compare with."""
    return closure(reduction=r) if r.f_beat is not None and r.excursion else None


def as_csv(done: Iterable[Reduced]) -> str:
    """CSV in SI, one row a track; vectors as two columns, of the speeds a cycle the slowest and the fastest."""
    rows = []
    for one in done:
        flat, figures = {"track": one.name}, row(one)
        for key, value in figures.items():
            if key in ("axis", "drift", "u_drift"):
                flat |= {f"{key}_x": value[0], f"{key}_y": value[1]}
            elif key not in PARTS:
                flat[key] = value
        for name, keys in PARTS.items():
            flat |= {f"{name}_{key}": (figures[name] or {}).get(key) for key in keys}
        cycles = _cycles(one.reduction)
        flat |= {"slowest_cycle": min(cycles, default=None), "fastest_cycle": max(cycles, default=None)}
        rows.append(flat)
    table = pd.DataFrame(rows, dtype=object)
    table.attrs["units"] = UNITS
    return frame_as_csv(table)


def report(done: Reduced) -> str:
    """A short text that can be read at the bench."""
    r = done.reduction
    lines = [("speed", f"{handy('U', r.U, r.u_U)}   95 %: {_interval(r)}   {_axis(r)}")]
    if r.f_beat is None:
        lines.append(("beat", f"none seen; probability of no motion {_probability(r.p_zero)}"))
    else:
        f = written(r.f_beat, r.u_f_beat, "Hz") + ("" if r.u_f_beat else " as given")
        net = handy("A_tip", r.net_per_cycle, r.u_net_per_cycle)
        lines += [
            ("beat", f"{f}, {r.cycles:.1f} cycles"),
            ("amplitude", f"{handy('A_tip', r.amplitude, r.u_amplitude)} along the axis, half the beat"),
            ("net a cycle", f"{net}; probability of none {_probability(r.p_zero)}"),
        ]  # fmt: skip
    if r.A_tip is not None:
        lines.append(("tail tip", f"{handy('A_tip', r.A_tip, r.u_A_tip)} peak to peak"))
    if any((*r.drift, *r.u_drift)):
        both = (handy("U", v, u) for v, u in zip(r.drift, r.u_drift, strict=True))
        lines.append(("drift", f"{', '.join(both)} taken off"))
    lines.append(("left out", left_out(r)))
    if r.steadiness is not None:
        lines.append(("steadiness", _steadiness(r)))
    if (path := closed(r)) is not None and path.closes:
        lines.append(("closes", f"{path.sentence} (detection limit {100.0 * path.detection_limit:.2g} %)"))
    if done.path is not None:
        lines.append(("free path", _free(done.path)))
    lines += [("file", sentence) for sentence in done.said]
    width = max(len(label) for label, _ in lines)
    return "\n".join([done.name, *(f"  {label.ljust(width)}  {words}" for label, words in lines)])


def many(done: Sequence[Reduced]) -> str:
    """One line a track."""
    head = ["track", "U", "95 %", "f_beat", "amplitude", "net a cycle", "p of none", "cycles", "left out"]
    lines = [head]
    for one in done:
        r = one.reduction
        beat = [written(r.f_beat, r.u_f_beat, "Hz"), handy("A_tip", r.amplitude, r.u_amplitude),
                handy("A_tip", r.net_per_cycle, r.u_net_per_cycle)]  # fmt: skip
        cycles = "" if r.cycles is None else f"{r.cycles:.1f}"
        lines.append([one.name, handy("U", r.U, r.u_U), _interval(r), *(b or "-" for b in beat),
                      _probability(r.p_zero), cycles or "-", left_out(r)])  # fmt: skip
    return aligned(lines, text_columns=1)


def left_out(r: Reduction) -> str:
    """'2 start-up cycles, 3 outliers, 12 lost frames in 2 gaps', or 'nothing'."""
    parts = (
        (f"{r.trimmed:g}", "start-up cycle", r.trimmed), (r.rejected, "outlier", r.rejected),
        (r.lost, "lost frame", r.lost), (r.duplicates, "duplicate", r.duplicates),
        (r.unreadable, "unreadable row", r.unreadable),
    )  # fmt: skip
    said = [f"{n} {words}{'' if size == 1 else 's'}" for n, words, size in parts if size]
    if r.gaps:
        said = [f"{s} in {r.gaps} gap{'' if r.gaps == 1 else 's'}" if " lost" in s else s for s in said]
    return ", ".join(said) or "nothing"


def _interval(r):
    unit = handy_unit("U", r.U, r.u_U)
    digits = max(0, 1 - math.floor(math.log10(from_si("U", r.u_U, unit)))) if r.u_U > 0.0 else 4
    low, high = (f"{from_si('U', value, unit) + 0.0:.{min(digits, 12)}f}" for value in (r.U_low, r.U_high))
    return f"{low} to {high} {unit}"


def _axis(r):
    angle = math.degrees(math.atan2(r.axis[1], r.axis[0])) + 0.0
    source = {"given": "as given", "body": "the body's", "velocity": "that of the velocity"}[r.axis_from]
    return f"axis {angle:.1f} deg, {source}"


def _probability(p):
    return "< 1e-6" if p < 1e-6 else f"{p:.2g}"


def _steadiness(r):
    steady, unit = r.steadiness, handy_unit("U", r.U, r.u_U)
    cycles = _cycles(r)
    span = ""
    if len(cycles):
        low, high = (from_si("U", value, unit) for value in (cycles.min(), cycles.max()))
        span = f"{low:.3g} to {high:.3g} {unit} from cycle to cycle, "
    trend, u = (from_si("U", value, unit) for value in (steady.trend, steady.u_trend))
    drifting = written(trend, u, f"{unit} a second")
    return f"{span}trend {drifting} (probability of none {_probability(steady.p_trend)})"


def _free(path: FreePath):
    """What a free path says of diffusing and swimming."""
    said = []
    if path.D is not None:
        said.append(f"D = {written(path.D, path.u_D, 'm2/s')}")
        if path.v is None:
            said.append("diffusion explains it, no swimming seen")
    if path.v is not None:
        said.append(f"swims at {handy('U', path.v, path.u_v)}")
    if path.tau is not None:
        said.append(f"forgets its direction in {written(path.tau, path.u_tau, 's')}")
    if path.Pe is not None:
        said.append(f"Peclet number {path.Pe:.2g}")
    if path.curvature is not None:
        said.append(f"curvature {written(path.curvature, path.u_curvature, '1/m')}")
    return "; ".join(said) or "neither diffusion nor a steady swim"


def _cycles(r):
    """Speeds a cycle that are known."""
    return [] if r.steadiness is None else r.steadiness.per_cycle[np.isfinite(r.steadiness.per_cycle)]


def _fields(part):
    """A part's figures by name, without the curves it was fitted to."""
    return {f.name: _plain(getattr(part, f.name)) for f in fields(part) if f.name not in ("lag", "msd")}


def _plain(value):
    """The value as JSON takes it: null for what is not finite."""
    if isinstance(value, np.ndarray | tuple | list):
        return [_plain(one) for one in value]
    if isinstance(value, np.generic):
        value = value.item()
    return None if isinstance(value, float) and not math.isfinite(value) else value
