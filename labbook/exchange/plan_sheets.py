"""Planned runs out, as a run sheet, a page to print and tick off, or JSON; and a sheet of them in again."""

import csv
import io
import json
from collections.abc import Sequence
from html import escape

import numpy as np
import pandas as pd

from labbook.book.cautions import CAUTIONS, at_the_bench
from labbook.book.drafts import all_of
from labbook.book.plan_setting import Plan
from labbook.book.records import kind
from labbook.errors import Refusal
from labbook.exchange.outward import harmless
from labbook.exchange.sheets import read_rows, table_from_text
from labbook.registry.typed import printed
from labbook.registry.written import shown

TO_FILL = {
    "at": "at",
    "T": "T [degC]",
    "U": "U [mm/s]",
    "A_tip": "A_tip [mm]",
}  # what a trial is there to tell
SET = ("rig", "drive", "f", "theta0", "h0", "B", "I_coil", "T", "T_end", "h_wall", "D_tank")
ORDER = (
    "swimmer",
    "fluid",
    "rig",
    "at",
    "f",
    "drive",
    "theta0",
    "h0",
    "B",
    "I_coil",
    "T",
    "T_end",
    "U",
    "A_tip",
    "h_wall",
    "D_tank",
    "series",
    "note",
)
_SYMBOLS = {
    "theta0": "θ₀",
    "h0": "h₀",
    "I_coil": "I",
    "T_end": "T at the end",
    "h_wall": "wall at",
    "D_tank": "bore",
}
_STYLE = """
:root { color-scheme: light; }
body { font: 10.5pt/1.35 system-ui, sans-serif; color: #20262A; background: #FFF; margin: 1.2rem; }
h1 { font-size: 15pt; margin: 0 0 .3rem; } h2 { font-size: 11.5pt; margin: 1rem 0 .3rem; }
table { border-collapse: collapse; width: 100%; } thead { display: table-header-group; }
th, td { border: 1px solid #9AA0A3; padding: .3rem .4rem; text-align: left; vertical-align: top; }
td.n { text-align: right; white-space: nowrap; } td.fill { min-width: 3.4rem; }
tr { break-inside: avoid; } td.note { border-top: none; font-size: 9pt; color: #4A5358; }
tr.run td { border-bottom: none; } input { width: 1.1rem; height: 1.1rem; }
ul { margin: .2rem 0; padding-left: 1.2rem; } .caution { list-style: none; margin-left: -1.2rem; }
@page { size: A4 landscape; margin: 12mm; } @media print { body { margin: 0; } }
"""


def duration(seconds: float) -> str:
    """'38 s', '16 min' or '2.3 h'; '' where it is not known."""
    if not np.isfinite(seconds):
        return ""
    if seconds < 120:
        return f"{seconds:.2g} s" if seconds < 99.5 else f"{seconds:.0f} s"
    return f"{seconds / 60:.2g} min" if seconds < 5400 else f"{seconds / 3600:.2g} h"


def as_run_sheet(runs: pd.DataFrame, series: str = "") -> str:
    """CSV in the run sheet's format: `labbook load` takes it once `at` and U are filled in, Bench as it is.

    Cells carry their units; what is to be measured stays empty, T among it, which is planned for and not
    known; the note says what was planned and expected.
    """
    rows = [_row(run, series) for run in runs.to_dict("records")]
    used = [c for c in ORDER if c in TO_FILL or any(row.get(c) for row in rows)]
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow([TO_FILL.get(c, c) for c in used])
    writer.writerows([[harmless(row.get(c, "")) for c in used] for row in rows])
    return out.getvalue()


def _row(run: dict, series: str) -> dict[str, str]:
    cells = dict(run["cells"])
    at_T = f"at {cells['T']}: " if cells.get("T") else ""
    said = [f"planned {at_T}{expected(run)}", *([run["why"]] if run.get("why") else []), *run["against"]]
    note = "; ".join([*([cells["note"]] if cells.get("note") else []), *said])
    return {k: v for k, v in cells.items() if k not in TO_FILL} | {
        "series": cells.get("series") or series,
        "note": note,
    }


def expected(run: dict) -> str:
    """'Sp 2.00(4), Re_omega 0.067(4), U 0.0015(2) mm/s, settles in 3.3 min' of a planned run."""
    parts = [f"{k} {shown(k, run[k], run[f'u_{k}'])}" for k in ("Sp", "Re_omega") if np.isfinite(run[k])]
    if np.isfinite(run["U_model"]):
        parts.append(f"U {shown('U', run['U_model'], run['u_U_model'])}")
    if np.isfinite(run["f_stepout"]):
        parts.append(f"step-out at {shown('f', run['f_stepout'])}")
    return ", ".join([*parts, f"settles in {duration(run['t_settle'])}"])


