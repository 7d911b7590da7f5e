"""Commands that compute nothing load nothing heavy: they start at once."""

from __future__ import annotations

import json
import subprocess
import sys

import pytest

HEAVY = {"pandas", "scipy", "matplotlib", "pint", "statsmodels", "alembic"}
CODE = """
import json, sys
from sameline.cli import run
code = run(sys.argv[1:])
print(json.dumps([code, sorted({name.partition(".")[0] for name in sys.modules})]), file=sys.stderr)
"""
COMMANDS = {
    "help": ("--help",),
    "help of a command": ("compare", "--help"),
    "list": ("list", "batches"),
    "log, no comparison touched": ("log", "-b", "B-1", "-c", "TS", "12.1", "12.4", "--at", "2026-01-05"),
    "log with the unit": ("list", "characteristics"),
    "runs": ("runs",),
    "differ, all": ("differ",),
    "trail": ("trail",),
    "history": ("history", "pair"),
    "compare without data": ("compare", "other pair", "B-1", "B-3", "-c", "TS"),
}


@pytest.fixture
def loaded(bench):
    bench.done("compare", "pair", "B-2", "B-3", "-c", "TS")

    def load(*arguments: str) -> set[str]:
        ended = subprocess.run(
            [sys.executable, "-c", CODE, *arguments], cwd=bench.folder, capture_output=True, text=True, check=True
        )
        code, modules = json.loads(ended.stderr.splitlines()[-1])
        assert code == 0, ended
        return set(modules)

    return load


@pytest.mark.parametrize("command", COMMANDS)
def test_a_command_that_computes_nothing_starts_at_once(loaded, command):
    assert not HEAVY & loaded(*COMMANDS[command])


def test_help_needs_no_database(loaded):
    assert not {"sqlalchemy", "numpy", "rich"} & loaded("--help")


def test_the_check_sees_a_heavy_import(loaded, bench):
    """The other side of the coin: where a comparison is computed, scipy is there."""
    bench.done("log", "-b", "B-2", "-c", "TS", "12.1", "12.4", "--at", "2026-01-05")
    assert "scipy" in loaded("log", "-b", "B-3", "-c", "TS", "12.6", "12.9", "--at", "2026-01-05")
