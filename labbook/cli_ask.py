"""The command line's questions: find runs, read the registry, draw a figure."""

import json

import click
import pandas as pd

from labbook.api import Book
from labbook.book.asking import Question, check_key
from labbook.book.clock import local, now
from labbook.book.queries import key_counts, refuse_unknown, regime_counts
from labbook.charts.axes import house_words
from labbook.charts.files import save
from labbook.charts.trend import trend
from labbook.cli_print import TABLE_KEYS, aligned, runs_table
from labbook.errors import Refusal
from labbook.exchange.outward import frame_as_csv, sheets_as_json
from labbook.registry.catalogue import NUMBERS
from labbook.registry.regimes import REGIMES

_as = click.option("--as", "form", type=click.Choice(["table", "csv", "json"]), default="table", show_default=True)


def _question_options(command):
    for option in reversed((
        click.option("--regime", multiple=True, help="A regime's name; several mean and."),
        click.option("--range", "ranges", multiple=True, nargs=3, type=(str, float, float), metavar="KEY LO HI",
                     help="Limits in SI, inclusive, inf allowed; numbers in the house dialect."),
        click.option("--fluid", multiple=True, help="A code; several mean or."),
        click.option("--swimmer", multiple=True, help="A code; several mean or."),
        click.option("--material", multiple=True, help="A code; several mean or."),
        click.option("--person", multiple=True, help="A handle; several mean or."),
        click.option("--series", multiple=True, help="A label; several mean or."),
        click.option("--since", help="ISO date or moment, inclusive."),
        click.option("--until", help="ISO date or moment, inclusive."),
        click.option("--text", help="A word in code, note, series or video."),
        click.option("--state", type=click.Choice(["kept", "void", "all"]), default="kept", show_default=True),
    )):  # fmt: skip
        command = option(command)
    return command


def _question(regime, ranges, fluid, swimmer, material, person, series, since, until, text, state) -> Question:
    return Question(regime, {k: (low, high) for k, low, high in ranges}, fluid, swimmer, material, person,
                    series, since, until, text, state)  # fmt: skip


@click.command()
@click.argument("book", required=False)
@_question_options
@click.option("--newest", type=click.IntRange(1), help="Only so many of the newest, newest first.")
@_as
def runs(book: str | None, form: str, newest: int | None, **options) -> None:
    """Find runs by regime, ranges, fluid, swimmer, material, person, series, dates and text."""
    question = _question(**options)
    with Book.open(book) as opened:
        opened.ask(refuse_unknown, question)
        if form == "json":
            click.echo(sheets_as_json(opened.sheets(question, newest)))
            return
        if form == "csv":
            click.echo(frame_as_csv(opened.frame(question, newest=newest)), nl=False)
            return
        table = opened.frame(question, keys=TABLE_KEYS, newest=newest)
        counts = opened.ask(regime_counts, question)
    click.echo(runs_table(table))
    click.echo(f"\n{len(table)} runs: {question.in_words()}")
    click.echo("  ".join(f"{name} {n}" for name, n in counts.items()))


@click.command()
@click.argument("book", required=False)
@_as
def numbers(book: str | None, form: str) -> None:
    """The registry: each number's formula, house dialect, source and regimes, and how many runs have it."""
    with Book.open(book) as opened:
        counts = opened.ask(key_counts, NUMBERS)
    rows = [
        {
            "key": n.key, "name": n.name, "formula": n.formula, "dialect": n.dialect, "compares": n.compares,
            "source": n.source, "runs": counts[n.key],
            "regimes": [r.name for r in REGIMES.values() if r.number == n.key],
        }
        for n in NUMBERS.values()
    ]  # fmt: skip
    if form == "json":
        click.echo(json.dumps(rows, ensure_ascii=False, indent=1))
    elif form == "csv":
        click.echo(frame_as_csv(pd.DataFrame([{**r, "regimes": "; ".join(r["regimes"])} for r in rows])), nl=False)
    else:
        lines = [["key", "formula", "house dialect", "regimes", "runs"]]
        lines += [[r["key"], r["formula"], r["dialect"], ", ".join(r["regimes"]), str(r["runs"])] for r in rows]
        click.echo(aligned(lines, text_columns=4))


@click.command()
@click.argument("book")
@click.argument("x")
@click.argument("y")
@click.option("-o", "--output", required=True, type=click.Path(), help="fig.svg or fig.png")
@click.option("--colour", type=click.Choice(["swimmer", "fluid", "material", "by", "series"]), default="swimmer",
              show_default=True)  # fmt: skip
@click.option("--bars", type=click.Choice(["own", "total", "none"]), default="own", show_default=True)
@click.option("--linear", is_flag=True, help="Linear axes instead of logarithmic ones.")
@_question_options
def draw(book: str, x: str, y: str, output: str, colour: str, bars: str, linear: bool, **options) -> None:
    """Draw one number or quantity against another into a file, e.g. draw bench.db Sp stride -o fig.svg."""
    question = _question(**options)
    for key in (x, y):
        check_key(key)
    with Book.open(book) as opened:
        opened.ask(refuse_unknown, question)
        table = opened.frame(question, keys=tuple(dict.fromkeys((x, y))), texts=("code", colour))
        drawn = trend(table, x=x, y=y, group=colour, log_x=not linear, log_y=not linear, bars=bars, width=760,
                      height=520)  # fmt: skip
        if not drawn.drawn:
            raise Refusal("draw", f"{x} {y}", "no run that was found has both", "look at `labbook runs`")
        try:
            said = (f"{question.in_words()}.", drawn.caption, house_words((x, y)),
                    f"{opened.name}, {local(now()):%Y-%m-%d}.")  # fmt: skip
            save(drawn.chart, output, caption=" ".join(part for part in said if part))
        except OSError as error:
            raise Refusal("output", output, f"cannot be written ({error.strerror})") from None
    click.echo(f"{drawn.drawn} runs drawn into {output}")
    for why, n in drawn.left_out.items():
        click.echo(f"{n} not drawn: {why}")
