"""Theory in words: what a run must have for a curve, why none has one, and what legend and caption say."""

from collections.abc import Mapping

import numpy as np
import pandas as pd

from labbook.registry.quantities import QUANTITIES

FORM = "flexible tail"
DRIVES = {"free_head_angle": "head free", "pivoted_angle": "base pivoted"}  # those that set an angle
# without these a run has no curve, nor without b where its head is free
NEEDED = ("L_tail", "zeta_n", "zeta_t", "mu")
_GIVE = {
    "zeta_n": "its section (d, or D and d_in, or w and t)",
    "zeta_t": "a house drag model that gives zeta_t",
    "b": "the radius b of its head",
    "L_tail": "L_tail",
    "mu": "its fluid a viscosity",
}


def why_no_run(runs: pd.DataFrame) -> str:
    """Why none of some runs has a curve, with what would make it possible."""
    tails = runs[(runs["form"] == FORM) & runs["drive"].isin(list(DRIVES))]
    if tails.empty:
        drives = " or ".join(DRIVES)
        return f"the curve is that of a {FORM} turned by a set angle ({drives}): no run found has one"
    wanted = (*NEEDED, "b")
    never = [key for key in wanted if tails[key].isna().all()] or [k for k in wanted if tails[k].isna().any()]
    if {"zeta_n", "zeta_t"} <= set(never):
        never.remove("zeta_t")
    if "zeta_n" in never and {"L_tail", "mu"} & set(never):
        never.remove("zeta_n")  # it follows from those
    symbols = " and ".join(QUANTITIES[key].symbol for key in never)
    given = ", ".join(_GIVE[key] for key in never)
    return f"no run found has {symbols}, which the curve takes: give the swimmer {given}"


def label(drive: str, numbers: Mapping[str, float] | None, *, several: bool = False) -> str:
    """The legend's entry: b/L_tail and drag ratio of one swimmer, or of the middle of several.

    numbers: b over L_tail (NaN without a head), zeta_n and zeta_t over mu; None where each has its own.
    """
    lead = f"theory: small angle, {DRIVES[drive]},"
    if numbers is None:
        return f"{lead} each swimmer with its own b/L_tail and ζ_n/ζ_t"
    head = f" b/L_tail = {numbers['b']:.2g}," if np.isfinite(numbers["b"]) else ""
    told = f"{lead}{head} ζ_n/ζ_t = {numbers['zeta_n'] / numbers['zeta_t']:.3g}"
    return f"{told} (medians)" if several else told


def own_words(frame: pd.DataFrame, swimmers: Mapping[str, str], names: list[str]) -> list[str]:
    """The sentences about curves of one swimmer each; swimmers: group -> its swimmer; names: all groups."""
    if len(swimmers) > 1:
        lead = f"a curve for each of {len(swimmers)} groups of one swimmer"
    else:
        lead = f"the curve of {next(iter(swimmers.values()))}"
    said = [f"Theory: {lead}, at its own head, drag ratio and walls"]
    share = (frame["high"] / frame["y"] - 1).dropna()
    if len(share):
        low, high = (f"{100 * end:.2g}" for end in (share.min(), share.max()))
        span = low if low == high else f"{low} to {high}"
        said.append(
            f"Bands on theory: 1 u of the predicted speed, {span} %, from what a swimmer's runs share "
            "(sizes, modulus, viscosity) and from the model itself"
        )
    without = [name for name in names if "" not in swimmers and name not in swimmers]
    return said + ([f"No curve for {', '.join(without)}"] if without else [])


def shared_words(swimmers: int) -> list[str]:
    """The sentence about a curve that several swimmers share."""
    band = "its band from the lowest to the highest of their own curves"
    return [f"Theory in ink: the median of {swimmers} swimmers, {band}"]
