"""Runs of a question for statistics: values, own uncertainties, and every shared error with whose it is."""

from dataclasses import dataclass

import numpy as np
from sqlalchemy import Connection, select

from labbook.book.asking import Question, check_key
from labbook.book.block_spread import follow, measured_of, needed, undefined
from labbook.book.derive import blocks_alike
from labbook.book.gathering import Gathering, gather
from labbook.book.queries import count
from labbook.book.registry_rows import registry_of
from labbook.book.run_rows import batches, facts_of, shelf_for
from labbook.book.shelf import Shelf
from labbook.book.sources import source_row
from labbook.book.stored_view import resolved
from labbook.book.tables import run
from labbook.errors import Refusal
from labbook.physics.trend_points import Points, SharedError, points
from labbook.registry.spread import OWN_SOURCES

MOST = 16_000  # runs: beyond, an answer would take longer than one waits for a page
SETTINGS = ("f", "theta0", "B")  # runs equal in these, swimmer and fluid are repeats
# a set of readings errs alone: the sentence of the run's value says which it was
READ_FROM = {"E": "E", "mu_readings": "mu", "rho_reading": "rho"}


@dataclass(frozen=True, eq=False)
class TrendRuns:
    """Some kept or other runs, n of them, oldest first.

    code, swimmer, fluid, material, form: texts, '' for none; day: ordinals; settings: f, theta0, B in SI, NaN
    where not typed; x, y, own_x, own_y: SI; shared: SharedErrors, an owner each; own: source -> (part of x,
    part of y); beyond: the temperature lies beyond the fluid's readings; T and wall (the head's radius over
    the wall's distance) are NaN where absent.
    """

    x_key: str
    y_key: str
    code: np.ndarray
    day: np.ndarray
    swimmer: np.ndarray
    fluid: np.ndarray
    material: np.ndarray
    form: np.ndarray
    settings: dict[str, np.ndarray]
    x: np.ndarray
    y: np.ndarray
    own_x: np.ndarray
    own_y: np.ndarray
    shared: tuple[SharedError, ...]
    own: dict[str, tuple[np.ndarray, np.ndarray]]
    beyond: np.ndarray
    T: np.ndarray
    wall: np.ndarray

    def __len__(self) -> int:
        return len(self.x)

    def points(self) -> Points:
        """The runs as the statistics take them."""
        own = {"u_own_x": self.own_x, "u_own_y": self.own_y}
        return points(x=self.x, y=self.y, swimmer=self.swimmer, shared=self.shared, **own)

    def where(self, keep: np.ndarray) -> "TrendRuns":
        """Some of the runs."""
        texts = (a[keep] for a in (self.code, self.day, self.swimmer, self.fluid, self.material, self.form))
        floats = (a[keep] for a in (self.x, self.y, self.own_x, self.own_y))
        return TrendRuns(
            self.x_key, self.y_key, *texts, {k: a[keep] for k, a in self.settings.items()}, *floats,
            tuple(SharedError(s.name, s.owner[keep], s.x[keep], s.y[keep]) for s in self.shared),
            {k: (x[keep], y[keep]) for k, (x, y) in self.own.items()}, self.beyond[keep], self.T[keep],
            self.wall[keep],
        )  # fmt: skip


