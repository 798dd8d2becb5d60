"""What a stranger installs is whole: the wheel carries what a book needs, and works anywhere."""

import ast
import os
import subprocess
import sys
import tarfile
import tomllib
import zipfile
from importlib import metadata
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
COMMAND = "from labbook.cli import main; main(prog_name='labbook')"
JUNK = ("__pycache__", ".pyc", ".db", ".hypothesis", ".pytest_cache", ".venv", ".git/", ".egg-info")


def build(what: str, folder: Path) -> Path:
    """Build with the project's own backend, as pip would, without a network."""
    script = f"import sys, hatchling.build as backend; print(backend.build_{what}(sys.argv[1]))"
    done = subprocess.run(
        [sys.executable, "-c", script, str(folder)], cwd=ROOT, capture_output=True, text=True, check=True
    )
    return folder / done.stdout.split()[-1]


@pytest.fixture(scope="module")
def wheel(tmp_path_factory):
    return build("wheel", tmp_path_factory.mktemp("wheel"))


@pytest.fixture(scope="module")
def names(wheel):
    with zipfile.ZipFile(wheel) as archive:
        return set(archive.namelist())


@pytest.fixture(scope="module")
def away(wheel, tmp_path_factory):
    """away(*arguments) runs the unpacked wheel's labbook in an empty folder: exit code, stdout, stderr."""
    site, folder = tmp_path_factory.mktemp("site"), tmp_path_factory.mktemp("elsewhere")
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(site)
    environment = os.environ | {"PYTHONPATH": str(site), "LABBOOK_BY": "wren", "PYTHONIOENCODING": "utf-8"}

    def call(*arguments, script=COMMAND):
        done = subprocess.run(
            [sys.executable, "-c", script, *arguments], cwd=folder, env=environment, capture_output=True,
            encoding="utf-8", check=False,
        )  # fmt: skip
        return done.returncode, done.stdout, done.stderr

    call.site, call.folder = site, folder
    return call


def files(folder: str) -> set[str]:
    return {
        path.relative_to(ROOT).as_posix() for path in (ROOT / folder).rglob("*")
        if path.is_file() and not any(junk in path.as_posix() for junk in JUNK)
    }  # fmt: skip


def test_every_file_of_the_package_is_in_the_wheel(names):
    assert files("labbook") <= names
    assert "labbook/app/.streamlit/config.toml" in names


def test_migrations_and_the_demo_travel_inside(names):
    assert {f"labbook/_data/{f}" for f in files("migrations") | files("seeds_demo")} <= names


def test_nothing_else_travels(names):
    info = f"labbook-{PROJECT['version']}.dist-info/"
    assert [n for n in names if not n.startswith(("labbook/", info))] == []
    assert [n for n in names if any(junk in n for junk in JUNK)] == []
    assert f"{info}licenses/LICENSE" in names


def test_a_book_is_made_filled_and_checked_away_from_the_checkout(away):
    code, place, _ = away(script="import labbook; print(labbook.__file__)")
    assert code == 0 and Path(place.strip()).is_relative_to(away.site), "the unpacked wheel is what runs"
    assert away("--version") == (0, f"labbook, version {PROJECT['version']}\n", "")
    assert away("new", "bench.db")[0] == 0
    demo = away(script="from labbook.demo import demo_folder; print(demo_folder())")[1].strip()
    assert Path(demo).is_relative_to(away.site)
    code, said, trouble = away("load", "bench.db", demo)
    assert code == 0, trouble
    assert "920 runs" in said  # the lines of seeds_demo/runs.csv without its header
    assert away("check", "bench.db")[0] == 0
    assert "Re_omega" in away("numbers", "bench.db")[1]
    assert (away.folder / "bench.db").exists()


def test_the_source_archive_is_whole_and_holds_no_junk(tmp_path):
    with tarfile.open(build("sdist", tmp_path)) as archive:
        held = {name.partition("/")[2] for name in archive.getnames()}
    wanted = files("labbook") | files("migrations") | files("seeds_demo") | files("tests")
    assert wanted | {"README.md", "DEVELOPERS.md", "LICENSE", "pyproject.toml", "PKG-INFO"} <= held
    assert [n for n in held if any(junk in n for junk in JUNK)] == []


def imported(*folders: str) -> set[str]:
    """Top-level names that the Python files of some folders import from outside the project."""
    # tests and the demo's script also import the files beside them
    beside = [*(ROOT / "seeds_demo").glob("*.py"), *(ROOT / "tests").rglob("*.py")]
    local = {"labbook", *(path.stem for path in beside)}
    found = set()
    for folder in folders:
        for path in (ROOT / folder).rglob("*.py"):
            for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
                if isinstance(node, ast.Import):
                    found |= {alias.name.partition(".")[0] for alias in node.names}
                elif isinstance(node, ast.ImportFrom) and not node.level:
                    found.add(node.module.partition(".")[0])
    return found - local - sys.stdlib_module_names


def declared(lines: list[str]) -> set[str]:
    heads = (line.replace("[", " ").replace(">", " ").split()[0] for line in lines)
    return {head.lower().replace("_", "-") for head in heads}


def undeclared(modules: set[str], known: set[str]) -> set[str]:
    """Modules that come from no declared distribution."""
    owners = metadata.packages_distributions()
    return {m for m in modules if not {o.lower().replace("_", "-") for o in owners.get(m, ())} & known}


def test_every_import_of_the_package_is_a_declared_dependency():
    assert undeclared(imported("labbook", "migrations"), declared(PROJECT["dependencies"])) == set()


def test_every_import_of_the_tests_is_declared():
    lines = PROJECT["dependencies"] + PROJECT["optional-dependencies"]["test"]
    extra = declared(PROJECT["optional-dependencies"]["postgresql"])
    assert undeclared(imported("tests"), declared(lines) | extra) == set()


def test_an_undeclared_import_would_be_seen():
    assert undeclared({"pytest"}, {"numpy"}) == {"pytest"}
