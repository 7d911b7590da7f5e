"""A replicate that is ten, a hundred or a thousand times the others of its run: a slipped decimal point.

Asked about where too little is recorded of a characteristic to say what is far (see `sameline.intake.far`).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from statistics import median

from sameline.records.drafts import DraftMeasurement

_FEWEST = 3
_AGREE = 2.0
"""The others must lie within this factor of each other, and the corrected value among them (common practice)."""


def slipped(measurements: Sequence[DraftMeasurement]) -> Iterator[tuple[DraftMeasurement, str]]:
    """Replicates whose decimal point has likely slipped, each with what is said about it."""
    values = [abs(measurement.value) for measurement in measurements if measurement.qualifier is None]
    if len(values) < _FEWEST or min(values) * 5 > max(values):
        return
    for measurement in measurements:
        others = [abs(other.value) for other in measurements if other is not measurement and other.qualifier is None]
        times = _power_of_ten(abs(measurement.value), others)
        if measurement.qualifier is None and times:
            yield measurement, f"{measurement.text} is about {times} the other replicates of its run"


def _power_of_ten(value: float, others: Sequence[float]) -> str | None:
    if len(others) < _FEWEST - 1 or min(others) <= 0 or max(others) > _AGREE * min(others):
        return None
    for power in (1, 2, 3):
        for words, corrected in ((f"{10**power} times", value / 10**power), (f"1/{10**power} of", value * 10**power)):
            if max(others) / _AGREE <= corrected <= min(others) * _AGREE and abs(corrected / median(others) - 1) < 0.25:
                return words
    return None