def planned_lines(text: str, name: str = "plan.csv") -> list[dict[str, str]]:
    """The lines of a planned sheet as cells with their units, for a form to start from; `at` may be empty.

    Refuses what a run sheet would refuse, but for what is still to be filled in.
    """
    rows, refused = read_rows([table_from_text(text, name, "run")])
    refused = [r for r in refused if not (r.typed is None and r.field.endswith(", at"))]
    if refused:
        raise all_of(refused)
    if not rows:
        raise Refusal("plan", name, "holds no planned line")
    columns = kind("run").typed
    return [row.draft.texts | {c: printed(columns[c], t) for c, t in row.draft.typed.items()} for row in rows]


def as_json(table: pd.DataFrame) -> str:
    """A JSON list, one object a row, SI values, null where absent."""
    return json.dumps(
        [{k: _plain(v) for k, v in row.items()} for row in table.to_dict("records")],
        ensure_ascii=False,
        allow_nan=False,
        indent=1,
    )


def _plain(value):
    if isinstance(value, float | np.floating):
        return float(value) if np.isfinite(value) else None
    return int(value) if isinstance(value, np.integer) else value


def as_page(plan: Plan, runs: pd.DataFrame, title: str, said: Sequence[str] = ()) -> str:
    """An HTML page to print: planned runs with tick boxes and room to write, notes, cautions; asks for nothing."""
    rows = runs.to_dict("records")
    cells = [run["cells"] for run in rows]
    same = [k for k in SET if k != "f" and len({c.get(k) for c in cells}) == 1 and cells[0].get(k)]
    vary = [k for k in SET if any(c.get(k) for c in cells) and k not in same]
    head = [
        "done",
        "",
        "fluid",
        *(_SYMBOLS.get(k, k) for k in vary),
        "Sp",
        "Re_ω",
        "U expected",
        "settles in",
        "at",
        "T",
        "U",
        "A_tip",
        "remarks",
    ]
    body = "".join(_page_row(i, run, vary, len(head)) for i, run in enumerate(rows, start=1))
    shared = ", ".join(f"{_SYMBOLS.get(k, k)} {cells[0][k]}" for k in same)
    notes = "".join(
        f"<li>{escape(s)}</li>"
        for s in [*([f"in every run: {shared}"] if shared else []), *said, *plan.notes]
    )
    minded = "".join(
        f'<li class="caution"><label><input type="checkbox"> {escape(CAUTIONS[c])}</label></li>'
        for c in cautions_of(plan, runs)
    )
    titles = "".join(f"<th>{escape(h)}</th>" for h in head)
    return (
        '<!doctype html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        '<meta http-equiv="Content-Security-Policy" '
        "content=\"default-src 'none'; style-src 'unsafe-inline'\">\n"
        f"<title>{escape(title)}</title>\n<style>{_STYLE}</style>\n</head>\n<body>\n<h1>{escape(title)}</h1>\n"
        f"<ul>{notes}</ul>\n<table>\n<thead><tr>{titles}</tr></thead>\n<tbody>\n{body}</tbody>\n</table>\n"
        f"<h2>Mind, before you start</h2>\n<ul>{minded}</ul>\n</body>\n</html>\n"
    )


def _page_row(i: int, run: dict, vary, width: int) -> str:
    numbers = [shown(k, run[k], run[f"u_{k}"]) for k in ("Sp", "Re_omega")]
    numbers += [shown("U", run["U_model"], run["u_U_model"]), duration(run["t_settle"])]
    filled = "".join(
        f'<td class="n">{escape(c)}</td>' for c in (*(run["cells"].get(k, "") for k in vary), *numbers)
    )
    note = "; ".join([*([run["why"]] if run.get("why") else []), *run["against"]])
    more = f'<tr><td class="note" colspan="{width}">{escape(note)}</td></tr>\n' if note else ""
    box = f'<input type="checkbox" aria-label="run {i} done">'
    return (
        f'<tr class="run"><td>{box}</td><td class="n">{i}</td><td>{escape(run["fluid"])}</td>{filled}'
        + '<td class="fill"></td>' * 5
        + f"</tr>\n{more}"
    )


def cautions_of(plan: Plan, runs: pd.DataFrame) -> list[str]:
    """The cautions of planned runs: of the rig and of every fluid among them."""
    rig = {} if plan.rig is None else {"kind": plan.rig.texts["kind"] or "", **plan.rig.typed}
    kinds = {x.code: x.texts["kind"] for x in plan.fluids}
    found = [c for code in dict.fromkeys(runs["fluid"]) for c in at_the_bench(kinds[code], rig)]
    return list(dict.fromkeys(found))
