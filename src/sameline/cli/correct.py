"""`sameline amend`, `exclude`, `restore`: corrections, always with a reason; the original stays readable."""

from __future__ import annotations

from typing import Annotated

import typer

from sameline.cli.common import (
    DEFAULT_STORE,
    NEGATIVE_VALUES,
    ByOption,
    JsonOption,
    ReasonOption,
    StoreOption,
    check_no_option,
    open_store,
    say,
    say_changes,
)
from sameline.errors import CallError

CAUSE_WORDS = (
    "instrument fault, specimen damaged, wrong specimen, method not followed, conditions out of range, "
    "copying error, or other stated cause"
)

Run = Annotated[int | None, typer.Option("--run", help="Number of the run.")]
Replicate = Annotated[int | None, typer.Option("--replicate", help="Number of the replicate within the run.")]
Batch = Annotated[str | None, typer.Option("--batch", help="Code of the batch.")]


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.command(context_settings=NEGATIVE_VALUES)(amend)
    app.command()(exclude)
    app.command()(restore)
    app.command()(reverse)


def amend(
    value: Annotated[str, typer.Argument(help="The value as it should have been recorded.")],
    run: Annotated[int, typer.Option("--run", help="Number of the run.")],
    replicate: Annotated[int, typer.Option("--replicate", help="Number of the replicate within the run.")],
    reason: ReasonOption,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Correct a recorded value."""
    check_no_option([value])
    with open_store(store, by) as lab:
        measurement, draft = lab.corrected(run, replicate, value)
        outcome = lab.amend(measurement, draft, reason=reason)
    say(f"run {run}, replicate {replicate}: {measurement.text} amended to {draft.text}, entry {outcome.entry}")
    say_changes(outcome, as_json=as_json)


def exclude(
    cause: Annotated[str, typer.Option(help=f"The assignable cause: {CAUSE_WORDS}.")],
    reason: ReasonOption,
    run: Run = None,
    replicate: Replicate = None,
    batch: Batch = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Set a replicate, run or batch aside, with its cause."""
    with open_store(store, by) as lab:
        words, what = lab.named(run=run, replicate=replicate, batch=batch)
        outcome = lab.exclude(cause, reason=reason, **what)
    say(f"{words} set aside ({cause}), entry {outcome.entry}")
    say_changes(outcome, as_json=as_json)


def restore(
    reason: ReasonOption,
    run: Run = None,
    replicate: Replicate = None,
    batch: Batch = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Put back what was set aside."""
    if run is None and batch is None:
        raise CallError("what is to be put back?", advice="name it with --run, --run and --replicate, or --batch")
    with open_store(store, by) as lab:
        words, what = lab.named(run=run, replicate=replicate, batch=batch)
        outcome = lab.restore(reason=reason, **what)
    say(f"{words} put back, entry {outcome.entry}")
    say_changes(outcome, as_json=as_json)


def reverse(
    entry: Annotated[int, typer.Argument(help="Number of the entry, as `sameline trail` shows it.")],
    reason: ReasonOption,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Reverse a whole entry, such as a file taken in by mistake.

    Runs that it recorded are set aside, corrections that it made are undone; what it wrote stays readable.
    """
    with open_store(store, by) as lab:
        outcome = lab.reverse(entry, reason=reason)
    say(f"entry {entry} reversed, entry {outcome.entry}")
    say_changes(outcome, as_json=as_json)
