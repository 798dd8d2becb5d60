"""Trends in words that can stand in a paper: numbers, intervals, n, method, and what was left out."""

from math import floor, isfinite, log10


def told(
    *,
    x="Sp",
    y="U/(omega L_tail theta0^2)",
    maximum=None,
    power_law=None,
    changes=(),
    outliers=None,
    repeats=None,
    excluded=None,
) -> str:
    """One paragraph for each result given, then what was excluded: reason -> number of runs, beside what the
    results left out themselves.

    maximum: Maximum; power_law: PowerLaw; changes: Changes; outliers: Outliers; repeats: Repeats; x, y:
    names.
    """
    said = []
    if maximum is not None:
        said.append(_maximum(maximum, x, y))
    if power_law is not None:
        said.append(_power_law(power_law, x, y))
    if changes:
        said.append(_changes(changes, x, y))
    if repeats is not None:
        said.append(_repeats(repeats))
    if outliers is not None:
        said.append(_outliers(outliers))
    if excluded:
        said.append(f"Excluded beforehand: {_counts(excluded)}.")
    return "\n\n".join(said)


def rounded(value, half):
    """A value with as many decimals as show two digits of half its interval."""
    if not isfinite(value):
        return "unknown"
    if not (isfinite(half) and half > 0.0):
        return f"{value:.3g}"
    decimals = 1 - floor(log10(half))
    return f"{value:.{decimals}f}" if decimals >= 0 else f"{round(value, decimals):.0f}"


def _with_interval(value, low, high):
    half = 0.5 * (high - low)
    return f"{rounded(value, half)} (95 % interval {rounded(low, half)} to {rounded(high, half)})"


def _maximum(m, x, y):
    runs = f"{m.n} runs of {_swimmers(m.swimmers)} with {x} between {m.window[0]:.3g} and {m.window[1]:.3g}"
    left = _left_out(m.left_out)
    if not m.found:
        return f"{y} against {x}: {m.verdict} ({runs}).{left}"
    if m.verdict:
        return f"{y} is highest near {x} = {m.x:.3g}, at {m.y:.3g}, from {runs}; {m.verdict}.{left}"
    return (
        f"{y} has its maximum of {_with_interval(m.y, m.y_low, m.y_high)} at {x} = "
        f"{_with_interval(m.x, m.x_low, m.x_high)}, from {runs}. Standard uncertainty over swimmers "
        f"{_percent(m.u_x_swimmers)} in {x} and {_percent(m.u_y_swimmers)} in {y}, from errors that swimmers "
        f"share {_percent(m.u_x_shared)} and {_percent(m.u_y_shared)}. Weighted polynomial of order "
        f"{m.shape.order} in ln {x}; intervals by bootstrap over swimmers and Monte "
        f"Carlo of shared errors, with Student's t ({_dof(m.dof_x)} and {_dof(m.dof_y)} degrees of freedom)."
        f"{_scatter(m.scatter)}{left}"
    )


def _power_law(s, x, y):
    runs = f"{s.n} runs of {_swimmers(s.swimmers)}"
    left = _left_out(s.left_out)
    start = f"{y} goes as {x} to the power "
    between = f"between {x} = {s.low:.3g} and {s.high:.3g}"
    if s.verdict:
        return f"{start}{s.slope:.3g} {between}, from {runs}; {s.verdict}.{left}"
    bend = ""
    if s.p_bend < 0.05:
        bend = (
            f" The runs bend away from a power law ({_p(s.p_bend)}): the exponent is a mean over the range."
        )
    return (
        f"{start}{_with_interval(s.slope, s.slope_low, s.slope_high)} {between}, from {runs}. "
        f"Standard uncertainty {s.u_swimmers:.2g} over swimmers and {s.u_shared:.2g} from shared errors "
        f"({_dof(s.dof)} degrees of freedom).{bend}{_scatter(s.scatter)}{left}"
    )


def _changes(changes, x, y):
    lines, still = [], []
    for c in changes:
        if c.verdict:
            lines.append(f"{c.owner}: {c.verdict}.")
            continue
        rate, what = (c.x, x) if c.likelier == "x" else (c.y, y)
        if rate.p_all >= 0.05:
            still.append(c)
            continue
        half = 50.0 * (rate.high - rate.low)
        per_year, low, high = (rounded(100.0 * v, half) for v in (rate.per_year, rate.low, rate.high))
        line = f"{c.owner}: {what} changes by {per_year} % a year (95 % interval {low} to {high} %, "
        line += f"{_p(rate.p)}, {_p(rate.p_all)} among {len(changes)} looked at), from {c.n} runs of "
        line += f"{_swimmers(c.swimmers)} over {c.days:.0f} days"
        if rate.p_differ < 0.05:
            line += f"; its swimmers do not change alike ({_p(rate.p_differ)})"
        lines.append(line + ".")
    if still:
        most = max(max(abs(c.y.low), abs(c.y.high)) for c in still)
        p = min(min(c.y.p_all, c.x.p_all) for c in still)
        names = ", ".join(str(c.owner) for c in still)
        lines.append(
            f"No change shown for {names}: the 95 % intervals of {y} lie within {100.0 * most:.2g} % a year "
            f"either way ({_p(p)} for the most striking, {sum(c.n for c in still)} runs)."
        )
    return "Change over time. " + " ".join(lines)


def _repeats(r):
    if not len(r.n):
        return "No run was repeated with the same settings."
    start = f"{len(r.n)} group{'s' * (len(r.n) != 1)} of repeated runs ({int(r.n.sum())} runs)"
    if not r.pooled_dof:
        return f"{start}, without stated uncertainty to compare their scatter with."
    more = "more than" if r.pooled_p < 0.05 else "no more than"
    apart = int((r.p < 0.05 / len(r.n)).sum())
    some = f"; {apart} of them scatter{'s' * (apart == 1)} more by itself" if apart else ""
    return (
        f"{start} scatter {more} their own uncertainties say: {r.pooled_birge:.2f} times (chi-square "
        f"{r.pooled_chi_square:.1f} with {r.pooled_dof} degrees of freedom, {_p(r.pooled_p)}){some}."
    )


def _outliers(o):
    rule = (
        f"of {o.far.n} runs tested at {100 * o.far.alpha:g} % false alarms a group, scatter "
        f"{_percent(o.far.scatter)} beyond own uncertainties"
    )
    if not o.rows:
        return f"No outlier ({rule})."
    count = f"{len(o.rows)} outlier{'s' * (len(o.rows) != 1)}"
    return f"{count} ({rule}). " + " ".join(row.sentence for row in o.rows)


def _scatter(scatter):
    return (
        f" Runs of a swimmer scatter by {_percent(scatter)} beyond their own uncertainties."
        if scatter
        else ""
    )


def _left_out(reasons):
    return f" Left out: {_counts(reasons)}." if reasons else ""


def _counts(reasons):
    return ", ".join(f"{n} {'run' if n == 1 else 'runs'} {reason}" for reason, n in reasons.items())


def _swimmers(n):
    return "1 swimmer" if n == 1 else f"{n} swimmers"


def _dof(dof):
    return f"{dof:.1f}" if dof < 100.0 else "over 100"


def _percent(share):
    return f"{100.0 * share:.2g} %"


def _p(p):
    return "p < 0.0001" if p < 1e-4 else f"p = {p:.2g}"
