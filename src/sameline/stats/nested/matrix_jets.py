"""Matrices that carry their first and second derivatives in the variance components; see `jets`."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class MatrixJet:
    """A matrix with its derivatives in t components.

    Args:
        value: shape (p, q).
        slope: shape (t, p, q).
        curve: shape (t, t, p, q), symmetric in the first two.
    """

    value: NDArray[np.float64]
    slope: NDArray[np.float64]
    curve: NDArray[np.float64]

    def part(self, rows: slice, columns: slice) -> MatrixJet:
        """A rectangle of it."""
        return MatrixJet(self.value[rows, columns], self.slope[:, rows, columns], self.curve[:, :, rows, columns])

    @property
    def transposed(self) -> MatrixJet:
        """Rows and columns exchanged."""
        return MatrixJet(*(each.swapaxes(-1, -2) for each in (self.value, self.slope, self.curve)))

    def __sub__(self, other: MatrixJet) -> MatrixJet:
        return MatrixJet(self.value - other.value, self.slope - other.slope, self.curve - other.curve)

    def __matmul__(self, other: MatrixJet) -> MatrixJet:
        cross = self.slope[:, None] @ other.slope[None, :]
        return MatrixJet(
            self.value @ other.value,
            self.slope @ other.value + self.value @ other.slope,
            self.curve @ other.value + self.value @ other.curve + cross + cross.swapaxes(0, 1),
        )

    def times_component(self, theta: NDArray[np.float64], index: int) -> MatrixJet:
        """Multiplied by the component θ[index]."""
        slope, curve = self.slope * theta[index], self.curve * theta[index]
        slope[index] += self.value
        curve[index] += self.slope
        curve[:, index] += self.slope
        return MatrixJet(self.value * theta[index], slope, curve)

    def plus_identity(self) -> MatrixJet:
        """With 1 added on the diagonal."""
        return MatrixJet(self.value + np.eye(len(self.value)), self.slope, self.curve)

    def inverse(self) -> MatrixJet:
        """Inverse of a regular square matrix."""
        inner = np.asarray(np.linalg.inv(self.value), float)
        first = inner @ self.slope
        cross = first[:, None] @ first[None, :]
        return MatrixJet(inner, -first @ inner, (cross + cross.swapaxes(0, 1) - inner @ self.curve) @ inner)

    def log_determinant(self) -> tuple[float, NDArray[np.float64], NDArray[np.float64]]:
        """Logarithm of a positive determinant: value, slope (t,), curve (t, t)."""
        inner = np.asarray(np.linalg.inv(self.value), float)
        first = inner @ self.slope
        slope = np.einsum("iaa->i", first)
        cross = np.einsum("iab,jba->ij", first, first)
        curve = np.einsum("ab,ijba->ij", inner, self.curve) - cross
        return float(np.linalg.slogdet(self.value)[1]), slope, curve
