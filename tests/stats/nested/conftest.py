"""The definitions written out with n × n matrices, to hold the sums over batches against."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest
from numpy.typing import ArrayLike


def indicators(labels: ArrayLike) -> np.ndarray:
    labels = np.asarray(labels)
    return (labels[:, None] == np.unique(labels)).astype(float)


def criterion(y: np.ndarray, x: np.ndarray, parts: list[np.ndarray], theta: ArrayLike) -> SimpleNamespace:
    """REML (Harville 1977) with gradient, Hessian and expected information; V = Σ θ_i parts_i."""
    theta, t, n = np.asarray(theta, float), len(parts), y.size
    v = sum(value * part for value, part in zip(theta, parts, strict=True))
    inverse = np.linalg.inv(v)
    w = x.T @ inverse @ x
    p = inverse - inverse @ x @ np.linalg.inv(w) @ x.T @ inverse
    value = np.linalg.slogdet(v)[1] + np.linalg.slogdet(w)[1] + y @ p @ y + (n - x.shape[1]) * np.log(2 * np.pi)
    pv = [p @ part for part in parts]
    py = p @ y
    gradient = np.array([np.trace(each) - py @ part @ py for each, part in zip(pv, parts, strict=True)])
    traces = np.array([[np.trace(pv[i] @ pv[j]) for j in range(t)] for i in range(t)])
    forms = np.array([[py @ parts[i] @ p @ parts[j] @ py for j in range(t)] for i in range(t)])
    means = np.linalg.solve(w, x.T @ inverse @ y)
    return SimpleNamespace(
        value=value,
        gradient=gradient,
        hessian=2 * forms - traces,
        information=traces / 2,
        means=means,
        inverse=inverse,
        phi=np.linalg.inv(w),
    )


def kenward_roger(
    x: np.ndarray, parts: list[np.ndarray], theta: ArrayLike, contrast: np.ndarray
) -> tuple[float, float]:
    """Standard error and degrees of freedom of one contrast by Kenward and Roger (1997), sections 2 and 3."""
    found = criterion(np.zeros(len(x)), x, parts, theta)
    inverse, phi, t = found.inverse, found.phi, len(parts)
    w = np.linalg.inv(found.information)
    p = [-x.T @ inverse @ part @ inverse @ x for part in parts]
    q = [[x.T @ inverse @ parts[i] @ inverse @ parts[j] @ inverse @ x for j in range(t)] for i in range(t)]
    bend = sum(w[i, j] * (q[i][j] - p[i] @ phi @ p[j]) for i in range(t) for j in range(t))
    adjusted = phi + 2 * phi @ bend @ phi
    span = np.outer(contrast, contrast) / (contrast @ phi @ contrast)
    a1 = sum(
        w[i, j] * np.trace(span @ phi @ p[i] @ phi) * np.trace(span @ phi @ p[j] @ phi)
        for i in range(t)
        for j in range(t)
    )
    a2 = sum(w[i, j] * np.trace(span @ phi @ p[i] @ phi @ span @ phi @ p[j] @ phi) for i in range(t) for j in range(t))
    b = (a1 + 6 * a2) / 2
    g = (2 * a1 - 5 * a2) / (3 * a2)
    c1, c2, c3 = g / (3 + 2 * (1 - g)), (1 - g) / (3 + 2 * (1 - g)), (3 - g) / (3 + 2 * (1 - g))
    expected, variance = 1 / (1 - a2), 2 * (1 + c1 * b) / ((1 - c2 * b) ** 2 * (1 - c3 * b))
    ratio = variance / (2 * expected**2)
    df = 4 + 3 / (ratio - 1)
    scale = df / (expected * (df - 2))
    return float(np.sqrt(contrast @ adjusted @ contrast / scale)), float(df)


@pytest.fixture(scope="session")
def literal() -> SimpleNamespace:
    return SimpleNamespace(indicators=indicators, criterion=criterion, kenward_roger=kenward_roger)
