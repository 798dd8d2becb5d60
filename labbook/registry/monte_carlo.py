"""Propagation of distributions by drawing (JCGM 101:2008), and when a first-order uncertainty misleads."""

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal

RELATIVE_LIMIT = 0.15  # inputs beyond 15 % relative standard uncertainty are worth a Monte Carlo check

DRAWS = 200_000  # 10^4 times 1/(1 - 0.95), the least that JCGM 101, 7.2.2, advises for 95 %
FEWEST_DRAWS = 1_000
COVERAGE_FACTOR = 1.96  # of a normal result at 95 %: 1.959964
MOST_UNDEFINED = 0.025  # one tail of the interval: with more, the limit itself may be missing

SHAPES = ("normal", "rectangular")


@dataclass(frozen=True)
class Source:
    """One input's distribution: value, standard uncertainty, shape; a rectangle has half width u sqrt 3.

    Errors: Refusal for a value or u that is not finite, a negative u, an unknown shape.
    """

    value: float
    u: float
    shape: str = "normal"

    def __post_init__(self):
        if self.shape not in SHAPES:
            raise Refusal("shape", self.shape, "is not a distribution", f"one of {', '.join(SHAPES)}")
        if not math.isfinite(self.value):
            raise Refusal("value", self.value, "is not a finite number")
        if not (math.isfinite(self.u) and self.u >= 0):
            raise Refusal("u", self.u, "a standard uncertainty is a finite number, 0 or more")

    def spread_out(self, standard: np.ndarray) -> np.ndarray:
        """Draws of this source from draws of mean 0 and standard deviation 1."""
        return self.value + self.u * standard


@dataclass(frozen=True)
class Sampled:
    """What a set of draws says: mean, standard uncertainty, probabilistically symmetric 95 % interval.

    draws: all of them; undefined: those with no finite result, left out of the rest (nan where none is left).
    """

    mean: float
    u: float
    low: float
    high: float
    draws: int
    undefined: int


def sampled(
    function: Callable[..., np.ndarray],
    sources: Mapping[str, Source],
    *,
    draws: int = DRAWS,
    seed: int = 101,
    correlated: Mapping[tuple[str, str], float] | None = None,
) -> Sampled:
    """The distribution of function(**arrays), called once on draws of all sources.

    correlated: (key, key) -> correlation coefficient of two normal sources (JCGM 101, 6.4.8). The same seed
    gives the same draws. Errors: Refusal for fewer than 1,000 draws and for correlations that cannot be.
    """
    if isinstance(draws, bool) or not isinstance(draws, int) or draws < FEWEST_DRAWS:
        raise Refusal("draws", draws, f"a 95 % interval needs at least {FEWEST_DRAWS}", f"{DRAWS} is usual")
    chance = np.random.default_rng(seed)
    tied = _tied(chance, sources, correlated or {}, draws)
    given = {}
    for key, source in sources.items():
        if key in tied:
            standard = tied[key]
        elif source.shape == "normal":
            standard = chance.standard_normal(draws)
        else:
            standard = chance.uniform(-math.sqrt(3), math.sqrt(3), draws)
        given[key] = source.spread_out(standard)
    with np.errstate(all="ignore"):  # draws without a result are counted, not warned about
        result = function(**given)
    return summary(np.broadcast_to(np.asarray(result, dtype=float), draws))


def _tied(chance, sources, correlated, draws) -> dict[str, np.ndarray]:
    """Standard normal draws of the sources that are correlated with another."""
    keys = tuple(dict.fromkeys(key for pair in correlated for key in pair))
    for key in keys:
        if key not in sources:
            raise Refusal("correlated", key, "is not one of the sources", f"one of {', '.join(sources)}")
        if sources[key].shape != "normal":
            raise Refusal("correlated", key, "only normal sources can be correlated")
    matrix = np.eye(len(keys))
    for (one, two), coefficient in correlated.items():
        if one == two or not abs(coefficient) <= 1:
            raise Refusal("correlated", f"{one}, {two}", "two sources have a coefficient from -1 to 1")
        i, j = keys.index(one), keys.index(two)
        matrix[i, j] = matrix[j, i] = coefficient
    if not keys:
        return {}
    sizes, axes = np.linalg.eigh(matrix)
    if sizes[0] < -1e-9:
        raise Refusal("correlated", ", ".join(keys), "these coefficients contradict each other")
    standard = (axes * np.sqrt(np.maximum(sizes, 0.0))) @ chance.standard_normal((len(keys), draws))
    return dict(zip(keys, standard, strict=True))


