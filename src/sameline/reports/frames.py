"""Records as pandas data frames, with stable column names."""

from __future__ import annotations

from typing import TYPE_CHECKING

from sameline.records.registry import KINDS, codes, listing
from sameline.records.runs import read_measurements
from sameline.records.store import Reading

if TYPE_CHECKING:
    import pandas as pd


def measurement_frame(reading: Reading) -> pd.DataFrame:
    """Every replicate as it holds, one row each, in order of run and replicate.

    Columns: run (its number), batch, material, supplier, characteristic, unit, tested_at (UTC), analyst, instrument,
    session, replicate, value (in `unit`), text (as recorded), recorded_unit (where it was another), qualifier ("<",
    ">" or None), amended, excluded (the cause, or None), entry (that recorded it).
    """
    import pandas as pd

    connection = reading.connection
    batch = codes(connection, KINDS["batch"])
    origin = {row["code"]: (row["material"], row["supplier"]) for row in listing(reading, KINDS["batch"])}
    unit = {row["code"]: row["unit"] for row in listing(reading, KINDS["characteristic"])}
    characteristic = codes(connection, KINDS["characteristic"])
    person, instrument = codes(connection, KINDS["person"]), codes(connection, KINDS["instrument"])
    found = read_measurements(reading)
    columns = {
        "run": [m.run for m in found],
        "batch": [batch[m.batch] for m in found],
        "material": [origin[batch[m.batch]][0] for m in found],
        "supplier": [origin[batch[m.batch]][1] for m in found],
        "characteristic": [characteristic[m.characteristic] for m in found],
        "unit": [unit[characteristic[m.characteristic]] for m in found],
        "tested_at": pd.to_datetime([m.tested_at for m in found], utc=True, format="ISO8601"),
        "analyst": [None if m.analyst is None else person[m.analyst] for m in found],
        "instrument": [None if m.instrument is None else instrument[m.instrument] for m in found],
        "session": [m.session for m in found],
        "replicate": [m.replicate for m in found],
        "value": [m.value for m in found],
        "text": [m.text for m in found],
        "recorded_unit": [m.unit for m in found],
        "qualifier": [m.qualifier for m in found],
        "amended": [m.amended for m in found],
        "excluded": [m.excluded for m in found],
        "entry": [m.entry for m in found],
    }
    return pd.DataFrame(columns)
