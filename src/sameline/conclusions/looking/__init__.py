"""The error rate over all looks: which way of looking judges which comparison, and what the next look must remember.

open, planned: units of batches (run means) or units as they are -> evidence and boundaries of `sameline.stats.looks`,
exact for independent normal units with one spread. Suppliers and materials on the nested model, crossed sessions,
unequal spreads and ranks have no such exact form; there each judged look has its own share of the error rate.
single: the procedure as it is, once, when the stated amount of data is there.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from sameline.conclusions.looking.once import judge_once
from sameline.conclusions.looking.open_end import judge_without_end
from sameline.conclusions.looking.planned import judge_up_to_plan
from sameline.conclusions.looking.shared import judge_by_shares
from sameline.conclusions.looking.view import Looking

if TYPE_CHECKING:
    from sameline.conclusions.judged import Judged
    from sameline.records.comparisons import Revision, Statement

__all__ = ["Looking", "over_all_looks"]


def over_all_looks(looking: Looking) -> Judged:
    """The verdicts that keep the stated error rate over all pairs and all looks.

    Raises:
        StatsError: the looks cannot go on as they were stated.
    """
    revision = looking.revision
    if revision.looks == "single":
        return judge_once(looking)
    if revision.looks == "planned":
        return judge_up_to_plan(looking)
    return judge_without_end(looking) if has_exact_form(revision) else judge_by_shares(looking)


def has_exact_form(revision: Revision | Statement) -> bool:
    """Whether the units themselves say how they scatter: the comparison can be looked at without end, exactly."""
    if revision.model == "pooled":
        return True
    own_spread = not revision.known_spread and not revision.sessions
    return revision.model == "nested" and revision.grouping == "batch" and own_spread
