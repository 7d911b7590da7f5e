"""Every outlier test that applies to values in groups, in one call: flags only, nothing is left out.

Grubbs' test within each group, Cochran's on the variances, Mandel's h and k on groups of equal size. Each test is at
level alpha by itself, so with many groups some flags come by chance; a person decides, with an assignable cause.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any

import numpy as np

from sameline.errors import StatsError
from sameline.stats import cochran, mandel
from sameline.stats.grubbs import grubbs_test
from sameline.stats.samples import Samples, gather
from sameline.stats.verdicts import check_alpha


@dataclass(frozen=True, slots=True)
class Flag:
    """One suspect.

    Args:
        test: "grubbs", "cochran", "mandel-h" or "mandel-k".
        group: label of its group.
        row: position of the suspect value among the values given, from 0; None where the whole group is the suspect.
        value: the suspect value; None likewise.
        statistic: the test's statistic.
        critical: its critical value.
        p_value: None for Mandel's statistics.
    """

    test: str
    group: str
    row: int | None
    value: float | None
    statistic: float
    critical: float
    p_value: float | None


@dataclass(frozen=True, slots=True)
class Screening:
    """All flags, and {test: reason} for tests that could not be computed ("grubbs in 'A'", "cochran", "mandel")."""

    flags: tuple[Flag, ...]
    not_estimable: Mapping[str, str]


def screen_outliers(values: Iterable[Any], groups: Iterable[Any], *, alpha: float = 0.05) -> Screening:
    """Runs the outlier tests on values in groups.

    Args:
        values: n values: numbers, decimal text or `Decimal`.
        groups: n group labels; one label throughout is allowed.
        alpha: level of each test, between 0 and 1.

    Raises:
        StatsError: a value, label or alpha is refused. A test that cannot be computed is no error here.
    """
    alpha = check_alpha(alpha)
    samples = gather(values, groups, fewest=1)
    flags: list[Flag] = []
    reasons: dict[str, str] = {}
    tests = {f"grubbs in {label!r}": _grubbs(samples, at, alpha) for at, label in enumerate(samples.labels)}
    tests |= {"cochran": _cochran(samples, alpha), "mandel": _mandel(samples, alpha)}
    for name, found in tests.items():
        try:
            flags.extend(found)
        except StatsError as refusal:
            reasons[name] = refusal.message
    return Screening(tuple(flags), MappingProxyType(reasons))


def _grubbs(samples: Samples, at: int, alpha: float) -> Iterator[Flag]:
    rows = np.flatnonzero(samples.codes == at)
    got = grubbs_test(samples.values.centred[rows], alpha=alpha)
    if got.outlier:
        row = int(rows[got.index])
        value = float(samples.values.raw[row])
        yield Flag("grubbs", samples.labels[at], row, value, got.G, got.critical, got.p_value)


def _cochran(samples: Samples, alpha: float) -> Iterator[Flag]:
    got = cochran.of_samples(samples, alpha=alpha)
    if got.outlier:
        yield Flag("cochran", got.group, None, None, got.C, got.critical, got.p_value)


def _mandel(samples: Samples, alpha: float) -> Iterator[Flag]:
    got = mandel.of_samples(samples, alpha=alpha)
    for label, h, k in zip(got.labels, got.h, got.k, strict=True):
        if label in got.h_beyond:
            yield Flag("mandel-h", label, None, None, h, got.h_critical, None)
        if label in got.k_beyond:
            yield Flag("mandel-k", label, None, None, k, got.k_critical, None)
