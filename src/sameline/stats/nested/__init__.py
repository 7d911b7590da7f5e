"""Nested data: the right experimental unit, variance components, and comparisons that rest on them."""

from __future__ import annotations

from sameline.stats.nested.fit import NestedFit, fit_nested
from sameline.stats.nested.known_spread import KnownSpread, known_spread
from sameline.stats.nested.moments import NestedAnova, nested_anova

__all__ = ["KnownSpread", "NestedAnova", "NestedFit", "fit_nested", "known_spread", "nested_anova"]
