"""Repeat groups of a book's runs: one swimmer in one fluid at the same f, theta0 and B, and their scatter."""

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
import pandas as pd
from sqlalchemy import Connection

from labbook.book.asking import Question
from labbook.book.queries import count, frame
from labbook.book.trend_group import kept_only
from labbook.book.trend_source import SETTINGS
from labbook.errors import Refusal
from labbook.physics.repeats import TOLERANCE, Repeats, alike, repeats
from labbook.physics.trend_text import told

MOST = 100_000  # runs: beyond, a page would wait too long
ALIKE = f"Repeats: one swimmer in one fluid with f, theta0 and B equal within {100 * TOLERANCE:g} %."
WIDER = 1e-10  # relative: an address writes twelve digits


@dataclass(frozen=True, eq=False)
class RepeatGroups:
    """key: of the value; runs: how many have it; found: of all groups together.

    table: a row a group, in order of its first run: swimmer, fluid, n, mean (plain), u_mean (scatter over
    root n: JCGM 100:2008, 4.2.3), scatter, over_stated, p, codes, and the ends of f, theta0, B and T as
    f_low, f_high, ...; bare: groups with neither theta0 nor B typed, of which only f is known to be alike.
    """

    key: str
    runs: int
    table: pd.DataFrame
    found: Repeats

    @property
    def bare(self) -> int:
        if self.table.empty:
            return 0
        return int((self.table["theta0_low"].isna() & self.table["B_low"].isna()).sum())

    def in_words(self) -> str:
        """What the groups say together, and what a repeat is."""
        text = f"{told(repeats=self.found)} {ALIKE}"
        if self.bare:
            who = "1 group has" if self.bare == 1 else f"{self.bare} groups have"
            text += f" {who} neither theta0 nor B typed: only f is known to be alike."
        return text


def repeat_groups(connection: Connection, question: Question, key: str) -> RepeatGroups:
    """The repeat groups among a question's runs, void ones aside, with what they say of a quantity or number.

    Errors: Refusal for an unknown key, for void runs alone and for more than 100 000 runs.
    """
    asked = kept_only(question)
    if (found := count(connection, asked)) > MOST:
        raise Refusal("runs", found, f"repeats are looked for among {MOST} runs at most", "narrow the filter")
    keys = tuple(dict.fromkeys((*SETTINGS, "T", key)))
    table = frame(connection, asked, keys=keys, texts=("code", "at", "swimmer", "fluid"))
    columns = {name: table[name].to_numpy() for name in ("code", "swimmer", "fluid")}
    settings = {k: table[k].to_numpy(float) for k in SETTINGS}
    own = table[f"u_own_{key}"].to_numpy(float)
    return grouped(key, **columns, settings=settings, T=table["T"].to_numpy(float),
                   y=table[key].to_numpy(float), own_y=own)  # fmt: skip


def grouped(
    key: str, *, code: np.ndarray, swimmer: np.ndarray, fluid: np.ndarray, settings: Mapping[str, np.ndarray],
    T: np.ndarray, y: np.ndarray, own_y: np.ndarray,
) -> RepeatGroups:  # fmt: skip
    """The repeat groups of n runs given as columns (n,)."""
    sets = alike(identities=(swimmer, fluid), settings=list(settings.values()))
    found = repeats(y=y, u_own=np.where(np.isfinite(own_y), own_y, 0.0), sets=sets)
    members = [np.flatnonzero(found.group == g) for g in range(len(found.n))]
    first = [m[0] for m in members]
    rows = {
        "swimmer": swimmer[first] if first else [], "fluid": fluid[first] if first else [], "n": found.n,
        "mean": found.plain_mean, "u_mean": found.scatter / np.sqrt(found.n),
        "scatter": found.scatter, "over_stated": found.over_stated, "p": found.p,
        "codes": [tuple(code[m]) for m in members],
    }  # fmt: skip
    for name, column in (*settings.items(), ("T", T)):
        rows[f"{name}_low"] = np.array([np.fmin.reduce(column[m]) for m in members], float)
        rows[f"{name}_high"] = np.array([np.fmax.reduce(column[m]) for m in members], float)
    return RepeatGroups(key, int(np.isfinite(y).sum()), pd.DataFrame(rows), found)


def narrowed(question: Question, group: Mapping) -> Question:
    """The question for a group's runs alone: a row of the table as its swimmer, fluid and settings.

    A setting that was not typed cannot be asked for: runs that have it typed are then found too.
    """
    ranges = dict(kept_only(question).ranges)
    for key in SETTINGS:
        low, high = float(group[f"{key}_low"]), float(group[f"{key}_high"])
        if np.isfinite(low):
            before = ranges.get(key, (-np.inf, np.inf))
            ranges[key] = max(before[0], low - WIDER * abs(low)), min(before[1], high + WIDER * abs(high))
    codes = {"swimmers": (str(group["swimmer"]),), "fluids": (str(group["fluid"]),)}
    return replace(kept_only(question), ranges=ranges, **codes)
