"""What a test of equal spread, or of shape, answers."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class DiagnosticTest:
    """One diagnostic.

    Args:
        name: "levene-median", "levene-mean", "bartlett" or "shapiro-wilk".
        statistic: F, K squared or W.
        df1: degrees of freedom (of the numerator); None for Shapiro-Wilk.
        df2: degrees of freedom of the denominator; None where there is none.
        p_value: its p-value.
    """

    name: str
    statistic: float
    df1: float | None
    df2: float | None
    p_value: float
