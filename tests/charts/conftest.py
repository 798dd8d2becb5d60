"""Sample runs and spec readers for the chart tests, loaded by path (importlib mode has no package)."""

import importlib.util
from pathlib import Path

import pytest


@pytest.fixture(scope="session")
def samples():
    place = Path(__file__).with_name("samples.py")
    spec = importlib.util.spec_from_file_location("chart_samples", place)
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module