def summary(values) -> Sampled:
    """What draws that somebody else made say: values is a one-dimensional array of results."""
    values = np.asarray(values, dtype=float).ravel()
    defined = values[np.isfinite(values)]
    undefined = len(values) - len(defined)
    if not len(defined):
        return Sampled(math.nan, math.nan, math.nan, math.nan, len(values), undefined)
    low, high = np.quantile(defined, (0.025, 0.975))
    u = float(np.std(defined, ddof=1)) if len(defined) > 1 else math.nan
    return Sampled(float(np.mean(defined)), u, float(low), float(high), len(values), undefined)


def misleads(value: float, u: float, sample: Sampled) -> str:
    """'' where the draws bear the first-order result out, else one sentence with both 95 % intervals.

    They do where both ends agree within half a unit of the first significant digit of u (JCGM 101:2008, 7.9.2
    and clause 8), and where no more than 2.5 % of the draws are without a result.
    """
    lacking = sample.undefined / sample.draws if sample.draws else 1.0
    if lacking == 1.0:
        return "first order misleads: no draw of the inputs gives a result"
    if not (math.isfinite(value) and math.isfinite(u)):
        drawn = _interval(sample.low, sample.high, _unit(sample.u))
        return f"first order gives no result, Monte Carlo {drawn} at 95 %"
    first_low, first_high = value - COVERAGE_FACTOR * u, value + COVERAGE_FACTOR * u
    unit = _unit(u if u > 0 else sample.u)
    tolerance = unit / 2 if u > 0 else 0.0
    apart = max(abs(first_low - sample.low), abs(first_high - sample.high))
    rounding = 1e-12 * max(abs(sample.low), abs(sample.high))
    if apart <= tolerance + rounding and lacking <= MOST_UNDEFINED:
        return ""
    first, drawn = _interval(first_low, first_high, unit), _interval(sample.low, sample.high, unit)
    tail = f"; {sample.undefined} of {sample.draws} draws have no result" if sample.undefined else ""
    return f"first order misleads: it gives {first} at 95 %, Monte Carlo {drawn}{tail}"


def _unit(u: float) -> float:
    """One unit of the first significant digit of u, after rounding to it: 0.0539 has 0.01."""
    if not (math.isfinite(u) and u > 0):
        return 0.0
    return 10.0 ** int(f"{u:.0e}".partition("e")[2])


def _interval(low: float, high: float, unit: float) -> str:
    """'1.128 to 1.340': both ends to a tenth of the unit."""
    return f"{_plain(low, unit / 10)} to {_plain(high, unit / 10)}"


def _plain(value: float, step: float) -> str:
    if not (math.isfinite(value) and step > 0):
        return f"{value:g}"
    last = -math.floor(math.log10(step) + 0.5)
    largest = max(abs(value), step)
    if 1e-4 <= largest < 1e6:
        return f"{round(value, last) + 0.0:.{max(last, 0)}f}"
    return f"{value:.{max(last + math.floor(math.log10(largest)), 0)}e}"


def strongest_relative(
    values: Mapping[str, float | None], u: Mapping[str, float | None]
) -> list[tuple[str, float]]:
    """The inputs beyond 15 % relative standard uncertainty, the strongest first, as (key, u/|value|).

    An input whose value is 0 is infinitely uncertain; an absent value or uncertainty says nothing.
    """
    found = []
    for key, value in values.items():
        spread = u.get(key)
        if value is None or spread is None or not spread > 0 or math.isnan(value):
            continue
        relative = float(spread) / abs(value) if value else math.inf
        if relative > RELATIVE_LIMIT:
            found.append((key, relative))
    return sorted(found, key=lambda row: -row[1])
