"""Looking again and again, honestly: one stated error rate over all pairs and all looks.

A comparison says beforehand how it will be looked at, and calls one of these at every look, with what is now recorded
and the state of the look before:

- `judge_open(UnitMeans, ...)`: no end. E-values of unit means with a pooled variance, closed testing over partitions.
  EXACT at all looks together for independent normal units with one spread.
- `judge_planned(UnitMeans, Plan, ...)`: a stated final amount of data, any looks on the way. Boundaries for the
  studentized range. EXACT but for the seeded simulation of the boundary (standard error 0.00015 of the error rate).
- `judge_single(UnitMeans, units, ...)`: one look at a stated amount. EXACT (Tukey-Kramer, Dunnett).
- `judge_union(Contrasts, ...)`: any procedure, unequal spread, nested fits. The sharing over looks is EXACT, the
  p-value of each look is as good as the procedure: approximate for Games-Howell, Kenward-Roger and the like.
- `judge_open_contrasts(Contrasts, unit_sd, ...)`: e-values of any fit's contrasts. APPROXIMATE.

Units are what is independent: run means, or batch means. Replicates of one run are not units.

Each gives a `LookResult`: per pair the difference, the overall p-value (the smallest overall error rate at which the
pair is claimed by this look), an interval that holds at all looks together, the verdict, what the look alone would say
(`p_single`), and `.state` to store and hand to the next look (`to_plain`, `LooksState.from_plain`). Results are a pure
function of what is handed in: a stored look can be computed again to the last digit.

Two statements hold at the family error rate alpha each: "no equal pair is ever claimed to differ" and "all intervals
cover at every look". Claims are kept: the overall p-value is the least so far, which the martingale allows; `p_now`
says what this look's data alone show, and `receded` marks a claim whose evidence went back. `amendments` says what a
correction does, `shares` how joining groups share, `windows` how a drifting supplier is watched, `price` what it
costs.

Example:
    Three groups at the first look and the next:

    >>> from sameline.stats.looks import LooksState, judge_open, unit_means
    >>> groups = ["A", "A", "A", "B", "B", "B", "C", "C", "C"]
    >>> seen = unit_means([70.1, 69.8, 70.3, 70.0, 70.4, 69.9, 71.9, 72.2, 72.0], groups)
    >>> first = judge_open(seen, margin=1.0)
    >>> [(row.a, row.b, round(row.p_value, 4), row.verdict) for row in first.pairs]
    [('A', 'B', 1.0, 'undecided'), ('A', 'C', 0.2101, 'undecided'), ('B', 'C', 0.2101, 'undecided')]
    >>> stored = first.state.to_plain()
    >>> seen = unit_means([70.1, 69.8, 70.3, 70.0, 70.4, 69.9, 71.9, 72.2, 72.0, 70.2, 70.1, 72.1], [*groups, *"ABC"])
    >>> second = judge_open(seen, margin=1.0, state=LooksState.from_plain(stored))
    >>> second.pair("A", "C").verdict
    'differs'
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from sameline.stats.looks.amendments import restate
    from sameline.stats.looks.evidence import phi_from_margin
    from sameline.stats.looks.open_looks import judge_open, judge_open_contrasts, skip_look
    from sameline.stats.looks.planned import Plan, judge_planned
    from sameline.stats.looks.price import Price, price_of_looking
    from sameline.stats.looks.results import LookResult, LooksState, PairAtLook
    from sameline.stats.looks.single import judge_single
    from sameline.stats.looks.union import judge_union, rate_of_look
    from sameline.stats.looks.units import Contrasts, UnitMeans, unit_means
    from sameline.stats.looks.windows import over_windows, window_alpha, window_of

__all__ = [
    "Contrasts",
    "LookResult",
    "LooksState",
    "PairAtLook",
    "Plan",
    "Price",
    "UnitMeans",
    "judge_open",
    "judge_open_contrasts",
    "judge_planned",
    "judge_single",
    "judge_union",
    "over_windows",
    "phi_from_margin",
    "price_of_looking",
    "rate_of_look",
    "restate",
    "skip_look",
    "unit_means",
    "window_alpha",
    "window_of",
]

_HOMES = {
    "amendments": ("restate",),
    "evidence": ("phi_from_margin",),
    "open_looks": ("judge_open", "judge_open_contrasts", "skip_look"),
    "planned": ("Plan", "judge_planned"),
    "price": ("Price", "price_of_looking"),
    "results": ("LookResult", "LooksState", "PairAtLook"),
    "single": ("judge_single",),
    "union": ("judge_union", "rate_of_look"),
    "units": ("Contrasts", "UnitMeans", "unit_means"),
    "windows": ("over_windows", "window_alpha", "window_of"),
}


def __getattr__(name: str) -> Any:  # noqa: ANN401 - whatever the name is
    """Imports a public name where it is first used, so that importing the package costs nothing."""
    for home, names in _HOMES.items():
        if name in names:
            return getattr(import_module(f"{__name__}.{home}"), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
