"""README.md keeps its word: its commands run, its tables are the registry's, its links lead somewhere."""

import ast
import fnmatch
import math
import re
import shlex
import shutil
from pathlib import Path

import pytest
from click.testing import CliRunner

from labbook.book.records import KINDS
from labbook.cli import main
from labbook.registry.catalogue import NUMBERS
from labbook.registry.dialects import CHOICES
from labbook.registry.regimes import REGIMES

ROOT = Path(__file__).resolve().parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
FOLDERS = {"labbook", "migrations", "tests", "seeds_demo"}
TOP = {"README.md", "DEVELOPERS.md", "LICENSE", "pyproject.toml"} | FOLDERS
SERVERS = ("open", "demo")  # these end only when a person ends them
SETUP = re.compile(r"^python3 -m venv .* -m pytest$", re.MULTILINE)


def blocks(text: str, language: str) -> list[str]:
    """The fenced blocks of one language, in order."""
    return re.findall(rf"^```{language}\n(.*?)^```$", text, re.MULTILINE | re.DOTALL)


def commands(text: str) -> list[list[str]]:
    """The words of every labbook command in the bash blocks, in order."""
    lines = "".join(blocks(text, "bash")).splitlines()
    return [words for line in lines if (words := shlex.split(line, comments=True))[:1] == ["labbook"]]


def rows(text: str, heading: str) -> list[list[str]]:
    """The cells of the table whose header row starts with `heading`."""
    table = text.split(f"\n| {heading} |", 1)[1].split("\n\n", 1)[0].splitlines()[2:]
    return [[cell.strip() for cell in line.removeprefix("|").removesuffix("|").split(" | ")] for line in table]


@pytest.fixture
def bench(tmp_path, monkeypatch):
    """An empty folder beside a copy of the demo's sheets and tracks, where README's commands may write."""
    shutil.copytree(ROOT / "seeds_demo", tmp_path / "seeds_demo", ignore=shutil.ignore_patterns("*.py*", "*.png"))
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("LABBOOK_BY", "wren")
    monkeypatch.delenv("LABBOOK_BOOK", raising=False)
    return tmp_path


def run(words: list[str]):
    return CliRunner().invoke(main, words[1:], prog_name="labbook")


def test_every_command_of_the_readme_runs_in_order_and_so_does_its_python(bench):
    said = {}
    for words in commands(README):
        if words[1] in SERVERS:
            main.commands[words[1]].make_context(words[1], words[2:])  # raises on wrong usage
            continue
        done = run(words)
        assert done.exit_code == 0, f"{shlex.join(words)}\n{done.output}{done.exception or ''}"
        said[words[1]] = done.stdout
    assert said["log"].strip() == "R-0921", "the code that README goes on to amend"
    assert (bench / "fig.svg").read_text(encoding="utf-8").lstrip().startswith("<svg")
    assert said["check"].startswith("nothing stale")
    # what README prints of the track is what the command says, but for lines that it leaves out
    (printed,) = blocks(README, "text")
    assert len(printed.splitlines()) == 5 and set(printed.splitlines()) <= set(said["reduce"].splitlines())
    names = {}
    exec("\n".join(blocks(README, "python")), names)  # noqa: S102 (README's own, on the book made above)
    assert names["runs"]["Sp"].between(1, 3).all() and len(names["runs"]) > 10
    assert names["runs"].attrs["units"]["U"] == "m/s"
    assert names["book"].check() == []
    names["book"].close()


def test_a_command_that_does_not_exist_would_be_seen():
    assert commands("```bash\nlabbook fly b.db  # up\nls\n```\n") == [["labbook", "fly", "b.db"]]
    assert run(["labbook", "fly", "b.db"]).exit_code == 2


@pytest.mark.parametrize("name", sorted(main.commands))
def test_every_command_is_in_the_readme(name):
    assert re.search(rf"\blabbook {name}\b", README)


