"""Components and means from sufficient statistics: the closed form where there is one, else the search."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from sameline.stats.nested.balanced import closed_form, has_closed_form
from sameline.stats.nested.contrasts import Contrasts, CorrelatedMeans, IndependentMeans
from sameline.stats.nested.criterion import nested_criterion
from sameline.stats.nested.kenward_roger import kenward_roger
from sameline.stats.nested.reml import minimise
from sameline.stats.nested.satterthwaite import satterthwaite
from sameline.stats.nested.unweighted import MeanSquares, unweighted_mean_squares

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    from sameline.stats.nested.layout import Layout
    from sameline.stats.nested.reml import Evaluated

DF_METHODS = ("kenward-roger", "satterthwaite")
WHOLE = 1e-9


@dataclass(frozen=True, slots=True)
class Estimate:
    """What one fit found, groups in order of first appearance.

    Args:
        random: names of the components, top down; length t.
        theta: their variances, shape (t,).
        criterion: minus twice the REML log likelihood, None where the components were not fitted.
        means: group means about the origin, shape (k,).
        spread: variances of means and differences.
        expected: inverse expected information of all components, shape (t, t).
        observed: inverse observed information of those above zero, shape (t, t), zero elsewhere.
        exact_df: degrees of freedom where they are known exactly (one component only).
        squares: mean squares for intervals of the components, for nested data.
        criterion_at: the criterion as a function, for designs without such mean squares.
    """

    random: tuple[str, ...]
    theta: NDArray[np.float64]
    criterion: float | None
    means: NDArray[np.float64]
    spread: IndependentMeans | CorrelatedMeans
    expected: NDArray[np.float64]
    observed: NDArray[np.float64]
    exact_df: float | None = None
    squares: MeanSquares | None = None
    criterion_at: Callable[[NDArray[np.float64]], Evaluated] | None = None

    def taken(self, place: NDArray[np.intp], shift: float) -> Estimate:
        """Some of the groups, their means moved by `shift`; not a fit of its own any more."""
        return replace(
            self, criterion=None, squares=None, means=self.means[place] + shift, spread=self.spread.taken(place)
        )

    def judged(self, contrasts: Contrasts, method: str) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Standard errors and degrees of freedom of m contrasts by one of `DF_METHODS`, shape (m,) each."""
        if method == "kenward-roger":
            error, df = kenward_roger(contrasts, self.expected)
        else:
            error, df = satterthwaite(contrasts, self.observed)
        if self.exact_df is not None:
            df = np.full(df.shape, self.exact_df)
        whole = np.round(df)
        return error, np.where(np.abs(df - whole) < WHOLE * df, whole, df)


def estimate_nested(layout: Layout, place: NDArray[np.intp]) -> Estimate:
    """Fits nested data by REML.

    Args:
        layout: sufficient statistics in canonical order.
        place: canonical code of each group in the order wanted, shape (k,).
    """
    t = len(layout.random)
    squares = unweighted_mean_squares(layout)
    if has_closed_form(layout):
        theta = closed_form(layout)
        found = nested_criterion(layout, theta)
    else:
        theta, found = minimise(lambda at: nested_criterion(layout, at), starting_points(squares))
    return Estimate(
        random=layout.random,
        theta=theta,
        criterion=found.value,
        means=found.means[place],
        spread=IndependentMeans.of(found.precision.taken(place)),
        expected=inverse(found.information),
        observed=inverse_of_free(0.5 * found.hessian, theta > 0.0),
        exact_df=float(layout.values - layout.k) if t == 1 else None,
        squares=squares,
    )


def starting_points(squares: MeanSquares) -> list[NDArray[np.float64]]:
    """Where the search starts: the mean squares' own estimate, and nearly all spread in the residual."""
    moments = np.linalg.solve(squares.expectation, squares.value)
    scale = float(np.abs(moments).sum())
    residual = np.append(np.full(moments.size - 1, 1e-2), 1.0)
    return [np.maximum(moments, 1e-3 * scale * residual), scale * residual]


def inverse(information: NDArray[np.float64]) -> NDArray[np.float64]:
    """Inverse of a symmetric positive definite matrix, scaled to a unit diagonal first."""
    scale = 1.0 / np.sqrt(np.diag(information))
    inner = np.linalg.inv(information * scale[:, None] * scale)
    return np.asarray(0.5 * (inner + inner.T) * scale[:, None] * scale)


def inverse_of_free(information: NDArray[np.float64], free: NDArray[np.bool_]) -> NDArray[np.float64]:
    """Inverse of the free rows and columns, zero elsewhere."""
    full = np.zeros_like(information)
    at = np.ix_(free, free)
    full[at] = inverse(information[at])
    return full
