"""How the command line reads cells and prints: key=value pairs, tables that line up, a progress bar on stderr."""

import sys

import click
import pandas as pd

from labbook.registry.written import SHOWN, shown

TABLE_KEYS = ("f", "U", "T", "mu", "Sp", "Re_omega", "St", "stride")


by_option = click.option("--by", help="Your handle; left out: LABBOOK_BY, else the system user.")


def cells_of(pairs: tuple[str, ...]) -> dict[str, str]:
    """Cells from key=value arguments; a usage error for anything else."""
    cells = {}
    for pair in pairs:
        key, sign, value = pair.partition("=")
        if not sign or not key.strip():
            raise click.UsageError(f"{pair!r} is not key=value")
        if key.strip() in cells:
            raise click.UsageError(f"{key.strip()} is given twice")
        cells[key.strip()] = value.strip()
    return cells


class Bar:
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


def runs_table(table: pd.DataFrame) -> str:
    """A frame of runs as a table, each key in its usual unit, each number with its dialect if it is not the house's."""
    if table.empty:
        return "no runs"
    units = {k: SHOWN[k] for k in TABLE_KEYS if k in SHOWN} | {"f": "Hz"}
    spoken = {k: w for k, w in table.attrs.get("dialects", {}).items() if w != "house"}
    keys = [k for k in table if f"u_{k}" in table]
    heads = [f"{k} [{units[k]}]" if k in units else f"{k} ({spoken[k]})" if k in spoken else k for k in keys]
    header = ["run", "at", "by", "swimmer", "fluid", *heads]
    lines = [header]
    for row in table.to_dict("records"):
        cells = [shown(k, row[k], row[f"u_{k}"], units.get(k)).removesuffix(f" {units.get(k)}") for k in keys]
        lines.append([row["code"], f"{row['at']:%Y-%m-%d %H:%M}", row["by"], row["swimmer"], row["fluid"], *cells])
    return aligned(lines, text_columns=5)


def aligned(lines: list[list[str]], text_columns: int) -> str:
    """Lines of cells in columns, the first `text_columns` to the left, the others to the right."""
    widths = [max(len(line[i]) for line in lines) for i in range(len(lines[0]))]
    return "\n".join(
        "  ".join(
            c.ljust(w) if i < text_columns else c.rjust(w)
            for i, (c, w) in enumerate(zip(line, widths, strict=True))
        ).rstrip()
        for line in lines
    )