def test_the_readme_names_no_command_that_does_not_exist():
    assert {m for m in re.findall(r"`labbook ([a-z]+)", README)} <= set(main.commands)


def test_every_option_in_the_readme_exists():
    known = {o for c in main.commands.values() for p in c.params for o in (*p.opts, *p.secondary_opts)}
    assert set(re.findall(r"(?<=`)--[a-z-]+", README)) <= known


def band(row) -> str:
    low = f"{row.low:g} {'≤' if row.low_closed else '<'} " if math.isfinite(row.low) else ""
    high = f" {'≤' if row.high_closed else '<'} {row.high:g}" if math.isfinite(row.high) else ""
    return f"{low}{row.number}{high}"


def test_the_table_of_numbers_is_the_registrys():
    expected = [[f"`{n.key}`", n.name, f"`{n.formula}`", n.dialect] for n in NUMBERS.values()]
    assert rows(README, "key | name") == expected


def test_the_table_of_regimes_is_the_registrys():
    assert rows(README, "regime") == [[r.name, band(r)] for r in REGIMES.values()]


def test_every_dialect_of_the_sperm_number_is_in_the_readme():
    for choice in CHOICES["Sp"]["coefficient"]:
        assert f"`{choice}`" in README, choice


def test_the_table_of_sheets_has_every_column_and_marks_the_required_ones():
    told = {
        name.strip("`"): re.sub(r"\([^)]*\)", "", columns).split(",")
        for name, columns in rows(README, "sheet")
    }
    assert set(told) == {kind.sheet for kind in KINDS.values()}
    for kind in KINDS.values():
        columns = [column.strip() for column in told[kind.sheet]]
        assert {c.strip("*") for c in columns} == set(kind.columns), kind.name
        assert {c.strip("*") for c in columns if c.startswith("**")} == set(kind.required), kind.name


def page_titles() -> list[str]:
    """The titles in the app's navigation: PAGES holds (function, title, path) rows."""
    tree = ast.parse((ROOT / "labbook" / "app" / "main.py").read_text(encoding="utf-8"))
    (rows_of_pages,) = (
        node.value.elts
        for node in tree.body
        if isinstance(node, ast.Assign) and node.targets[0].id == "PAGES"
    )
    return [row.elts[1].value for row in rows_of_pages]


def test_the_table_of_pages_is_the_navigation():
    assert [cells[0].strip("*") for cells in rows(README, "page")] == page_titles()


@pytest.mark.parametrize("name", ["README.md", "DEVELOPERS.md"])
def test_links_and_pictures_lead_to_files(name):
    text = (ROOT / name).read_text(encoding="utf-8")
    targets = [t for t in re.findall(r"\]\(([^)\s]+)\)", text) if "://" not in t]
    assert [t for t in targets if not (ROOT / t.partition("#")[0]).exists()] == []


def test_paths_that_developers_md_names_exist():
    paths = [p for p in re.findall(r"`([\w./-]+\.(?:py|toml|csv|md))`", DEVELOPERS) if "NNNN" not in p]
    places = [ROOT, ROOT / "labbook"]
    assert len(paths) > 10
    assert [p for p in paths if not any((place / p).exists() for place in places)] == []


def test_the_readme_is_short_enough_to_read():
    assert len(README.splitlines()) < 320


def test_ci_finds_exactly_one_test_command_in_the_readme():
    assert len(SETUP.findall(README)) == 1
    assert "grep -E '" + SETUP.pattern in (ROOT / ".ci" / "run").read_text(encoding="utf-8")


def test_the_top_level_holds_nothing_else():
    ignored = [line.strip("/") for line in (ROOT / ".gitignore").read_text(encoding="utf-8").split()]
    names = {p.name for p in ROOT.iterdir() if not p.name.startswith(".")}
    assert {n for n in names if not any(fnmatch.fnmatch(n, pattern) for pattern in ignored)} == TOP
