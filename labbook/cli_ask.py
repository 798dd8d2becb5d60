"""The command line's questions: find runs, read the registry, draw a figure."""

import json

import click
import pandas as pd

from labbook.api import Book
from labbook.book.asking import Question, check_key
from labbook.book.clock import local, now
from labbook.book.published_points import points
from labbook.book.queries import key_counts, refuse_unknown, regime_counts
from labbook.charts.axes import house_words
from labbook.charts.dialect_axis import dialect_title
from labbook.charts.files import save
from labbook.charts.theory import NOTHING, Theory
from labbook.charts.trend import trend
from labbook.charts.trend_shared import SHARED
from labbook.cli_print import TABLE_KEYS, aligned, runs_table
from labbook.cli_theory import refuse_axes, theory_under
from labbook.errors import Refusal
from labbook.exchange.outward import frame_as_csv, sheets_as_json
from labbook.registry.catalogue import Number
from labbook.registry.dialects import CHOICES, DIALECTS, read_choices, written_choices
from labbook.registry.group import Registry

BARS_BY_WORD = {"own": "own", "shared": "shared", "total": "total", "band": SHARED, "none": "none"}
_dialect = click.option(
    "--dialect", "dialects", multiple=True, metavar="NUMBER=choice:option,...",
    help="Restate a number, e.g. Sp=rate:f,power:1; may repeat. Ranges and regimes stay in the house dialect.",
)  # fmt: skip
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


def _dialects(texts: tuple[str, ...]) -> dict[str, dict]:
    found: dict[str, dict] = {}
    for text in texts:
        number, choices = read_choices(text)
        if number in found:
            raise Refusal("dialect", text, f"{number} has a dialect already", "give one for each number")
        found[number] = choices
    return found


def _lost(table: pd.DataFrame) -> list[str]:
    """'12 runs without Sp (rate f): needs L_body' for runs that have no value in an asked dialect."""
    said = []
    for number, why in table.attrs.get("lost", {}).items():
        for sentence, n in pd.Series(why).value_counts().items():
            said.append(f"{n} runs without {number} ({table.attrs['dialects'][number]}): {sentence}")
    return said


def _question(regime, ranges, fluid, swimmer, material, person, series, since, until, text, state) -> Question:
    return Question(regime, {k: (low, high) for k, low, high in ranges}, fluid, swimmer, material, person,
                    series, since, until, text, state)  # fmt: skip


@click.command()
@click.argument("book", required=False)
@_question_options
@click.option("--newest", type=click.IntRange(1), help="Only so many of the newest, newest first.")
@_dialect
@_as
def runs(book: str | None, form: str, newest: int | None, dialects: tuple[str, ...], **options) -> None:
    """Find runs by regime, ranges, fluid, swimmer, material, person, series, dates and text."""
    question, spoken = _question(**options), _dialects(dialects)
    with Book.open(book) as opened:
        opened.ask(refuse_unknown, question)
        if form == "json":
            click.echo(sheets_as_json(opened.sheets(question, newest, spoken)))
            return
        if form == "csv":
            click.echo(frame_as_csv(opened.frame(question, newest=newest, dialects=spoken)), nl=False)
            return
        table = opened.frame(question, keys=tuple(dict.fromkeys((*TABLE_KEYS, *spoken))), newest=newest, dialects=spoken)
        counts = opened.ask(regime_counts, question)
    click.echo(runs_table(table))
    click.echo(f"\n{len(table)} runs: {question.in_words()}")
    if spoken:
        click.echo("ranges and regimes are read in the house dialect")
    for line in _lost(table):
        click.echo(line)
    click.echo("  ".join(f"{name} {n}" for name, n in counts.items()))


@click.command()
@click.argument("book", required=False)
@_as
def numbers(book: str | None, form: str) -> None:
    """The registry: each number's formula, house dialect, source, how many runs have it; regimes; dialects."""
    with Book.open(book) as opened:
        registry = opened.registry
        counts = opened.ask(key_counts, registry.numbers)
        held = opened.ask(regime_counts, Question())
    rows = [_number_row(n, registry, counts[n.key]) for n in registry.numbers.values()]
    if form == "json":
        click.echo(json.dumps(rows, ensure_ascii=False, indent=1))
    elif form == "csv":
        told = [{k: "; ".join(v) if isinstance(v, list) else v for k, v in row.items()} for row in rows]
        click.echo(frame_as_csv(pd.DataFrame(told)), nl=False)
    else:
        lines = [["key", "formula", "house dialect", "regimes", "runs"]]
        lines += [[r["key"], r["formula"], r["dialect"], ", ".join(r["regimes"]), str(r["runs"])] for r in rows]
        click.echo(aligned(lines, text_columns=4))
        bands = [["regime", "band", "runs"], *([r.name, r.words, str(held[r.name])] for r in registry.regimes.values())]
        click.echo("\n" + aligned(bands, text_columns=2))
        options = [["dialects of", "choice", "options, the house's first"]]
        options += [[n, name, ", ".join(map(str, dict.fromkeys((registry.choices(n)[name], *chosen))))]
                    for n, named in CHOICES.items() for name, chosen in named.items()]  # fmt: skip
        click.echo("\n" + aligned(options, text_columns=3))


