"""What replicates taken for independent evidence would do: how much too narrow their intervals would be."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from sameline.stats.distributions import t_isf
from sameline.stats.nested.layout import lower_units
from sameline.stats.verdicts import check_alpha

if TYPE_CHECKING:
    from sameline.stats.nested.estimate import Estimate
    from sameline.stats.nested.rows import Rows


@dataclass(frozen=True, slots=True)
class ReplicatesAsUnits:
    """The nested answer beside the one on replicates as units.

    Args:
        level: the level whose spread is ignored, the lowest above the replicates ("run").
        spread_ratio: its standard deviation over the replicates'.
        error_ratio: standard error of the nested analysis over that on replicates, geometric mean over neighbouring
            pairs of groups (over the means with one group).
        width_ratio: the same of interval widths at one alpha, degrees of freedom included.
        text: one sentence for a reader.
    """

    level: str
    spread_ratio: float
    error_ratio: float
    width_ratio: float
    text: str


def replicates_as_units(estimate: Estimate, rows: Rows, method: str, alpha: float) -> ReplicatesAsUnits | None:
    """Compares the fit with a one-way analysis of the same values; None without a spread above the replicates."""
    alpha = check_alpha(alpha)
    above = [name for name in estimate.random[:-1] if name != "session"]
    if not above or estimate.theta[-1] <= 0.0:
        return None
    k = len(rows.groups)
    groups = lower_units(rows.y, rows.units["group"])
    df = rows.y.size - k
    share = (1.0 / groups.size)[rows.place]
    a, b = np.arange(k - 1), np.arange(1, k)
    contrasts = estimate.spread.differences(a, b) if k > 1 else estimate.spread.means()
    error, nested_df = estimate.judged(contrasts, method)
    naive = np.sqrt(groups.within_ss / df * (share[a] + share[b] if k > 1 else share))
    ratio = error / naive
    width = ratio * t_isf(alpha / 2.0, nested_df) / t_isf(alpha / 2.0, float(df))
    level, unit = above[-1], estimate.random[-1]
    spread = float(np.sqrt(estimate.theta[estimate.random.index(level)] / estimate.theta[-1]))
    narrow = float(np.exp(np.log(width).mean()))
    text = (
        f"{level}-to-{level} spread is {spread:.2g} times the {unit} spread: "
        f"an interval on {unit}s would be {narrow:.2g} times too narrow"
    )
    return ReplicatesAsUnits(level, spread, float(np.exp(np.log(ratio).mean())), narrow, text)
