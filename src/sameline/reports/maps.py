"""Heading maps in plain words, and as a document."""

from __future__ import annotations

import json
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from sameline.reports.text import table

if TYPE_CHECKING:
    from sameline.intake.headings import HeadingMap, MapColumn
    from sameline.intake.proposals import Proposal

_DATES = {"dmy": "day, month, year", "mdy": "month, day, year", "ymd": "year, month, day"}


def proposal_text(proposal: Proposal, form: HeadingMap) -> list[str]:
    """A proposed map: what each column is taken for and why, what is concluded of the rest, what is not said yet.

    Args:
        proposal: the proposal.
        form: its map, with what the person said laid over it.
    """
    where = proposal.file if proposal.sheet is None else f"{proposal.file}, sheet {proposal.sheet!r}"
    lines = [f"{where}: headings in row {proposal.row}", ""]
    reasons = {guess.column: (guess.reason, ", ".join(guess.samples[:3])) for guess in proposal.guesses}
    rows = [(c.heading, column_words(c), *reasons.get(c, ("as you say", ""))) for c in form.columns]
    lines += table(("column", "is taken for", "because", "such as"), rows, "<<<<")
    missing = form.missing()
    notes = [
        *_constants(form),
        *_dates(form, proposal.map),
        *(note for note in proposal.notes if not note.startswith("no column is taken for")),
    ]
    if notes:
        lines += ["", *(f"  {note}" for note in dict.fromkeys(notes))]
    if missing:
        lines += ["", f"  NOT SAID YET: {', '.join(missing)}. Say it with --column or --constant."]
    return lines


def column_words(column: MapColumn) -> str:
    """What a column is, in words: "values of TS in N/mm²", "batch", "not read"."""
    if column.field == "ignore":
        return "not read"
    if column.field != "value":
        return column.field
    number = "values" if column.replicate is None else f"replicate {column.replicate}"
    of = f" of {column.characteristic}" if column.characteristic else ""
    return f"{number}{of}{f' in {column.unit}' if column.unit else ''}"


def _constants(form: HeadingMap) -> list[str]:
    return [f"{field} is {value} in the whole file" for field, value in form.constants]


def _dates(form: HeadingMap, proposed: HeadingMap | None = None) -> list[str]:
    """The order of dates, where it is said and is not what was proposed (the notes say that)."""
    if form.date_order is None or (proposed is not None and proposed.date_order == form.date_order):
        return []
    return [f"dates are {_DATES[form.date_order]}"]


def _sayings(form: HeadingMap) -> list[str]:
    said = [*_constants(form), *_dates(form)]
    if form.decimal is not None:
        said.append(f"the decimal sign is {form.decimal!r}")
    if form.fill_down:
        said.append(f"empty cells repeat the one above in: {', '.join(form.fill_down)}")
    if form.footers:
        said.append(f"rows that begin with {', '.join(map(repr, form.footers))} are left out")
    return said


def maps_text(maps: Sequence[tuple[int, HeadingMap]]) -> list[str]:
    """The kept maps, each with its entry and what it says."""
    if not maps:
        return ["No heading map is kept. `sameline map propose FILE` proposes one."]
    lines = []
    for entry, form in maps:
        lines.append(f"{form.name}, kept by entry {entry}")
        lines += [f"  {column.heading}: {column_words(column)}" for column in form.columns]
        lines += [f"  {saying}" for saying in _sayings(form)]
    return lines


def map_document(form: HeadingMap) -> dict[str, Any]:
    """A map for other programs."""
    document: dict[str, Any] = json.loads(form.to_json())
    return document
