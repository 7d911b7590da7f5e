"""What acts did, and which act wakes what."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING

from sameline.errors import FindingsError

if TYPE_CHECKING:
    from pathlib import Path

    from sameline.intake.files import Intake
    from sameline.records.answers import Conclusion
    from sameline.records.drafts import CharacteristicFacts, DraftRun, SourceFile

WAKES: dict[str, str] = {
    "init": "nothing",
    "add": "nothing",
    "log": "the comparisons in whose scope the new runs fall",
    "take": "the comparisons in whose scope the new runs fall",
    "amend": "the comparisons in whose scope the amended run fell, and falls now",
    "exclude": "the comparisons in whose scope what is set aside falls",
    "restore": "the comparisons in whose scope what is put back falls",
    "reverse": "the comparisons that the reversed entry touched, or would touch now",
    "compare": "the comparison that is stated",
    "restate batch": "the comparisons in whose scope its runs fell, and fall now",
    "restate characteristic": "the comparisons that take their margin from it",
    "conclude": "nothing",
}
"""Which act wakes what. Anything that is not listed wakes nothing; a test holds each line to what happens."""


@dataclass(frozen=True, slots=True)
class Outcome:
    """What an act did.

    Attributes:
        entry: the ledger entry that recorded it.
        runs: ids of the runs it recorded, if it recorded any.
        conclusions: the answers it led to, in order of their comparisons.
        behind: names of comparisons that are still behind, with the reason.
    """

    entry: int
    runs: tuple[int, ...] = ()
    conclusions: tuple[Conclusion, ...] = ()
    behind: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True)
class Taken:
    """What files held, and what became of it.

    Attributes:
        intake: runs and findings.
        facts: the characteristics of the runs, by code.
        passed: what is said of runs that are recorded already and were passed over, a line for each file and entry.
        outcomes: one for each file of which something was recorded, as `by_source` lists them.
        rest: the files that hold what could not be taken, to be mended.
    """

    intake: Intake
    facts: dict[str, CharacteristicFacts]
    passed: tuple[str, ...] = ()
    outcomes: tuple[Outcome, ...] = ()
    rest: tuple[Path, ...] = ()


def refuse(found: Intake, *, as_they_stand: bool, good_runs: bool = False) -> None:
    """Refuse files with findings; questions may be answered by taking the values as they stand."""
    if found.refusals and not (good_runs and found.runs):
        raise FindingsError(
            "nothing was recorded", [str(f) for f in found.findings], advice="mend the file and take it again"
        )
    if found.questions and not as_they_stand:
        raise FindingsError(
            "there are questions; nothing was recorded",
            [str(f) for f in found.questions],
            advice="mend the file, or take the values as they stand with --as-they-stand",
        )


def by_source(found: Intake) -> Iterator[tuple[SourceFile, list[DraftRun]]]:
    """The runs of each file that has any; files stand in the order in which they were read."""
    parts = list(found.parts)
    for source in found.sources:
        own = [part for part in parts if part.file == source.name]
        runs = [run for part in own for run in part.runs]
        if runs:
            yield source, runs
