"""Marks of a plan before they are drawn: one dot for runs in one place, numbers joined, names kept apart."""

import numpy as np
import pandas as pd

from labbook.charts.trend_layers import short

DOTS = (200, 140)  # places along f and mu: dots closer than that fall together
LINE = 14.0  # pixels of a line of names


def thinned(runs: pd.DataFrame, f: np.ndarray, mu: np.ndarray, keys=("f", "mu")) -> pd.DataFrame:
    """The first run of every place on the plane, so that many runs weigh no more than some thousand dots."""
    places = [
        np.round(np.log(runs[key].to_numpy(float) / span[0]) / np.log(span[-1] / span[0]) * n)
        for key, span, n in zip(keys, (f, mu), DOTS, strict=True)
    ]
    return runs[~pd.DataFrame(dict(zip("xy", places, strict=True)), index=runs.index).duplicated()]


def joined(runs: pd.DataFrame, keys=("f", "mu")) -> list[dict]:
    """A row for each place, with the numbers of all proposals there: '2' or '1–3'."""
    columns = [runs[c].tolist() for c in (*keys, "place", "fluid")]
    here: dict[tuple, list[tuple]] = {}
    for x, y, place, fluid in zip(*columns, strict=True):
        here.setdefault((short(x), short(y)), []).append((place, fluid))
    return [
        {
            keys[0]: x,
            keys[1]: y,
            "place": numbers(sorted(place for place, _ in found)),
            "fluid": ", ".join(dict.fromkeys(fluid for _, fluid in found)),
        }
        for (x, y), found in here.items()
    ]


def numbers(found: list[int]) -> str:
    """'1–3' of 1, 2, 3 and '1,4' of 1, 4."""
    if len(found) > 1 and found == list(range(found[0], found[-1] + 1)):
        return f"{found[0]}–{found[-1]}"
    return ",".join(map(str, found))


def apart(fluids: pd.DataFrame, mu: np.ndarray, height: float) -> list[dict]:
    """Names of fluids with the viscosity of their line and the place of the name, at least LINE pixels apart.

    Fluids that have no room for a line of their own share one: 'sil-a, sil-b'. mu: the frame, ascending, in
    Pa.s; height: its pixels.
    """
    pairs = zip(fluids["code"].tolist(), fluids["mu"].tolist(), strict=True)
    known = sorted(((code, m) for code, m in pairs if np.isfinite(m)), key=lambda pair: pair[1])
    span = np.log(mu[-1] / mu[0])
    groups = [[[code], [np.log(m / mu[0]) / span * height]] for code, m in known]
    while len(groups) * LINE > height:
        means = [np.mean(at) for _, at in groups]
        near = int(np.argmin(np.diff(means)))
        for mine, other in zip(groups[near], groups.pop(near + 1), strict=True):
            mine += other
    at = [float(np.mean(places)) for _, places in groups]
    rows = []
    for (codes, places), y in zip(groups, spread_out(at, LINE, LINE / 2, height - LINE / 2), strict=True):
        name = ", ".join(codes) if len(codes) < 3 else f"{codes[0]} and {len(codes) - 1} more"
        rows += [
            {"name": name if i == 0 else "", "mu": _back(p, mu, height), "at": _back(y, mu, height)}
            for i, p in enumerate(places)
        ]
    return rows


def _back(y: float, mu, height: float) -> float:
    return short(float(mu[0] * (mu[-1] / mu[0]) ** (y / height)))


def spread_out(wanted: list[float], gap: float, low: float, high: float) -> list[float]:
    """Ascending places at least `gap` apart between low and high, as near to those wanted as may be.

    Least squares: neighbours that would touch become one block at the mean of what they want.
    """
    blocks: list[list[float]] = []  # (sum of wanted - own offset, how many)
    for place in wanted:
        blocks.append([place, 1])
        while len(blocks) > 1 and _end(blocks[-2], gap) > _start(blocks[-1]):
            total, n = blocks.pop()
            blocks[-1] = [blocks[-1][0] + total - n * gap * blocks[-1][1], blocks[-1][1] + n]
    found: list[float] = []
    for total, n in blocks:
        found += [total / n + i * gap for i in range(int(n))]
    ceiling = high
    for i in reversed(range(len(found))):
        found[i] = ceiling = min(found[i], ceiling)
        ceiling -= gap
    floor = low
    for i in range(len(found)):
        found[i] = floor = max(found[i], floor)
        floor += gap
    return found


def _start(block) -> float:
    return block[0] / block[1]


def _end(block, gap: float) -> float:
    return block[0] / block[1] + block[1] * gap