def _number_row(row: Number, registry: Registry, runs: int) -> dict:
    key = row.key
    return {
        "key": key, "name": row.name, "formula": row.formula, "dialect": row.dialect, "compares": row.compares,
        "source": row.source, "runs": runs, "version": registry.versions.get(key, 1),
        "regimes": [r.name for r in registry.regimes.values() if key in r.numbers],
        "dialects": [written_choices(key, d.choices, registry.choices(key)) for d in DIALECTS if d.of == key],
    }  # fmt: skip


@click.command()
@click.argument("book")
@click.argument("x")
@click.argument("y")
@click.option("-o", "--output", required=True, type=click.Path(), help="fig.svg or fig.png")
@click.option("--colour", type=click.Choice(["swimmer", "fluid", "material", "by", "series"]), default="swimmer",
              show_default=True)  # fmt: skip
@click.option("--bars", type=click.Choice(list(BARS_BY_WORD)), default="own", show_default=True,
              help="Own, shared or all of u; band: own bars, and how far each group may move together.")  # fmt: skip
@click.option("--no-published", is_flag=True, help="Without the points that others printed.")
@click.option("--theory", is_flag=True, help="With what theory says: F_scaled or U_scaled over Sp, U_ratio over anything.")
@click.option("--linear", is_flag=True, help="Linear axes instead of logarithmic ones.")
@_dialect
@_question_options
def draw(
    book: str, x: str, y: str, output: str, colour: str, bars: str, no_published: bool, theory: bool,
    linear: bool, dialects: tuple[str, ...], **options,
) -> None:  # fmt: skip
    """Draw one number or quantity against another into a file, e.g. draw bench.db Sp stride -o fig.svg.

    Published points of both numbers are drawn beside the runs, restated to the figure's dialects."""
    question, spoken = _question(**options), _dialects(dialects)
    with Book.open(book) as opened:
        registry = opened.registry
        for key in (x, y):
            check_key(key, registry)
        if theory:
            refuse_axes(x, y)
        opened.ask(refuse_unknown, question)
        table = opened.frame(question, keys=tuple(dict.fromkeys((x, y))), texts=("code", colour), dialects=spoken)
        away = {k: dialects for k, dialects in spoken.items() if table.attrs["dialects"][k] != "house"}
        titles = {f"{axis}_title": dialect_title(k, away[k], registry.choices(k))
                  for axis, k in (("x", x), ("y", y)) if k in away}
        # bands are read in the house dialect
        regimes = [r for r in registry.regimes.values() if not set(r.numbers) & set(away)]
        others = None if no_published else opened.ask(points, x, y, spoken)
        under = theory_under(opened, question, table, x, y, colour=colour, log=not linear, dialects=spoken) if theory else Theory(NOTHING)
        drawn = trend(table, x=x, y=y, group=colour, log_x=not linear, log_y=not linear, bars=BARS_BY_WORD[bars],
                      width=760, height=520, numbers=registry.numbers, regimes=regimes, published=others,
                      curve=under.frame, curve_words=under.words, **titles)  # fmt: skip
        if not drawn.drawn + drawn.published:
            raise Refusal("draw", f"{x} {y}", "no run that was found has both", "look at `labbook runs`")
        try:
            said = (f"{question.in_words()}.", drawn.caption, *(f"{t}." for t in titles.values()),
                    house_words([k for k in (x, y) if k not in away], registry.numbers), f"{opened.name}, {local(now()):%Y-%m-%d}.")  # fmt: skip
            save(drawn.chart, output, caption=" ".join(part for part in said if part))
        except OSError as error:
            raise Refusal("output", output, f"cannot be written ({error.strerror})") from None
    click.echo(f"{drawn.drawn} runs drawn into {output}")
    if others is not None and (n := len(others) + sum(others.attrs["lost"].values())):
        rest = f", {n - drawn.published} not: the figure says why" if n > drawn.published else ""
        click.echo(f"{drawn.published} published points drawn beside them{rest}")
    for why, n in drawn.left_out.items():
        click.echo(f"{n} not drawn: {why}")
