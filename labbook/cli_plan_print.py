"""How the command line writes a plan: tables with remarks, run sheets, pages, and sizes that would do."""

from collections.abc import Sequence

import numpy as np
import pandas as pd

from labbook.book.clock import local, now
from labbook.book.plan_candidates import Proposals
from labbook.book.plan_inverse import batches_near, inverse
from labbook.book.plan_setting import Plan
from labbook.book.planning import best_first, in_common
from labbook.cli_print import aligned
from labbook.exchange.outward import frame_as_csv
from labbook.exchange.plan_sheets import as_json, as_page, as_run_sheet, duration
from labbook.registry.written import shown, written


def runs_written(made: Plan, table: pd.DataFrame, form: str, name: str, told: Sequence[str]) -> str:
    """Planned runs in one of the forms; told: what is said of all of them."""
    day = f"{local(now()):%Y-%m-%d}"
    if form == "csv":
        return as_run_sheet(table, f"plan {made.swimmer.code} {day}")
    if form == "json":
        return as_json(table) + "\n"
    if form == "html":
        return as_page(made, table, f"Planned runs of {made.swimmer.code}, {name}, {day}", told)
    lines = [["", "fluid", "f [Hz]", "θ0 [rad]", "Sp", "Re_omega", "U [mm/s]", "settles in", "verdict"]]
    for i, row in enumerate(table.to_dict("records"), start=1):
        lines.append(
            [
                str(i),
                row["fluid"],
                row["f_typed"].removesuffix(" Hz") or f"{row['f']:.3g}",
                written(row["theta0"]),
                *(shown(k, row[k], row[f"u_{k}"]) for k in ("Sp", "Re_omega")),
                shown("U", row["U_model"], row["u_U_model"]).removesuffix(" mm/s"),
                duration(row["t_settle"]),
                row["verdict"],
            ]
        )
    # an amplitude that all share is in the notes
    told_above = {3} if len({line[3] for line in lines[1:]}) == 1 else set()
    filled = [i for i in range(len(lines[0])) if i < 3 or any(line[i] for line in lines[1:])]
    lines = [[line[i] for i in filled if i not in told_above] for line in lines]
    common = in_common(table)
    said = [*told, *made.notes, *(f"in every run: {s}" for s in common)]
    parts = ["\n".join(said), aligned(lines, text_columns=2), *_remarks(table, common)]
    return "\n\n".join(p for p in parts if p) + "\n"


def _remarks(table: pd.DataFrame, common: Sequence[str], name: str | None = None) -> list[str]:
    """'3, 4: f below 0.04 Hz: ...' for what is said of some rows and not of all: one text, a line each."""
    found: dict[str, list[str]] = {}
    for i, row in enumerate(table.to_dict("records"), start=1):
        for said in (
            *([row["why"]] if row.get("why") else []),
            *(s for s in row["against"] if s not in common),
        ):
            found.setdefault(said, []).append(row[name] if name else str(i))
    return ["\n".join(f"{', '.join(rows)}: {said}" for said, rows in found.items())] if found else []


def gain_in_words(found: Proposals, top: bool) -> str:
    """What proposals are worth: the widest gap, or how well the maximum is known, before and after them."""
    if top:
        before = f"{found.before:.2g}" if np.isfinite(found.before) else "not known"
        what = "standard uncertainty of the Sp of the maximum from its own runs, relative"
        return f"{what}: {before}, then {found.after:.2g}"
    before = f"{found.before:.2g}" if np.isfinite(found.before) else "all"
    return f"widest gap, as a share of the plane: {before}, then {found.after:.2g}"


def inverse_written(made: Plan, key: str, hertz: float, sp: float, form: str) -> str:
    """The values of a size, modulus or viscosity that would do, fluid by fluid, in one of the forms."""
    table = best_first(inverse(made, key, hertz, sp))
    if form == "json":
        return as_json(table) + "\n"
    if form == "csv":
        return frame_as_csv(table.assign(against=["; ".join(a) for a in table["against"]]))
    lines = [["fluid", key, "Sp", "Re_omega", "U [mm/s]", "verdict"]]
    for row in table.to_dict("records"):
        lines.append(
            [
                row["fluid"],
                _to_three(key, row[key]),
                *(shown(k, row[k], u) for k, u in (("Sp", row["u_Sp"]), ("Re_omega", None))),
                shown("U", row["U_model"], row["u_U_model"]).removesuffix(" mm/s"),
                row["verdict"],
            ]
        )
    common = in_common(table)
    now_ = _to_three(key, float(table["now"].iloc[0]))
    told = [
        f"{key} of {made.swimmer.code} that gives Sp = {sp:.4g} at {hertz:g} Hz"
        + (f" (now {now_})" if now_ else ""),
        f"1 % of {key} moves Sp by {abs(float(table['slope'].median())):.2g} %",
        *made.notes,
        *(f"in every fluid: {s}" for s in common),
    ]
    if key == "E":
        near = batches_near(made, float(np.nanmedian(table["E"])))[:4]
        told.append(
            "batches on the shelf, the nearest first: " + ", ".join(f"{c} {shown('E', E)}" for c, E in near)
        )
    parts = ["\n".join(told), aligned(lines, text_columns=1), *_remarks(table, common, "fluid")]
    return "\n\n".join(parts) + "\n"


def _to_three(key: str, value: float) -> str:
    return "" if np.isnan(value) else shown(key, float(f"{value:.3g}"))
