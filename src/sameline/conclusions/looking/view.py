"""What is looked at, and what a look leaves for the next."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

from sameline.errors import StatsError
from sameline.ledger.canonical import canonical

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from sameline.conclusions.inputs import Inputs
    from sameline.conclusions.judged import Judged
    from sameline.conclusions.models import Unit
    from sameline.conclusions.past import Past
    from sameline.records.comparisons import Revision
    from sameline.stats.looks import LooksState, UnitMeans


Plain = Mapping[str, Any]
"""A state of `sameline.stats.looks` as plain data."""


@dataclass(frozen=True, slots=True)
class Looking:
    """What is looked at.

    Attributes:
        revision, inputs, past: the question, its data, and what earlier looks left.
        units: the units as the model counts them.
        alone: what the model says of this look alone.
        again: judges this look anew at another error rate.
    """

    revision: Revision
    inputs: Inputs
    past: Past
    units: tuple[Unit, ...]
    alone: Judged
    again: Callable[[float], Judged]


def unit_means_seen(looking: Looking, units: Sequence[Unit]) -> UnitMeans:
    """Unit means of all groups; a control first, and groups that join by a filter in the order in which they came."""
    from sameline.stats.looks import unit_means

    labels = [label for _, label in looking.inputs.groups]
    control = looking.inputs.control
    if control is not None:
        labels = [control, *(label for label in labels if label != control)]
    return unit_means([u.value for u in units], [u.group for u in units], labels)


def state_before(stored: Plain | None, mode: str, rule: str, fixed: Sequence[str] | None) -> LooksState | None:
    """The state to go on from; a restated question over data already seen draws on the reserve."""
    from sameline.stats.looks import LooksState, restate

    if stored is None:
        return None
    state = LooksState.from_plain(stored)
    groups = {name for row in state.pairs for name in (row.a, row.b)}
    if (state.mode, state.rule) == (mode, rule) and (fixed is None or groups == set(fixed)):
        return state
    carried = restate(state, mode, rule)
    return replace(carried, pairs=()) if fixed is not None and groups != set(fixed) else carried


def remembered(state: str | None) -> dict[str, Any]:
    """What a look before left, by name; nothing at the first look."""
    if state is None:
        return {}
    found = json.loads(state)
    if not isinstance(found, dict):
        raise StatsError("the state of the looks so far cannot be read")
    return found


def kept_reserve(looking: Looking, memory: Plain) -> float:
    """The share of the error rate kept for amended data: fixed at the first look, whatever the default is later."""
    from sameline.stats.looks.amendments import RESERVE

    return RESERVE if looking.past.restated else float(memory.get("reserve", RESERVE))


def kept_text(state: dict[str, Any]) -> str:
    """What the next look must remember, as the store keeps it."""
    return canonical(state).decode()
