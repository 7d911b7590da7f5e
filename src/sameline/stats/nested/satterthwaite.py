"""Satterthwaite's degrees of freedom of one contrast of the means.

ν = 2 (l'Φl)² / Var(l'Φl), the variance by the delta method with the inverse observed information of the components
at the REML optimum. A component estimated at zero is no longer a parameter and drops out, which may make the degrees
of freedom far too many; see `kenward_roger` for the convention that keeps it.

References: Satterthwaite (1946), Biometrics Bull. 2:110-114; Giesbrecht and Burns (1985), Biometrics 41:477-486.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from sameline.stats.nested.contrasts import Contrasts


def satterthwaite(
    contrasts: Contrasts, components_covariance: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Standard errors and degrees of freedom of m contrasts, shape (m,) each.

    Args:
        contrasts: variances with their derivatives.
        components_covariance: inverse observed information, shape (t, t), rows and columns of zero components zero.
    """
    spread = np.einsum("im,ij,jm->m", contrasts.slope, components_covariance, contrasts.slope)
    return np.sqrt(contrasts.variance), 2.0 * contrasts.variance**2 / spread
