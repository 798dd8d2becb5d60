"""Theory to lie under a plot: small-angle curves over sperm number, one a swimmer or one for several."""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd

from labbook.charts.drawable import UNNAMED
from labbook.charts.theory_band import SOURCES, relative_u
from labbook.charts.theory_words import DRIVES, FORM, NEEDED, label, own_words, shared_words, why_no_run
from labbook.physics import rods
from labbook.physics.predictions import predicted
from labbook.registry.catalogue import NUMBERS
from labbook.registry.dialects import AT_BIRTH, Choices
from labbook.registry.restating import restate
from labbook.registry.swimmer_share import exchanged

X, CURVES = "Sp", ("U_scaled", "F_scaled")
# what the curves take from the runs
INPUTS = tuple(dict.fromkeys((*NEEDED, "theta0", "h_wall", "D_tank", *SOURCES)))
TEXTS = ("drive", "form", "swimmer")
POINTS = 120
MOST = 6  # curves in one figure
BEYOND = 1.3  # times its runs' Sp that a curve among several goes on
ALIKE = 0.1  # of the speed: curves no further apart are one line on a figure of decades


@dataclass(frozen=True)
class Theory:
    """What theory says on some axes: a frame to draw, sentences for the caption, or why there is nothing.

    frame: columns x, y and, where there is a band, low and high; label: the legend's entry; family: the group
    whose colour it has, '' for ink.
    """

    frame: pd.DataFrame
    words: tuple[str, ...] = ()
    why: str = ""


NOTHING = pd.DataFrame({"x": [], "y": [], "label": []})


def models_own(coefficient: str) -> dict[str, dict[str, object]]:
    """The dialects that the tail model itself speaks where `coefficient` stands behind the runs' zeta_n."""
    return {"Sp": AT_BIRTH["Sp"] | {"coefficient": coefficient}, "U_scaled": AT_BIRTH["U_scaled"]}


def why_no_curve(coefficient: str, spoken: dict[str, Choices]) -> str:
    """Why no curve can be drawn on axes in these dialects (every choice named); '' where one can.

    The model's curve is one of dimensionless numbers: a change of rate or power is the same for all swimmers,
    one of length or coefficient is not.
    """
    if coefficient not in rods.MODELS:
        return f"zeta_n and zeta_t of one drag model are needed, and {coefficient} gives zeta_n alone"
    for number, own in models_own(coefficient).items():
        for name in exchanged(own, spoken.get(number, own)):
            needs = f"{own[name]} as the {name} in {number}"
            return f"the curve needs {needs}; with {spoken[number][name]} each swimmer has one of its own"
    return ""


def tail_curves(
    runs: pd.DataFrame,
    low: float,
    high: float,
    *,
    y: str = CURVES[0],
    family: str | None = None,
    spans: Mapping[str, tuple[float, float]] | None = None,
    spoken: dict[str, Choices] | None = None,
    coefficient: str = rods.HOUSE_MODEL,
) -> Theory:
    """The curves of y over Sp for the swimmers of some runs, all of the drive that most of them have.

    runs: a row a run with TEXTS, INPUTS in SI and, for bands, u_shared_ beside SOURCES. family: the column
    that colours the runs, spans: the groups that the legend names, with the Sp of their runs. Where each is
    of one swimmer, it has that swimmer's curve, with its head, drag ratio and walls (the MOST groups with
    most runs), over its span and a little further; else, and where those curves lie within ALIKE of each
    other, all share one of the medians of their swimmers. A swimmer's band is 1 u of the predicted speed from
    what its runs share and from the model itself, that of several swimmers goes from the lowest to the
    highest of their own curves. spoken: the dialects of both axes, every choice named (left out: the model's
    own); low, high, spans and the frame are in them. coefficient: the drag model of zeta_n and zeta_t.
    Source: labbook.physics.predictions.
    """
    own = models_own(coefficient)
    spoken, spans = own | (spoken or {}), spans or {}
    why, (usable, drive) = why_no_curve(coefficient, spoken), _usable(runs, NUMBERS[y].only_drives or DRIVES)
    if why or usable.empty:
        return Theory(NOTHING, why=why or why_no_run(runs))

    def models(*ends):
        low, high = restate(X, np.array(ends), choices=own[X], house=spoken[X], inputs={}).value
        return (low, high) if low < high else (low / BEYOND, high * BEYOND)

    low, high = models(low, high)
    single, rest = _families(usable, family, spans)
    if _alike(single, np.geomspace(low, high, POINTS), y, drive):
        single, rest = {}, pd.concat(single.values())
    drawn = {}
    for name, part in single.items():
        near, far = models(*spans[name]) if name in spans and len(single) > 1 else (low, high)
        Sp = np.geomspace(max(near / BEYOND, low), min(far * BEYOND, high), POINTS)
        told = label(drive, None if len(single) > 1 else _numbers(part).iloc[0])
        drawn[name] = _alone(part, Sp, y, drive, coefficient).assign(label=told, family=name)
    if len(rest):
        middle = _numbers(rest.assign(swimmer=""))
        together = _together(rest, middle, np.geomspace(low, high, POINTS), y, drive)
        drawn[""] = together.assign(label=label(drive, middle.iloc[0], several=True), family="")
    frame = pd.concat(drawn.values(), ignore_index=True)
    swimmers = {name: part["swimmer"].iloc[0] for name, part in single.items()}
    said = own_words(frame, swimmers, list(spans)) if single else shared_words(rest["swimmer"].nunique())
    frame["x"] = restate(X, frame["x"].to_numpy(), choices=spoken[X], house=own[X], inputs={}).value
    for column in ("y", "low", "high") if y in own else ():
        frame[column] = restate(y, frame[column].to_numpy(), choices=spoken[y], house=own[y], inputs={}).value
    return Theory(frame, tuple(said))


