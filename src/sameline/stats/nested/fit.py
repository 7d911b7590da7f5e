"""The nested model of quality-control data: value ~ group, batch within group, run within batch, replicate error.

Restricted maximum likelihood (REML) gives the components; means and differences of groups come with Kenward and
Roger's standard errors and degrees of freedom, or Satterthwaite's. On balanced data with one run a replicate it is
exactly the textbook one-way analysis.

References: Harville (1977), J. Amer. Statist. Assoc. 72:320-338 (REML); Kenward and Roger (1997), Biometrics
53:983-997; ISO 5725-3 (repeatability and intermediate precision).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

from sameline.errors import StatsError
from sameline.stats.nested import cautioning
from sameline.stats.nested.adjustments import ADJUSTMENTS
from sameline.stats.nested.components import ComponentTable, component_table
from sameline.stats.nested.estimate import DF_METHODS, Estimate, estimate_nested
from sameline.stats.nested.known_spread import KnownSpread, estimate_with
from sameline.stats.nested.layout import layout_of
from sameline.stats.nested.levels import Chain, Collapsed, chain_of, session_collapsed
from sameline.stats.nested.means import NestedMeans, means_of
from sameline.stats.nested.pairs import Asked, NestedPairs, one_of, pairs_of
from sameline.stats.nested.pseudo_replication import ReplicatesAsUnits, replicates_as_units
from sameline.stats.nested.rows import Rows, read_rows
from sameline.stats.nested.sessions import estimate_crossed
from sameline.stats.nested.settling import Settling, Wanted, settling_of
from sameline.stats.plans import Family
from sameline.stats.verdicts import check_alpha, check_margin

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping

    from sameline.stats.cautions import Caution


@dataclass(frozen=True, slots=True)
class NestedFit:
    """A fitted nested model.

    Args:
        groups: group labels in order of first appearance; ("all",) when none were given.
        components: variances by level, top down, such as {"batch": 0.4, "run": 0.2, "replicate": 0.1}, in the squared
            unit of the values. A level that cannot be told apart is not there; see `collapsed`.
        collapsed: levels without a component of their own, and what that means.
        at_zero: levels whose component is estimated at exactly zero.
        df_method: "kenward-roger" or "satterthwaite".
        reml_criterion: minus twice the restricted log likelihood; None when the run's spread was brought from outside.
        counts: number of units by level, such as {"group": 3, "batch": 9, "run": 18, "replicate": 54}.
        cautions: what a reader must know.
        known: the run-to-run spread brought from outside, if it was used.
        unseen: why no pair can be judged, or None.
    """

    groups: tuple[str, ...]
    components: Mapping[str, float]
    collapsed: tuple[Collapsed, ...]
    at_zero: tuple[str, ...]
    df_method: str
    reml_criterion: float | None
    counts: Mapping[str, int]
    cautions: tuple[Caution, ...]
    known: KnownSpread | None
    unseen: str | None
    _estimate: Estimate
    _rows: Rows

    def using(self, df: str) -> NestedFit:
        """The same fit judged with the other kind of degrees of freedom, "kenward-roger" or "satterthwaite".

        Raises:
            StatsError: neither of the two.
        """
        one_of("df", df, DF_METHODS)
        return replace(self, df_method=df)

    def means(self, alpha: float = 0.05) -> NestedMeans:
        """Group means with 1 - alpha intervals, each for itself.

        Raises:
            StatsError: alpha is not between 0 and 1.
        """
        return means_of(self._estimate, self._rows, self.df_method, alpha, self.unseen)

    def spread(self, alpha: float = 0.05) -> ComponentTable:
        """Components as standard deviations with 1 - alpha intervals, and as repeatability and intermediate precision.

        Raises:
            StatsError: alpha is not between 0 and 1.
        """
        return component_table(self._estimate, self.collapsed, alpha)

    def replicates_as_units(self, alpha: float = 0.05) -> ReplicatesAsUnits | None:
        """What taking replicates for independent evidence would do to the intervals; None where replicates are units.

        Raises:
            StatsError: alpha is not between 0 and 1.
        """
        return replicates_as_units(self._estimate, self._rows, self.df_method, alpha) if self.unseen is None else None

    def pairs(
        self,
        alpha: float = 0.05,
        adjust: str = "tukey",
        control: str | None = None,
        margin: float | None = None,
        *,
        alternative: str = "two-sided",
    ) -> NestedPairs:
        """Differences between groups with verdicts, mean(b) - mean(a).

        Args:
            alpha: error rate of all pairs together (of each pair with "none").
            adjust: "tukey" (all pairs), "dunnett" (with a control), "holm", "bonferroni" or "none".
            control: label of the control; pairs with it only, it is `a`.
            margin: smallest difference that matters, in the values' unit.
            alternative: "two-sided"; with "dunnett" also "greater" or "less" (of b against the control).

        Raises:
            StatsError: one group only, an unknown control or adjustment, or options that do not go together.
        """
        asked = Asked(check_alpha(alpha), adjust, control, check_margin(margin), alternative)
        return pairs_of(self, self._estimate, asked)

    def to_settle(
        self,
        a: str,
        b: str,
        *,
        margin: float | None = None,
        alpha: float = 0.05,
        adjust: str = "tukey",
        power: float = 0.8,
    ) -> Settling:
        """How many more runs (or batches, where they are the topmost level) in each group would settle a pair.

        Args:
            a: label of one group.
            b: label of the other.
            margin: smallest difference that matters; with it equivalence settles the pair too.
            alpha: error rate of all pairs together.
            adjust: as for `pairs`; Holm is planned as Bonferroni.
            power: wanted chance that the pair is settled, were the difference and the spreads as now estimated.

        Raises:
            StatsError: the pair cannot be judged at all, or an argument cannot be meant.
        """
        one_of("adjust", adjust, ADJUSTMENTS)
        family = Family(len(self.groups), check_alpha(alpha), "bonferroni" if adjust == "holm" else adjust)
        wanted = Wanted(a, b, check_margin(margin), family, power)
        return settling_of(self, self._estimate, self._rows, wanted)


def fit_nested(
    values: Iterable[Any],
    groups: Iterable[Any] | None,
    batches: Iterable[Any] | None = None,
    runs: Iterable[Any] | None = None,
    *,
    sessions: Iterable[Any] | None = None,
    df: str = "kenward-roger",
    known: KnownSpread | None = None,
) -> NestedFit:
    """Fits group means with nested random batches and runs.

    A batch belongs to its group and a run to its batch: the same label in two groups is two batches. Where the groups
    are batches, give them as `groups`, leave `batches` out and give `runs`: value ~ group + run within group.

    Args:
        values: measured values, shape (n,).
        groups: label of each value's group, or None to fit the components of one characteristic.
        batches: label of its batch within the group, or None.
        runs: label of its run within the batch, or None; without it each value counts as a unit of its batch.
        sessions: label of the session (day) shared by the batches tested together, or None.
        df: "kenward-roger" or "satterthwaite".
        known: run-to-run spread from outside, used only where every group has one run.

    Raises:
        StatsError: the input cannot be read, nothing varies, or there is no replication at any level.
    """
    one_of("df", df, DF_METHODS)
    rows = read_rows(values, groups, batches, runs, sessions)
    chain = chain_of(rows, spread_known=known is not None)
    merged = session_collapsed(chain)
    collapsed = chain.collapsed if merged is None else (*chain.collapsed, merged)
    hidden = [gone for gone in collapsed if gone.level in {"run", "session"} and gone.into == "group"]
    used = known if any(gone.level == "run" for gone in hidden) else None
    if not chain.random and used is None:
        raise StatsError(
            "there is one value a group: no replication at any level to judge a difference by",
            where="values",
            advice="test at least one group in a second run, or bring a known run-to-run spread",
        )
    estimate = _estimated(chain, used, crossed="session" in rows.units and merged is None)
    blind = [gone.meaning for gone in hidden if not (used and gone.level == "run")]
    unseen = "; ".join(blind) if blind and len(rows.groups) > 1 else None
    return NestedFit(
        groups=rows.groups,
        components=MappingProxyType(dict(zip(estimate.random, estimate.theta.tolist(), strict=True))),
        collapsed=collapsed,
        at_zero=tuple(n for n, v in zip(estimate.random, estimate.theta, strict=True) if v <= 0.0),
        df_method=df,
        reml_criterion=estimate.criterion,
        counts=MappingProxyType({level: rows.count(level) for level in rows.units}),
        cautions=cautioning.of_fit(chain, collapsed, estimate, known if known is not used else None, used),
        known=used,
        unseen=unseen,
        _estimate=estimate,
        _rows=rows,
    )


def _estimated(chain: Chain, known: KnownSpread | None, *, crossed: bool) -> Estimate:
    if known:
        return estimate_with(chain, known)
    if crossed:
        return estimate_crossed(chain, chain.rows.place)
    return estimate_nested(layout_of(chain), chain.rows.place)
