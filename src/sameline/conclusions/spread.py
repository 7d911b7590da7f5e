"""The spread of a characteristic: variance components over its batches, runs and replicates."""

from __future__ import annotations

from typing import TYPE_CHECKING

from sameline.errors import CallError
from sameline.records.registry import KINDS, codes, find, listing
from sameline.records.runs import Measurement, read_measurements

if TYPE_CHECKING:
    from sameline.records.store import Reading
    from sameline.stats.nested.fit import NestedFit


def fit_spread(
    reading: Reading,
    characteristic: str,
    *,
    material: str | None = None,
    supplier: str | None = None,
    tested_from: str | None = None,
    tested_before: str | None = None,
) -> NestedFit:
    """The components of a characteristic, as of the reading; each material has a mean of its own.

    Args:
        reading: the view.
        characteristic: code.
        material: only batches of this material.
        supplier: only batches from this supplier.
        tested_from: only runs tested at or after this moment (UTC, ISO 8601).
        tested_before: only runs tested before this moment.

    Raises:
        CallError: a code is not registered, or nothing was recorded that fits.
        StatsError: the components cannot be had from what was recorded.
    """
    from sameline.stats.nested.fit import fit_nested

    number = find(reading.connection, KINDS["characteristic"], characteristic)
    origin = {row["code"]: (row["material"], row["supplier"]) for row in listing(reading, KINDS["batch"])}
    for kind, code in (("material", material), ("supplier", supplier)):
        if code is not None:
            find(reading.connection, KINDS[kind], code)
    batch = codes(reading.connection, KINDS["batch"])
    chosen = {
        key
        for key, code in batch.items()
        if code in origin and material in (None, origin[code][0]) and supplier in (None, origin[code][1])
    }
    found = read_measurements(reading, characteristic=number, batches=chosen)
    kept = [m for m in found if _fits(m, tested_from, tested_before)]
    if not kept:
        raise CallError(f"no value of {characteristic} is recorded that fits", advice="leave a filter out")
    return fit_nested(
        [m.value for m in kept],
        [origin[batch[m.batch]][0] for m in kept],
        [batch[m.batch] for m in kept],
        [m.run for m in kept],
    )


def _fits(m: Measurement, tested_from: str | None, tested_before: str | None) -> bool:
    inside = (tested_from is None or m.tested_at >= tested_from) and (
        tested_before is None or m.tested_at < tested_before
    )
    return inside and m.excluded is None and m.qualifier is None
