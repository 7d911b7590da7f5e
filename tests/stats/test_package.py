"""What the package promises beside its figures: it loads on demand, and its names are what they say."""

import pkgutil
import subprocess
import sys

import pytest

import sameline.stats as package


def test_importing_the_package_loads_nothing_heavy():
    code = "import sys, sameline.stats; print(*[m for m in ('numpy', 'scipy', 'pandas') if m in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert not done.stdout.strip()


def test_a_comparison_loads_neither_pandas_nor_scipy_stats():
    code = (
        "import sys; from sameline.stats import compare_pairs; compare_pairs([1, 2, 3, 5], list('AABB')).cautions;"
        "print(*[m for m in ('scipy.stats', 'pandas', 'matplotlib') if m in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert not done.stdout.strip()


@pytest.mark.parametrize("name", package.__all__)
def test_every_name_offered_can_be_had(name: str):
    assert getattr(package, name) is not None


def test_no_module_hides_a_name_of_the_package():
    # Importing a submodule sets it as an attribute of its package, where it would hide a function of the same name.
    assert not {module.name for module in pkgutil.iter_modules(package.__path__)} & set(package.__all__)


def test_an_unknown_name_is_an_attribute_error():
    with pytest.raises(AttributeError, match="no_such_test"):
        _ = package.no_such_test
