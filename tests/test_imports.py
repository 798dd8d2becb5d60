"""Who may import whom, read from the source with `ast`: one table of rooms, one of outside packages."""

import ast
import graphlib
import re
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent

# room -> rooms of labbook that it may import besides itself. A room is a folder or a module at the root;
# `labbook` is the root's own __init__
MAY_IMPORT = {
    "errors": set(),
    "physics": {"errors"},
    "registry": {"errors", "physics"},
    "book": {"errors", "physics", "registry"},
    "exchange": {"errors", "registry", "book"},
    "charts": {"errors", "registry", "physics"},
    "places": set(),
    "api": {"errors", "registry", "book", "exchange", "places"},
    "demo": {"errors", "book", "api"},
    "labbook": {"errors", "api"},
    "app": {"errors", "physics", "registry", "book", "exchange", "charts", "places", "api", "demo", "labbook"},
    "cli": {"errors", "physics", "registry", "book", "exchange", "charts", "places", "api", "demo", "labbook"},
    "migrations": {"errors", "book"},
}

# room -> outside packages that it may import besides the standard library
MAY_USE = {
    "errors": set(),
    "physics": {"numpy", "scipy"},
    "registry": {"numpy", "uncertainties", "pint"},
    "book": {"numpy", "pandas", "dateutil", "sqlalchemy", "alembic"},
    "exchange": {"numpy", "pandas", "pyarrow", "openpyxl"},
    "charts": {"numpy", "pandas", "altair", "vl_convert"},
    "places": {"platformdirs"},
    "api": {"numpy", "pandas"},
    "demo": set(),
    "labbook": set(),
    "app": {"numpy", "pandas", "streamlit"},
    "cli": {"numpy", "pandas", "click"},
    "migrations": {"sqlalchemy", "alembic"},
}

# tighter than its room
ONLY_IN = {"pint": "labbook.registry.units"}


def sources():
    """{module name: source} of the package and its migrations."""
    found = {}
    for folder in ("labbook", "migrations"):
        for path in sorted((ROOT / folder).rglob("*.py")):
            parts = path.relative_to(ROOT).with_suffix("").parts
            found[".".join(parts[:-1] if parts[-1] == "__init__" else parts)] = path.read_text(
                encoding="utf-8"
            )
    return found


def room(module):
    head, _, rest = module.partition(".")
    if rest.startswith("cli_"):  # the command line's own parts beside cli.py
        return "cli"
    return rest.partition(".")[0] or head if head == "labbook" else head


def targets(node, modules):
    """[(imported module, name or None)]: `from labbook.physics import rods` imports labbook.physics.rods."""
    if isinstance(node, ast.Import):
        return [(alias.name, None) for alias in node.names]
    inside = [f"{node.module}.{alias.name}" for alias in node.names]
    return [
        (path, None) if path in modules else (node.module, alias.name)
        for path, alias in zip(inside, node.names, strict=True)
    ]


def imports(tree):
    return [node for node in ast.walk(tree) if isinstance(node, ast.Import | ast.ImportFrom)]


def complaints(module, source, modules):
    """What one module's imports do that they may not."""
    tree, own = ast.parse(source), room(module)
    said = []
    for node in imports(tree):
        at = f"{module}:{node.lineno}"
        if node not in tree.body:
            said.append(f"{at}: an import that is not at the top of its module")
        if isinstance(node, ast.ImportFrom) and node.level:
            said.append(f"{at}: a relative import")
            continue
        if isinstance(node, ast.ImportFrom) and any(alias.name == "*" for alias in node.names):
            said.append(f"{at}: a star import")
        for target, name in targets(node, modules):
            top = target.partition(".")[0]
            if top in ("labbook", "migrations"):
                if room(target) not in MAY_IMPORT[own] | {own}:
                    said.append(f"{at}: {own} may not import {room(target)}")
                elif name not in (None, "*") and target in modules and name not in defined(modules[target]):
                    said.append(f"{at}: {name} is not defined in {target}")
            elif top not in sys.stdlib_module_names:
                if top not in MAY_USE[own] or ONLY_IN.get(top, module) != module:
                    said.append(f"{at}: {module} may not use {top}")
    for node in ast.walk(tree):
        match node:
            case ast.Call(
                func=ast.Name(id="__import__") | ast.Attribute(attr="import_module" | "__import__")
            ):
                said.append(f"{module}:{node.lineno}: an import by call")
    return said


def defined(source):
    """The names that a module defines itself; the root may pass on what it imports."""
    names = set()
    tree = ast.parse(source)
    for node in tree.body:
        match node:
            case ast.FunctionDef(name=name) | ast.AsyncFunctionDef(name=name) | ast.ClassDef(name=name):
                names.add(name)
            case ast.Assign() | ast.AnnAssign():
                names.update(part.id for part in ast.walk(node) if isinstance(part, ast.Name)
                             and isinstance(part.ctx, ast.Store))  # fmt: skip
            case ast.ImportFrom(module="labbook.api", names=aliases):
                names.update(alias.name for alias in aliases)
    return names


