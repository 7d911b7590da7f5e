"""The tree written from its definitions, for every test here."""

import importlib.util
from pathlib import Path

import pytest


@pytest.fixture(scope="session")
def definition():
    spec = importlib.util.spec_from_file_location("reference_tree", Path(__file__).with_name("reference_tree.py"))
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module
