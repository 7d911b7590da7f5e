"""What a look answers, and what it must remember for the next."""

from __future__ import annotations

from dataclasses import asdict, dataclass, field, fields
from typing import TYPE_CHECKING, Any

from sameline.errors import StatsError

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    import pandas as pd

    from sameline.stats.looks.units import Pair


@dataclass(frozen=True, slots=True)
class PairMemory:
    """What is remembered of one pair.

    Attributes:
        a: first group.
        b: second group.
        p_value: the overall p-value so far: the least over the looks of its present version.
        version: 0 until an amendment touches the pair, then the number of the amendment that last did.
        since: looks judged since that version began.
        lower: last interval where looks are judged only at times (`union`), else None; None also stands for no bound.
        upper: likewise.
    """

    a: str
    b: str
    p_value: float = 1.0
    version: int = 0
    since: int = 0
    lower: float | None = None
    upper: float | None = None

    # written out, for dataclasses.replace is slow and a look may have many pairs
    def counted(self) -> PairMemory:
        """The memory with one more look since its version began."""
        return PairMemory(self.a, self.b, self.p_value, self.version, self.since + 1, self.lower, self.upper)

    def with_p(self, p_value: float) -> PairMemory:
        """The memory with another p-value."""
        return PairMemory(self.a, self.b, p_value, self.version, self.since, self.lower, self.upper)


@dataclass(frozen=True, slots=True)
class PlannedLook:
    """A past look of a plan: what its boundary was computed from, and the boundary.

    Attributes:
        n: units a group.
        fraction: information fraction at which it spent, at most 1.
        boundaries: studentized range at each error rate of the plan's table; None where nothing could be claimed.
    """

    n: tuple[int, ...]
    fraction: float
    boundaries: tuple[float | None, ...]


@dataclass(frozen=True, slots=True)
class LooksState:
    """All that a comparison remembers from look to look; plain numbers and text.

    Attributes:
        mode: "open", "planned", "single" or "union".
        rule: the options that may not change between looks, as text; a changed rule is a restated comparison.
        look: looks so far.
        amendments: looks at which an amendment or exclusion touched data seen at an earlier look.
        pairs: one memory a pair.
        planned: past looks of a plan.
        judged: looks that spent error rate, of a mode that does not spend at each.
        units: units at the last of those.
        restated: times the comparison was restated over data already seen.
        version: version that pairs new to the state begin with; above 0 after a restatement.
    """

    mode: str
    rule: str
    look: int = 0
    amendments: int = 0
    pairs: tuple[PairMemory, ...] = ()
    planned: tuple[PlannedLook, ...] = ()
    judged: int = 0
    units: int = 0
    restated: int = 0
    version: int = 0

    def to_plain(self) -> dict[str, Any]:
        """Lists, numbers, text and None only: what a conclusion stores. `from_plain` gives the same state back."""
        return _plain(asdict(self))  # type: ignore[no-any-return]

    @staticmethod
    def from_plain(stored: Mapping[str, Any]) -> LooksState:
        """Reads what `to_plain` wrote.

        Raises:
            StatsError: a field is missing or unknown.
        """
        known = {item.name for item in fields(LooksState)}
        if set(stored) != known:
            raise StatsError(f"not a state of looks: {sorted(set(stored) ^ known)}", where="state")
        own = dict(stored)
        own["pairs"] = tuple(PairMemory(**row) for row in stored["pairs"])
        own["planned"] = tuple(
            PlannedLook(tuple(row["n"]), row["fraction"], tuple(row["boundaries"])) for row in stored["planned"]
        )
        return LooksState(**own)

    def memory(self) -> dict[Pair, PairMemory]:
        """The pairs' memories by pair."""
        return {(row.a, row.b): row for row in self.pairs}


def _plain(value: Any) -> Any:  # noqa: ANN401 - walks nested plain data
    if isinstance(value, dict):
        return {key: _plain(inner) for key, inner in value.items()}
    return [_plain(inner) for inner in value] if isinstance(value, (list, tuple)) else value


