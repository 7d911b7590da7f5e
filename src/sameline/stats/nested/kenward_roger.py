"""Kenward and Roger's standard errors and degrees of freedom of one contrast of the means.

Variance: Φ + 2 Φ Σij Wij (Qij - PiΦPj) Φ, with W the inverse of the expected information of all components, those
estimated at zero included: a level keeps its place in the uncertainty when its estimate touches zero, so that the
degrees of freedom do not jump there. The price: where a level truly has no spread, about half of the fits stop at
zero with a variance pooled from both levels but few degrees of freedom, and fewer false claims are made than alpha
allows (0.01 to 0.04 at 0.05, the benchmark nested_false_claims).

For a single contrast their approximate F has one numerator degree of freedom, scale 1 and denominator
2 (l'Φl)² / (g'Wg), g the gradient of l'Φl.

Reference: Kenward and Roger (1997), Biometrics 53:983-997.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from sameline.stats.nested.contrasts import Contrasts


def kenward_roger(
    contrasts: Contrasts, components_covariance: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Standard errors and degrees of freedom of m contrasts, shape (m,) each.

    Args:
        contrasts: variances with their derivatives.
        components_covariance: inverse expected information of all components, shape (t, t).
    """
    correction = np.einsum("ij,ijm->m", components_covariance, contrasts.bend)
    spread = np.einsum("im,ij,jm->m", contrasts.slope, components_covariance, contrasts.slope)
    return np.sqrt(contrasts.variance + 2.0 * correction), 2.0 * contrasts.variance**2 / spread
