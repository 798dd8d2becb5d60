"""The command line's statistics of a trend: maximum, slope, change over time, outliers, repeats."""

import json
import math
from pathlib import Path

import click

from labbook.api import Book
from labbook.book.clock import local, now
from labbook.book.queries import refuse_unknown
from labbook.book.trend_group import EVERY, FAMILIES, trend_group
from labbook.book.trend_statistics import STEPS, Statistics, statistics
from labbook.book.trend_tables import (
    as_numbers,
    changes_table,
    outliers_table,
    repeats_table,
    slopes_table,
    tops_table,
)
from labbook.book.trend_told import axis_name, paragraphs
from labbook.charts.dialect_axis import axis_words
from labbook.cli_ask import _question, _question_options
from labbook.cli_print import Bar, aligned
from labbook.errors import Refusal
from labbook.registry.group import Registry

FORMS = ("table", "text", "json")
HELP = """Statistics of one number against another: maximum, slope, change over time, outliers, repeats.

\b
labbook trend b.db Sp U_scaled                       by material batch, as tables
labbook trend b.db Sp U_scaled --as text             sentences for a paper
labbook trend b.db Sp U_scaled --family fluid --between 0.8 1.6
labbook trend b.db f_ratio stride --form helix --range Re_omega 0 0.1 --as json

House dialect. Void runs stay out, and so do runs with x or y within three of their own u of zero; of several
forms of swimmer the one with most runs is looked at, since another form is no part of its curve. Intervals
hold 95 % and are over swimmers, not runs, and the errors that swimmers share. What is left out is counted.
"""


@click.command(help=HELP)
@click.argument("book")
@click.argument("x")
@click.argument("y")
@click.option("--family", type=click.Choice(FAMILIES), default=FAMILIES[0], show_default=True,
              help="Whose maxima are told beside the whole group's.")  # fmt: skip
@click.option("--form", default="", help=f"A form of swimmer, or {EVERY}; left out: the one with most runs.")
@click.option("--between", nargs=2, type=float, metavar="LO HI",
              help="The range of x for the slope, SI; left out: below the maximum and beyond.")  # fmt: skip
@click.option("--as", "form_of_answer", type=click.Choice(FORMS), default="table", show_default=True)
@click.option("-o", "--output", type=click.Path(dir_okay=False), help="A file in place of the terminal.")
@_question_options
def trend(
    book: str, x: str, y: str, family: str, form: str, between: tuple[float, float] | None,
    form_of_answer: str, output: str | None, **options,
) -> None:  # fmt: skip
    """Work out and print or write the statistics; what users read is HELP."""
    question = _question(**options)
    if between and any(math.isnan(end) for end in between):
        raise click.UsageError("--between takes two numbers")
    with Book.open(book) as opened:
        registry = opened.registry
        opened.ask(refuse_unknown, question)
        with Bar("statistics", len(STEPS)) as bar:
            group = opened.ask(trend_group, question, x, y, form)
            found = statistics(group, family, between, lambda what: bar.step(what, 1))
        asked, name = question.in_words(), opened.name
    if form_of_answer == "json":
        numbers = as_numbers(found) | {"question": asked}
        text = json.dumps(numbers, ensure_ascii=False, allow_nan=False, indent=1)
    elif form_of_answer == "text":
        said = paragraphs(found, asked, registry, axis_words((x, y), {}, registry))
        text = "\n\n".join([*said, f"{name}, {local(now()):%Y-%m-%d}."])
    else:
        text = _tables(found, asked, registry)
    _out(text, output)


def _tables(found: Statistics, asked: str, registry: Registry) -> str:
    """A table for each question that was asked of the runs, then what was left out."""
    runs = found.group.runs
    x, y = (axis_name(key, registry) for key in (runs.x_key, runs.y_key))
    blocks = [
        ("Maximum", tops_table([found.top, *found.tops], found.family, x, y), 1, ""),
        ("Slope", slopes_table(found.slopes, x), 1, ""),
        ("Change over time", changes_table(found.changed, x, y), 1, found.changed.why),
        ("Outliers", outliers_table(found.outlying, runs.code), 1, found.outlying.why or "none stands out"),
        (f"Repeats\n{found.repeats.in_words()}", repeats_table(found.repeats), 2, ""),
    ]
    used = f"{len(found.group.points.index)} of {found.group.found} runs: {asked}"
    said = [used + (f", {found.group.form}" if found.group.form else "")]
    for title, lines, texts, otherwise in blocks:
        told = aligned(_trimmed(lines), texts) if len(lines) > 1 else otherwise
        said.append(f"{title}\n{told}".rstrip())
    if found.more_families:
        said.append(f"{found.more_families} smaller families were not looked at")
    left = [f"  {n} {why}" for why, n in found.group.excluded.items()]
    if left:
        said.append("\n".join(["left out", *left]))
    return "\n\n".join(said)


def _trimmed(lines: list[list[str]]) -> list[list[str]]:
    """The lines without a last column that is empty, and with a last column of words to the left."""
    if lines[0][-1] != "note":
        return lines
    if not any(row[-1] for row in lines[1:]):
        return [row[:-1] for row in lines]
    width = max(len(row[-1]) for row in lines)
    return [[*row[:-1], row[-1].ljust(width)] for row in lines]


def _out(text: str, output: str | None) -> None:
    if output is None:
        click.echo(text)
        return
    try:
        Path(output).write_text(f"{text}\n", encoding="utf-8")
    except OSError as error:
        raise Refusal("output", output, f"cannot be written ({error.strerror})") from None
    click.echo(f"written into {output}")
