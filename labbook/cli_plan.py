"""The command line's plan: the next runs of a swimmer, and sheets of them to take to the bench."""

from pathlib import Path

import click

from labbook.api import Book
from labbook.book.plan_setting import Plan
from labbook.book.plan_targets import optimum, reach, viscosity_for
from labbook.book.plan_zones import good_viscosities
from labbook.book.planning import at_frequency, best_first, to_run
from labbook.cli_plan_print import gain_in_words, inverse_written, runs_written
from labbook.cli_print import cells_of
from labbook.errors import Refusal
from labbook.registry.typed import read

FORMS = ("table", "csv", "json", "html")
HELP = """The next runs of a swimmer: frequencies in the fluids on the shelf, what to expect, what stands against it.

\b
labbook plan b.db reed-03                         the predicted optimum, in each fluid
labbook plan b.db reed-03 --sp 2 theta0='0.25 rad' T='22 degC'
labbook plan b.db reed-03 --f 1Hz --fluid sil5000-a
labbook plan b.db reed-03 -n 5 --fill Sp,Re_omega    five runs for the group's widest gap
labbook plan b.db reed-03 -n 6 --top -o plan.html    six that pin down the maximum, to print
labbook plan b.db reed-03 --inverse d --f 1Hz        which diameter has its optimum at 1 Hz
labbook plan b.db new form='flexible tail' L_body='30 mm' L_tail='24 mm' d='1 mm' b='3 mm' E='0.5 MPa'

key=value: cells of a run (theta0, B, T, rig, drive, h_wall ...), as in `log`; or columns of a swimmer, for one
that is changed or still to be built, and E in place of a material. What is not given comes from its last run.
As csv, planned runs are a run sheet that `load` takes once `at`, T and U are filled in; html is a page to print.
"""


@click.command(help=HELP)
@click.argument("book")
@click.argument("swimmer")
@click.argument("cells", nargs=-1, metavar="[key=value...]")
@click.option("--sp", type=float, help="The sperm number, in the house dialect; left out: the predicted optimum.")
@click.option("--f", "f", help="A drive frequency, e.g. 1Hz (a bare number is Hz).")
@click.option("--fluid", "fluids", multiple=True, help="A code; may repeat. Left out: all that are not retired.")
@click.option("-n", "n", type=int, help="How many runs to propose (5 where --fill or --top is given).")
@click.option("--fill", metavar="X,Y", help="Fill the widest gap on a plane, e.g. Sp,Re_omega or Sp,theta0.")
@click.option("--top", is_flag=True, help="Pin down the maximum of the scaled speed over Sp.")
@click.option("--within", multiple=True, nargs=3, type=(str, float, float), metavar="KEY LO HI",
              help="With --fill or --top: a part of the plane, in SI.")  # fmt: skip
@click.option("--strict", is_flag=True, help="Propose nothing that is doubtful.")
@click.option("--inverse", metavar="KEY", help="Which d, t, D, L_tail, E or mu gives the sperm number at --f.")
@click.option("--as", "form", type=click.Choice(FORMS), help="Left out: by the name of -o, else a table.")
@click.option("-o", "--output", type=click.Path(dir_okay=False), help="A file: plan.csv, plan.html, plan.json.")
def plan(
    book: str, swimmer: str, cells: tuple[str, ...], sp: float | None, f: str | None, fluids: tuple[str, ...],
    n: int | None, fill: str | None, top: bool, within: tuple[tuple[str, float, float], ...], strict: bool,
    inverse: str | None, form: str | None, output: str | None,
) -> None:  # fmt: skip
    """Print or write what is planned; what users read is HELP."""
    form = form or _form_of(output)
    proposing = bool(fill or top or n is not None)
    _refuse_usage(proposing, sp, f, fill, top, within, strict, inverse, form)
    hertz = None if f is None else read("f", f, "Hz").value
    with Book.open(book) as opened:
        made = opened.plan(swimmer, fluids=fluids, **cells_of(cells))
        name = opened.name
        if proposing:
            axes = tuple(k.strip() for k in (fill or "").split(",") if k.strip())
            part = {k: (low, high) for k, low, high in within}
            found = opened.propose(made, 5 if n is None else n, fill=axes, top=top, within=part, strict=strict)
    if proposing:
        told = [found.criterion, *found.notes, gain_in_words(found, top)]
        text = runs_written(made, found.runs, form, name, told)
    elif inverse:
        text = inverse_written(made, inverse, hertz, optimum(made) if sp is None else sp, form)
    else:
        text = _in_each_fluid(made, sp, hertz, form, name, bool(fluids))
    _out(text, output)


def _refuse_usage(proposing, sp, f, fill, top, within, strict, inverse, form) -> None:
    said = ""
    if fill and top:
        said = "--fill and --top exclude each other"
    elif inverse and (proposing or f is None):
        said = "--inverse asks for a size at one frequency: give --f, and none of -n, --fill, --top"
    elif inverse and form == "html":
        said = "--inverse gives sizes and no runs: as table, csv or json"
    elif proposing and (f or sp):
        said = "-n, --fill and --top choose f and Sp themselves: give --within Sp 1 3 for a part"
    elif (within or strict) and not proposing:
        said = "--within and --strict go with -n, --fill or --top"
    if said:
        raise click.UsageError(said)


def _form_of(output: str | None) -> str:
    suffix = Path(output).suffix.lower().lstrip(".") if output else ""
    return "html" if suffix == "htm" else suffix if suffix in FORMS else "table"


def _in_each_fluid(made: Plan, sp: float | None, hertz: float | None, form: str, name: str, named: bool) -> str:
    """Every fluid at one frequency, or at the frequency that gives the sperm number."""
    if hertz is not None:
        table, told = at_frequency(made, hertz), [f"{made.swimmer.code} at {hertz:g} Hz"]
        if sp is not None:
            told.append(f"Sp = {sp:g} there takes a viscosity of {viscosity_for(made, sp, hertz):.3g} Pa.s")
    else:
        target = optimum(made) if sp is None else sp
        table = reach(made, target)
        why = ", where the predicted scaled speed is largest" if sp is None else ""
        told = [f"{made.swimmer.code} at Sp = {target:.4g}{why}", good_viscosities(made, target)]
    if form in ("csv", "html"):
        table = to_run(made, table, forbidden=named)
    elif form == "table":
        table = best_first(table)
    return runs_written(made, table, form, name, [t for t in told if t])


def _out(text: str, output: str | None) -> None:
    if output is None:
        click.echo(text, nl=False)
        return
    try:
        Path(output).write_text(text, encoding="utf-8")
    except OSError as error:
        raise Refusal("output", output, f"cannot be written ({error.strerror})") from None
    click.echo(f"planned into {output}")
