"""The result of a comparison of pairs: columns of numbers, made into rows, lines and cautions only when asked."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from types import MappingProxyType
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from sameline.errors import StatsError
from sameline.stats import analysis_of_variance as one_way
from sameline.stats.cautions import Caution
from sameline.stats.columns import Bools, Columns, Question
from sameline.stats.diagnostics import Diagnostics, diagnose
from sameline.stats.lines import Display, control_display, lines
from sameline.stats.overall import OverallTest, overall_test
from sameline.stats.pair_cautions import pair_cautions
from sameline.stats.procedures import COMMON, Procedure
from sameline.stats.summaries import GroupSummary, summaries
from sameline.stats.values import Floats
from sameline.stats.verdicts import verdicts

if TYPE_CHECKING:
    import pandas as pd


class Pair(NamedTuple):
    """One pair; None where the procedure has no such figure or the pair is not estimable."""

    a: str
    b: str
    difference: float
    standard_error: float | None
    df: float | None
    statistic: float | None
    p_value: float | None
    lower: float | None
    upper: float | None
    verdict: str
    differs: bool


@dataclass(frozen=True, eq=False)
class PairsResult:
    """Every pair's difference, test, simultaneous interval and verdict. Made by `compare_pairs`; nothing in it changes.

    What is costly and not always wanted (rows, lines, cautions) is worked out when first asked for and kept.

    Args:
        method: the procedure.
        question: what was asked, with the checked samples.
        margin: smallest difference that matters, or None.
        columns: the procedure's answer.
    """

    method: Procedure
    question: Question
    margin: float | None
    columns: Columns

    def __post_init__(self) -> None:
        for column in (*_numbers(self.columns), self.columns.estimable, *self.columns.details.values()):
            column.setflags(write=False)

    @property
    def procedure(self) -> str:
        """Name of the procedure."""
        return self.method.name

    @property
    def alpha(self) -> float:
        """Family error rate."""
        return self.question.alpha

    @property
    def alternative(self) -> str:
        """The alternative asked."""
        return self.question.alternative

    @property
    def labels(self) -> tuple[str, ...]:
        """Group labels in order of first appearance."""
        return self.question.samples.labels

    @property
    def control(self) -> str | None:
        """Label of the control group, if one."""
        return None if self.question.control is None else self.labels[self.question.control]

    @property
    def statistic_name(self) -> str:
        """What the statistic is: "q" (studentized range), "t" or "z"."""
        return self.method.statistic

    @property
    def a(self) -> tuple[str, ...]:
        """Label of group a of each pair."""
        return tuple(self.labels[at] for at in self.question.first.tolist())

    @property
    def b(self) -> tuple[str, ...]:
        """Label of group b of each pair."""
        return tuple(self.labels[at] for at in self.question.second.tolist())

    @cached_property
    def differs(self) -> Bools:
        """Whether each pair is shown to differ (p-value below alpha), shape (m,); False where not estimable."""
        found: Bools = self.columns.p_value < self.alpha
        found.setflags(write=False)
        return found

    @cached_property
    def verdicts(self) -> tuple[str, ...]:
        """The verdict on each pair."""
        return tuple(verdicts(self.columns.lower, self.columns.upper, self.margin, self.differs))

    @property
    def critical_value(self) -> float | None:
        """Critical value of the statistic; None where each pair has its own (`columns.critical`) or there is none."""
        critical = self.columns.critical
        return float(critical[0]) if np.all(critical == critical[0]) else None

    @cached_property
    def not_estimable(self) -> Mapping[tuple[str, str], str]:
        """The pairs that could not be computed, each with its reason."""
        a, b = self.a, self.b
        return MappingProxyType({(a[at], b[at]): reason for at, reason in self.columns.reasons.items()})

    @cached_property
    def pairs(self) -> tuple[Pair, ...]:
        """One row a pair, with None where there is no figure."""
        c = self.columns
        figures = [
            _plain(column)
            for column in (c.difference, c.standard_error, c.df, c.statistic, c.p_value, c.lower, c.upper)
        ]
        rows = zip(self.a, self.b, *figures, self.verdicts, self.differs.tolist(), strict=True)
        return tuple(Pair._make(row) for row in rows)

    @cached_property
    def groups(self) -> tuple[GroupSummary, ...]:
        """Size, mean, spread and interval of the mean of each group, in order of first appearance."""
        return summaries(self.question.samples, self.alpha, pooled=self.method.family == COMMON)

    @cached_property
    def anova(self) -> one_way.Anova | None:
        """The analysis of variance on the same data, for procedures that assume a common variance; else None."""
        if self.method.family != COMMON:
            return None
        return one_way.of_samples(self.question.samples, alpha=self.alpha)

    @cached_property
    def overall(self) -> OverallTest | None:
        """One test of all groups, by the assumptions of the procedure; None where it is not estimable."""
        try:
            return overall_test(self.question.samples, self.method.family)
        except StatsError:
            return None

    @cached_property
    def display(self) -> Display:
        """Lines, or letters, or the matrix of pairs. A pair that is not estimable is not shown to differ."""
        question = self.question
        matrix = np.zeros((len(self.labels), len(self.labels)), bool)
        matrix[question.first, question.second] = self.differs
        matrix |= matrix.T
        draw = lines if question.control is None else control_display
        return draw(self.labels, question.samples.deviation, matrix)

    @property
    def lines(self) -> list[list[str]]:
        """The lines, as lists of labels in order of mean; empty with a control or where only the matrix tells."""
        return [list(members) for members in self.display.sets]

    @cached_property
    def cautions(self) -> tuple[Caution, ...]:
        """What a reader must know before leaning on the result."""
        return pair_cautions(self)

    @cached_property
    def diagnostics(self) -> Diagnostics:
        """Tests of equal spread and of shape on the same samples."""
        return diagnose(self.question.samples)

    def frame(self) -> pd.DataFrame:
        """One row a pair: the fields of `Pair`. Columns with a figure missing hold None there, never NaN."""
        import pandas as pd

        if not self.pairs:
            return pd.DataFrame(columns=list(Pair._fields))
        columns = {}
        for name, cells in zip(Pair._fields, zip(*self.pairs, strict=True), strict=True):
            columns[name] = pd.Series(list(cells), dtype=object if None in cells else None)
        return pd.DataFrame(columns)


def _numbers(columns: Columns) -> tuple[Floats, ...]:
    c = columns
    return c.difference, c.standard_error, c.df, c.statistic, c.p_value, c.lower, c.upper, c.critical, c.p_raw


def _plain(column: Floats) -> list[float | None]:
    """The column as Python floats, None for NaN."""
    if not np.isnan(column).any():
        return list(column.tolist())
    return [None if cell != cell else cell for cell in column.tolist()]  # noqa: PLR0124 - the test for NaN
