"""Every diagnostic of equal spread and of shape on the same samples; they inform, and never choose a procedure."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

from sameline.errors import StatsError
from sameline.stats import bartlett, levene, shapiro
from sameline.stats.diagnostic_test import DiagnosticTest
from sameline.stats.samples import Samples


@dataclass(frozen=True, slots=True)
class Diagnostics:
    """What the diagnostics say.

    Args:
        tests: those that could be computed, by name ("levene-median", "levene-mean", "bartlett", "shapiro-wilk").
        not_estimable: {name: reason} for the others.
    """

    tests: Mapping[str, DiagnosticTest]
    not_estimable: Mapping[str, str]


def diagnose(samples: Samples) -> Diagnostics:
    """Runs every diagnostic; one that cannot be computed gives its reason instead."""
    wanted: dict[str, Callable[[], DiagnosticTest]] = {
        "levene-median": lambda: levene.of_samples(samples, center="median"),
        "levene-mean": lambda: levene.of_samples(samples, center="mean"),
        "bartlett": lambda: bartlett.of_samples(samples),
        "shapiro-wilk": lambda: shapiro.of_samples(samples),
    }
    tests, reasons = {}, {}
    for name, run in wanted.items():
        try:
            tests[name] = run()
        except StatsError as refusal:
            reasons[name] = refusal.message
    return Diagnostics(MappingProxyType(tests), MappingProxyType(reasons))
