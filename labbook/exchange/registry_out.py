"""The registry out: every number of a group as CSV or Markdown, with formula, source, regimes, runs."""

import csv
import io
from collections.abc import Mapping

from labbook.exchange.outward import harmless
from labbook.registry.catalogue import NUMBERS, Number
from labbook.registry.dialects import AT_BIRTH, DIALECTS, completed, written_choices
from labbook.registry.formula import parse
from labbook.registry.group import Registry
from labbook.registry.latex import formula_latex, number_latex
from labbook.registry.quantities import QUANTITIES

COLUMNS = ("key", "symbol", "name", "formula", "house dialect", "compares", "inputs", "source", "regimes",
           "dialects", "version", "runs")  # fmt: skip


def registry_csv(registry: Registry, counts: Mapping[str, int]) -> str:
    """CSV of the registry, one row a number; counts: how many kept runs have each."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(COLUMNS)
    for number in registry.numbers.values():
        writer.writerow([harmless(cell) for cell in _row(number, registry, counts.get(number.key, 0))])
    return out.getvalue()


def _row(number: Number, registry: Registry, runs: int) -> tuple:
    inputs = ", ".join(f"{key} [{QUANTITIES[key].unit}]" for key in number.inputs)
    regimes = "; ".join(f"{name}: {words}" for name, words in _regimes(number, registry))
    others = other_dialects(number.key, registry)
    spoken = "; ".join(f"{words}: {formula} ({source})" for words, (formula, source) in others.items())
    return (
        number.key, number.symbol, number.name, number.formula, number.dialect, number.compares, inputs,
        number.source, regimes, spoken, _version(number, registry), runs,
    )  # fmt: skip


def _regimes(number: Number, registry: Registry) -> list[tuple[str, str]]:
    return [(r.name, r.words) for r in registry.regimes.values() if number.key in r.numbers]


def other_dialects(number: str, registry: Registry) -> dict[str, tuple[str, str]]:
    """Where each published dialect departs from the group's house -> (formula, source), without the house.

    The dialect at birth is among them where the group chose another; {} for a number without dialects.
    """
    if number not in AT_BIRTH:
        return {}
    house, born = registry.choices(number), NUMBERS[number]
    rows = [(row.choices, row.formula, row.source) for row in DIALECTS if row.of == number]
    told: dict[str, tuple[str, str]] = {}
    for choices, formula, source in [({}, born.formula, born.source), *rows]:
        chosen = completed(number, choices)
        if chosen != house:
            told.setdefault(written_choices(number, chosen, house), (formula, source))
    return told


def _version(number: Number, registry: Registry) -> str:
    if number.key in registry.own:
        return f"own, version {registry.versions[number.key]}"
    return "at birth, house dialect changed" if registry.house.get(number.key) else "at birth"


def registry_markdown(registry: Registry, counts: Mapping[str, int]) -> str:
    """Markdown of the registry, a section a number with its formula in $...$; counts as in the CSV."""
    parts = ["# Numbers"]
    for number in registry.numbers.values():
        parts.append(_section(number, registry, counts.get(number.key, 0)))
    rows = [f"| {_text(r.name)} | {_text(r.words)} | {_text(r.source)} |" for r in registry.regimes.values()]
    parts.append("\n".join(["# Regimes", "", "| regime | band | source |", "|---|---|---|", *rows]))
    return "\n\n".join(parts) + "\n"


def _section(number: Number, registry: Registry, runs: int) -> str:
    inputs = [f"{_text(QUANTITIES[k].symbol)} `{k}` [{QUANTITIES[k].unit}]" for k in number.inputs]
    regimes = [f"{_text(name)}: {_text(words)}" for name, words in _regimes(number, registry)]
    told = {
        "formula": f"`{number.formula}`",
        "compares": _text(number.compares),
        "inputs": ", ".join(inputs),
        "house dialect": _text(number.dialect),
        "source": _text(number.source),
        "regimes": "; ".join(regimes),
        "version": _version(number, registry),
        "runs": f"{runs} kept",
    }
    head = f"## {_text(number.name)}: {_text(number.symbol)} `{number.key}`"
    lines = [head, "", f"${number_latex(number)}$", ""]
    lines += [f"- {word}: {text}" for word, text in told.items() if text]
    others = other_dialects(number.key, registry).items()
    spoken = [f"  - {_text(words)}: ${_formula(text)}$; {_text(source)}" for words, (text, source) in others]
    return "\n".join([*lines, *(["- dialects:", *spoken] if spoken else [])])


def _formula(text: str) -> str:
    return formula_latex(parse(text, QUANTITIES).tree)


def _text(text: str) -> str:
    """A text that Markdown shows as it stands, on one line."""
    return "".join(f"\\{c}" if c in "\\`*_[]<>$|#" else c for c in " ".join(text.split()))
