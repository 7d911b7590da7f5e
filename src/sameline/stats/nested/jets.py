"""Values that carry their first and second derivatives in the variance components.

Every quantity that REML, Satterthwaite and Kenward-Roger need is a value, a gradient or a Hessian of four sums over
batches (log|V|, X'V⁻¹X, X'V⁻¹y, y'V⁻¹y), because V is linear in the components θ:

    X'V⁻¹ViV⁻¹X = -∂(X'V⁻¹X)/∂θi,   X'V⁻¹ViV⁻¹VjV⁻¹X (symmetrised) = ½ ∂²(X'V⁻¹X)/∂θi∂θj,
    tr(V⁻¹ViV⁻¹Vj) = -∂²log|V|/∂θi∂θj.

So the sums are built once, with derivatives carried along exactly by the product rule, and no trace is written out.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray
    from scipy.sparse import csr_array


@dataclass(frozen=True, slots=True)
class Jet:
    """n values with their derivatives in t components.

    Args:
        value: shape (n,).
        slope: first derivatives, shape (t, n).
        curve: second derivatives, shape (t, t, n), symmetric in the first two.
    """

    value: NDArray[np.float64]
    slope: NDArray[np.float64]
    curve: NDArray[np.float64]

    def __add__(self, other: Jet) -> Jet:
        return Jet(self.value + other.value, self.slope + other.slope, self.curve + other.curve)

    def scaled(self, factor: NDArray[np.float64] | float) -> Jet:
        """Multiplies by constants, shape (n,) or a number."""
        return Jet(self.value * factor, self.slope * factor, self.curve * factor)

    def __mul__(self, other: Jet) -> Jet:
        cross = self.slope[:, None] * other.slope[None, :]
        return Jet(
            self.value * other.value,
            self.slope * other.value + self.value * other.slope,
            self.curve * other.value + self.value * other.curve + cross + cross.swapaxes(0, 1),
        )

    def reciprocal(self) -> Jet:
        """1 / self."""
        inverse = 1.0 / self.value
        slope = -self.slope * inverse**2
        cross = self.slope[:, None] * self.slope[None, :]
        return Jet(inverse, slope, (2.0 * cross * inverse - self.curve) * inverse**2)

    def log(self) -> Jet:
        """Natural logarithm of positive values."""
        ratio = self.slope / self.value
        return Jet(np.log(self.value), ratio, self.curve / self.value - ratio[:, None] * ratio[None, :])

    def summed(self, starts: NDArray[np.intp]) -> Jet:
        """Sums over consecutive stretches beginning at `starts`, shape (m,), none of them empty."""
        return Jet(
            np.add.reduceat(self.value, starts),
            np.add.reduceat(self.slope, starts, axis=-1),
            np.add.reduceat(self.curve, starts, axis=-1),
        )

    def taken(self, at: NDArray[np.intp]) -> Jet:
        """The values at some places, shape (m,)."""
        return Jet(self.value[at], self.slope[:, at], self.curve[:, :, at])

    def mapped(self, weights: csr_array) -> Jet:
        """Weighted sums, `weights` of shape (m, n)."""
        t, n = self.slope.shape
        rows = weights @ np.concatenate((self.value[None], self.slope, self.curve.reshape(t * t, n))).T
        columns = np.ascontiguousarray(rows.T)
        return Jet(columns[0], columns[1 : t + 1], columns[t + 1 :].reshape(t, t, -1))

    def total(self) -> Jet:
        """Sum of all n values, shape (1,)."""
        return self.summed(np.zeros(1, np.intp))


def linear(value: NDArray[np.float64], slope: NDArray[np.float64]) -> Jet:
    """A jet linear in the components: value (n,), slope (t, n), no curvature."""
    t, n = slope.shape
    return Jet(value, slope, np.zeros((t, t, n)))


def component(theta: NDArray[np.float64], index: int) -> Jet:
    """The component θ[index] itself as a jet of one value."""
    slope = np.zeros((theta.size, 1))
    slope[index, 0] = 1.0
    return linear(theta[index : index + 1], slope)


def constant(value: NDArray[np.float64] | float, t: int) -> Jet:
    """Values that do not depend on the components."""
    values = np.atleast_1d(np.asarray(value, float))
    return linear(values, np.zeros((t, values.size)))
