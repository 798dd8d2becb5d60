"""Numbers of many runs in another dialect: the swimmers' dimensions looked up once, columns restated."""

from collections.abc import Mapping

import numpy as np
import pandas as pd
from sqlalchemy import Connection, select

from labbook.book.block_spread import section_of
from labbook.book.shelf import item_of
from labbook.book.tables import swimmer
from labbook.registry.dialects import Choices, completed, written_choices
from labbook.registry.group import Registry
from labbook.registry.restating import Restated, restate
from labbook.registry.swimmer_share import DIMENSIONS

Dialects = Mapping[str, Choices]  # number -> the choices wanted; what they leave out is the house's


def in_words(registry: Registry, dialects: Dialects) -> dict[str, str]:
    """Number -> its dialect, said against the one at birth, which never changes: 'house', 'rate f, power 1'.

    A group's house that is another says which: 'house: rate f'. Errors: Refusal for an unknown choice or option.
    """
    asked = {n: completed(n, choices, registry.house.get(n)) for n, choices in dialects.items()}
    return {n: _said(n, chosen, chosen == registry.choices(n)) for n, chosen in asked.items()}


def _said(number: str, chosen: Choices, house: bool) -> str:
    words = written_choices(number, chosen)  # 'house' here means: as at birth
    if house:
        return words if words == "house" else f"house: {words}"
    return words if words != "house" else "as at birth"


def house_in_words(registry: Registry, keys) -> dict[str, str]:
    """Number -> 'house: rate f' for those of the keys whose house dialect is not the one at birth."""
    return in_words(registry, {n: {} for n in keys if registry.house.get(n)})


def away(registry: Registry, dialects: Dialects | None) -> dict[str, dict[str, object]]:
    """Those of the dialects that are not the house's, every choice named."""
    asked = {n: completed(n, c, registry.house.get(n)) for n, c in (dialects or {}).items()}
    return {n: chosen for n, chosen in asked.items() if chosen != registry.choices(n)}


_SECTIONS = {"rod": ("d",), "tube": ("D", "d_in"), "strip": ("w", "t")}


def swimmer_inputs(connection: Connection, ids: np.ndarray) -> dict[str, np.ndarray]:
    """What a restating needs of the swimmers of some runs: their ids, dimensions and u_, one array each."""
    stored = [item_of(row) for row in connection.execute(select(swimmer)).mappings()]
    rows = max((item.id for item in stored), default=0) + 1
    columns = {f"{p}{key}": np.full(rows, np.nan) for key in DIMENSIONS for p in ("", "u_")}
    one_length = np.zeros(rows, bool)
    for item in stored:
        one_length[item.id] = item.texts["form"] == "undulating" and "L_tail" not in item.typed
        # dimensions of another section than the stated one are no dimensions of this swimmer
        others = {key for section, keys in _SECTIONS.items() if section != section_of(item) for key in keys}
        for key in set(DIMENSIONS) & set(item.typed) - others:
            columns[key][item.id], columns[f"u_{key}"][item.id] = item.value(key), item.u(key)
    ids = np.asarray(ids, dtype=np.int64)
    return {key: column[ids] for key, column in columns.items()} | {"tail_is_body": one_length[ids], "swimmer": ids}


def restated(registry: Registry, number: str, choices: Choices, inputs, value, u_own=None, u_shared=None) -> Restated:
    """A column of house values in a dialect, with its uncertainties where given."""
    return restate(
        number, value, u_own, u_shared, choices=choices, house=registry.house.get(number), inputs=inputs
    )


def restated_frame(
    connection: Connection, registry: Registry, table: pd.DataFrame, ids: np.ndarray, dialects: Dialects
) -> pd.DataFrame:
    """A frame of runs with some numbers in other dialects, their u_ columns too where it has them.

    ids: the swimmer of each row. attrs['dialects'] says which dialect each restated column is in;
    attrs['lost'] holds, number by number, a sentence for each run that lost its value by it (None elsewhere).
    """
    spoken = {n: c for n, c in away(registry, dialects).items() if n in table}
    table.attrs["dialects"] = house_in_words(registry, [k for k in table if k in registry.house]) | in_words(registry, dialects)
    table.attrs["lost"] = {}
    if not spoken:
        return table
    inputs = swimmer_inputs(connection, ids)
    attrs, columns = table.attrs, {}
    for number, choices in spoken.items():
        own, shared = (table.get(f"{p}{number}") for p in ("u_own_", "u_shared_"))
        found = restated(registry, number, choices, inputs, table[number], own, shared)
        columns[number] = found.value
        if own is not None:
            columns |= {f"u_{number}": np.hypot(found.u_own, found.u_shared), f"u_own_{number}": found.u_own,
                        f"u_shared_{number}": found.u_shared}  # fmt: skip
        if found.why is not None:
            attrs["lost"][number] = found.why
    table = table.assign(**columns)
    table.attrs = attrs
    return table
