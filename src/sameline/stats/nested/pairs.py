"""Differences between the groups of a nested fit, with family-wise intervals, p-values and verdicts."""

from __future__ import annotations

from dataclasses import dataclass
from types import MappingProxyType
from typing import TYPE_CHECKING

import numpy as np

from sameline.errors import StatsError
from sameline.stats.columns import interval
from sameline.stats.lines import Display, control_display, lines
from sameline.stats.nested.adjustments import ADJUSTMENTS, FEWEST_DF, Family, adjusted
from sameline.stats.verdicts import verdicts

if TYPE_CHECKING:
    from collections.abc import Mapping

    import pandas as pd
    from numpy.typing import NDArray

    from sameline.stats.nested.estimate import Estimate
    from sameline.stats.nested.fit import NestedFit

    Floats = NDArray[np.float64]
    Maybe = tuple[float | None, ...]

ALTERNATIVES = ("two-sided", "greater", "less")
MOST_TUKEY_GROUPS = 200
COLUMNS = (
    "a",
    "b",
    "difference",
    "standard_error",
    "df",
    "statistic",
    "p_value",
    "lower",
    "upper",
    "verdict",
    "differs",
)


@dataclass(frozen=True, slots=True)
class NestedPairs:
    """One entry a pair, (earlier, later) in order of first appearance, or (control, other).

    Args:
        a: label of the first group.
        b: label of the second.
        difference: mean(b) - mean(a), in the values' unit.
        standard_error: of the difference.
        df: degrees of freedom.
        statistic: difference over standard error.
        p_value: adjusted for the family (raw with "none").
        lower: lower end of the simultaneous interval, -inf where open; None where the procedure has none (Holm).
        upper: upper end, likewise.
        verdict: in the words of `sameline.stats.verdicts`.
        differs: whether p_value < alpha.
        not_estimable: why a pair has no figures beside its difference.
        display: lines or letters over the groups in order of mean.
        adjust: the adjustment.
        df_method: "kenward-roger" or "satterthwaite".
        alpha: error rate of the family.
        margin: smallest difference that matters, or None.
        control: the control, or None.
    """

    a: tuple[str, ...]
    b: tuple[str, ...]
    difference: tuple[float, ...]
    standard_error: Maybe
    df: Maybe
    statistic: Maybe
    p_value: Maybe
    lower: Maybe
    upper: Maybe
    verdict: tuple[str, ...]
    differs: tuple[bool, ...]
    not_estimable: Mapping[tuple[str, str], str]
    display: Display
    adjust: str
    df_method: str
    alpha: float
    margin: float | None
    control: str | None

    @property
    def lines(self) -> tuple[tuple[str, ...], ...]:
        """Maximal sets of groups none of which is shown to differ from another, each in order of mean."""
        return self.display.sets

    def frame(self) -> pd.DataFrame:
        """Columns a, b, difference, standard_error, df, statistic, p_value, lower, upper, verdict, differs."""
        import pandas as pd

        return pd.DataFrame({name: list(getattr(self, name)) for name in COLUMNS})


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
    return NestedPairs(
        a=tuple(fit.groups[at] for at in a.tolist()),
        b=tuple(fit.groups[at] for at in b.tolist()),
        difference=tuple(difference.tolist()),
        standard_error=_maybe(np.where(usable, error, np.nan)),
        df=_maybe(np.where(usable, df, np.nan)),
        statistic=_maybe(t),
        p_value=_maybe(p),
        lower=_maybe(low),
        upper=_maybe(high),
        verdict=tuple(verdicts(low, high, asked.margin, differs)),
        differs=tuple(differs.tolist()),
        not_estimable=MappingProxyType(reasons),
        display=_display(fit.groups, estimate.means, _matrix(a, b, differs), asked.control),
        adjust=asked.adjust,
        df_method=fit.df_method,
        alpha=asked.alpha,
        margin=asked.margin,
        control=asked.control,
    )


def _check_options(groups: tuple[str, ...], asked: Asked) -> None:
    _one_of("adjust", asked.adjust, ADJUSTMENTS)
    _one_of("alternative", asked.alternative, ALTERNATIVES)
    k, control = len(groups), asked.control
    if k < 2:
        raise StatsError("there is one group: no pair to judge", where="groups", advice="give values of more groups")
    if control is not None:
        _one_of("control", control, groups)
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


def _one_of(option: str, given: str, known: tuple[str, ...]) -> None:
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


def _matrix(a: NDArray[np.intp], b: NDArray[np.intp], differs: NDArray[np.bool_]) -> NDArray[np.bool_]:
    k = int(max(a.max(), b.max())) + 1
    matrix = np.zeros((k, k), bool)
    matrix[a, b] = matrix[b, a] = differs
    return matrix


def _display(groups: tuple[str, ...], means: Floats, differs: NDArray[np.bool_], control: str | None) -> Display:
    return lines(groups, means, differs) if control is None else control_display(groups, means, differs)


def _maybe(column: Floats) -> Maybe:
    """Numbers, with None where there is none."""
    return tuple(None if each != each else each for each in column.tolist())  # noqa: PLR0124 - the test for NaN
