"""Acts on the registry, each one function, one transaction, one ledger line: own numbers, regimes, house dialects."""

from collections.abc import Callable, Mapping

from sqlalchemy import Connection, Engine, bindparam, func, select, update

from labbook.book import chain, stored_view
from labbook.book.asking import Question
from labbook.book.derive import derive
from labbook.book.ledger import handle, reason
from labbook.book.opening import writing
from labbook.book.queries import regime_counts
from labbook.book.registry_rows import put_version, registry_of
from labbook.book.run_rows import batches, derive_again, facts_of, own_cells, shelf_for, with_nulls
from labbook.book.stored_view import TOLD, own_columns, resolved, table_of, view_column
from labbook.book.tables import book, run
from labbook.errors import Refusal
from labbook.registry.catalogue import Number
from labbook.registry.dialects import AT_BIRTH, completed
from labbook.registry.group import Registry
from labbook.registry.own_numbers import read_number
from labbook.registry.regimes import Regime, checked

Progress = Callable[[int], None]
TAKEN = (*TOLD, *run.c.keys(), "regime", "regimes")  # names that frames and files use already


def define_number(
    engine: Engine, cells: Mapping[str, str], by: str, *, why: str | None = None, progress: Progress = lambda n: None
) -> int:
    """Add an own number from cells as typed, or a new version of one (with a reason); returns its version.

    The number becomes a column of the stored view at once; only it is derived. The same cells again change
    nothing. Errors: Refusal or Refusals, and nothing is written.
    """
    by = handle(by)
    with writing(engine) as connection:
        before = registry_of(connection)
        number = read_number(cells, before, TAKEN)
        key, old = number.key, before.own.get(number.key)
        if old is not None:
            if old == number:
                return before.versions[key]
            if not (why or "").strip():
                raise Refusal("why", None, f"is missing: {key} stands in the registry, and this is another version",
                              "say why it changes, or use another key")  # fmt: skip
        version = put_version(connection, "number", key, number.content(), by, reason(why) if why else None)
        if old is None:
            stored_view.add_number(connection, key)
        runs = _write_number(connection, key, progress) if old is None or _differs(old, number) else 0
        _settle(connection)
        chain.append(
            connection, by, "define" if old is None else "amend", "number", key,
            before=None if old is None else _told(old, before.versions[key]),
            after=_told(number, version) | {"derived runs": runs}, why=why,
        )  # fmt: skip
    return version


def _differs(old: Number, new: Number) -> bool:
    """Whether another version gives other values."""
    return old.parsed.tree != new.parsed.tree


def _told(number: Number, version: int) -> dict:
    content = number.content()
    shown = ("name", "formula", "compares", "source", "answer")
    return {"version": version, **{k: content[k] for k in shown}}


def _settle(connection: Connection) -> None:
    connection.execute(update(book).values(registry=registry_of(connection).fingerprint))


def _write_number(connection: Connection, key: str, progress: Progress) -> int:
    """Derive one own number of every run and write its columns; returns how many runs there are."""
    registry = registry_of(connection)
    columns = own_columns(key)
    view = table_of(tuple(registry.own))
    statement = (
        update(view).where(view.c.run_id == bindparam("of_run")).values({c: bindparam(f"new_{c}") for c in columns})
    )
    compiled = statement.compile(dialect=connection.dialect)
    names = [*(f"new_{c}" for c in columns), "of_run"]
    done = 0
    for rows in batches(connection):
        derived = derive(facts_of(rows), shelf_for(connection, rows), registry, (key,))
        ids = [r[0] for r in rows]
        cells = with_nulls(connection, own_cells(ids, derived, key))
        written = [(*row, run_id) for row, run_id in zip(cells, ids, strict=True)]
        if compiled.positional:
            order = [names.index(n) for n in compiled.positiontup]
            connection.exec_driver_sql(str(compiled), [tuple(row[i] for i in order) for row in written])
        else:
            connection.exec_driver_sql(str(compiled), [dict(zip(names, row, strict=True)) for row in written])
        done += len(rows)
        progress(len(rows))
    return done


def withdraw_number(engine: Engine, key: str, why: str, by: str) -> None:
    """Take an own number out of use: its versions stay in the book, its values leave the stored view."""
    by, why = handle(by), reason(why)
    with writing(engine) as connection:
        before = registry_of(connection)
        if key not in before.own:
            known = ", ".join(before.own) or "none so far"
            raise Refusal("key", key, "is no number of the group's own", f"own numbers: {known}")
        used = [r.name for r in before.regimes.values() if any(band.number == key for band in r.bands)]
        if used:
            raise Refusal("key", key, f"is what {', '.join(used)} stands on", "withdraw that regime first")
        put_version(connection, "number", key, None, by, why)
        stored_view.empty_number(connection, key)
        _settle(connection)
        chain.append(connection, by, "withdraw", "number", key,
                     before=_told(before.own[key], before.versions[key]), why=why)  # fmt: skip


