"""Statistics of a trend as tables, header first, and as plain numbers for a program to read."""

import numpy as np

from labbook.book.repeat_groups import RepeatGroups
from labbook.book.trend_group import EVERY
from labbook.book.trend_source import SETTINGS
from labbook.book.trend_statistics import Changed, Outlying, Slope, Statistics, Top
from labbook.book.trend_told import interval, verdict
from labbook.physics.trend_causes import Outlier
from labbook.physics.trend_change import Rate
from labbook.registry.written import shown

Table = list[list[str]]
GROUP = "all runs"


def tops_table(tops: list[Top], family: str, x: str, y: str) -> Table:
    """Maxima with their 95 % intervals."""
    lines = [[family, f"{x} (95 %)", f"{y} (95 %)", "runs", "swimmers", "note"]]
    for top in tops:
        m, name = top.maximum, top.name or GROUP
        if m is None:
            lines.append([name, "", "", str(top.n), "", verdict(top.why, x, y)])
        else:
            cells = [interval(m.x, m.x_low, m.x_high), interval(m.y, m.y_low, m.y_high)]
            lines.append([name, *cells, str(m.n), str(m.swimmers), verdict(m.verdict, x, y)])
    return lines


def slopes_table(slopes: tuple[Slope, ...], x: str) -> Table:
    """Exponents with their 95 % intervals and ranges."""
    lines = [["where", "exponent (95 %)", f"from {x}", "to", "runs", "swimmers", "note"]]
    for slope in slopes:
        law = slope.law
        if law is None:
            lines.append([slope.where, "", "", "", "", "", verdict(slope.why, x, "y")])
            continue
        bent = f"bends (p = {law.p_bend:.2g})" if law.p_bend < 0.05 else ""
        lines.append([
            slope.where, interval(law.slope, law.slope_low, law.slope_high), f"{law.low:.3g}",
            f"{law.high:.3g}", str(law.n), str(law.swimmers), law.verdict or bent,
        ])  # fmt: skip
    return lines


def changes_table(changed: Changed, x: str, y: str) -> Table:
    """Change in per cent a year of y at equal x, and of x at equal y."""
    lines = [[changed.owner, f"{y} % a year (95 %)", f"or {x} % a year (95 %)", "p",
              f"p among {len(changed.rows)}", "runs", "swimmers", "days", "note"]]  # fmt: skip
    for row in changed.rows:
        likelier = row.x if row.likelier == "x" else row.y
        lines.append([
            str(row.owner), _per_cent(row.y), _per_cent(row.x), p_text(likelier.p), p_text(likelier.p_all),
            str(row.n), str(row.swimmers), f"{row.days:.0f}", "too few runs over time" if row.verdict else "",
        ])  # fmt: skip
    return lines


def _per_cent(rate: Rate) -> str:
    return interval(100.0 * rate.per_year, 100.0 * rate.low, 100.0 * rate.high)


def outliers_table(outlying: Outlying, codes: np.ndarray) -> Table:
    """Runs far from the curve, worst first, with the likeliest cause."""
    lines = [["run", "off the curve", "times allowed", "p", "likeliest cause", "standard uncertainties"]]
    for row in outlying.found.rows if outlying.found else ():
        shift = f"{row.shift:.1f}" if np.isfinite(row.shift) else ""
        lines.append([str(codes[row.index]), f"{100 * row.off:+.0f} %", f"{row.z:.1f}", p_text(row.p),
                      row.cause or "none found", shift])  # fmt: skip
    return lines


def repeats_table(groups: RepeatGroups) -> Table:
    """Repeat groups in usual units: n, mean, scatter, scatter over stated u, p."""
    lines = [["swimmer", "fluid", *SETTINGS, "T", "n", f"mean {groups.key}", "scatter", "over stated u", "p"]]
    for row in groups.table.to_dict("records"):
        settings = [setting_text(row, key) for key in (*SETTINGS, "T")]
        over = f"{row['over_stated']:.2f}" if np.isfinite(row["over_stated"]) else ""
        mean, scatter = shown(groups.key, row["mean"], row["u_mean"]), _two_digits(groups.key, row["scatter"])
        cells = [str(row["n"]), mean, scatter, over, p_text(row["p"])]
        lines.append([row["swimmer"], row["fluid"], *settings, *cells])
    return lines


