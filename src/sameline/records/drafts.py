"""Runs that are checked and ready to be recorded, and what intake must know of the store to check them.

Intake makes drafts from files and forms; the records side resolves their codes and writes them. Everything here is
an immutable value: no database, no files.
"""

from __future__ import annotations

from collections.abc import Collection, Container, Mapping
from dataclasses import dataclass, field


@dataclass(frozen=True, slots=True)
class DraftMeasurement:
    """One replicate as recorded.

    Attributes:
        replicate: its number within the run, from 1.
        text: the figure as it was written ("12.50" is not "12.5": its resolution is a fact).
        value: the same as a number, in the characteristic's unit; for a censored result, the bound.
        qualifier: "<" or ">" for a censored result, else None.
        unit: the unit as it was written, when that is not the characteristic's own; else None.
    """

    replicate: int
    text: str
    value: float
    qualifier: str | None = None
    unit: str | None = None


@dataclass(frozen=True, slots=True)
class DraftRun:
    """One run, by the codes that the store knows, with its replicates.

    Attributes:
        batch, characteristic, analyst, instrument: codes; analyst and instrument may be None where not known.
        tested_at: when it was tested, UTC, ISO 8601 to the microsecond with a final Z (see `sameline.records.moments`).
        measurements: the replicates in order of their numbers.
        session: label of the occasion on which several batches were tested together, if stated.
        note: free text, if any.
        row: the row of the file where the run begins (headings are row 1), if it came from a file.
    """

    batch: str
    characteristic: str
    tested_at: str
    measurements: tuple[DraftMeasurement, ...]
    analyst: str | None = None
    instrument: str | None = None
    session: str | None = None
    note: str | None = None
    row: int | None = None


@dataclass(frozen=True, slots=True)
class SourceFile:
    """A file that runs came from: its name without folders, its SHA-256 in hexadecimal, and its size in bytes."""

    name: str
    sha256: str
    size: int


@dataclass(frozen=True, slots=True)
class CharacteristicFacts:
    """What checking a value needs to know of a characteristic.

    Attributes:
        code: its code.
        unit: its unit, as registered.
        lower, upper: specification limits in that unit, or None.
        decimals: number of decimals reported.
        safety_critical: whether a safety-critical part depends on it.
        mean, spread: mean and standard deviation of all values recorded so far, or None with fewer than eight.
    """

    code: str
    unit: str
    lower: float | None = None
    upper: float | None = None
    decimals: int | None = None
    safety_critical: bool = False
    mean: float | None = None
    spread: float | None = None


@dataclass(frozen=True, slots=True)
class Register:
    """What is registered in a store, as intake needs it to check a file.

    Attributes:
        batches: batch code -> material code.
        characteristics: code -> facts.
        people: codes of persons.
        instruments: codes of instruments.
        zone: the laboratory's time zone (IANA name); moments written without a zone are in it.
        now: the present moment (UTC, ISO 8601), so that a date in the future is found.
    """

    batches: Mapping[str, str]
    characteristics: Mapping[str, CharacteristicFacts]
    people: Collection[str]
    instruments: Collection[str]
    zone: str
    now: str
    runs: Container[tuple[str, str, str]] = field(default_factory=frozenset)
    """(batch, characteristic, tested_at) of the runs already recorded."""
