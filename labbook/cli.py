"""The command line: the same calls as the app and the Python API, from a terminal."""

import os
import socket
import subprocess
import sys
from pathlib import Path

import click

from labbook.api import Book
from labbook.book.ledger import amend as amend_run
from labbook.book.ledger import record
from labbook.book.records import KINDS
from labbook.book.stocking import stock
from labbook.cli_ask import draw, numbers, runs
from labbook.cli_plan import plan
from labbook.cli_print import Bar, by_option, cells_of
from labbook.cli_reduce import reduce
from labbook.cli_registry import budget, dialect, number, published, regime
from labbook.cli_trend import trend
from labbook.demo import make_demo
from labbook.errors import LabbookError, Refusal, Unconfirmed
from labbook.exchange import sheets as sheet_files
from labbook.places import DEMO, current_handle, data_folder, default_book


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


_confirm = click.option("--confirm", is_flag=True, help="Pass warnings; the record is marked confirmed.")
_why = click.option("--why", help="The reason, kept in the ledger.")


# ---- books


@main.command()
@click.argument("book")
def new(book: str) -> None:
    """Make an empty book (a file, or an empty database by URL)."""
    Book.new(book).close()
    click.echo(f"made {book}")


@main.command()
@click.option("--port", type=click.IntRange(1, 65535), default=8501, show_default=True)
@click.option("--no-browser", is_flag=True, help="Do not open a browser.")
@click.option("--fresh", is_flag=True, help="Make the demo book anew, whatever it holds.")
def demo(port: int, no_browser: bool, fresh: bool) -> None:
    """Make the demo book (kept from the last time unless --fresh) and open the app on it."""
    path = data_folder() / DEMO
    if fresh or not path.exists():
        for name in (path, Path(f"{path}-wal"), Path(f"{path}-shm")):
            name.unlink(missing_ok=True)
        with Bar("making the demo book") as bar:
            make_demo(path, bar.step).close()
    os.environ.setdefault("LABBOOK_BY", "wren")
    _serve(str(path), port, no_browser)


@main.command("open")
@click.argument("book", required=False)
@click.option("--port", type=click.IntRange(1, 65535), default=8501, show_default=True)
@click.option("--no-browser", is_flag=True, help="Do not open a browser.")
def open_(book: str | None, port: int, no_browser: bool) -> None:
    """Open the app on a book."""
    target = book or default_book()
    with Bar("opening") as bar:
        Book.open(target, lambda n: bar.step("deriving again", n)).close()
    _serve(target, port, no_browser)


def _refuse_taken(port: int) -> None:
    with socket.socket() as probe:
        if os.name != "nt":  # a server that has just ended leaves its port waiting; on Windows this means another thing
            probe.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
        try:
            probe.bind(("127.0.0.1", port))
        except OSError as error:
            raise Refusal("port", port, f"cannot be used ({error.strerror})", "choose another with --port") from None


def _serve(target: str, port: int, no_browser: bool) -> None:
    page = Path(__file__).parent / "app" / "main.py"
    command = [
        sys.executable, "-m", "streamlit", "run", str(page), "--server.address", "127.0.0.1",
        "--server.port", str(port), "--server.headless", str(no_browser).lower(),
        "--browser.gatherUsageStats", "false",
    ]  # fmt: skip
    _refuse_taken(port)
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
    with Book.open(book) as opened, Bar("checking") as bar:
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
@by_option
@_confirm
def log(book: str, cells: tuple[str, ...], by: str | None, confirm: bool) -> None:
    """Log one run, e.g. swimmer=reed-03 fluid=sil5k-b f='0.5 Hz' U='0.051(3) mm/s' T='22.4 degC'."""
    wanted = cells_of(cells)
    who = by or wanted.pop("by", None)
    with Book.open(book) as opened:
        logged = record(opened.engine, wanted, who or current_handle(), confirm=confirm)
    if logged.known:
        click.echo(f"this run is {logged.code} already; nothing was added", err=True)
    click.echo(logged.code)


@main.command()
@click.argument("book")
@click.argument("run")
@click.argument("cells", nargs=-1, required=True, metavar="key=value...")
@click.option("--why", required=True, help="The reason, kept in the ledger.")
@by_option
@_confirm
def amend(book: str, run: str, cells: tuple[str, ...], why: str, by: str | None, confirm: bool) -> None:
    """Change cells of a run; the old values stay in the ledger. An empty value clears a cell."""
    with Book.open(book) as opened:
        amend_run(opened.engine, run, cells_of(cells), why, by or current_handle(), confirm=confirm)
    click.echo(f"amended {run}")


@main.command()
@click.argument("book")
@click.argument("run")
@click.option("--why", required=True, help="The reason, kept in the ledger.")
@by_option
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
    @by_option
    @_confirm
    def command(book, cells, retire, back, why, by, confirm):
        wanted = cells_of(cells)
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
@by_option
@_confirm
def load(book: str, sheet: str, by: str | None, confirm: bool) -> None:
    """Load a shelf folder, a workbook or one CSV file, whole or not at all."""
    tables = sheet_files.read_tables(sheet)
    total = sum(n for _, n in sheet_files.counted(tables))
    with Book.open(book) as opened:
        with Bar("loading", 2 * total) as bar:
            loaded = opened.load_tables(
                tables, Path(sheet).resolve().name, by=by, confirm=confirm, progress=bar.step
            )
    for sentence in loaded.warned:
        click.echo(f"confirmed: {sentence}", err=True)
    click.echo(str(loaded))


for _command in (runs, numbers, draw, trend, plan, reduce, number, regime, dialect, published, budget):
    main.add_command(_command)
