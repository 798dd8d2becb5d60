"""The command line: the same calls as the app and the Python API, from a terminal."""

import json
import os
import subprocess
import sys
from pathlib import Path

import click
import pandas as pd

from labbook.api import DEMO, Book, current_handle, data_folder, default_book, make_demo
from labbook.book.asking import Question, check_key
from labbook.book.ledger import amend as amend_run
from labbook.book.ledger import record
from labbook.book.queries import key_counts, regime_counts
from labbook.book.records import KINDS
from labbook.book.stocking import stock
from labbook.charts.files import save
from labbook.charts.trend import trend
from labbook.errors import LabbookError, Refusal, Unconfirmed
from labbook.exchange import sheets as sheet_files
from labbook.exchange.outward import frame_as_csv, sheets_as_json
from labbook.registry.catalogue import NUMBERS
from labbook.registry.regimes import REGIMES
from labbook.registry.written import SHOWN, shown

TABLE_KEYS = ("f", "U", "T", "mu", "Sp", "Re_omega", "St", "stride")


class _Group(click.Group):
    """Says what was refused in one sentence each on stderr, with exit code 1."""

    def invoke(self, ctx):
        try:
            return super().invoke(ctx)
        except Unconfirmed as warned:
            click.echo(str(warned), err=True)
            click.echo("Nothing was written. Repeat with --confirm if this is right.", err=True)
        except LabbookError as error:
            click.echo(str(error), err=True)
        except BrokenPipeError:
            sys.stderr.close()
        ctx.exit(1)


@click.group(cls=_Group, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="labbook", prog_name="labbook")
def main() -> None:
    """The group's bench notebook for artificial swimmers, and its registry of dimensionless numbers."""


_by = click.option("--by", help="Your handle; left out: LABBOOK_BY, else the system user.")
_confirm = click.option("--confirm", is_flag=True, help="Pass warnings; the record is marked confirmed.")
_as = click.option("--as", "form", type=click.Choice(["table", "csv", "json"]), default="table", show_default=True)
_why = click.option("--why", help="The reason, kept in the ledger.")


def _cells(pairs: tuple[str, ...]) -> dict[str, str]:
    cells = {}
    for pair in pairs:
        key, sign, value = pair.partition("=")
        if not sign or not key.strip():
            raise click.UsageError(f"{pair!r} is not key=value")
        if key.strip() in cells:
            raise click.UsageError(f"{key.strip()} is given twice")
        cells[key.strip()] = value.strip()
    return cells


# ---- books


@main.command()
@click.argument("book")
def new(book: str) -> None:
    """Make an empty book (a file, or an empty database by URL)."""
    Book.new(book).close()
    click.echo(f"made {book}")


@main.command()
@click.option("--port", type=int, default=8501, show_default=True)
@click.option("--no-browser", is_flag=True, help="Do not open a browser.")
@click.option("--fresh", is_flag=True, help="Make the demo book anew, whatever it holds.")
def demo(port: int, no_browser: bool, fresh: bool) -> None:
    """Make the demo book (kept from the last time unless --fresh) and open the app on it."""
    path = data_folder() / DEMO
    if fresh or not path.exists():
        for name in (path, Path(f"{path}-wal"), Path(f"{path}-shm")):
            name.unlink(missing_ok=True)
        with _Bar("making the demo book") as bar:
            make_demo(path, bar.step).close()
    os.environ.setdefault("LABBOOK_BY", "wren")
    _serve(str(path), port, no_browser)


@main.command("open")
@click.argument("book", required=False)
@click.option("--port", type=int, default=8501, show_default=True)
@click.option("--no-browser", is_flag=True, help="Do not open a browser.")
def open_(book: str | None, port: int, no_browser: bool) -> None:
    """Open the app on a book."""
    target = book or default_book()
    with _Bar("opening") as bar:
        Book.open(target, lambda n: bar.step("deriving again", n)).close()
    _serve(target, port, no_browser)


def _serve(target: str, port: int, no_browser: bool) -> None:
    page = Path(__file__).parent / "app" / "main.py"
    command = [
        sys.executable, "-m", "streamlit", "run", str(page), "--server.address", "127.0.0.1",
        "--server.port", str(port), "--server.headless", str(no_browser).lower(),
        "--browser.gatherUsageStats", "false",
    ]  # fmt: skip
    click.echo(f"{Path(target).name} is at http://127.0.0.1:{port} (Ctrl-C ends it)")
    sys.stdout.flush()
    os.environ["LABBOOK_OPEN"] = target
    os.environ["PYTHONUNBUFFERED"] = "1"
    if sys.platform == "win32":
        sys.exit(subprocess.call(command))
    os.execv(sys.executable, command)


