"""Where a run's uncertainty comes from: each source's share of a number, and the number by Monte Carlo."""

from dataclasses import dataclass, replace

import numpy as np
from sqlalchemy import Connection, select

from labbook.book.block_spread import follow, measured_of, needed, spread_of
from labbook.book.gathering import Gathering, gather
from labbook.book.registry_rows import registry_of
from labbook.book.run_facts import RunFacts
from labbook.book.run_rows import FACTS, facts_of, shelf_for
from labbook.book.shelf import Shelf
from labbook.book.sources import source_row
from labbook.book.tables import run
from labbook.errors import Refusal
from labbook.registry.group import Registry
from labbook.registry.monte_carlo import DRAWS, FEWEST_DRAWS, Sampled, misleads, strongest_relative, summary
from labbook.registry.quantities import QUANTITIES, RUN_KEYS, SWIMMER_KEYS
from labbook.registry.spread import OWN_SOURCES, Spread
from labbook.registry.typed import DIGITS

ROOT_3 = np.sqrt(3.0)
SHARE_STEP = 0.1  # of u: a drawn glycerol share is rounded to it, which adds less than 0.1 % to its u


@dataclass(frozen=True)
class Contribution:
    """What one source brings: part = (d number/d source) u(source), signed; its share of the variance.

    belongs: run, fluid, material, swimmer, rig or theory; all but the run's own are shared with other runs.
    """

    source: str
    name: str
    belongs: str
    part: float
    share: float

    @property
    def own(self) -> bool:
        """Whether the source belongs to the run alone."""
        return self.belongs == "run"


@dataclass(frozen=True)
class Budget:
    """One number of one run: its value, own, shared and total uncertainty, and what they are made of.

    contributions: the largest first; wide: (key, relative u) of the inputs beyond 15 %.
    """

    number: str
    value: float
    u: float
    u_own: float
    u_shared: float
    contributions: tuple[Contribution, ...]
    wide: tuple[tuple[str, float], ...]

    @property
    def advice(self) -> str:
        """What would help most, in one sentence; '' without any uncertainty."""
        if not self.contributions:
            return ""
        first = self.contributions[0]
        whose = {"run": "this run's", "theory": "the"}.get(first.belongs, f"the {first.belongs}'s")
        better = source_row(first.source).better
        share = f"{first.share:.0%}".replace("%", " %") if first.share < 0.995 else "nearly all"
        return f"{share} of the variance comes from {whose} {first.name}: {better}"

    @property
    def caution(self) -> str:
        """'θ₀ carries 22 %: first order may mislead' of the inputs beyond 15 %; '' without any."""
        if not self.wide:
            return ""
        said = [f"carries {100 * size:.0f} %" if np.isfinite(size) else "is 0" for _, size in self.wide]
        named = [f"{QUANTITIES[key].symbol} {how}" for (key, _), how in zip(self.wide, said, strict=True)]
        return f"{', '.join(named)}: first order may mislead"


def budgets(connection: Connection, code: str) -> dict[str, Budget]:
    """The budget of every number that a run has, by key; Refusal for an unknown run."""
    registry = registry_of(connection)
    spread = _first_order(_gathered(connection, code, registry), registry)
    values = {key: float(spread.values[key][0]) for key in registry.numbers}
    return {key: _budget(key, v, spread, registry) for key, v in values.items() if np.isfinite(v)}


def _gathered(connection, code, registry) -> Gathering:
    """What one run is derived from."""
    row = connection.execute(select(*FACTS).where(run.c.code == code)).one_or_none()
    if row is None:
        raise Refusal("run", code, "the book has no such run")
    return gather(facts_of([row]), shelf_for(connection, [row]), needed(registry, ()))


def _first_order(one: Gathering, registry: Registry) -> Spread:
    with np.errstate(all="ignore"):
        return spread_of(one, np.arange(1), registry)


def _budget(key: str, value: float, spread: Spread, registry: Registry) -> Budget:
    parts = {source: float(part[0]) for source, part in spread.budget(key).items()}
    variance = sum(p * p for p in parts.values())
    # what rounding left of a source that cancels is none
    rows = [_contribution(s, p, variance) for s, p in parts.items() if p * p > 1e-20 * variance]
    rows.sort(key=lambda row: -row.share)
    own, shared = float(spread.own(key)[0]), float(spread.shared(key)[0])
    u, wide = float(np.hypot(own, shared)), _wide(key, spread, registry)
    return Budget(key, value, u, own, shared, tuple(rows), wide)


def _contribution(source: str, part: float, variance: float) -> Contribution:
    row = source_row(source)
    return Contribution(source, row.name, row.belongs, part, part * part / variance)


def _wide(key: str, spread: Spread, registry: Registry) -> tuple[tuple[str, float], ...]:
    """The measured inputs of a number that carry more than 15 % relative uncertainty."""
    inputs = needed(registry, (key,)) & {*RUN_KEYS, *SWIMMER_KEYS, "mu", "rho", "lam", "E", "rho_s"} - {"T"}
    # a density beside a viscosity that was read as such is needed in general, and not here
    inputs = {k for k in inputs if spread.parts[k].keys() & spread.budget(key)}
    values = {k: float(spread.values[k][0]) for k in inputs}
    sizes = {k: float(np.hypot(spread.own(k)[0], spread.shared(k)[0])) for k in inputs}
    return tuple(strongest_relative(values, sizes))


# ---- by Monte Carlo


@dataclass(frozen=True)
class Simulated:
    """A number of a run by Monte Carlo beside its first-order result; warning: '' where they agree."""

    number: str
    value: float
    u: float
    sample: Sampled
    warning: str


