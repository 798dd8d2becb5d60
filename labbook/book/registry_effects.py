"""What an act on the registry would change, told without writing: a regime's runs, a dialect's values."""

import json
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from sqlalchemy import Connection, Text, cast, func, select

from labbook.book.asking import Question, holds
from labbook.book.block_spread import needed
from labbook.book.queries import frame
from labbook.book.registry_rows import registry_of
from labbook.book.stored_view import resolved
from labbook.book.tables import registry_row
from labbook.registry.dialects import Choices, completed
from labbook.registry.group import Registry
from labbook.registry.regimes import Regime, checked


def count_in(connection: Connection, regime: Regime) -> int:
    """How many kept runs lie in a regime that need not be kept; Refusal for an unknown number."""
    checked(regime, registry_of(connection).numbers)
    query = select(func.count()).select_from(resolved).where(resolved.c.state == "kept", holds(regime))
    return connection.scalar(query)


@dataclass(frozen=True)
class Standing:
    """A number among the kept runs: how many have it, its span, and how many lie in its regimes."""

    runs: int
    lowest: float | None
    highest: float | None
    regimes: Mapping[str, int]


@dataclass(frozen=True)
class Effect:
    """A number as it stands and as it would stand in another dialect; lost: reason -> runs that lose it."""

    now: Standing
    then: Standing
    lost: Mapping[str, int]


def dialect_effect(connection: Connection, number: str, choices: Choices) -> Effect:
    """What making a dialect the house's would do to a number: the kept runs restated, nothing written.

    choices: what they leave out is the house's. Errors: Refusal for an unknown number, choice or option.
    """
    registry = registry_of(connection)
    chosen = completed(number, choices, registry.house.get(number))
    mine = [r for r in registry.regimes.values() if number in r.numbers]
    keys = tuple(dict.fromkeys((number, *(k for r in mine for k in r.numbers))))
    asked = {"keys": keys, "texts": (), "spread": False}
    now = frame(connection, Question(), **asked)
    then = frame(connection, Question(), **asked, dialects={number: chosen})
    reasons = [why for why in then.attrs["lost"].get(number, ()) if why]
    return Effect(
        _standing(now, number, mine), _standing(then, number, mine),
        {why: reasons.count(why) for why in dict.fromkeys(reasons)},
    )  # fmt: skip


def _standing(table, number: str, regimes: list[Regime]) -> Standing:
    values = table[number].to_numpy()
    there = values[~np.isnan(values)]
    columns = {key: table[key].to_numpy() for key in table}
    return Standing(
        len(there), *((float(there.min()), float(there.max())) if len(there) else (None, None)),
        {r.name: int(np.sum(r.holds(columns))) for r in regimes},
    )  # fmt: skip


def takers_of_drag(registry: Registry, number: str, choices: Choices) -> tuple[str, ...]:
    """The other numbers that change too if a dialect becomes the house's: those that take its drag model."""
    house = {**registry.house, number: completed(number, choices, registry.house.get(number))}
    if Registry(house=house).coefficient == registry.coefficient:
        return ()
    drag = {"zeta_n", "zeta_t"}
    return tuple(k for k in registry.numbers if k != number and drag & needed(registry, (k,)))


def history(connection: Connection, kind: str) -> dict[str, list[dict]]:
    """Every stored version of the rows of a kind by key, newest first: version, content, at, by, why."""
    row = registry_row.c
    query = select(row.key, row.version, cast(row.content, Text).label("content"), row.at, row.by, row.why)
    found: dict[str, list[dict]] = {}
    for line in connection.execute(query.where(row.kind == kind).order_by(row.version.desc())).mappings():
        content = json.loads(line["content"]) if line["content"] else None
        found.setdefault(line["key"], []).append({**line, "content": content})
    return found