def _alike(single, Sp: np.ndarray, y: str, drive: str) -> bool:
    """Whether the curves of several swimmers cannot be told apart on a figure."""
    if len(single) < 2:
        return False
    each = np.concatenate([_curves(_numbers(part), Sp, y, drive) for part in single.values()])
    return bool((each.max(axis=0) / each.min(axis=0) < 1 + ALIKE).all())


def _usable(runs: pd.DataFrame, drives) -> tuple[pd.DataFrame, str]:
    """The runs that have a curve, of the one of some drives that most of those have, and that drive."""
    free = runs["drive"] == "free_head_angle"
    fits = (runs["form"] == FORM) & runs["drive"].isin(list(drives)) & runs[list(NEEDED)].notna().all(axis=1)
    usable = runs[fits & (runs["b"].notna() | ~free)]
    drive = usable["drive"].mode()
    return usable[usable["drive"].isin(drive[:1])], str(drive.iloc[0]) if len(drive) else ""


def _families(usable, family, names) -> tuple[dict[str, pd.DataFrame], pd.DataFrame]:
    """The runs of each group that has a curve of its own, and the runs that share one."""
    none = usable.iloc[:0]
    one = usable["swimmer"].nunique() == 1
    if family is None or (one and family != "swimmer"):
        return ({"": usable}, none) if one else ({}, usable)
    group = usable[family].where(usable[family].notna(), UNNAMED)
    groups = {name: part for name, part in usable.groupby(group) if name in names}
    if not groups or any(part["swimmer"].nunique() > 1 for part in groups.values()):
        return {}, usable
    kept = sorted(groups, key=lambda name: -len(groups[name]))[:MOST]
    return {name: groups[name] for name in names if name in kept}, none


def _numbers(part: pd.DataFrame) -> pd.DataFrame:
    """Each swimmer's lengths over L_tail and coefficients over mu: a row each, NaN for what few runs have."""
    table = {key: part[key] / part["L_tail"] for key in ("b", "b_long", "h_wall", "D_tank")}
    table |= {key: part[key] / part["mu"] for key in ("zeta_n", "zeta_t")}
    by_swimmer = pd.DataFrame(table).groupby(part["swimmer"])
    return by_swimmer.median().where(by_swimmer.count().mul(2).ge(by_swimmer.size(), axis=0))


def _curves(numbers: pd.DataFrame, Sp: np.ndarray, y: str, drive: str) -> np.ndarray:
    """y at each Sp for each swimmer of a table, a row each, with all that cancels set to 1."""
    known = {key: numbers[key].to_numpy(dtype=float)[:, None] for key in numbers}
    known |= {"L_tail": 1.0, "mu": 1.0, "EI": 1.0, "theta0": 1.0}
    known["omega"] = Sp**4 / known["zeta_n"]
    found = predicted(form=FORM, drive=drive, values=known)
    return NUMBERS[y].parsed.value(known | {"U": found["U_model"]})


def _relative(part: pd.DataFrame, Sp: np.ndarray, drive: str, coefficient: str) -> np.ndarray:
    """Relative u along the curve of one swimmer, from the medians of its runs."""
    known = {key: float(part[key].median()) if part[key].notna().mean() >= 0.5 else np.nan for key in INPUTS}
    u = {
        key: known[key] * float((part[f"u_shared_{key}"] / part[key]).median())
        for key in SOURCES
        if f"u_shared_{key}" in part
    }
    return relative_u(known, u, Sp, form=FORM, drive=drive, coefficient=coefficient)


def _alone(part: pd.DataFrame, Sp: np.ndarray, y: str, drive: str, coefficient: str) -> pd.DataFrame:
    """The curve of one swimmer with its band."""
    value, share = _curves(_numbers(part), Sp, y, drive)[0], _relative(part, Sp, drive, coefficient)
    return pd.DataFrame({"x": Sp, "y": value, "low": value * (1 - share), "high": value * (1 + share)})


def _together(rest, middle: pd.DataFrame, Sp: np.ndarray, y: str, drive: str) -> pd.DataFrame:
    """The curve of the median swimmer, between the lowest and the highest of the swimmers' own."""
    value, each = _curves(middle, Sp, y, drive)[0], _curves(_numbers(rest), Sp, y, drive)
    return pd.DataFrame({"x": Sp, "y": value, "low": each.min(axis=0), "high": each.max(axis=0)})
