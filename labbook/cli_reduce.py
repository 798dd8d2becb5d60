"""The command line's way from tracks to speeds: reduce, and the attaching of tracks to runs."""

import json
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import click

from labbook.api import Book
from labbook.book.attaching import conditions
from labbook.cli_print import Bar, by_option
from labbook.cli_reduce_many import (
    Named,
    Reduced,
    Wanted,
    cores,
    drift_as_typed,
    files_of,
    reduced_all,
    refused,
    told,
)
from labbook.cli_reduce_report import as_csv, many, report, row
from labbook.errors import LabbookError
from labbook.exchange.track_files import content_of
from labbook.exchange.track_reducing import Made, reduce_track
from labbook.exchange.track_words import axis_of, columns_of
from labbook.registry.typed import read

FIT = "fit"


@click.command()
@click.argument("tracks", nargs=-1, required=True, metavar="TRACK...", type=click.Path())
@click.option("--fps", help="Frame rate, for a track that counts frames, e.g. 30.")
@click.option("--scale", help="Camera scale, e.g. '3.2(1) um/px', for a track in pixels.")
@click.option(
    "--f", "f", help="Drive frequency, e.g. 0.5 Hz (a bare number is Hz); left out, or 'fit': from the track."
)
@click.option("--drift", help="To take off: '0.1(1),-0.2(1) um/s', or the track of a tracer.")
@click.option(
    "--still",
    nargs=2,
    type=float,
    metavar="T0 T1",
    help="From where to where (s) the swimmer stood still, at either end, for the drift.",
)
@click.option(
    "--axis", help="Towards the head, in degrees from x towards y; left out, or 'auto': from the track."
)
@click.option(
    "--columns",
    multiple=True,
    metavar="ROLE=COLUMN,...",
    help="E.g. x=X_pos,y=Y_pos,'t=time [ms]'; roles: t frame x y heading head_x head_y tip_x tip_y.",
)
@click.option("--trim", default="auto", show_default=True, help="Leading cycles to drop.")
@click.option("--as", "form", type=click.Choice(["table", "csv", "json"]), default="table", show_default=True)
@click.option("--jobs", type=click.IntRange(1), help="Processes for several tracks; left out: one a core.")
@click.option("--run", "code", metavar="CODE", help="Attach the track to this run; U, A_tip and f enter it.")
@click.option("--by-name", is_flag=True, help="Attach each track to the run that its file is named by.")
@click.option("--book", help="The book of the runs; left out: LABBOOK_BOOK, else yours.")
@click.option("--confirm", is_flag=True, help="With --run or --by-name: pass warnings; the run is marked confirmed.")
@by_option
@click.pass_context  # fmt: skip
def reduce(
    ctx, tracks: tuple[str, ...], fps: str | None, scale: str | None, f: str | None, drift: str | None,
    still: tuple[float, float] | None, axis: str | None, columns: tuple[str, ...], trim: str, form: str,
    jobs: int | None, code: str | None, by_name: bool, book: str | None, confirm: bool, by: str | None,
) -> None:  # fmt: skip
    """Speed along the swimming axis, with a 95 % interval, from tracked positions: files or folders.

    A track is CSV or Parquet with columns t (or time) or frame, x, y and, if it likes, heading, head_x and
    head_y, tip_x and tip_y, with units in the header: x [um], t [ms]. With --run or --by-name the run's f and
    its rig's scale and frame rate serve where none is given.
    """
    if code and by_name:
        raise click.UsageError("--run and --by-name exclude each other")
    if (book or by or confirm) and not (code or by_name):
        raise click.UsageError("--book, --by and --confirm go with --run or --by-name")
    files = files_of(tracks)
    single = len(files) == 1 and not Path(tracks[0]).is_dir()
    if code and len(files) != 1:
        raise click.UsageError("--run takes one track; --by-name attaches several")
    hertz = None if f in (None, FIT) else read("f", f, "Hz").value
    towards = None if axis is None else axis_of(axis)
    wanted = Wanted(fps, scale, columns_of(columns), hertz, towards, None, still, trim)
    if code or by_name:
        with Book.open(book) as opened:
            done = list(_attached(opened, files, code, wanted, f, axis, drift, by, confirm))
    else:
        wanted = replace(wanted, drift=drift_as_typed(drift, wanted))
        done = list(reduced_all(files, wanted, jobs or cores()))
    good = [one for one in done if one.reduction is not None]
    if good or not single:
        click.echo(_written(good, form, single))
    for one in done:
        if one.refused is not None:
            click.echo(one.refused, err=True)
    if len(good) < len(done):
        ctx.exit(1)


def _written(good: list[Reduced], form: str, single: bool) -> str:
    if form == "csv":
        return as_csv(good).rstrip("\n")
    if form == "json":
        rows = [({} if single else {"track": one.name}) | row(one) for one in good]
        return json.dumps(rows[0] if single else rows, ensure_ascii=False, allow_nan=False, indent=1)
    if single:
        return report(good[0])
    return many(good) if good else "no track could be reduced"


def _attached(
    book: Book, files: list[Named], code: str | None, wanted: Wanted, f: str | None, axis: str | None,
    drift: str | None, by: str | None, confirm: bool,
) -> Iterator[Reduced]:  # fmt: skip
    """Each track reduced for its run and attached to it, one after the other."""
    settings = {"columns": dict(wanted.columns or {}), "scale": wanted.scale, "fps": wanted.fps, "axis": axis,
                "f": f if wanted.f is None else f"{wanted.f!r} Hz", "trim": wanted.trim,
                "still": wanted.still}  # fmt: skip
    with Bar("attaching", len(files)) as bar:
        for named in files:
            run = code or Path(named.path).stem
            try:
                made = _attach(book, run, named, settings, wanted, drift, by, confirm)
                yield told(named.name, made.reduction, (*made.said, f"kept with {run}"))
            except LabbookError as error:
                yield refused(named.name, error)
            bar.step(named.name, 1)


def _attach(book, run, named, settings, wanted, drift, by, confirm) -> Made:
    content, name = content_of(named.path), Path(named.path).name
    given = conditions(book.engine, run)
    if drift is not None:
        moved = drift_as_typed(drift, replace(wanted, rig=given))
        settings = settings | {"drift": (moved.velocity, moved.u)}
        if Path(drift).is_file():
            settings["drift_from"] = Path(drift).name
    made = reduce_track(content, name, settings, given)
    book.attach_track(run, content, name, settings, by=by, confirm=confirm, made=made)
    return made
