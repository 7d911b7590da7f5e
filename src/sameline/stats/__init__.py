"""Statistics for comparing several groups: arrays in, frozen results out.

Names are loaded when first used, so that importing this package costs nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from sameline.stats.analysis_of_variance import Anova, anova
    from sameline.stats.bartlett import bartlett_test
    from sameline.stats.cautions import Caution
    from sameline.stats.cochran import Cochran, cochran_critical, cochran_test
    from sameline.stats.diagnostic_test import DiagnosticTest
    from sameline.stats.dunnett_distribution import dunnett_isf, dunnett_sf
    from sameline.stats.equivalence import Equivalence, equivalent_pairs
    from sameline.stats.esd import Esd, esd_test
    from sameline.stats.grubbs import Grubbs, grubbs_test
    from sameline.stats.kruskal import KruskalWallis, kruskal_wallis
    from sameline.stats.levene import levene_test
    from sameline.stats.lines import Display
    from sameline.stats.mandel import Mandel, mandel_critical, mandel_statistics
    from sameline.stats.nested import NestedAnova, NestedFit, fit_nested, nested_anova
    from sameline.stats.overall import OverallTest
    from sameline.stats.pairs import compare_pairs
    from sameline.stats.pairs_result import Pair, PairsResult
    from sameline.stats.procedures import PROCEDURES, Procedure
    from sameline.stats.screening import Flag, Screening, screen_outliers
    from sameline.stats.shapiro import shapiro_test
    from sameline.stats.sizes import Design, Size, detectable_differences, power_curve, size_curve, size_for
    from sameline.stats.studentized_range import (
        studentized_range_cdf,
        studentized_range_isf,
        studentized_range_ppf,
        studentized_range_sf,
    )
    from sameline.stats.summaries import GroupSummary
    from sameline.stats.verdicts import VERDICTS, verdict
    from sameline.stats.welch import WelchAnova, welch_anova

__all__ = [
    "PROCEDURES",
    "VERDICTS",
    "Anova",
    "Caution",
    "Cochran",
    "Design",
    "DiagnosticTest",
    "Display",
    "Equivalence",
    "Esd",
    "Flag",
    "GroupSummary",
    "Grubbs",
    "KruskalWallis",
    "Mandel",
    "NestedAnova",
    "NestedFit",
    "OverallTest",
    "Pair",
    "PairsResult",
    "Procedure",
    "Screening",
    "Size",
    "WelchAnova",
    "anova",
    "bartlett_test",
    "cochran_critical",
    "cochran_test",
    "compare_pairs",
    "detectable_differences",
    "dunnett_isf",
    "dunnett_sf",
    "equivalent_pairs",
    "esd_test",
    "fit_nested",
    "grubbs_test",
    "kruskal_wallis",
    "levene_test",
    "mandel_critical",
    "mandel_statistics",
    "nested_anova",
    "power_curve",
    "screen_outliers",
    "shapiro_test",
    "size_curve",
    "size_for",
    "studentized_range_cdf",
    "studentized_range_isf",
    "studentized_range_ppf",
    "studentized_range_sf",
    "verdict",
    "welch_anova",
]

_HOME = {
    "analysis_of_variance": ("Anova", "anova"),
    "bartlett": ("bartlett_test",),
    "cautions": ("Caution",),
    "cochran": ("Cochran", "cochran_critical", "cochran_test"),
    "diagnostic_test": ("DiagnosticTest",),
    "dunnett_distribution": ("dunnett_isf", "dunnett_sf"),
    "equivalence": ("Equivalence", "equivalent_pairs"),
    "esd": ("Esd", "esd_test"),
    "grubbs": ("Grubbs", "grubbs_test"),
    "kruskal": ("KruskalWallis", "kruskal_wallis"),
    "levene": ("levene_test",),
    "lines": ("Display",),
    "mandel": ("Mandel", "mandel_critical", "mandel_statistics"),
    "nested": ("NestedAnova", "NestedFit", "fit_nested", "nested_anova"),
    "overall": ("OverallTest",),
    "pairs": ("compare_pairs",),
    "pairs_result": ("Pair", "PairsResult"),
    "procedures": ("PROCEDURES", "Procedure"),
    "screening": ("Flag", "Screening", "screen_outliers"),
    "shapiro": ("shapiro_test",),
    "sizes": ("Design", "Size", "detectable_differences", "power_curve", "size_curve", "size_for"),
    "studentized_range": (
        "studentized_range_cdf",
        "studentized_range_isf",
        "studentized_range_ppf",
        "studentized_range_sf",
    ),
    "summaries": ("GroupSummary",),
    "verdicts": ("VERDICTS", "verdict"),
    "welch": ("WelchAnova", "welch_anova"),
}


def __getattr__(name: str) -> object:
    for module, names in _HOME.items():
        if name in names:
            return getattr(import_module(f"{__name__}.{module}"), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")


def __dir__() -> list[str]:
    return sorted(__all__)