def trend_runs(connection: Connection, question: Question, x: str, y: str) -> TrendRuns:
    """The runs of a question with what statistics of y against x need, derived from the facts.

    House dialect. Errors: Refusal for an unknown key, and where the question finds more than 16 000 runs.
    """
    registry = registry_of(connection)
    for key in (x, y):
        check_key(key, registry)
    found = count(connection, question)
    if found > MOST:
        raise Refusal("runs", found, f"statistics take {MOST} runs at most", "narrow the filter")
    ids = select(resolved.c.run_id).select_from(resolved.join(run, run.c.id == resolved.c.run_id))
    wanted = run.c.id.in_(ids.where(*question.conditions(registry)))
    rows = [row for batch in batches(connection, wanted) for row in batch]
    rows.sort(key=lambda row: (row[5], row[0]))
    if not rows:
        return _none(x, y)
    facts, shelf = facts_of(rows), shelf_for(connection, rows)
    gathered = gather(facts, shelf, needed(registry, (x, y)))
    value, parts, settings = _propagated(gathered, shelf, registry, x, y)
    own_x, own_y = (_own(parts[key], len(rows)) for key in (x, y))
    nothing = np.zeros(len(rows))
    sources = sorted(parts[x].keys() | parts[y].keys())
    both = {s: (parts[x].get(s, nothing), parts[y].get(s, nothing)) for s in sources}
    return TrendRuns(
        x, y, np.array([row[1] for row in rows], object), facts.days, *_names(gathered, shelf), settings,
        value[x], value[y], own_x, own_y,
        tuple(SharedError(s, _owner(s, gathered), *both[s]) for s in sources if s not in OWN_SOURCES),
        {s: both[s] for s in sources if s in OWN_SOURCES}, np.asarray(gathered.batch["mu"].beyond, bool),
        gathered.values["T"], value["wall"],
    )  # fmt: skip


def _none(x: str, y: str) -> TrendRuns:
    text, number = np.empty(0, object), np.empty(0)
    none = dict.fromkeys(SETTINGS, number)
    return TrendRuns(x, y, text, number, text, text, text, text, none, number, number, number, number, (), {},
                     np.empty(0, bool), number, number)  # fmt: skip


def _own(parts: dict[str, np.ndarray], n: int) -> np.ndarray:
    """Standard uncertainty from the sources of each run alone."""
    with np.errstate(over="ignore"):  # over a divisor of next to nothing
        return np.sqrt(sum((part**2 for source, part in parts.items() if source in OWN_SOURCES), np.zeros(n)))


def _propagated(gathered: Gathering, shelf: Shelf, registry, x: str, y: str):
    """Values of x, y and wall; key -> source -> part of x and y; the settings; one array a run each."""
    n, keys = len(gathered.facts), needed(registry, (x, y, "wall"))
    numbers = tuple(k for k in (x, y) if k in registry.numbers)
    value = {k: np.full(n, np.nan) for k in (x, y, "wall")}
    parts: dict[str, dict[str, np.ndarray]] = {x: {}, y: {}}
    settings = {k: np.full(n, np.nan) for k in SETTINGS}
    with np.errstate(all="ignore"):
        for rows in blocks_alike(gathered.facts, shelf):
            group = shelf.swimmers[int(gathered.facts.swimmer[rows[0]])]
            spread, drive = measured_of(gathered, rows, group), str(gathered.facts.drive[rows[0]])
            follow(spread, group, drive, registry, keys)
            if numbers:
                undefined(spread, drive, registry, numbers)
            for key in value:
                value[key][rows] = spread.values[key]
            for key in parts:
                for source, part in spread.parts[key].items():
                    parts[key].setdefault(source, np.zeros(n))[rows] = np.nan_to_num(part)
            for key in SETTINGS:
                settings[key][rows] = spread.values[key]
    return value, parts, settings


def _names(gathered: Gathering, shelf: Shelf) -> tuple[np.ndarray, ...]:
    """Codes of swimmer, fluid and material, and the swimmer's form, of each run."""
    facts = gathered.facts
    swimmers = np.array([shelf.swimmers[int(i)].code for i in facts.swimmer], object)
    fluids = np.array([shelf.fluids[int(i)].code for i in facts.fluid], object)
    materials = np.array([shelf.materials[int(i)].code if i else "" for i in gathered.material], object)
    forms = np.array([shelf.swimmers[int(i)].texts["form"] for i in facts.swimmer], object)
    return swimmers, fluids, materials, forms


def _owner(source: str, gathered: Gathering) -> np.ndarray:
    """Whose error a source is, for each run."""
    facts, belongs = gathered.facts, source_row(source).belongs
    ids = {"fluid": facts.fluid, "material": gathered.material, "swimmer": facts.swimmer, "rig": facts.rig}
    owner = ids.get(belongs, np.zeros(len(facts), np.int64)).astype(object)
    if source not in READ_FROM:
        return owner
    said = gathered.batch[READ_FROM[source]].said
    return np.array([f"{i} {text}" for i, text in zip(owner, said, strict=True)], object)
