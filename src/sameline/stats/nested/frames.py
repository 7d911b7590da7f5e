"""Tables for pandas that keep None where there is no figure, never NaN."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from collections.abc import Sequence

    import pandas as pd


def frame_of(names: Sequence[str], rows: Sequence[Sequence[Any]]) -> pd.DataFrame:
    """One row an entry of `rows`, one column a name."""
    import pandas as pd

    columns = {}
    for at, name in enumerate(names):
        cells = [row[at] for row in rows]
        columns[name] = pd.Series(cells, dtype=object if not cells or None in cells else None)
    return pd.DataFrame(columns)
