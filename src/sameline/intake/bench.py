"""One run as it is typed at the bench: checked exactly as a file is."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from dataclasses import replace

from sameline.errors import FindingsError
from sameline.intake.files import Intake, read_files
from sameline.intake.findings import Finding
from sameline.intake.rawfiles import RawFile
from sameline.records.drafts import CharacteristicFacts, DraftMeasurement, Register

HEADINGS = ("batch", "characteristic", "tested_at", "analyst", "instrument", "session", "replicate", "value")


def read_typed(
    register: Register,
    values: Sequence[str],
    *,
    batch: str,
    characteristic: str,
    tested_at: str,
    analyst: str = "",
    instrument: str = "",
    session: str = "",
) -> Intake:
    """One run from typed texts: a run, or the findings that say what is wrong."""
    text = io.StringIO()
    writer = csv.writer(text)
    writer.writerow(HEADINGS)
    for replicate, value in enumerate(values, 1):
        writer.writerow((batch, characteristic, tested_at, analyst, instrument, session, replicate, value))
    return read_files([RawFile("the run", text.getvalue().encode())], register)


def typed_finding(finding: Finding) -> str:
    """A finding in words that fit a form: its place is the replicate and the column."""
    row = finding.row
    where = f"replicate {row - 1}: " if finding.column == "value" and row is not None else ""
    advice = f"; {finding.suggestion}" if finding.suggestion else ""
    return f"{where}{finding.problem}{advice}"


def read_corrected(facts: CharacteristicFacts, replicate: int, text: str) -> DraftMeasurement:
    """The value that a person says a recorded replicate should have had.

    Raises:
        FindingsError: the text is no value of this characteristic.
    """
    now = "9999-01-01T00:00:00.000000Z"
    register = Register({"-": "-"}, {facts.code: facts}, frozenset(), frozenset(), "UTC", now)
    found = read_typed(register, [text], batch="-", characteristic=facts.code, tested_at="2000-01-01T00:00Z")
    if found.refusals:
        raise FindingsError("the value is not amended", [typed_finding(f) for f in found.refusals])
    return replace(found.runs[0].measurements[0], replicate=replicate)
