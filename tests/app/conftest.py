"""Opens one page of the app without a browser; its class is loaded by path (importlib mode: no package)."""

import importlib.util
import shutil
from pathlib import Path

import pytest


@pytest.fixture(scope="session")
def one_page():
    place = Path(__file__).with_name("one_page.py")
    spec = importlib.util.spec_from_file_location("one_page_of_the_app", place)
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module.OnePage


@pytest.fixture
def demo_copy(demo_book, tmp_path):
    """A copy of the demo book, to write to."""
    return Path(shutil.copy(demo_book, tmp_path / "demo.db"))


@pytest.fixture
def open_page(one_page, monkeypatch):
    """open_page(book, "shelf", kind="fluid") is that page of that book, run once."""
    return lambda book, name, **address: one_page(monkeypatch, book, name, **address)
