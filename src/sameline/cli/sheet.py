"""`sameline sheet`: an entry form to be filled in and taken in."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from sameline.cli.common import DEFAULT_STORE, StoreOption, open_store, say
from sameline.errors import CallError

if TYPE_CHECKING:
    from collections.abc import Sequence

    from sameline.lab import Lab


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.command()(sheet)


def sheet(
    characteristics: Annotated[list[str], typer.Argument(help="Codes of what is measured.")],
    batch: Annotated[
        list[str] | None, typer.Option("--batch", "-b", help="A batch to choose from; all if left out. Repeatable.")
    ] = None,
    replicates: Annotated[int, typer.Option(min=1, max=100, help="Columns for replicates.")] = 3,
    rows: Annotated[int, typer.Option(min=1, max=200, help="Rows, one for each run.")] = 20,
    out: Annotated[Path, typer.Option(help="The XLSX file to write.")] = Path("entry-form.xlsx"),
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Write an entry form to be filled in and taken in."""
    from sameline.reports.entry_form import entry_form

    if out.exists():
        raise CallError("there is a file here already", where=str(out), advice="name another with --out")
    with open_store(store) as lab:
        chosen = [_one(lab, "characteristic", code) for code in dict.fromkeys(characteristics)]
        batches = [_one(lab, "batch", code)["code"] for code in dict.fromkeys(batch or ())]
        lists: dict[str, Sequence[str]] = {
            "batch": batches or _codes(lab, "batch"),
            "analyst": _codes(lab, "person"),
            "instrument": _codes(lab, "instrument"),
        }
    made = entry_form(chosen, lists, replicates, rows)
    try:
        out.write_bytes(made)
    except OSError as error:
        raise CallError(f"the form cannot be written: {error.strerror}", where=str(out)) from error
    say(f"{out}: an entry form for {rows} runs; fill it in, then `sameline take {out}`")


def _one(lab: Lab, kind: str, code: str) -> dict[str, Any]:
    from sameline.records.registry import KINDS, find

    with lab.reading() as reading:
        find(reading.connection, KINDS[kind], code)  # a code that is not registered is refused, with the nearest
    return next(row for row in lab.listing(kind) if row["code"] == code)


def _codes(lab: Lab, kind: str) -> list[str]:
    return [row["code"] for row in lab.listing(kind)]
