"""Expected mean squares against the classical tables of the reference cases."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from sameline.errors import StatsError
from sameline.stats.nested import fit_nested, nested_anova

PATHS = sorted((Path(__file__).parents[2] / "reference" / "cases").glob("open_variance_components_*.json"))


def test_there_are_cases():
    assert len(PATHS) == 8


@pytest.fixture(params=PATHS, ids=[path.stem.removeprefix("open_variance_components_") for path in PATHS])
def case(request: pytest.FixtureRequest) -> dict[str, Any]:
    return json.loads(request.param.read_text("utf-8"))


def test_the_table(case: dict[str, Any]):
    data, wanted = case["data"], case["expect"]["table"]
    table = nested_anova(data["value"], data["group"], data["batch"], data["run"])
    found = table.frame()
    assert list(found["source"]) == wanted["source"]
    assert list(found["df"]) == wanted["df"]
    for ours, theirs in {"ss": "ss", "ms": "ms", "standard_deviation": "sd", "variance": "variance"}.items():
        np.testing.assert_allclose(found[ours], wanted[theirs], rtol=1e-10)
    np.testing.assert_allclose(found["variance_raw"], wanted["variance_raw"], rtol=1e-9)
    np.testing.assert_allclose(100 * found["share"], wanted["percent_of_total"], rtol=1e-10)
    np.testing.assert_allclose(np.diag(table.expectation), wanted["ems_coefficient"], rtol=1e-12)
    np.testing.assert_allclose(found["statistic"][:-1].astype(float), wanted["F"][:-1], rtol=1e-10)
    np.testing.assert_allclose(found["p_value"][:-1].astype(float), wanted["p"][:-1], rtol=1e-9)
    assert found["p_value"].iloc[-1] is None
    assert table.grand_mean == pytest.approx(case["expect"]["grand_mean"], rel=1e-14)
    assert table.total_variance == pytest.approx(case["expect"]["total_variance"], rel=1e-10)


def test_replicate_interval_is_the_exact_chi_squared_one(case: dict[str, Any]):
    data, wanted = case["data"], case["expect"]["replicate_sd_ci"]
    if data["group"] is not None:
        # Groups are random in the table and fixed in the fit; what is within runs is the same.
        assert data["batch"] is not None
    spread = fit_nested(data["value"], data["group"], data["batch"], data["run"]).spread(case["options"]["alpha"])
    replicate = next(line for line in spread.levels if line.name == "replicate")
    assert replicate.lower == pytest.approx(wanted["lo"], rel=1e-9)
    assert replicate.upper == pytest.approx(wanted["hi"], rel=1e-9)


def test_unbalanced_coefficients_by_the_trace_definition():
    """E(MS) has coefficients tr(Q Zj Zj')/df, Q the projection of the level: written out with n × n matrices."""
    rng = np.random.default_rng(11)
    batch = np.repeat(np.arange(5), [3, 7, 4, 9, 2])
    run = rng.integers(0, 3, batch.size)
    table = nested_anova(rng.normal(size=batch.size), None, batch, run)
    cell = np.unique(batch * 10 + run, return_inverse=True)[1]
    designs = [np.ones((batch.size, 1)), np.eye(5)[batch], np.eye(cell.max() + 1)[cell], np.eye(batch.size)]
    hats = [design @ np.linalg.pinv(design) for design in designs]
    for i in range(3):
        q = hats[i + 1] - hats[i]
        for j in range(i, 3):
            z = designs[j + 1]
            literal = np.trace(q @ z @ z.T) / np.linalg.matrix_rank(q)
            assert table.expectation[i, j] == pytest.approx(literal, rel=1e-10)


def test_refuses_a_level_without_units_of_its_own():
    with pytest.raises(StatsError, match="no more units of run"):
        nested_anova([1.0, 2.0, 3.0, 4.0], None, ["A", "A", "B", "B"], ["r", "r", "r", "r"])
    with pytest.raises(StatsError, match="no level"):
        nested_anova([1.0, 2.0])