@main.command()
@click.argument("book")
@click.argument("dest")
def copy(book: str, dest: str) -> None:
    """Write a consistent copy of a book while others may be writing to it."""
    with Book.open(book) as source:
        source.copy(dest)
    click.echo(f"copied to {dest}")


@main.command()
@click.argument("book", required=False)
@click.pass_context
def check(ctx, book: str | None) -> None:
    """Verify the ledger's chain and every stored number; names what is stale or was changed by hand."""
    with Book.open(book) as opened, _Bar("checking") as bar:
        found = opened.check(lambda n: bar.step("runs", n))
    for line in found:
        click.echo(line)
    if found:
        ctx.exit(1)
    click.echo("nothing stale; the ledger's chain holds")


# ---- acts


@main.command()
@click.argument("book")
@click.argument("cells", nargs=-1, required=True, metavar="key=value...")
@_by
@_confirm
def log(book: str, cells: tuple[str, ...], by: str | None, confirm: bool) -> None:
    """Log one run, e.g. swimmer=reed-03 fluid=sil5k-b f='0.5 Hz' U='0.051(3) mm/s' T='22.4 degC'."""
    wanted = _cells(cells)
    who = by or wanted.pop("by", None)
    with Book.open(book) as opened:
        click.echo(record(opened.engine, wanted, who or current_handle(), confirm=confirm))


@main.command()
@click.argument("book")
@click.argument("run")
@click.argument("cells", nargs=-1, required=True, metavar="key=value...")
@click.option("--why", required=True, help="The reason, kept in the ledger.")
@_by
@_confirm
def amend(book: str, run: str, cells: tuple[str, ...], why: str, by: str | None, confirm: bool) -> None:
    """Change cells of a run; the old values stay in the ledger. An empty value clears a cell."""
    with Book.open(book) as opened:
        amend_run(opened.engine, run, _cells(cells), why, by or current_handle(), confirm=confirm)
    click.echo(f"amended {run}")


@main.command()
@click.argument("book")
@click.argument("run")
@click.option("--why", required=True, help="The reason, kept in the ledger.")
@_by
def void(book: str, run: str, why: str, by: str | None) -> None:
    """Mark a run, or a reading, void: it stays in the book and leaves the plots."""
    with Book.open(book) as opened:
        opened.void(run, why=why, by=by)
    click.echo(f"{run} is void")


def _shelf_command(kind: str) -> click.Command:
    row = KINDS[kind]
    example = {"fluid": "code=sil5k-b kind=silicone-oil grade='5000 cSt'",
               "material": "code=sil-7 rho_s='1.03 g/cm3'",
               "swimmer": "code=reed-03 form='flexible tail' L_body='30 mm' L_tail='24 mm' section=rod d='2 mm'",
               "rig": "code=pair-1 current_to_B='0.9 mT/A' u_f='0.1 %'",
               "reading": "of=sil5k-b key=mu value='4.85(5) Pa.s' T='22.0 degC' on=2026-03-01"}[kind]  # fmt: skip

    @click.argument("book")
    @click.argument("cells", nargs=-1, required=True, metavar="key=value...")
    @click.option("--retire", is_flag=True, help="Retire it: kept, but no longer offered first.")
    @click.option("--back", is_flag=True, help="Take a retired one back.")
    @_why
    @_by
    @_confirm
    def command(book, cells, retire, back, why, by, confirm):
        wanted = _cells(cells)
        with Book.open(book) as opened:
            if retire or back:
                opened.retire(kind, wanted.get("code", ""), why=why or "", by=by, back=back)
                click.echo(f"{wanted.get('code')} is {'back in use' if back else 'retired'}")
            else:
                click.echo(stock(opened.engine, kind, wanted, by or current_handle(), why=why, confirm=confirm))

    command.__doc__ = (
        f"Add a {kind} to the shelf, or amend one with --why. E.g. {example}\n\nColumns: {', '.join(row.columns)}."
    )
    return main.command(kind)(command)


for _kind in ("fluid", "material", "swimmer", "rig", "reading"):
    _shelf_command(_kind)


