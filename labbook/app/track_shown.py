"""What a page says of a reduced track: speed with its interval, beat, cycles, whether it closes, and its charts."""

import math
from collections.abc import Mapping
from types import SimpleNamespace

import streamlit as st

from labbook.app import session
from labbook.app.record_budget import interval_in_words
from labbook.book.reduced_cells import handy, handy_unit
from labbook.errors import Refusal
from labbook.physics.tracks import closure
from labbook.registry.units import from_si
from labbook.registry.written import written


def speed(result: Mapping) -> str:
    """'0.0512(4) mm/s, 95 %: 0.0504 to 0.0520 mm/s'."""
    U, u = result["U"], result["u_U"]
    unit = handy_unit("U", U, u)
    low, high, spread = (float(from_si("U", one, unit)) for one in (result["U_low"], result["U_high"], u))
    interval = interval_in_words(low, high, spread) if spread > 0 else f"{low:.4g} to {high:.4g}"
    return f"{handy('U', U, u)}, 95 %: {interval} {unit}"


def told(result: Mapping) -> None:
    """The figures of a reduced track, and of a control whether its path closes."""
    session.table(("", ""), figures(result))
    sentence = reversibility(result)
    if sentence:
        session.note(sentence)


def figures(result: Mapping) -> list[tuple[str, str]]:
    """(name, words) of everything a reduction says, absent things left out."""
    rows = [("speed along the axis", speed(result))]
    if result["f_beat"] is not None:
        given = "" if result["u_f_beat"] else ", as given"
        rows += [
            ("beat", f"{written(result['f_beat'], result['u_f_beat'], 'Hz')}{given}"),
            ("amplitude along the axis", handy("A_tip", result["amplitude"], result["u_amplitude"])),
            ("net motion a cycle", handy("A_tip", result["net_per_cycle"], result["u_net_per_cycle"])),
        ]  # fmt: skip
    rows.append(("probability of no net motion", probability(result["p_zero"])))
    if result["A_tip"] is not None:
        rows.append(("A_tip, peak to peak", handy("A_tip", result["A_tip"], result["u_A_tip"])))
    cycles = "" if result["cycles"] is None else f"{result['cycles']:.1f} cycles, "
    rows.append(("used", f"{cycles}{_spaced(result['frames'])} frames"))
    rows.append(("left out", left_out(result)))
    rows.append(("axis", axis(result)))
    if any((*result["drift"], *result["u_drift"])):
        rows.append(("drift taken off", velocity((result["drift"], result["u_drift"]))))
    return rows


def velocity(drift: tuple) -> str:
    """'1.60(12) um/s, -0.90(12) um/s' of ((vx, vy), (ux, uy)) in m/s."""
    return ", ".join(handy("U", v, u) for v, u in zip(*drift, strict=True))


def left_out(result: Mapping) -> str:
    """'2 start-up cycles, 3 outlying frames, 12 lost frames in 2 gaps', or 'nothing'."""
    parts = (
        ("trimmed", "start-up cycle"), ("rejected", "outlying frame"), ("lost", "lost frame"),
        ("duplicates", "repeated frame"), ("unreadable", "unreadable row"),
    )  # fmt: skip
    said = []
    for key, words in parts:
        n = result[key]
        if n:
            said.append(f"{n:g} {words}{'' if n == 1 else 's'}")
            if key == "lost" and result["gaps"]:
                said[-1] += f" in {result['gaps']} gap{'' if result['gaps'] == 1 else 's'}"
    return ", ".join(said) or "nothing"


def axis(result: Mapping) -> str:
    """'30.0° from x to y, as given'."""
    angle = math.degrees(math.atan2(result["axis"][1], result["axis"][0])) + 0.0
    source = {"given": "as given", "body": "from the body", "velocity": "that of the velocity"}[result["axis_from"]]
    return f"{angle:.1f}° from x to y, {source}"


def probability(p: float) -> str:
    """A probability to two digits."""
    return "below 1e-6" if p < 1e-6 else f"{p:.2g}"


def reversibility(result: Mapping) -> str | None:
    """Whether the path closes, in a sentence; None where there is no beat to close."""
    try:
        found = closure(reduction=SimpleNamespace(**result))
    except Refusal:
        return None
    return f"Reversibility: {found.sentence}."


def charts(drawn: Mapping[str, dict], place: str) -> None:
    """The path and the steps side by side, the position against time and its residuals below."""
    left, right = st.columns([45, 55], gap="small")
    with left:
        chart(drawn, "path", place, width="content")
    with right:
        chart(drawn, "steps", place)
    chart(drawn, "along", place)
    chart(drawn, "residual", place)


def chart(drawn: Mapping[str, dict], name: str, place: str, width: str = "stretch") -> None:
    """One chart, where there is one."""
    if name in drawn:
        with st.container(key=f"lb-track-{name}-{place}".replace(":", "-")):
            st.vega_lite_chart(spec=drawn[name], theme=None, width=width, key=f"{place}:track-{name}")


def explained(result: Mapping) -> None:
    """One line of what the charts mark."""
    said = ["Points are frames, the line is the fit"]
    if result["rejected"]:
        said.append("crosses are outlying frames, left out of the fit")
    if result["trimmed"]:
        said.append("the grey stretch is trimmed")
    if result["steadiness"] is not None:
        said.append("bars are steps from cycle to cycle, with the mean and its 95 % band")
    session.note("; ".join(said) + ".")


def _spaced(n: int) -> str:
    return f"{n:,}".replace(",", "\u202f")