def set_regime(engine: Engine, regime: Regime, why: str, by: str) -> tuple[int, int]:
    """Add a regime, or change one; returns how many kept runs lay in it before and lie in it now."""
    by, why = handle(by), reason(why)
    with writing(engine) as connection:
        before = registry_of(connection)
        checked(regime, before.numbers)
        old = before.regimes.get(regime.name)
        alike = [n for n in before.regimes if n.lower() == regime.name.lower() and n != regime.name]
        if alike:
            raise Refusal("name", regime.name, f"differs from {alike[0]!r} by capitals alone", "choose another name")
        if old == regime:
            raise Refusal("regime", regime.name, "nothing would change")
        counted = _kept(connection, regime.name)
        put_version(connection, "regime", regime.name, regime.content(), by, why)
        now = _kept(connection, regime.name)
        chain.append(
            connection, by, "define" if old is None else "amend", "regime", regime.name,
            before=None if old is None else _bands(old) | {"runs": counted}, after=_bands(regime) | {"runs": now},
            why=why,
        )  # fmt: skip
    return counted, now


def _kept(connection: Connection, name: str) -> int:
    return regime_counts(connection, Question()).get(name, 0)


def _bands(regime: Regime) -> dict:
    return {"bands": " and ".join(band.words for band in regime.bands), "colour": regime.colour, "source": regime.source}


def withdraw_regime(engine: Engine, name: str, why: str, by: str) -> None:
    """Take a regime out of use; its versions stay in the book."""
    by, why = handle(by), reason(why)
    with writing(engine) as connection:
        old = registry_of(connection).regime(name)
        put_version(connection, "regime", name, None, by, why)
        chain.append(connection, by, "withdraw", "regime", name, before=_bands(old), why=why)


def adopt_dialect(
    engine: Engine, number: str, choices: Mapping[str, object], why: str, by: str, progress: Progress = lambda n: None
) -> dict:
    """Change the group's house dialect of a number and derive the book again, in one transaction.

    Returns {'before': ..., 'after': ...}, each with the choices, the number's smallest and largest value among
    the kept runs, and how many of them lie in each regime of it.
    """
    by, why = handle(by), reason(why)
    with writing(engine) as connection:
        registry = registry_of(connection)
        chosen = completed(number, choices, registry.choices(number) if number in AT_BIRTH else None)
        if chosen == registry.choices(number):
            raise Refusal("dialect", number, "is the house dialect already")
        if chosen.get("coefficient") in NEEDS_PITCH:
            raise Refusal("coefficient", chosen["coefficient"], "needs a helix pitch, so most runs would have no "
                          + number, "restate to it instead")  # fmt: skip
        before = _seen(connection, number)
        departs = {k: v for k, v in chosen.items() if v != AT_BIRTH[number][k]}
        put_version(connection, "house", number, departs, by, why)
        changed = derive_again(connection, progress=progress)
        _settle(connection)
        after = _seen(connection, number) | {"derived runs": len(changed)}
        moved = _follow_drag(registry_of(connection)) if registry_of(connection).coefficient != registry.coefficient else []
        if moved:
            after["changed with it"] = ", ".join(key for key in moved if key != number)
        chain.append(connection, by, "adopt", "dialect", number, before=before, after=after, why=why)
    return {"before": before, "after": after}


def _follow_drag(registry: Registry) -> list[str]:
    """What follows from the drag model: the resistive coefficients and every number made of them."""
    drag = {"zeta_n", "zeta_t"}
    return [*sorted(drag), *(k for k, n in registry.numbers.items() if drag & set(n.inputs))]


NEEDS_PITCH = ("gray_hancock_1955", "lighthill")


def _seen(connection: Connection, number: str) -> dict:
    """A number as the book has it: its dialect, its span among kept runs, and its regimes' counts."""
    registry = registry_of(connection)
    value = view_column(number)
    low, high = connection.execute(
        select(func.min(value), func.max(value)).select_from(resolved).where(resolved.c.state == "kept")
    ).one()
    counts = regime_counts(connection, Question())
    mine = [r.name for r in registry.regimes.values() if any(band.number == number for band in r.bands)]
    return {"choices": dict(registry.choices(number)), "lowest": low, "highest": high,
            "regimes": {name: counts[name] for name in mine}}  # fmt: skip
