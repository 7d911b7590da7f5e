"""Heading maps as they are kept: a name, and the map as text that intake writes and reads."""

from __future__ import annotations

from dataclasses import dataclass

from sqlalchemy import func, select

from sameline.errors import CallError
from sameline.records import tables as t
from sameline.records.acts import Act
from sameline.records.store import Reading


@dataclass(frozen=True, slots=True)
class KeptMap:
    """A heading map as it holds: the entry that kept it, its name and its text (JSON)."""

    entry: int
    name: str
    form: str


def read_maps(reading: Reading) -> list[KeptMap]:
    """The maps that hold, by name: of each name the one kept last."""
    kept = t.heading_map
    last = select(func.max(kept.c.id)).where(kept.c.entry <= reading.position).group_by(kept.c.name)
    query = select(kept.c.entry, kept.c.name, kept.c.form).where(kept.c.id.in_(last)).order_by(kept.c.name)
    return [KeptMap(*row) for row in reading.connection.execute(query)]


def keep_map(act: Act, name: str, form: str) -> int:
    """Keep a map under a name; one that was kept under it before stays readable as of then.

    Returns:
        The row's id.

    Raises:
        CallError: the name is empty, or this very map is kept under it.
    """
    if not name.strip():
        raise CallError("the map needs a name", advice="give --name, for example --name 'tensile rig'")
    kept = t.heading_map
    held = select(kept.c.entry, kept.c.form).where(kept.c.name == name).order_by(kept.c.id.desc()).limit(1)
    before = act.connection.execute(held).first()
    if before is not None and before.form == form:
        raise CallError(f"this map is kept already as {name!r}, by entry {before.entry}")
    return act.add(kept, name=name, form=form)