@dataclass(frozen=True, slots=True)
class PairAtLook:
    """One pair at one look. Figures are None for a pair that could not be judged; the result says why.

    Attributes:
        a: first group.
        b: second group; the difference is mean(b) - mean(a).
        difference: in the characteristic's unit.
        standard_error: of the difference.
        df: its degrees of freedom.
        statistic: t = difference / standard error.
        p_value: overall: the smallest overall error rate, over all pairs and all looks, at which the pair is claimed
            by this look. It never rises from look to look except when an amendment touches the pair.
        lower: lower end of the interval that holds for all pairs and looks together; -inf for no bound yet.
        upper: upper end; inf for no bound yet.
        verdict: one of the four words.
        p_now: overall p-value of the data of this look alone, without what earlier looks had shown; None at a look
            that spent no error rate.
        p_single: what a single look would have said (Tukey-Kramer, or Dunnett with a control).
        log_evidence: natural log of the pair's own e-value; None for procedures without one.
        share: share of the error rate the pair's interval spends.
        differs: p_value <= alpha.
    """

    a: str
    b: str
    difference: float | None
    standard_error: float | None
    df: float | None
    statistic: float | None
    p_value: float | None
    lower: float | None
    upper: float | None
    verdict: str
    p_now: float | None
    p_single: float | None
    log_evidence: float | None
    share: float | None
    differs: bool

    @property
    def receded(self) -> bool:
        """Claimed at an earlier look, but the data of this look alone would not claim it."""
        return self.differs and self.p_now is not None and self.p_value is not None and self.p_now > self.p_value


@dataclass(frozen=True, slots=True)
class LookResult:
    """One look at one comparison.

    Attributes:
        mode: "open", "planned", "single" or "union".
        look: number of this look, counted from 1.
        alpha: the family error rate over all pairs and all looks.
        labels: the groups.
        pairs: one entry a pair asked.
        guarantee: "exact" or "approximate", with what it rests on.
        notes: what a reader must know of this look: overrun, amendments, groups without data.
        state: what to hand to the next look.
        not_estimable: reason for each pair that could not be judged.
    """

    mode: str
    look: int
    alpha: float
    labels: tuple[str, ...]
    pairs: tuple[PairAtLook, ...]
    guarantee: str
    notes: tuple[str, ...]
    state: LooksState
    not_estimable: Mapping[Pair, str] = field(default_factory=dict)

    def frame(self) -> pd.DataFrame:
        """One row a pair, columns as the attributes of `PairAtLook`."""
        import pandas as pd

        return pd.DataFrame([asdict(row) for row in self.pairs], columns=[item.name for item in fields(PairAtLook)])

    def pair(self, a: str, b: str) -> PairAtLook:
        """The entry of one pair.

        Raises:
            StatsError: no such pair was asked.
        """
        for row in self.pairs:
            if (row.a, row.b) == (a, b):
                return row
        raise StatsError(f"no pair {a}, {b} in this look", where="pair", advice="pairs are (earlier, later)")


def remembered(state: LooksState | None, mode: str, rule: str) -> LooksState:
    """The state to go on from; a fresh one at the first look.

    Raises:
        StatsError: the state is of another mode, or of the same mode under another rule.
    """
    if state is None:
        return LooksState(mode=mode, rule=rule)
    if state.mode != mode or state.rule != rule:
        raise StatsError(
            f"the looks so far were made as {state.mode} under {state.rule!r}, this one is {mode} under {rule!r}",
            where="state",
            advice="restate the comparison with looks.restate(state, ...), which counts the earlier looks",
        )
    return state


def check_members(names: Sequence[str], labels: tuple[str, ...], where: str) -> frozenset[str]:
    """The names as a set.

    Raises:
        StatsError: a name is not among the labels.
    """
    unknown = sorted(set(names) - set(labels))
    if unknown:
        raise StatsError(f"not groups of this comparison: {', '.join(unknown)}", where=where)
    return frozenset(names)