def _two_digits(key: str, u: float) -> str:
    """An uncertainty in its usual unit, two digits of it."""
    number, space, unit = shown(key, u).partition(" ")
    return f"{float(number):.2g}{space}{unit}" if number else ""


def setting_text(row: dict, key: str) -> str:
    """A setting of a group, or from where to where it lies."""
    low, high = (shown(key, row[f"{key}_{end}"]) for end in ("low", "high"))
    return low if low == high else f"{low.rpartition(' ')[0]} to {high}"


def p_text(p: float) -> str:
    """A probability to two digits, '' where unknown."""
    return "" if not np.isfinite(p) else "< 0.0001" if p < 1e-4 else f"{p:.2g}"


# ---- for a program


def as_numbers(s: Statistics) -> dict:
    """Everything in plain numbers, SI, None where unknown."""
    group, found = s.group, s.outlying.found
    return {
        "x": group.runs.x_key, "y": group.runs.y_key, "form": group.form or EVERY, "runs_found": group.found,
        "runs_used": len(group.points.index), "swimmers": len(group.points.swimmers),
        "excluded": group.excluded,
        "maximum": _top(s.top), "family": s.family, "families": [{"name": t.name} | _top(t) for t in s.tops],
        "slopes": [_slope(slope) for slope in s.slopes],
        "changes": {"owner": s.changed.owner, "why_none": s.changed.why,
                    "rows": [_change(r) for r in s.changed.rows]},
        "outliers": {
            "why_none": s.outlying.why, "tested": found.far.n if found else 0,
            "scatter": _known(found.far.scatter) if found else None,
            "rows": [_outlier(row, group.runs.code) for row in found.rows] if found else [],
        },
        "repeats": _repeats(s.repeats),
    }  # fmt: skip


def _known(value):
    return float(value) if np.isfinite(value) else None


def _fields(of, *names) -> dict:
    return {name: _known(getattr(of, name)) for name in names}


def _top(top: Top) -> dict:
    m = top.maximum
    if m is None:
        return {"found": False, "said": top.why, "runs": top.n}
    return {
        "found": m.found, "said": m.verdict, "runs": m.n, "swimmers": m.swimmers,
        **_fields(m, "x", "x_low", "x_high", "y", "y_low", "y_high", "u_x_swimmers", "u_x_shared",
                  "u_y_swimmers", "u_y_shared", "dof_x", "dof_y", "scatter", "between_x", "between_y"),
        "window": [_known(v) for v in m.window], "order": m.shape.order, "left_out": m.left_out,
    }  # fmt: skip


def _slope(slope: Slope) -> dict:
    law = slope.law
    if law is None:
        return {"where": slope.where, "slope": None, "said": slope.why}
    names = ("slope", "slope_low", "slope_high", "u_swimmers", "u_shared", "dof", "p_bend", "low", "high",
             "scatter")  # fmt: skip
    return {"where": slope.where, "said": law.verdict, "runs": law.n, "swimmers": law.swimmers,
            **_fields(law, *names), "left_out": law.left_out}  # fmt: skip


def _change(row) -> dict:
    names = ("per_year", "u", "low", "high", "p", "p_all", "p_differ")
    return {"name": str(row.owner), "said": row.verdict, "likelier": row.likelier, "runs": row.n,
            "swimmers": row.swimmers, "days": _known(row.days), "y": _fields(row.y, *names),
            "x": _fields(row.x, *names)}  # fmt: skip


def _outlier(row: Outlier, codes: np.ndarray) -> dict:
    others = [{"cause": name, "shift": _known(k), "cost": _known(cost)} for name, k, cost in row.others]
    return {"run": str(codes[row.index]), "cause": row.cause, "said": row.sentence, "others": others,
            **_fields(row, "off", "z", "p", "shift", "cost")}  # fmt: skip


def _repeats(groups: RepeatGroups) -> dict:
    texts = ("swimmer", "fluid", "codes")
    rows = [{k: v if k in texts else int(v) if k == "n" else _known(v) for k, v in row.items()}
            for row in groups.table.to_dict("records")]  # fmt: skip
    pooled = _fields(groups.found, "pooled_chi_square", "pooled_birge", "pooled_p")
    return {"of": groups.key, "groups": rows, **pooled, "pooled_dof": groups.found.pooled_dof}
