"""`sameline log`: one run with its replicates, by options or asked for one after another."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING, Annotated

import typer

from sameline.cli.common import (
    DEFAULT_STORE,
    NEGATIVE_VALUES,
    ByOption,
    JsonOption,
    StoreOption,
    check_no_option,
    open_store,
    say,
    say_changes,
    write,
)
from sameline.errors import CallError, FindingsError

if TYPE_CHECKING:
    from sameline.intake.files import Intake
    from sameline.lab import Lab


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.command(context_settings=NEGATIVE_VALUES)(log)


def log(
    values: Annotated[list[str] | None, typer.Argument(help="The replicates' values as read, such as 12.50.")] = None,
    batch: Annotated[str | None, typer.Option("--batch", "-b", help="Code of the batch.")] = None,
    characteristic: Annotated[
        str | None, typer.Option("--characteristic", "-c", help="Code of what is measured.")
    ] = None,
    at: Annotated[str, typer.Option(help="When it was tested, such as 2026-03-04T08:30; now if left out.")] = "",
    analyst: Annotated[str | None, typer.Option(help="Who tested; the person acting if left out.")] = None,
    instrument: Annotated[str | None, typer.Option(help="Code of the instrument.")] = None,
    session: Annotated[str | None, typer.Option(help="Label of the occasion shared by several batches.")] = None,
    as_they_stand: Annotated[bool, typer.Option("--as-they-stand", help="Record values that are asked about.")] = False,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Record one run with its replicates.

    A run is one batch, one characteristic and one occasion: one analyst, one instrument, one time.
    """
    check_no_option(values or ())
    batch = batch or _ask("batch")
    characteristic = characteristic or _ask("characteristic")
    values = values or _ask("values, with blanks between them").split()
    with open_store(store, by) as lab:
        run = {"batch": batch, "characteristic": characteristic, "tested_at": at, "analyst": analyst or by or ""}
        found = _read(lab, values, {**run, "instrument": instrument or "", "session": session or ""})
        _refuse(found, as_they_stand=as_they_stand)
        outcome = lab.record(found.runs)
        if not as_json:
            _show(lab, outcome.runs, found)
    say_changes(outcome, as_json=as_json)


def _ask(what: str) -> str:
    """Ask for what was not given, where somebody is there to answer."""
    if not sys.stdin.isatty():
        option = "the values" if what.startswith("values") else f"--{what}"
        raise CallError(f"{option} must be given", advice="`sameline log --help` shows the form")
    return str(typer.prompt(what, err=True)).strip()


def _read(lab: Lab, values: list[str], run: dict[str, str]) -> Intake:
    from sameline.intake.bench import read_typed

    with lab.register() as register:
        return read_typed(register, values, **{**run, "tested_at": run["tested_at"] or register.now})


def _refuse(found: Intake, *, as_they_stand: bool) -> None:
    from sameline.intake.bench import typed_finding

    if found.refusals:
        raise FindingsError("nothing was recorded", [typed_finding(f) for f in found.findings])
    if found.questions and not as_they_stand:
        questions = [typed_finding(f) for f in found.questions]
        if sys.stdin.isatty():
            for question in questions:
                say(f"  {question}")
            if typer.confirm("Record it as it stands?", err=True):
                return
        raise FindingsError(
            "there are questions; nothing was recorded", questions, advice="--as-they-stand records the values"
        )


def _show(lab: Lab, runs: tuple[int, ...], found: Intake) -> None:
    from sameline.reports.runs import runs_summary

    with lab.register() as register:
        facts = {run.characteristic: register.characteristics[run.characteristic] for run in found.runs}
    write(runs_summary(runs, found.runs, facts))
