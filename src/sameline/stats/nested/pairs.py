"""Differences between the groups of a nested fit, with family-wise intervals, p-values and verdicts."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from types import MappingProxyType
from typing import TYPE_CHECKING

import numpy as np

from sameline.errors import StatsError
from sameline.stats.columns import interval
from sameline.stats.lines import Display, control_display, lines
from sameline.stats.nested.adjustments import ADJUSTMENTS, FEWEST_DF, Family, adjusted
from sameline.stats.nested.frames import frame_of
from sameline.stats.pairs_result import Pair
from sameline.stats.verdicts import verdicts

if TYPE_CHECKING:
    from collections.abc import Mapping

    import pandas as pd
    from numpy.typing import NDArray

    from sameline.stats.cautions import Caution
    from sameline.stats.nested.estimate import Estimate
    from sameline.stats.nested.fit import NestedFit

    Floats = NDArray[np.float64]

ALTERNATIVES = ("two-sided", "greater", "less")
MOST_TUKEY_GROUPS = 200


@dataclass(frozen=True, eq=False)
class NestedPairs:
    """The pairs asked, (earlier, later) in order of first appearance, or (control, other).

    Args:
        pairs: one row a pair: a, b, difference = mean(b) - mean(a) in the values' unit, standard_error, df, statistic
            (difference over standard error), p_value (adjusted for the family; raw with "none"), lower and upper end
            of the simultaneous interval (infinite where open; None with Holm, which has none), verdict, differs
            (p_value < alpha). None too where a pair cannot be judged.
        not_estimable: why a pair has no figures beside its difference.
        labels: group labels in order of first appearance.
        means: their means about a common origin, shape (k,).
        adjust: the adjustment.
        df_method: "kenward-roger" or "satterthwaite".
        alpha: error rate of the family.
        margin: smallest difference that matters, or None.
        control: the control, or None.
        alternative: "two-sided", "greater" or "less".
        cautions: those of the fit.
    """

    pairs: tuple[Pair, ...]
    not_estimable: Mapping[tuple[str, str], str]
    labels: tuple[str, ...]
    means: NDArray[np.float64]
    adjust: str
    df_method: str
    alpha: float
    margin: float | None
    control: str | None
    alternative: str
    cautions: tuple[Caution, ...]
    statistic_name: str = "t"

    @cached_property
    def display(self) -> Display:
        """Lines, or letters, or the matrix of pairs; a pair that cannot be judged is not shown to differ."""
        place = {label: at for at, label in enumerate(self.labels)}
        differs = np.zeros((len(self.labels), len(self.labels)), bool)
        for pair in self.pairs:
            differs[place[pair.a], place[pair.b]] = differs[place[pair.b], place[pair.a]] = pair.differs
        draw = lines if self.control is None else control_display
        return draw(self.labels, self.means, differs)

    @property
    def lines(self) -> list[list[str]]:
        """Maximal sets of groups none of which is shown to differ from another, each in order of mean."""
        return [list(members) for members in self.display.sets]

    def frame(self) -> pd.DataFrame:
        """One row a pair: the fields of `Pair`. Columns with a figure missing hold None there, never NaN."""
        return frame_of(Pair._fields, self.pairs)


@dataclass(frozen=True, slots=True)
class Asked:
    """What `NestedFit.pairs` is asked; see there."""

    alpha: float
    adjust: str
    control: str | None
    margin: float | None
    alternative: str


def pairs_of(fit: NestedFit, estimate: Estimate, asked: Asked) -> NestedPairs:
    """Judges the pairs asked; see `NestedFit.pairs`."""
    _check_options(fit.groups, asked)
    a, b = _places(fit.groups, asked.control)
    difference = estimate.means[b] - estimate.means[a]
    error, df = estimate.judged(estimate.spread.differences(a, b), fit.df_method)
    usable = np.zeros(df.shape, bool) if fit.unseen else df >= FEWEST_DF
    reasons = {
        (fit.groups[a[at]], fit.groups[b[at]]): fit.unseen or f"fewer than one degree of freedom ({df[at]:.2g})"
        for at in np.flatnonzero(~usable)
    }
    t = np.divide(difference, error, out=np.full(df.shape, np.nan), where=usable)
    p, low, high = (np.full(df.shape, np.nan) for _ in range(3))
    if usable.any():
        lambdas = None if asked.control is None else estimate.spread.correlation_with_control(int(a[0]), b)
        family = Family(t[usable], df[usable], a.size, len(fit.groups), lambdas, asked.alternative)
        p[usable], critical = adjusted(family, asked.adjust, asked.alpha)
        low[usable], high[usable] = interval(
            difference[usable], critical * error[usable], p[usable] < asked.alpha, asked.alternative
        )
    differs = p < asked.alpha
    error, df = np.where(usable, error, np.nan), np.where(usable, df, np.nan)
    figures = [_maybe(column) for column in (difference, error, df, t, p, low, high)]
    first, second = ([fit.groups[at] for at in places.tolist()] for places in (a, b))
    words = verdicts(low, high, asked.margin, differs)
    return NestedPairs(
        pairs=tuple(map(Pair._make, zip(first, second, *figures, words, differs.tolist(), strict=True))),
        not_estimable=MappingProxyType(reasons),
        labels=fit.groups,
        means=estimate.means,
        adjust=asked.adjust,
        df_method=fit.df_method,
        alpha=asked.alpha,
        margin=asked.margin,
        control=asked.control,
        alternative=asked.alternative,
        cautions=fit.cautions,
    )


def _check_options(groups: tuple[str, ...], asked: Asked) -> None:
    one_of("adjust", asked.adjust, ADJUSTMENTS)
    one_of("alternative", asked.alternative, ALTERNATIVES)
    k, control = len(groups), asked.control
    if k < 2:
        raise StatsError("there is one group: no pair to judge", where="groups", advice="give values of more groups")
    if control is not None:
        one_of("control", control, groups)
    if asked.adjust == "dunnett" and control is None:
        raise StatsError("Dunnett's procedure needs a control", where="control", advice="name the control")
    if asked.adjust == "tukey" and control is not None:
        raise StatsError(
            "Tukey's procedure has no control",
            where="control",
            advice="use dunnett, or holm, bonferroni or none, with a control",
        )
    if asked.alternative != "two-sided" and control is None:
        raise StatsError(
            "one-sided comparisons need a control", where="alternative", advice="name the control, or ask both sides"
        )
    if asked.adjust == "tukey" and k > MOST_TUKEY_GROUPS:
        raise StatsError(
            f"all pairs of {k} groups are {k * (k - 1) // 2} questions at once",
            where="groups",
            advice=f"up to {MOST_TUKEY_GROUPS} groups; compare with a control, or use holm or bonferroni",
        )


def one_of(option: str, given: str, known: tuple[str, ...]) -> None:
    """Refuses an option that is not among the known ones."""
    if given not in known:
        some = ", ".join(known[:10]) + (" …" if len(known) > 10 else "")
        raise StatsError(f"{option} {given!r} is not known", where=option, advice=f"one of {some}")


def _places(groups: tuple[str, ...], control: str | None) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    if control is None:
        a, b = np.triu_indices(len(groups), 1)
        return a, b
    at = groups.index(control)
    others = np.delete(np.arange(len(groups)), at)
    return np.full(others.shape, at), others


def _maybe(column: Floats) -> list[float | None]:
    """Numbers, with None where there is none."""
    return [None if each != each else each for each in column.tolist()]  # noqa: PLR0124 - the test for NaN