def simulate(connection: Connection, code: str, number: str, *, draws: int = DRAWS, seed: int = 101) -> Simulated:
    """A run's number with every measured input drawn (JCGM 101:2008) and pushed through the whole derivation.

    Stated uncertainties are drawn as normal, those that follow from digits alone as rectangular; a fluid's
    properties are found anew at each drawn temperature and glycerol share, and the errors of its readings and
    correlations, normal, go in to first order. The same seed gives the same draws.
    Errors: Refusal for an unknown run or number, where the run does not have the number, for too few draws.
    """
    if draws < FEWEST_DRAWS:
        raise Refusal("draws", draws, f"a 95 % interval needs at least {FEWEST_DRAWS}", f"{DRAWS} is usual")
    registry = registry_of(connection)
    registry.number(number)
    one = _gathered(connection, code, registry)
    first = _first_order(one, registry)
    value = float(first.values[number][0])
    if not np.isfinite(value):
        raise Refusal("number", number, f"{code} has none", "its sheet says why")
    u = float(np.hypot(first.own(number)[0], first.shared(number)[0]))
    with np.errstate(all="ignore"):  # draws without a result are counted, not warned about
        sample = summary(_drawn(one, registry, number, draws, np.random.default_rng(seed)))
    return Simulated(number, value, u, sample, misleads(value, u, sample))


def _drawn(one: Gathering, registry: Registry, number: str, draws: int, chance) -> np.ndarray:
    """The number for each draw of everything that was measured: as many runs, each in a world of its own."""
    keys = needed(registry, (number,))
    shelf, fluid, shared = _drawn_batch(one, draws, chance)
    many = gather(_drawn_facts(one, fluid, draws, chance), shelf, keys)
    swimmer = shelf.swimmers[int(one.facts.swimmer[0])]
    spread = measured_of(many, np.arange(draws), swimmer)
    for key, parts in spread.parts.items():
        for source, part in parts.items():
            if source in OWN_SOURCES or not np.any(part):
                continue  # the run's own sources are in the facts already
            if source not in shared:  # one draw wherever a source enters
                shared[source] = _standard(chance, draws, _from_digits(source, one))
            spread.values[key] = spread.values[key] + part * shared[source]
        spread.parts[key] = {}
    follow(spread, swimmer, str(one.facts.drive[0]), registry, keys)
    return np.broadcast_to(spread.values[number], draws)


def _drawn_facts(one: Gathering, fluid: np.ndarray, draws: int, chance) -> RunFacts:
    """The run typed again and again, each time with other errors of its own."""
    facts, rig = one.facts, one.shelf.rigs.get(int(one.facts.rig[0]))
    u = {k: one.u[k][0] for k in RUN_KEYS}
    half = abs(facts.values["T_end"][0] - facts.values["T"][0]) / 2
    drift = float(np.nan_to_num(half))
    u["T"] = np.sqrt(max(u["T"] ** 2 - drift**2 / 3, 0.0))  # the thermometer's, without the drift's
    values = {"T_end": np.full(draws, np.nan)}
    for key in RUN_KEYS:
        stated_by_rig = rig is not None and f"u_{key}" in rig.typed
        from_digits = bool(facts.digits[key][0]) and not stated_by_rig
        values[key] = one.values[key][0] + u[key] * _standard(chance, draws, from_digits)
    values["T"] = values["T"] + drift * chance.uniform(-1.0, 1.0, draws)
    none, never = ({k: np.zeros(draws, kind) for k in values} for kind in (float, bool))
    ids = (np.repeat(a, draws) for a in (facts.rig, facts.days, facts.drive))
    scale_u = {k: np.repeat(a, draws) for k, a in facts.scale_u.items()}
    return RunFacts(values, none, never, np.repeat(facts.swimmer, draws), fluid, *ids, scale_u=scale_u)


def _drawn_batch(one: Gathering, draws: int, chance) -> tuple[Shelf, np.ndarray, dict[str, np.ndarray]]:
    """A shelf with the fluid mixed at several compositions, its id for each draw, and what that settles."""
    number = int(one.facts.fluid[0])
    fluid = one.shelf.fluids[number]
    typed = fluid.typed.get("glycerol")
    if typed is None or not typed[3] > 0:
        return one.shelf, np.full(draws, number), {}
    text, unit, share, u, origin = typed
    standard = _standard(chance, draws, origin == DIGITS)
    steps, which = np.unique(np.round(standard / SHARE_STEP), return_inverse=True)
    shares = np.clip(share + steps * SHARE_STEP * u, 0.0, 1.0)
    cells = ({"glycerol": [text, unit, float(w), u, origin]} for w in shares)
    fluids = {i: replace(fluid, typed=fluid.typed | cell) for i, cell in enumerate(cells)}
    return replace(one.shelf, fluids=fluids), which, {"glycerol": np.zeros(draws)}


def _from_digits(source: str, one: Gathering) -> bool:
    """Whether a shared source is a value on the shelf that was typed without an uncertainty."""
    shelf, facts = one.shelf, one.facts
    key = "rho" if source == "rho_batch" else source
    found = (shelf.swimmers.get(int(facts.swimmer[0])), shelf.fluids.get(int(facts.fluid[0])),
             shelf.materials.get(int(one.material[0])), shelf.rigs.get(int(facts.rig[0])))  # fmt: skip
    return any(item is not None and key in item.typed and item.typed[key][4] == DIGITS for item in found)


def _standard(chance, draws: int, rectangular: bool) -> np.ndarray:
    """Draws of mean 0 and standard deviation 1."""
    return chance.uniform(-ROOT_3, ROOT_3, draws) if rectangular else chance.standard_normal(draws)
