"""Tracks reduced for the command line, one or a thousand: what is done with each, on all cores, in order."""

import multiprocessing
import os
import sys
from collections.abc import Iterator, Mapping, Sequence
from concurrent.futures import ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from dataclasses import dataclass, replace
from pathlib import Path
from typing import NamedTuple

import numpy as np

from labbook.cli_print import Bar
from labbook.errors import LabbookError, Refusal, Unconfirmed
from labbook.exchange.track_files import TrackFile, read_track
from labbook.exchange.track_reducing import drift_of_track
from labbook.exchange.track_words import velocity_of
from labbook.physics import tracks
from labbook.physics.track_drift import Drift
from labbook.physics.track_paths import FreePath, free_path
from labbook.physics.tracks import Reduction

SUFFIXES = (".csv", ".tsv", ".txt", ".parquet")


@dataclass(frozen=True)
class Wanted:
    """What is done with every track: as typed, but f in Hz, axis a unit vector or None, drift a Drift or
    None.

    rig: scale and fps that serve where a file needs them and none was typed.
    """

    fps: str | None = None
    scale: str | None = None
    columns: Mapping[str, str] | None = None
    f: float | None = None
    axis: tuple[float, float] | None = None
    drift: Drift | None = None
    still: tuple[float, float] | None = None
    trim: str = "auto"
    rig: Mapping[str, str] | None = None


class Named(NamedTuple):
    """One track file and what to call it."""

    path: str
    name: str


class Reduced(NamedTuple):
    """What one track gave, without its frames: a reduction and what was read, or why it is refused."""

    name: str
    reduction: Reduction | None
    path: FreePath | None
    said: tuple[str, ...]
    refused: str | None


def files_of(given: Sequence[str]) -> list[Named]:
    """The files of paths and folders, in the order given, a folder's by name; namesakes go by their paths."""
    paths: list[Path] = []
    for path in map(Path, given):
        if path.is_dir():
            inside = sorted(p for p in path.iterdir() if p.suffix.lower() in SUFFIXES and p.is_file())
            if not inside:
                raise Refusal(
                    "track", str(path), "this folder holds no track", f"name them {', '.join(SUFFIXES)}"
                )
            paths += inside
        else:
            paths.append(path)
    names = [path.name for path in paths]
    return [Named(str(path), path.name if names.count(path.name) == 1 else str(path)) for path in paths]


def drift_as_typed(text: str | None, wanted: Wanted) -> Drift | None:
    """A drift from '0.1(1),-0.2(1) um/s', or the velocity of a drift track, read as the other tracks are."""
    if text is None:
        return None
    if not Path(text).is_file():
        return Drift(*velocity_of(text))
    given = {"columns": wanted.columns, "scale": wanted.scale, "fps": wanted.fps}
    try:
        return Drift(*drift_of_track(text, Path(text).name, given, wanted.rig or {}))
    except Refusal as refusal:
        raise _placed(f"drift {Path(text).name}", refusal) from None


def read_and_reduce(source: str | bytes, name: str, wanted: Wanted) -> tuple[TrackFile, Reduction]:
    """One track in and its reduction."""
    track = read_track(
        source, name=name, columns=wanted.columns, fps=wanted.fps, scale=wanted.scale, rig=wanted.rig
    )
    try:
        reduction = tracks.reduce(**track.keywords(), f=wanted.f, axis=wanted.axis, drift=wanted.drift,
                                  still=wanted.still, trim=wanted.trim)  # fmt: skip
    except Refusal:
        raise
    except (np.linalg.LinAlgError, ArithmeticError, ValueError):  # one odd track among a thousand stops no other
        raise Refusal(
            "track", name, "no motion can be fitted to these positions", "look at the path"
        ) from None
    return track, reduction


def reduced(named: Named, wanted: Wanted) -> Reduced:
    """One track's figures, or why it has none; without the frames, which are many."""
    try:
        track, reduction = read_and_reduce(named.path, named.name, wanted)
    except LabbookError as error:
        return refused(named.name, error)
    return told(named.name, reduction, tuple(track.report()))


def told(name: str, reduction: Reduction, said: tuple[str, ...]) -> Reduced:
    """A reduction without its frames; of a path without beat also what it says of diffusing and swimming."""
    path = None
    if reduction.f_beat is None:
        try:
            path = free_path(t=reduction.trace.t, x=reduction.trace.x, y=reduction.trace.y)
        except Refusal:  # too short for it, though not for a speed
            path = None
    return Reduced(name, replace(reduction, trace=None), path, said, None)


def refused(name: str, error: LabbookError) -> Reduced:
    """What was refused, with the track's name before it."""
    text = str(_placed(name, error)) if isinstance(error, Refusal) else f"{name}: {error}"
    if isinstance(error, Unconfirmed):
        text = f"{name}: {' '.join(error.warnings)} Nothing was attached; repeat with --confirm if this is right."
    return Reduced(name, None, None, (), text)


def reduced_all(files: Sequence[Named], wanted: Wanted, jobs: int) -> Iterator[Reduced]:
    """Every track's figures in the order of the files, by `jobs` processes, with progress."""
    with Bar("reducing", len(files)) as bar:
        for done in _each(files, wanted, min(jobs, len(files))):
            bar.step(done.name, 1)
            yield done


def cores() -> int:
    """How many cores this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def _placed(where, refusal):
    if refusal.field == "track":
        return Refusal(where, None, refusal.reason, refusal.remedy)
    return Refusal(f"{where}, {refusal.field}", refusal.typed, refusal.reason, refusal.remedy)


def _each(files, wanted, jobs):
    if jobs <= 1:
        yield from (reduced(named, wanted) for named in files)
        return
    # a forked worker has all modules already; elsewhere than on Linux it is not safe
    context = multiprocessing.get_context("fork" if sys.platform == "linux" else "spawn")
    with ProcessPoolExecutor(jobs, mp_context=context) as pool:
        waiting = [pool.submit(reduced, named, wanted) for named in files]
        try:
            for named, future in zip(files, waiting, strict=True):
                yield future.result()
        except BrokenProcessPool:
            raise Refusal("track", named.name, "a worker was ended from outside while it read this track or the next",
                          "try with --jobs 1") from None  # fmt: skip
        finally:
            pool.shutdown(cancel_futures=True)