@main.command()
@click.argument("book")
@click.argument("sheet", type=click.Path())
@_by
@_confirm
def load(book: str, sheet: str, by: str | None, confirm: bool) -> None:
    """Load a shelf folder, a workbook or one CSV file, whole or not at all."""
    tables = sheet_files.read_tables(sheet)
    total = sum(n for _, n in sheet_files.counted(tables))
    with Book.open(book) as opened:
        with _Bar("loading", 2 * total) as bar:
            loaded = opened.load_tables(
                tables, Path(sheet).resolve().name, by=by, confirm=confirm, progress=bar.step
            )
    for sentence in loaded.warned:
        click.echo(f"confirmed: {sentence}", err=True)
    click.echo(str(loaded))


class _Bar:
    """A progress bar on stderr; where stderr is no terminal, nothing but the last word."""

    def __init__(self, label: str, total: int | None = None):
        self.label, self.total = label, total
        self.bar = None
        self.done = 0

    def __enter__(self):
        if sys.stderr.isatty():
            self.bar = click.progressbar(length=self.total or 1, label=self.label, file=sys.stderr).__enter__()
        return self

    def __exit__(self, *error):
        if self.bar is not None:
            if not error or error[0] is None:
                self.bar.update(max(0, self.bar.length - self.bar.pos))
            self.bar.__exit__(*error)

    def step(self, what: str, n: int) -> None:
        self.done += n
        if self.bar is not None:
            self.bar.label = f"{self.label}: {what}"
            self.bar.length = max(self.bar.length, self.done)
            self.bar.update(n)


# ---- questions


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


@main.command()
@click.argument("book", required=False)
@_question_options
@click.option("--newest", type=click.IntRange(1), help="Only so many of the newest, newest first.")
@_as
def runs(book: str | None, form: str, newest: int | None, **options) -> None:
    """Find runs by regime, ranges, fluid, swimmer, material, person, series, dates and text."""
    question = _question(**options)
    with Book.open(book) as opened:
        if form == "json":
            click.echo(sheets_as_json(opened.sheets(question, newest)))
            return
        if form == "csv":
            click.echo(frame_as_csv(opened.frame(question, newest=newest)), nl=False)
            return
        table = opened.frame(question, keys=TABLE_KEYS, newest=newest)
        counts = opened.ask(regime_counts, question)
    click.echo(_as_table(table))
    click.echo(f"\n{len(table)} runs: {question.in_words()}")
    click.echo("  ".join(f"{name} {n}" for name, n in counts.items()))


def _as_table(table) -> str:
    if table.empty:
        return "no runs"
    units = {k: SHOWN[k] for k in TABLE_KEYS if k in SHOWN} | {"f": "Hz"}
    header = ["run", "at", "by", "swimmer", "fluid", *(f"{k} [{units[k]}]" if k in units else k for k in TABLE_KEYS)]
    lines = [header]
    for row in table.to_dict("records"):
        cells = [shown(k, row[k], row[f"u_{k}"], units.get(k)).removesuffix(f" {units.get(k)}") for k in TABLE_KEYS]
        lines.append([row["code"], f"{row['at']:%Y-%m-%d %H:%M}", row["by"], row["swimmer"], row["fluid"], *cells])
    return _aligned(lines, text_columns=5)


def _aligned(lines: list[list[str]], text_columns: int) -> str:
    widths = [max(len(line[i]) for line in lines) for i in range(len(lines[0]))]
    return "\n".join(
        "  ".join(c.ljust(w) if i < text_columns else c.rjust(w) for i, (c, w) in enumerate(zip(line, widths, strict=True))).rstrip()
        for line in lines
    )


@main.command()
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
        click.echo(_aligned(lines, text_columns=4))


@main.command()
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
        table = opened.frame(question, keys=tuple(dict.fromkeys((x, y))), texts=("code", colour))
        drawn = trend(table, x=x, y=y, group=colour, log_x=not linear, log_y=not linear, bars=bars, width=760,
                      height=520)  # fmt: skip
        if not drawn.drawn:
            raise Refusal("draw", f"{x} {y}", "no run that was found has both", "look at `labbook runs`")
        try:
            save(drawn.chart, output, caption=f"{question.in_words()}. {drawn.caption} Book: {opened.name}.")
        except OSError as error:
            raise Refusal("output", output, f"cannot be written ({error.strerror})") from None
    click.echo(f"{drawn.drawn} runs drawn into {output}")
    for why, n in drawn.left_out.items():
        click.echo(f"{n} not drawn: {why}")


