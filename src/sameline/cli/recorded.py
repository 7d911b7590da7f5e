"""`sameline runs`: what is recorded, with the numbers by which amendments and exclusions name it."""

from __future__ import annotations

from typing import Annotated

import typer

from sameline.cli.common import DEFAULT_STORE, AsOfOption, JsonOption, StoreOption, open_store, write, write_json


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.command()(runs)


def runs(
    batch: Annotated[str | None, typer.Option("--batch", "-b", help="Only runs of this batch.")] = None,
    characteristic: Annotated[
        str | None, typer.Option("--characteristic", "-c", help="Only runs of this characteristic.")
    ] = None,
    last: Annotated[int | None, typer.Option(min=1, help="Only so many, the newest.")] = None,
    as_of: AsOfOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """List recorded runs with their numbers and values."""
    with open_store(store) as lab:
        from sameline.reports.recorded import recorded_runs, recorded_text

        with lab.reading(as_of) as reading:
            found = recorded_runs(reading, batch=batch, characteristic=characteristic, last=last)
    if as_json:
        from dataclasses import asdict

        write_json([asdict(run) for run in found])
    else:
        write(recorded_text(found))
