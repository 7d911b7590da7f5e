"""Sums over batches against n × n matrices: criterion, derivatives, information, Kenward-Roger."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest

from sameline.stats.nested import fit_nested
from sameline.stats.nested.criterion import nested_criterion
from sameline.stats.nested.layout import layout_of
from sameline.stats.nested.levels import chain_of
from sameline.stats.nested.rows import read_rows
from sameline.stats.nested.sessions import crossed_criterion, crossed_of

THETAS = ([0.8, 0.5, 1.3], [0.0, 0.5, 1.3], [0.8, 0.0, 1.3], [0.0, 0.0, 1.3], [1e3, 1e-3, 1.0], [1e-4, 50.0, 0.01])


def unbalanced(seed: int) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    rows = [
        (g, b, r)
        for g in range(3)
        for b in range(rng.integers(2, 5))
        for r in range(rng.integers(1, 4))
        for _ in range(rng.integers(1, 5))
    ]
    group, batch, run = np.array(rows).T
    return rng.normal(3.0 * group, 1.0), group, batch, run


@pytest.mark.parametrize("theta", THETAS)
@pytest.mark.parametrize("seed", [1, 2])
def test_nested_criterion(literal: SimpleNamespace, theta: list[float], seed: int):
    y, group, batch, run = unbalanced(seed)
    rows = read_rows(y, group, batch, run, None)
    found = nested_criterion(layout_of(chain_of(rows)), np.array(theta))
    cells = [group * 10 + batch, (group * 10 + batch) * 10 + run, np.arange(y.size)]
    parts = [literal.indicators(cell) @ literal.indicators(cell).T for cell in cells]
    wanted = literal.criterion(y, literal.indicators(group), parts, theta)
    assert found.value == pytest.approx(wanted.value, rel=1e-10)
    np.testing.assert_allclose(found.gradient, wanted.gradient, rtol=1e-7, atol=1e-9)
    np.testing.assert_allclose(found.hessian, wanted.hessian, rtol=1e-6, atol=1e-8 * np.abs(wanted.hessian).max())
    np.testing.assert_allclose(found.information, wanted.information, rtol=1e-7)
    np.testing.assert_allclose(found.means + rows.origin, wanted.means, rtol=1e-11)
    np.testing.assert_allclose(1 / found.precision.value, np.diag(wanted.phi), rtol=1e-11)


def sessions(seed: int, per_session: int) -> tuple[np.ndarray, ...]:
    """Batches tested together in sessions, some twice in one, with unequal replicates."""
    rng = np.random.default_rng(seed)
    rows = []
    for s in range(6):
        for b in rng.choice(9, per_session, replace=False):
            for r in range(rng.integers(1, 3)):
                rows += [(b % 3, b, s, r)] * rng.integers(1, 4)
    group, batch, session, run = np.array(rows).T
    return rng.normal(group, 1.0) + rng.normal(0, 2, 6)[session], group, batch, session, run


@pytest.mark.parametrize("theta", [[2.0, 0.8, 0.5, 1.3], [0.0, 0.8, 0.0, 1.3], [2.0, 0.0, 0.5, 0.3]])
@pytest.mark.parametrize("per_session", [4, 7])
def test_crossed_criterion(literal: SimpleNamespace, theta: list[float], per_session: int):
    y, group, batch, session, run = sessions(3, per_session)
    rows = read_rows(y, group, batch, run, session)
    design = crossed_of(chain_of(rows))
    assert design.random == ("session", "batch", "run", "replicate")
    found = crossed_criterion(design, np.array(theta))
    cells = [session, batch, (batch * 10 + session) * 10 + run, np.arange(y.size)]
    parts = [literal.indicators(cell) @ literal.indicators(cell).T for cell in cells]
    wanted = literal.criterion(y, literal.indicators(group), parts, theta)
    assert found.value == pytest.approx(wanted.value, rel=1e-11)
    np.testing.assert_allclose(found.gradient, wanted.gradient, rtol=1e-9, atol=1e-9)
    np.testing.assert_allclose(found.hessian, wanted.hessian, rtol=1e-8, atol=1e-9)
    np.testing.assert_allclose(found.information, wanted.information, rtol=1e-9)
    np.testing.assert_allclose(found.means + rows.origin, wanted.means, rtol=1e-11)
    np.testing.assert_allclose(np.linalg.inv(found.precision.value), wanted.phi, rtol=1e-10)


def test_kenward_roger_in_sessions(literal: SimpleNamespace):
    """The crossed design's standard errors and degrees of freedom by Kenward and Roger's own matrices."""
    y, group, batch, session, run = sessions(5, 6)
    fit = fit_nested(y, group, batch, run, sessions=session)
    cells = [session, batch, (batch * 10 + session) * 10 + run, np.arange(y.size)]
    parts = [literal.indicators(cell) @ literal.indicators(cell).T for cell in cells]
    theta = list(fit.components.values())
    order = [int(label) for label in fit.groups]
    for pair in fit.pairs().pairs:
        contrast = np.zeros(3)
        contrast[[int(pair.b), int(pair.a)]] = 1.0, -1.0
        error, df = literal.kenward_roger(literal.indicators(group), parts, theta, contrast)
        assert pair.standard_error == pytest.approx(error, rel=1e-9)
        assert pair.df == pytest.approx(df, rel=1e-8)
    for at, error, df in zip(order, fit.means().standard_error, fit.means().df, strict=True):
        wanted = literal.kenward_roger(literal.indicators(group), parts, theta, np.eye(3)[at])
        assert (error, df) == pytest.approx(wanted, rel=1e-8)


def test_kenward_roger_with_a_component_at_zero(literal: SimpleNamespace):
    """The nested design at the boundary, all components in the information."""
    y, group, batch, run = unbalanced(7)
    fit = fit_nested(y, group, batch, run)
    assert fit.at_zero
    cells = [group * 10 + batch, (group * 10 + batch) * 10 + run, np.arange(y.size)]
    parts = [literal.indicators(cell) @ literal.indicators(cell).T for cell in cells]
    theta = list(fit.components.values())
    for pair in fit.pairs().pairs:
        contrast = np.zeros(3)
        contrast[[int(pair.b), int(pair.a)]] = 1.0, -1.0
        error, df = literal.kenward_roger(literal.indicators(group), parts, theta, contrast)
        assert pair.standard_error == pytest.approx(error, rel=1e-9)
        assert pair.df == pytest.approx(df, rel=1e-8)
