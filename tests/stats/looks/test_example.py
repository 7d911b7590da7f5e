"""The example in the package's docstring is what the package does; importing it loads nothing heavy."""

import doctest
import subprocess
import sys

import pytest

from sameline.stats import looks


def test_the_example_is_right():
    found = doctest.testmod(looks)
    assert found.attempted >= 8
    assert found.failed == 0


def test_every_public_name_is_there_and_no_other():
    for name in looks.__all__:
        assert getattr(looks, name) is not None
    with pytest.raises(AttributeError):
        _ = looks.judge_closed


def test_importing_loads_no_library():
    code = "import sys, sameline.stats.looks; sys.exit(bool({'numpy', 'scipy', 'pandas'} & set(sys.modules)))"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
