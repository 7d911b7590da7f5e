"""Statistics for comparing several groups: arrays in, frozen results out.

Names are loaded when first used, so that importing this package costs nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from sameline.stats.analysis_of_variance import Anova, anova
    from sameline.stats.cautions import Caution
    from sameline.stats.lines import Display
    from sameline.stats.pairs import compare_pairs
    from sameline.stats.pairs_result import Pair, PairsResult
    from sameline.stats.studentized_range import (
        studentized_range_cdf,
        studentized_range_isf,
        studentized_range_ppf,
        studentized_range_sf,
    )
    from sameline.stats.verdicts import VERDICTS, verdict

__all__ = [
    "VERDICTS",
    "Anova",
    "Caution",
    "Display",
    "Pair",
    "PairsResult",
    "anova",
    "compare_pairs",
    "studentized_range_cdf",
    "studentized_range_isf",
    "studentized_range_ppf",
    "studentized_range_sf",
    "verdict",
]

_HOME = {
    "analysis_of_variance": ("Anova", "anova"),
    "cautions": ("Caution",),
    "lines": ("Display",),
    "pairs": ("compare_pairs",),
    "pairs_result": ("Pair", "PairsResult"),
    "studentized_range": (
        "studentized_range_cdf",
        "studentized_range_isf",
        "studentized_range_ppf",
        "studentized_range_sf",
    ),
    "verdicts": ("VERDICTS", "verdict"),
}


def __getattr__(name: str) -> object:
    for module, names in _HOME.items():
        if name in names:
            return getattr(import_module(f"{__name__}.{module}"), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
