"""Variances of group means and of their differences, with their derivatives in the components."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from sameline.stats.nested.jets import Jet


@dataclass(frozen=True, slots=True)
class Contrasts:
    """m linear combinations of the group means.

    Args:
        variance: estimated variance l'Φl with Φ = (X'V⁻¹X)⁻¹, shape (m,).
        slope: its derivatives in the components, shape (t, m).
        bend: ½ of the second derivatives' counterpart in Kenward and Roger's correction,
            l'Φ(Qij - PiΦPj)Φl, shape (t, t, m).
    """

    variance: NDArray[np.float64]
    slope: NDArray[np.float64]
    bend: NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class IndependentMeans:
    """Group means that share no random effect: X'V⁻¹X is diagonal.

    Args:
        each: contrasts that pick one group each, shape (k,) in the last axis.
    """

    each: Contrasts

    @staticmethod
    def of(precision: Jet) -> IndependentMeans:
        """From the diagonal of X'V⁻¹X with its derivatives."""
        w, slope = precision.value, precision.slope
        bend = (0.5 * precision.curve - slope[:, None] * slope[None, :] / w) / w**2
        return IndependentMeans(Contrasts(1.0 / w, -slope / w**2, bend))

    def taken(self, place: NDArray[np.intp]) -> IndependentMeans:
        """Some of the groups, in another order."""
        one = self.each
        return IndependentMeans(Contrasts(one.variance[place], one.slope[:, place], one.bend[:, :, place]))

    def means(self) -> Contrasts:
        """The k group means."""
        return self.each

    def differences(self, a: NDArray[np.intp], b: NDArray[np.intp]) -> Contrasts:
        """mean(b) - mean(a) for m pairs of group codes."""
        one = self.each
        return Contrasts(
            one.variance[a] + one.variance[b],
            one.slope[:, a] + one.slope[:, b],
            one.bend[:, :, a] + one.bend[:, :, b],
        )

    def correlation_with_control(self, control: int, others: NDArray[np.intp]) -> NDArray[np.float64]:
        """Weights l such that differences to one control correlate as l_i l_j, shape (m,)."""
        shared = self.each.variance[control]
        return np.asarray(np.sqrt(shared / (shared + self.each.variance[others])))


@dataclass(frozen=True, slots=True)
class CorrelatedMeans:
    """Group means that share session effects: full matrices.

    Args:
        variance: Φ, shape (k, k).
        slope: ∂Φ/∂θi, shape (t, k, k).
        bend: Φ(Qij - PiΦPj)Φ, symmetrised, shape (t, t, k, k).
    """

    variance: NDArray[np.float64]
    slope: NDArray[np.float64]
    bend: NDArray[np.float64]

    @staticmethod
    def of(value: NDArray[np.float64], slope: NDArray[np.float64], curve: NDArray[np.float64]) -> CorrelatedMeans:
        """From X'V⁻¹X, shape (k, k), and its derivatives, shapes (t, k, k) and (t, t, k, k)."""
        phi = np.linalg.inv(value)
        phi = 0.5 * (phi + phi.T)
        inner = phi @ slope @ phi
        both = inner[:, None] @ slope[None, :] @ phi
        bend = 0.5 * (phi @ curve @ phi) - 0.5 * (both + both.swapaxes(0, 1))
        return CorrelatedMeans(phi, -inner, bend)

    def taken(self, place: NDArray[np.intp]) -> CorrelatedMeans:
        """The groups in another order."""
        at = np.ix_(place, place)
        return CorrelatedMeans(*(each[..., at[0], at[1]] for each in (self.variance, self.slope, self.bend)))

    def means(self) -> Contrasts:
        """The k group means."""
        return Contrasts(
            np.diagonal(self.variance), np.diagonal(self.slope, 0, -2, -1), np.diagonal(self.bend, 0, -2, -1)
        )

    def differences(self, a: NDArray[np.intp], b: NDArray[np.intp]) -> Contrasts:
        """mean(b) - mean(a) for m pairs of group codes."""
        return Contrasts(*(_difference(each, a, b) for each in (self.variance, self.slope, self.bend)))

    def correlation_with_control(self, control: int, others: NDArray[np.intp]) -> NDArray[np.float64]:
        """Weights l such that differences to one control correlate at least as l_i l_j, shape (m,).

        Where they differ, the smallest correlation is taken for all: smaller correlations make the joint
        critical value larger (Slepian 1962, Šidák 1968), so the answer errs on the safe side.
        """
        phi = self.variance
        joint = (
            phi[np.ix_(others, others)] - phi[others, control][:, None] - phi[control, others] + phi[control, control]
        )
        scale = np.sqrt(np.diagonal(joint))
        correlation = joint / scale[:, None] / scale
        if others.size == 1:
            return np.full(1, np.sqrt(0.5))
        lowest = max(float(correlation.min()), 0.0)
        return np.full(others.size, np.sqrt(lowest))


def _difference(matrix: NDArray[np.float64], a: NDArray[np.intp], b: NDArray[np.intp]) -> NDArray[np.float64]:
    return np.asarray(matrix[..., a, a] + matrix[..., b, b] - matrix[..., a, b] - matrix[..., b, a])