def graph(modules):
    """{module: modules of labbook that it imports}."""
    return {
        module: {
            target
            for node in imports(ast.parse(source))
            if isinstance(node, ast.Import) or not node.level
            for target, _ in targets(node, modules)
            if target in modules
        }
        for module, source in modules.items()
    }


MODULES = sources()


@pytest.mark.parametrize("module", MODULES)
def test_a_module_imports_only_what_its_room_may(module):
    assert complaints(module, MODULES[module], MODULES) == []


def test_every_module_stands_in_a_known_room():
    assert {room(module) for module in MODULES} <= set(MAY_IMPORT)
    assert set(MAY_USE) == set(MAY_IMPORT)


def test_every_outside_package_is_declared():
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    declared = {re.match(r"[\w-]+", line)[0].lower().replace("-", "_") for line in project["dependencies"]}
    names = {"vl_convert": "vl_convert_python", "dateutil": "python_dateutil"}
    assert {names.get(name, name) for name in set().union(*MAY_USE.values())} <= declared


def test_no_modules_import_each_other_in_a_circle():
    order = list(
        graphlib.TopologicalSorter(graph(MODULES)).static_order()
    )  # raises CycleError with the circle
    assert set(order) == set(MODULES)


def test_the_table_itself_runs_one_way():
    graphlib.TopologicalSorter(MAY_IMPORT).prepare()


# --- the reader can see what it is there to see
# -----------------------------------------------------------------

FEW = {
    "labbook.errors": "class Refusal(Exception): ...",
    "labbook.registry.units": "import pint\nfrom labbook.errors import Refusal",
    "labbook.physics.rods": "from labbook.errors import Refusal",
    "labbook.book.tables": "import sqlalchemy\nROWS = 1",
    "labbook.app.main": "ROWS = 1",
}


@pytest.mark.parametrize(("module", "source", "said"), [
    ("labbook.registry.typed", "import pint", "may not use pint"),
    ("labbook.registry.typed", "from pint.errors import X", "may not use pint"),
    ("labbook.physics.rods", "import pandas", "may not use pandas"),
    ("labbook.physics.rods", "from labbook.registry import units", "physics may not import registry"),
    ("labbook.physics.rods", "import labbook.registry.units", "physics may not import registry"),
    ("labbook.charts.trend", "from labbook.book.tables import ROWS", "charts may not import book"),
    ("labbook.charts.trend", "from labbook.book import tables", "charts may not import book"),
    ("labbook.exchange.sheets", "from labbook.physics import rods", "exchange may not import physics"),
    ("labbook.exchange.sheets", "import sqlalchemy.orm", "may not use sqlalchemy"),
    ("labbook.app.bench", "import altair", "may not use altair"),
    ("labbook.app.bench", "import sqlalchemy", "may not use sqlalchemy"),
    ("labbook.cli", "from labbook.app import main", "cli may not import app"),
    ("labbook.cli", "import streamlit", "may not use streamlit"),
    ("labbook.app.bench", "import click", "may not use click"),
    ("labbook.app.bench", "import vl_convert", "may not use vl_convert"),
    ("labbook.api", "from labbook.charts import trend", "api may not import charts"),
    ("labbook.errors", "import numpy", "may not use numpy"),
    ("labbook", "from labbook.book.tables import ROWS", "labbook may not import book"),
    ("labbook.registry.typed", "from labbook.errors import *", "a star import"),
    ("labbook.registry.typed", "from . import units", "a relative import"),
    ("labbook.registry.typed", "def f():\n    import json", "not at the top"),
    ("labbook.registry.typed", "try:\n    import json\nfinally:\n    pass", "not at the top"),
    ("labbook.registry.typed", "if 1:\n    from labbook.errors import Refusal", "not at the top"),
    ("labbook.registry.typed", "__import__('json')", "an import by call"),
    ("labbook.registry.typed", "import importlib\nimportlib.import_module('json')", "an import by call"),
    ("labbook.registry.typed", "from labbook.registry.units import Refusal", "is not defined in"),
])  # fmt: skip
def test_a_forbidden_import_is_seen(module, source, said):
    found = complaints(module, source, FEW)
    assert len(found) == 1 and said in found[0]


def test_a_circle_is_seen():
    with pytest.raises(graphlib.CycleError):
        graphlib.TopologicalSorter(graph({
            "labbook.physics.a": "from labbook.physics import b",
            "labbook.physics.b": "import labbook.physics.a",
        })).prepare()  # fmt: skip


def test_nothing_happens_on_import():
    # every module outside the app, in a fresh Python: no pint registry is built and no file of a book appears
    names = [name for name in MODULES if room(name) not in ("app", "migrations")]
    script = (
        f"import importlib, sys, threading\nfor name in {names!r}: importlib.import_module(name)\n"
        "from labbook.registry import units\n"
        "pint_registries = units._pint_registry.cache_info().currsize\n"
        "print(pint_registries, threading.active_count(), 'streamlit' in sys.modules)"
    )
    done = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, cwd=ROOT, check=True
    )
    assert done.stdout.split() == ["0", "1", "False"]
