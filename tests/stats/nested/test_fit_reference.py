"""The fitted model against outside numbers: components, standard errors, degrees of freedom, intervals."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from sameline.stats.nested import NestedFit, fit_nested

PATHS = sorted((Path(__file__).parents[2] / "reference" / "cases").glob("open_nested_mixed_*.json"))
METHODS = ("kenward-roger", "satterthwaite")


@pytest.fixture(params=PATHS, ids=[path.stem.removeprefix("open_nested_mixed_") for path in PATHS])
def case(request: pytest.FixtureRequest) -> dict[str, Any]:
    return json.loads(request.param.read_text("utf-8"))


def fitted(case: dict[str, Any], df: str = "kenward-roger") -> NestedFit:
    data = case["data"]
    return fit_nested(data["value"], data["group"], data["batch"], data["run"], df=df)


def test_there_are_cases():
    assert len(PATHS) == 14


def test_components_and_criterion(case: dict[str, Any]):
    fit, expected = fitted(case), case["expect"]["variance_components"]
    found = {"residual" if level == "replicate" else level: value for level, value in fit.components.items()}
    assert found.keys() == expected.keys()
    total = sum(expected.values())
    for level, value in expected.items():
        assert found[level] == pytest.approx(value, abs=1e-9 * total)
    assert fit.reml_criterion == pytest.approx(case["expect"]["reml_criterion"], rel=1e-11)
    assert bool(fit.at_zero) == case["expect"]["singular"]


@pytest.mark.parametrize("method", METHODS)
def test_means_and_pairs(case: dict[str, Any], method: str):
    expected = case["expect"].get(method.replace("-", "_"))
    fit, alpha = fitted(case, method), case["options"]["alpha"]
    if expected is None:
        assert fit.groups == ("all",)
        return
    means, pairs = fit.means(alpha).frame(), fit.pairs(alpha).frame()
    for found, wanted, names in (
        (means, expected["means"], {"standard_error": "se", "df": "df", "mean": "mean"}),
        (pairs, expected["pairs"], {"standard_error": "se", "df": "df", "difference": "diff", "statistic": "t"}),
    ):
        for ours, theirs in names.items():
            np.testing.assert_allclose(found[ours], wanted[theirs], rtol=1e-10)
        error = np.asarray(wanted["se"])
        for ours, theirs in (("lower", "lo"), ("upper", "hi")):
            assert np.max(np.abs(found[ours] - wanted[theirs]) / error) < 1e-9
    assert list(pairs["a"]) == expected["pairs"]["group1"]
    np.testing.assert_allclose(pairs["p_value"], expected["pairs"]["p"], atol=1e-11)
    raw = fit.pairs(alpha, adjust="none").frame()
    np.testing.assert_allclose(raw["p_value"], expected["pairs"]["p_unadjusted"], rtol=1e-9)
