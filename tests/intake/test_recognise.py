from __future__ import annotations

import dataclasses
from collections.abc import Callable

import pytest

from sameline.intake.files import Intake
from sameline.intake.recognise import KnownRun, keys_of, recognise
from sameline.records.drafts import DraftRun

Take = Callable[..., Intake]
HEAD = "batch,characteristic,tested_at,analyst,instrument,session,replicate,value\n"
FIRST = HEAD + "B-117,TS,2026-03-04,ana,RIG-1,,1,12.50\nB-117,TS,2026-03-04,ana,RIG-1,,2,12.7\n"
SECOND = "B-121,TS,2026-03-04,ana,RIG-1,,1,12.4\n"


def stored(intake: Intake, entry: int = 7) -> dict[tuple[str, str, str], list[KnownRun]]:
    known: dict[tuple[str, str, str], list[KnownRun]] = {}
    for run in intake.runs:
        known.setdefault((run.batch, run.characteristic, run.tested_at), []).append(KnownRun(entry, run))
    return known


def test_what_is_not_recorded_is_new(take: Take):
    intake = take(FIRST)
    found = recognise(intake, {}, {"0" * 64: 3})
    assert (found.new, found.same, found.changed, found.findings) == (intake.runs, (), (), ())
    assert keys_of(intake) == {("B-117", "TS", "2026-03-03T23:00:00.000000Z")}


def test_the_same_file_again_says_which_entry_holds_it(take: Take):
    intake = take(FIRST)
    found = recognise(intake, stored(intake), {intake.sources[0].sha256: 7})
    assert found.new == ()
    assert [str(finding) for finding in found.findings] == [
        "results1.csv: this very file has been taken in already, in entry 7; there is nothing to take",
        "results1.csv, row 2: this run is recorded already, in entry 7; leave it out",
    ]


def test_a_changed_copy_is_recognised_run_by_run(take: Take):
    known = stored(take(FIRST))
    copy = take(FIRST.replace("12.7", "12.9") + "B-117,TS,2026-03-04,ana,RIG-1,,3,12.1\n" + SECOND)
    found = recognise(copy, known)
    assert [run.batch for run in found.new] == ["B-121"]
    assert [known.entry for known in found.changed] == [7]
    (finding,) = found.findings
    assert not finding.question
    assert finding.problem == (
        "this run is recorded already, in entry 7, with other values: "
        "replicate 2 12.7, now 12.9; replicate 3 not there, now 12.1"
    )


def test_writing_a_figure_in_another_way_does_not_change_it(take: Take):
    known = stored(take(FIRST))
    found = recognise(take(FIRST.replace("12.50", "12.5").replace("12.7", "12.70 MPa")), known)
    assert (len(found.same), found.new, found.changed) == (1, (), ())


@pytest.mark.parametrize(
    ("changes", "asked"),
    [
        ({"instrument": "DUR-2"}, True),
        ({"session": "afternoon"}, True),
        ({"analyst": "ben"}, True),  # the same values by another analyst
        ({"analyst": "ben", "measurements": ()}, False),
    ],
)
def test_what_looks_alike_is_asked_about(take: Take, changes: dict[str, object], asked: bool):
    intake = take(FIRST)
    (run,) = intake.runs
    recorded: DraftRun = dataclasses.replace(run, **changes)  # type: ignore[arg-type]
    found = recognise(intake, {(run.batch, run.characteristic, run.tested_at): [KnownRun(9, recorded)]})
    assert found.new == intake.runs
    assert [finding.question for finding in found.findings] == [True] * asked
