"""What is registered, as a table."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from sameline.reports.text import RIGHT, plain, table

_NUMERIC = {"lower", "upper", "target", "margin", "decimals"}


def registered_text(kind: str, rows: Sequence[dict[str, Any]]) -> list[str]:
    """All of one kind; columns that nobody filled are left out."""
    if not rows:
        return [f"No {kind} is registered. `sameline add {kind} CODE …` registers one."]
    columns = [name for name in rows[0] if any(row[name] not in (None, 0) for row in rows)]
    headings = [name.replace("_", " ") for name in columns]
    align = "".join(RIGHT if name in _NUMERIC else "<" for name in columns)
    return table(headings, [[_cell(name, row[name]) for name in columns] for row in rows], align, indent="")


def _cell(name: str, value: Any) -> str:  # noqa: ANN401 - any column's value
    if name == "safety_critical":
        return "yes" if value else "no"
    if isinstance(value, float):
        return plain(value)
    return "" if value is None else str(value)
