"""What pictures show of the records: runs with their replicates, marked where amended, set aside, or only a bound."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from itertools import groupby

from sameline.conclusions.inputs import gather
from sameline.errors import CallError
from sameline.records.answers import Conclusion
from sameline.records.comparisons import read_revision
from sameline.records.registry import KINDS, codes, current, find, listing
from sameline.records.runs import Measurement, read_measurements
from sameline.records.store import Reading


@dataclass(frozen=True, slots=True)
class DrawnValue:
    """One replicate: its value, "<" or ">" where that is only a bound, whether amended, the cause if set aside."""

    value: float
    bound: str | None = None
    amended: bool = False
    aside: str | None = None


@dataclass(frozen=True, slots=True)
class DrawnRun:
    """One run: its number, the code of its column (batch or group), when it was tested, its replicates."""

    run: int
    column: str
    tested_at: str
    values: tuple[DrawnValue, ...]

    @property
    def kept(self) -> list[float]:
        """The values that enter: not set aside, not only bounds."""
        return [v.value for v in self.values if v.aside is None and v.bound is None]

    @property
    def mean(self) -> float | None:
        """Mean of the values that enter, if there are any."""
        return sum(self.kept) / len(self.kept) if self.kept else None


@dataclass(frozen=True, slots=True)
class Shown:
    """A characteristic's results as recorded.

    Attributes:
        characteristic, name, method, unit: as registered; the method may be None.
        lower, upper: specification limits, or None.
        decimals: reported for single values.
        safety_critical: whether a safety-critical part depends on it.
        filter: which batches, in words.
        position: the ledger entry up to which the records were read.
        runs: in order of batch and time.
        left_out: older batches that are not shown.
    """

    characteristic: str
    name: str
    method: str | None
    unit: str
    lower: float | None
    upper: float | None
    decimals: int
    safety_critical: bool
    filter: str
    position: int
    runs: tuple[DrawnRun, ...]
    left_out: int = 0


def read_concluded_runs(reading: Reading, conclusion: Conclusion) -> tuple[DrawnRun, ...]:
    """The runs that a conclusion rests on, as they were when it read them; those set aside are there and marked."""
    then = Reading(reading.connection, conclusion.position, latest=False)
    inputs = gather(then, read_revision(then, conclusion.comparison, revision_id=conclusion.revision_id))
    group = {value.run: value.group for value in inputs.values}
    found = read_measurements(then, runs=group) if group else []
    return _drawn(found, group)


def read_shown(
    reading: Reading,
    characteristic: str,
    *,
    material: str | None = None,
    supplier: str | None = None,
    last: int | None = None,
) -> Shown:
    """A characteristic's runs by batch, batches in order of their first test.

    Args:
        reading: the view.
        characteristic: code.
        material: only batches of this one (by code).
        supplier: only batches from this one (by code).
        last: only so many batches, the newest.

    Raises:
        CallError: a code is not registered, or nothing was recorded that fits.
    """
    number = find(reading.connection, KINDS["characteristic"], characteristic)
    chosen = _batches(reading, material, supplier)
    found = read_measurements(reading, characteristic=number, batches=chosen)
    if not found:
        raise CallError(f"no value of {characteristic} is recorded that fits", advice="leave a filter out")
    found.sort(key=lambda m: (m.tested_at, m.run, m.replicate))
    order = list(dict.fromkeys(m.batch for m in found))
    kept = order if last is None else order[-last:]
    place = {batch: at for at, batch in enumerate(kept)}
    found = sorted((m for m in found if m.batch in place), key=lambda m: (place[m.batch], m.tested_at, m.run))
    stated = current(reading.connection, KINDS["characteristic"], number, reading.position)
    unit = next(row["unit"] for row in listing(reading, KINDS["characteristic"]) if row["code"] == characteristic)
    return Shown(
        characteristic=characteristic,
        name=stated["name"] or characteristic,
        method=stated["method"],
        unit=unit,
        lower=stated["lower"],
        upper=stated["upper"],
        decimals=2 if stated["decimals"] is None else stated["decimals"],
        safety_critical=bool(stated["safety_critical"]),
        filter=filter_words(material, supplier),
        position=reading.position,
        runs=_drawn(found, {m.run: chosen[m.batch] for m in found}),
        left_out=len(order) - len(kept),
    )


def filter_words(material: str | None, supplier: str | None) -> str:
    """Which batches a filter takes: "all batches of NBR-70 from OV"."""
    return "all batches" + (f" of {material}" if material else "") + (f" from {supplier}" if supplier else "")


def _batches(reading: Reading, material: str | None, supplier: str | None) -> dict[int, str]:
    for kind, code in (("material", material), ("supplier", supplier)):
        if code is not None:
            find(reading.connection, KINDS[kind], code)
    rows = {row["code"]: row for row in listing(reading, KINDS["batch"])}
    return {
        number: code
        for number, code in codes(reading.connection, KINDS["batch"]).items()
        if code in rows and material in (None, rows[code]["material"]) and supplier in (None, rows[code]["supplier"])
    }


def _drawn(found: Iterable[Measurement], column: Mapping[int, str]) -> tuple[DrawnRun, ...]:
    return tuple(
        DrawnRun(run, column[run], rows[0].tested_at, tuple(_value(m) for m in rows))
        for run, rows in ((run, list(members)) for run, members in groupby(found, key=lambda m: m.run))
    )


def _value(m: Measurement) -> DrawnValue:
    return DrawnValue(m.value, m.qualifier, m.amended, m.excluded)


def counted(runs: Sequence[DrawnRun]) -> tuple[int, int]:
    """How many runs and values enter."""
    entering = [sum(v.aside is None for v in run.values) for run in runs]
    return sum(n > 0 for n in entering), sum(entering)
