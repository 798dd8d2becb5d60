"""House rules that a machine can read: docstrings, length, names, no `assert`, no catch-all."""

import ast
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
MODULES = {str(path.relative_to(ROOT)): path for path in sorted((ROOT / "labbook").rglob("*.py"))}

LONGEST = 250
# a longer module needs a reason here, and a table of data is one
LONGER: dict[str, str] = {}

EMPTY_NAMES = {"utils", "util", "helpers", "helper", "manager", "managers", "common", "misc"}


def faults(source):
    """The catch-alls and `assert`s of one source, as 'line: what'.

    `except BaseException` that ends by raising again cleans up after itself, and is no catch-all.
    """
    said = []
    for node in ast.walk(ast.parse(source)):
        match node:
            case ast.Assert():
                said.append(f"{node.lineno}: assert")
            case ast.ExceptHandler(type=None):
                said.append(f"{node.lineno}: bare except")
            case ast.ExceptHandler(type=caught, body=[*_, last]):
                names = {part.id for part in ast.walk(caught) if isinstance(part, ast.Name)}
                again = isinstance(last, ast.Raise) and last.exc is None
                if "Exception" in names or ("BaseException" in names and not again):
                    said.append(f"{node.lineno}: except Exception")
    return said


@pytest.mark.parametrize("name", MODULES)
def test_a_module_starts_by_saying_what_may_live_there(name):
    source = MODULES[name].read_text(encoding="utf-8")
    assert ast.get_docstring(ast.parse(source)), "the first line is a docstring"
    assert source.startswith(('"""', "'''"))


@pytest.mark.parametrize("name", MODULES)
def test_a_module_is_short_or_says_why(name):
    lines = len(MODULES[name].read_text(encoding="utf-8").splitlines())
    assert lines <= LONGEST or LONGER.get(name), f"{lines} lines: split it, or list it with a reason"


def test_the_list_of_long_modules_is_not_stale():
    for name in LONGER:
        assert len(MODULES[name].read_text(encoding="utf-8").splitlines()) > LONGEST, name


def test_files_are_named_by_content():
    parts = {part for path in MODULES.values() for part in path.relative_to(ROOT).with_suffix("").parts}
    assert parts & EMPTY_NAMES == set()


@pytest.mark.parametrize("name", MODULES)
def test_arguments_are_refused_and_errors_named(name):
    assert faults(MODULES[name].read_text(encoding="utf-8")) == []


@pytest.mark.parametrize(("source", "said"), [
    ("assert x > 0", "1: assert"),
    ("try:\n    x()\nexcept:\n    pass", "3: bare except"),
    ("try:\n    x()\nexcept Exception:\n    pass", "3: except Exception"),
    ("try:\n    x()\nexcept (ValueError, BaseException) as e:\n    pass", "3: except Exception"),
])  # fmt: skip
def test_a_fault_is_seen(source, said):
    assert faults(source) == [said]


def test_a_named_error_and_a_clean_up_are_no_fault():
    assert faults("try:\n    x()\nexcept (ValueError, KeyError):\n    pass") == []
    assert faults("try:\n    x()\nexcept BaseException:\n    close()\n    raise") == []
