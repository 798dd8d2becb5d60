"""What is doubted of a run's values before a track brings them: the warnings that typed values would get."""

from collections.abc import Collection

from sqlalchemy import Connection

from labbook.book.arrivals import watched
from labbook.book.cells import CellsRead
from labbook.book.derive import derive
from labbook.book.plausibility import run_warnings
from labbook.book.records import KINDS
from labbook.book.reduced_cells import reduced_keys
from labbook.book.registry_rows import registry_of
from labbook.book.run_rows import facts_of, shelf_for
from labbook.book.shelf import Typed as Document
from labbook.registry.written import shown

COMPARED = {"f", "U"}  # of what a track brings or takes away, what moves Sp, Re and U
_GUESS = {"U": "another run's track, or a wrong scale or frame rate?", "f": "another run's track, or a wrong frame rate?"}


def doubts(connection: Connection, row, typed: Document, touched: Collection[str]) -> list[tuple[str, str]]:
    """(column, sentence) for each value outside its usual range, and where Sp, Re or U is far from the swimmer's runs.

    row: of `run`; typed: its document as it would be; touched: the keys that change.
    """
    found = []
    for key in reduced_keys(typed):
        if key in touched:
            text = shown(key, *typed[key][2:4])
            warning = CellsRead(KINDS["run"], key)[text].warning
            found += [(key, warning)] if warning else []
    if COMPARED & set(touched):
        would_be = (row["id"], row["code"], row["swimmer_id"], row["fluid_id"], row["rig_id"], row["at"], row["drive"],
                    typed, "kept")  # fmt: skip
        floats = derive(facts_of([would_be]), shelf_for(connection, [would_be]), registry_of(connection)).floats[0]
        far = run_warnings(connection, row["swimmer_id"], watched(floats), 2**62, leave_out=row["id"])
        found += [(key, _of_track(key, said, typed)) for key, said in far if key in touched]
    return found


def _of_track(key: str, said: str, typed: Document) -> str:
    """The sentence with a guess that fits what no hand has typed."""
    said, _, guess = said.rpartition(": ")
    return f"{said}: {_GUESS[key] if key in reduced_keys(typed) else guess}"
