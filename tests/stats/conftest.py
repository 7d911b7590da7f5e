"""A test with an argument named `<kind>_case` runs once for each reference case of that kind (tests/reference)."""

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import settings
from numpy.typing import ArrayLike

settings.register_profile("fixed", deadline=None, derandomize=True)
settings.load_profile("fixed")

Case = dict[str, Any]
CASES = Path(__file__).parents[1] / "reference" / "cases"


def pytest_generate_tests(metafunc: pytest.Metafunc):
    for name in metafunc.fixturenames:
        if name.endswith("_case"):
            found = [json.loads(path.read_text(encoding="utf-8")) for path in sorted(CASES.glob("*.json"))]
            chosen = [case for case in found if case["kind"] == name.removesuffix("_case")]
            if not chosen:
                raise LookupError(f"no reference case of kind {name.removesuffix('_case')!r}")
            metafunc.parametrize(name, chosen, ids=[case["id"] for case in chosen])


@pytest.fixture(scope="session")
def near() -> Callable[..., None]:
    """Asserts |got - want| <= atol + rtol |want| cell by cell; the text "inf" is infinity and null is no figure."""

    def check(got: ArrayLike, want: ArrayLike, *, rtol: float = 0.0, atol: float = 0.0, label: str = "") -> None:
        got = np.asarray([np.nan if cell is None else cell for cell in np.atleast_1d(got)], float)
        want = np.asarray([np.nan if cell is None else float(cell) for cell in np.atleast_1d(want)], float)
        assert got.shape == want.shape, label
        assert np.array_equal(np.isnan(got), np.isnan(want)), label
        same = (got == want) | np.isnan(want)
        got, want = np.where(same, 0.0, got), np.where(same, 0.0, want)
        off = np.abs(got - want)
        worst = off - (atol + rtol * np.abs(want))
        assert np.all(worst <= 0), (
            f"{label}: off by {off.max():.3g}, {got[worst.argmax()]!r} for {want[worst.argmax()]!r}"
        )

    return check


@pytest.fixture(scope="session")
def rtol_of() -> Callable[[Case], float]:
    """1e-9; 1e-8 where the data sit on a large offset: those expectations belong to the stored doubles."""

    def choose(case: Case) -> float:
        return 1e-8 if any(word in case["id"] for word in ("off1e", "tinyvar", "nist")) else 1e-9

    return choose
