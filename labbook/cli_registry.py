"""The command line's acts on the registry and the look at one run's uncertainty: number, regime, dialect, budget."""

import click

from labbook.api import Book
from labbook.book.budgets import budgets, simulate
from labbook.cli_print import Bar, aligned, by_option, cells_of
from labbook.errors import Refusal
from labbook.registry.dialects import read_choices, written_choices
from labbook.registry.own_numbers import FIELDS
from labbook.registry.regime_text import read_regime
from labbook.registry.written import written

_why = click.option("--why", help="The reason, kept in the ledger.")
_withdraw = click.option("--withdraw", is_flag=True, help="Take it out of use; its versions stay in the book.")


@click.command(
    epilog=f"Fields: {', '.join(FIELDS)}. A key that is the group's own already becomes a new version, with --why."
)
@click.argument("book")
@click.argument("cells", nargs=-1, required=True, metavar="key=value...")
@_withdraw
@_why
@by_option
def number(book: str, cells: tuple[str, ...], withdraw: bool, why: str | None, by: str | None) -> None:
    """Add a number of the group's own, e.g. key=Mg name='magnetic to viscous torque' formula='m_mag * B / (8 * pi *
    mu * b**3 * omega)' compares='...' source='own' example='m_mag = 0.5 mA.m2, B = 5 mT, ...' answer=2.00."""
    wanted = cells_of(cells)
    with Book.open(book) as opened:
        key = wanted.get("key", "")
        if withdraw:
            opened.withdraw("number", key, why=why or "", by=by)
            click.echo(f"{key} is withdrawn")
            return
        with Bar("deriving") as bar:
            version = opened.define_number(
                **wanted, why=why, by=by, progress=lambda n: bar.step("runs", n)
            )
        have = opened.runs(columns=(key,))[key].notna().sum()
    click.echo(f"{key}, version {version}: {have} kept runs have it")


@click.command()
@click.argument("book")
@click.argument("cells", nargs=-1, required=True, metavar="key=value...")
@_withdraw
@_why
@by_option
def regime(book: str, cells: tuple[str, ...], withdraw: bool, why: str | None, by: str | None) -> None:
    """Add or change a regime, e.g. name='slow wall' band='wall > 0.2' second='Sp < 1' colour=sky source='own' --why ..."""
    wanted = cells_of(cells)
    with Book.open(book) as opened:
        if withdraw:
            name = wanted.get("name", "")
            opened.withdraw("regime", name, why=why or "", by=by)
            click.echo(f"{name} is withdrawn")
            return
        row = read_regime(wanted)
        before, after = opened.set_regime(row, why=why or "", by=by)
    click.echo(f"{row.name}, {row.words}: {after} kept runs lie in it, {before} did before")


@click.command()
@click.argument("book")
@click.argument("choices", metavar="NUMBER=choice:option,...")
@_why
@by_option
def dialect(book: str, choices: str, why: str | None, by: str | None) -> None:
    """Make a dialect the group's house dialect, e.g. Sp=rate:f,power:1; the book is derived again. Sp=house
    leaves it as it is; other dialects are shown by `runs --dialect` without changing anything."""
    key, chosen = read_choices(choices)
    with Book.open(book) as opened, Bar("deriving") as bar:
        told = opened.adopt_dialect(key, chosen, why=why or "", by=by, progress=lambda n: bar.step("runs", n))
    lines = [["", "before", "after"]]
    before, after = told["before"], told["after"]
    lines.append(["dialect", *(written_choices(key, side["choices"]) for side in (before, after))])
    for name in ("lowest", "highest"):
        lines.append([f"{name} {key}", *(written(side[name], None) or "-" for side in (before, after))])
    lines.append(["runs derived again", "", str(after["derived runs"])])
    for name in after["regimes"]:
        lines.append([name, *(str(side["regimes"].get(name, 0)) for side in (before, after))])
    click.echo(aligned(lines, text_columns=1))
    if "changed with it" in after:
        click.echo(f"changed with it: {after['changed with it']}")


@click.command()
@click.argument("book")
@click.argument("cells", nargs=-1, required=True, metavar="key=value...")
@_withdraw
@_why
@by_option
@click.option("--confirm", is_flag=True, help="Pass warnings.")
def published(book: str, cells: tuple[str, ...], withdraw: bool, why: str | None, by: str | None, confirm: bool) -> None:
    """Add a point that others printed, e.g. series=yl-2006 citation='Yu, Lauga & Hosoi 2006' x=Sp x_value='2.5(1)'
    x_dialect=rate:f y=U_scaled y_value=0.012(2); it is drawn beside the runs, restated. A sheet published.csv is
    loaded with `labbook load`."""
    wanted = cells_of(cells)
    with Book.open(book) as opened:
        if withdraw:
            opened.withdraw("published", wanted.get("series", ""), why=why or "", by=by)
            click.echo(f"{wanted.get('series', '')} is withdrawn")
        else:
            click.echo(opened.stock("published", by=by, confirm=confirm, **wanted))


@click.command()
@click.argument("book")
@click.argument("run")
@click.option("--number", "key", default="Sp", show_default=True, help="Which number of the run.")
@click.option("--simulate", "simulates", is_flag=True, help="Also by Monte Carlo (JCGM 101).")
def budget(book: str, run: str, key: str, simulates: bool) -> None:
    """What each measured input contributes to the uncertainty of a run's number."""
    with Book.open(book) as opened:
        opened.registry.number(key)
        found = opened.ask(budgets, run)
        if key not in found:
            raise Refusal("number", key, f"{run} has none", opened.sheet(run).why_absent.get(key, ""))
        one = found[key]
        drawn = opened.ask(simulate, run, key) if simulates else None
    click.echo(f"{key} = {written(one.value, one.u)}; u own {one.u_own:.2g}, shared {one.u_shared:.2g}")
    lines = [["from", "of", "share"]]
    lines += [[f"{c.name} ({c.source})", c.belongs, f"{c.share:.1%}"] for c in one.contributions]
    click.echo(aligned(lines, text_columns=2))
    if one.advice:
        click.echo(one.advice)
    for source, relative in one.wide:
        click.echo(f"{source} carries {relative:.0%}: first order may mislead, look at --simulate")
    if drawn is not None:
        sample = drawn.sample
        click.echo(f"Monte Carlo, {sample.draws} draws: u {sample.u:.2g}, 95 % {sample.low:.4g} to {sample.high:.4g}")
        click.echo(drawn.warning or "first order is borne out")
