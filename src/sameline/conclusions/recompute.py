"""Checking that goes beyond hashes: every conclusion computed again from the rows as of its look.

The same machine and library versions must give the same answer to the last bit. Other versions may differ by
`TOLERANCE` relative in a figure, but in no verdict, line, count or word.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, fields, is_dataclass, replace
from typing import Any

from sameline.conclusions.conclude import Place, answer_as_of, place_of
from sameline.conclusions.inputs import gather
from sameline.conclusions.models import engine
from sameline.ledger.checkpoint import Checkpoint
from sameline.records import comparisons, concluded, scope
from sameline.records.answers import Answer
from sameline.records.checks import Finding, LedgerReport, check_ledger
from sameline.records.store import Reading, Store

TOLERANCE = 1e-9

CHECKS = (
    "the schema and its refusing triggers",
    "the chain of entries",
    "the ledger's tree",
    "the rows that the entries wrote: all there, no other",
    "each row's own digest",
    "each entry's Merkle root over its rows",
    "every reference",
    "every conclusion, computed again from the rows as of its look",
    "every comparison: none left behind unseen",
    "each checkpoint that is given: the ledger still begins with its entries",
    "each signature on a conclusion: by a key that held, over what the record says",
)
"""What verification checks, in the order of the findings' numbers (from 1)."""

Progress = Callable[[str, int, int], None]


@dataclass(frozen=True, slots=True)
class Verification:
    """What verification found.

    Attributes:
        ledger: the report on entries and rows.
        conclusions: how many were recomputed.
        findings: all, in the order of the checks.
        behind: names of the comparisons that are behind and say so; no finding.
    """

    ledger: LedgerReport
    conclusions: int
    findings: tuple[Finding, ...]
    behind: tuple[str, ...]


def verify(
    store: Store,
    progress: Progress | None = None,
    checkpoints: Sequence[Checkpoint] = (),
    since: Checkpoint | None = None,
) -> Verification:
    """Check the ledger against the rows, then recompute every conclusion.

    Args:
        store: an open store.
        progress: told now and then what is checked, how far it is, and how far it goes.
        checkpoints: statements of the ledger as it was, kept elsewhere.
        since: one of them; the rows and conclusions of the entries that it covers are taken as checked before.
    """
    tell = progress or (lambda _what, _done, _all: None)
    with store.reading() as reading:
        ledger = check_ledger(reading.connection, lambda done, total: tell("rows", done, total), checkpoints, since)
    done: list[int] = []
    late: list[str] = []
    with store.reading() as reading:
        recomputed = _as_far_as_possible(8, _conclusions(reading, tell, done, since.entries if since else 0))
        unseen = _as_far_as_possible(9, _left_behind(reading, late))
    found = sorted((*ledger.findings, *recomputed, *unseen), key=lambda f: f.check)
    return Verification(ledger, len(done), tuple(found), tuple(late))


def _as_far_as_possible(check: int, findings: Iterator[Finding]) -> list[Finding]:
    """All findings; where damaged records stop the check, that is one more."""
    found: list[Finding] = []
    try:
        found.extend(findings)
    except Exception as error:  # noqa: BLE001 - damaged records can break any step, and that is the finding
        found.append(Finding(check, None, None, None, None, f"the records cannot be read as far as this: {error}"))
    return found


def _conclusions(reading: Reading, tell: Progress, done: list[int], after: int) -> Iterator[Finding]:
    """8. Every conclusion with its place in its history, in the order of recording; `done` gets a number for each."""
    recorded = concluded.all_versions(reading, after)
    for number, (comparison, version) in enumerate(recorded, 1):
        yield from _conclusion(reading, comparison, version)
        done.append(number)
        tell("conclusions", number, len(recorded))


def _conclusion(reading: Reading, comparison: int, version: int) -> Iterator[Finding]:
    conclusion = None
    try:
        conclusion = concluded.version_of(reading, comparison, version)
        then = replace(reading, position=conclusion.position, latest=False)
        revision = comparisons.read_revision(then, comparison, revision_id=conclusion.revision_id)
        again = answer_as_of(then, revision)
        place = place_of(then, comparison, again)
    except Exception as error:  # noqa: BLE001 - damaged records can break any step, and that is the finding
        what = f"{conclusion.name} v{version}" if conclusion else f"comparison {comparison} v{version}"
        yield Finding(8, "conclusion", None, None, None, f"{what} cannot be computed again: {error}")
        return
    tolerance = 0.0 if conclusion.answer.engine in {engine(), ""} else TOLERANCE
    recorded = Place(conclusion.version, conclusion.look, conclusion.causes, conclusion.turns)
    different = [*differences(conclusion.answer, again, tolerance), *_differences("", recorded, place, 0.0)]
    if different:
        where = "; ".join(different[:3]) + (f"; and {len(different) - 3} more" if len(different) > 3 else "")
        problem = f"{conclusion.name} v{version} comes out otherwise when computed again: {where}"
        yield Finding(8, "conclusion", conclusion.id, conclusion.entry, conclusion.person, problem)


def differences(recorded: Answer, again: Answer, tolerance: float) -> Iterator[str]:
    """Where two answers differ: "pairs 1 p_value: recorded 0.03, now 0.04"; the engine's versions do not count."""
    yield from _differences("", replace(recorded, engine=""), replace(again, engine=""), tolerance)


def _differences(path: str, old: Any, new: Any, tolerance: float) -> Iterator[str]:  # noqa: ANN401 - any field
    if is_dataclass(old) and is_dataclass(new):
        for f in fields(old):
            yield from _differences(f"{path} {f.name}".strip(), getattr(old, f.name), getattr(new, f.name), tolerance)
    elif isinstance(old, tuple) and isinstance(new, tuple) and len(old) == len(new):
        for at, (one, other) in enumerate(zip(old, new, strict=True), 1):
            yield from _differences(f"{path} {at}", one, other, tolerance)
    elif not _same(old, new, tolerance):
        yield f"{path}: recorded {_short(old)}, now {_short(new)}"


def _same(old: Any, new: Any, tolerance: float) -> bool:  # noqa: ANN401
    if isinstance(old, float) and isinstance(new, float):
        return old == new or math.isclose(old, new, rel_tol=tolerance, abs_tol=tolerance * 1e-3)
    return bool(old == new)


def _short(value: Any) -> str:  # noqa: ANN401
    text = value.hex() if isinstance(value, bytes) else str(value)
    return text if len(text) <= 60 else text[:57] + "..."


def _left_behind(reading: Reading, late: list[str]) -> Iterator[Finding]:
    """9. A comparison must rest on the values that its last conclusion read, or say that it is behind (`late`)."""
    behind = set(scope.behind(reading))
    for comparison, name in comparisons.stated_names(reading):
        if comparison in behind:
            late.append(name)
            continue
        last = concluded.latest(reading, comparison)
        revision = comparisons.read_revision(reading, comparison)
        if last is None or last.revision_id != revision.id:
            yield Finding(9, "comparison", comparison, None, None, f"{name} has no conclusion on its last revision")
        elif last.answer.inputs != gather(reading, revision).digest():
            yield Finding(9, "comparison", comparison, last.entry, last.person, f"{name} rests on other values by now")
