"""Everything the book knows of single runs: what was typed, what was resolved and from what, numbers, marks."""

import math
from collections.abc import Iterator
from dataclasses import dataclass, field, replace

import pandas as pd
from sqlalchemy import Connection, select

from labbook.book.absence import marks_of, why_absent
from labbook.book.asking import Question
from labbook.book.clock import local
from labbook.book.dialect_columns import Dialects, house_in_words
from labbook.book.queries import RUN_TEXTS, frame
from labbook.book.registry_rows import registry_of
from labbook.book.run_prediction import Prediction, prediction_of
from labbook.book.stored_view import SENTENCES
from labbook.book.tables import run
from labbook.book.track_pages import TrackSheet, track_of, tracks_of
from labbook.errors import Refusal
from labbook.registry.group import Registry
from labbook.registry.regimes import regimes_of
from labbook.registry.typed import REDUCED


@dataclass(frozen=True)
class RunSheet:
    """One run: text columns, typed documents, values (SI) with u, u_own, u_shared, and how they came about.

    sentences: 'viscosity: fit of 3 readings of 2026-03-01' and the like, absent ones left out; dialects: number
    -> words, for numbers whose values are not in the house dialect (regimes always are); track: what values of the
    run come from, None where all were typed; prediction: what stands behind U_model.
    """

    texts: dict[str, str | None]
    typed: dict[str, list]
    values: dict[str, float | None]
    u: dict[str, float | None]
    u_own: dict[str, float | None]
    u_shared: dict[str, float | None]
    sentences: dict[str, str]
    regimes: list[str]
    why_absent: dict[str, str]
    marks: dict[str, list[str]]
    logged: str | None = None
    dialects: dict[str, str] = field(default_factory=dict)
    track: TrackSheet | None = None
    prediction: Prediction | None = None

    def row(self) -> dict:
        """The run as one flat record, for JSON."""
        flat: dict = dict(self.texts)
        for key in self.values:
            flat[key] = self.values[key]
            flat[f"u_{key}"], flat[f"u_own_{key}"] = self.u[key], self.u_own[key]
            flat[f"u_shared_{key}"] = self.u_shared[key]
        return flat | {
            "resolved_from": list(self.sentences.values()),
            "regimes": self.regimes,
            "why_absent": self.why_absent,
            "marks": self.marks,
            "track": self.track.row() if self.track is not None else None,
            "model": self.prediction.row() if self.prediction is not None else None,
        } | ({"dialects": self.dialects} if self.dialects else {})


_TEXTS = (*RUN_TEXTS, *SENTENCES, "form", "marks", "confirmed", "typed")


def sheets(
    connection: Connection, question: Question, newest: int | None = None, dialects: Dialects | None = None
) -> Iterator[RunSheet]:
    """The sheets of the runs that a question finds, some numbers in other dialects if asked."""
    found = frame(connection, question, texts=_TEXTS, newest=newest)
    registry = registry_of(connection)
    tracks = tracks_of(connection, [code for code, marks in zip(found["code"], found["marks"], strict=True)
                                    if marks and REDUCED in marks])  # fmt: skip
    if not dialects:
        yield from (sheet_from(row, registry, track=tracks.get(row["code"])) for row in found.to_dict("records"))
        return
    spoken = frame(connection, question, keys=tuple(dialects), texts=("code",), newest=newest, dialects=dialects)
    place = {code: i for i, code in enumerate(spoken["code"])}
    for row in found.to_dict("records"):
        yield _in_dialects(sheet_from(row, registry, track=tracks.get(row["code"])), spoken, place[row["code"]])


def _in_dialects(sheet: RunSheet, spoken: pd.DataFrame, i: int) -> RunSheet:
    """A sheet with the numbers of one row of a restated frame; a run that lost one says why."""
    words = {n: w for n, w in spoken.attrs["dialects"].items() if w != "house"}
    row = spoken.iloc[i]
    more = {p: {n: _number(row[f"{p}{n}"]) for n in words} for p in ("", "u_", "u_own_", "u_shared_")}
    lost = {n: why[i] for n, why in spoken.attrs["lost"].items() if why[i]}
    return replace(
        sheet, values=sheet.values | more[""], u=sheet.u | more["u_"], u_own=sheet.u_own | more["u_own_"],
        u_shared=sheet.u_shared | more["u_shared_"], dialects=sheet.dialects | words,
        why_absent=sheet.why_absent | {n: f"dialect {words[n]}: {why}" for n, why in lost.items()},
    )  # fmt: skip


def run_sheet(connection: Connection, code: str) -> RunSheet:
    """The sheet of one run; Refusal for an unknown code."""
    stored = connection.execute(select(run.c.id, run.c.logged).where(run.c.code == code)).one_or_none()
    if stored is None:
        raise Refusal("run", code, "the book has no such run")
    row = frame(connection, _Only(state="all", run_id=stored[0]), texts=_TEXTS).to_dict("records")[0]
    return sheet_from(row, registry_of(connection), stored[1], track_of(connection, code))


@dataclass(frozen=True)
class _Only(Question):
    """The question for one run by its id."""

    run_id: int = 0

    def conditions(self, registry: Registry, *, regimes: bool = True):
        return [run.c.id == self.run_id]

    def needs_run(self) -> bool:
        return True


def sheet_from(
    row: dict, registry: Registry, logged: str | None = None, track: TrackSheet | None = None
) -> RunSheet:
    """A sheet from one row of a frame with all columns."""
    texts = {k: _plain(row[k]) for k in RUN_TEXTS}
    values = {k: _number(row[k]) for k in registry.keys}
    u = {p: {k: _number(row[f"{p}{k}"]) for k in registry.keys} for p in ("u_", "u_own_", "u_shared_")}
    said = {s: row[s] for s in SENTENCES}
    return RunSheet(
        texts, {k: entry for k, entry in row["typed"].items() if k != "scale"}, values, u["u_"], u["u_own_"], u["u_shared_"],
        {s: text for s, text in said.items() if text and not text.startswith("absent")},
        regimes_of(values, registry.regimes),
        why_absent(values | {f"u_{k}": v for k, v in u["u_"].items()}, said, texts["swimmer"] or "",
                   row["form"], texts["drive"] or "", registry),
        marks_of(row["marks"], row["confirmed"], values, registry), logged,
        house_in_words(registry, registry.numbers), track, prediction_of(row["form"], texts["drive"] or "", values, registry),
    )  # fmt: skip


def _plain(value):
    if value is None or (isinstance(value, float) and math.isnan(value)):
        return None
    return value.isoformat(timespec="seconds") if isinstance(value, pd.Timestamp) else str(value)


def _number(value: float) -> float | None:
    return None if math.isnan(value) else float(value)


def moment_in_words(text: str) -> str:
    """'2026-03-01 14:32' of a stored or shown time, in local time."""
    return local(text).strftime("%Y-%m-%d %H:%M")
