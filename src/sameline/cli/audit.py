"""`sameline trail`, `sameline verify`: who did what, and whether the records are as they were recorded."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from sameline.cli.common import (
    DEFAULT_STORE,
    AsOfOption,
    ByOption,
    JsonOption,
    StoreOption,
    open_store,
    say,
    say_changes,
    write,
    write_json,
)
from sameline.errors import CallError, CheckFailedError

if TYPE_CHECKING:
    from collections.abc import Callable

    from sameline.ledger.checkpoint import Checkpoint


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.command()(trail)
    app.command()(verify)
    app.command("catch-up")(catch_up)


def trail(
    person: Annotated[str | None, typer.Option(help="Only this person's acts.")] = None,
    batch: Annotated[str | None, typer.Option(help="Only acts about this batch.")] = None,
    comparison: Annotated[str | None, typer.Option(help="Only acts about this comparison.")] = None,
    since: Annotated[str | None, typer.Option(help="Only acts recorded from this moment on.")] = None,
    until: Annotated[str | None, typer.Option(help="Only acts recorded before this moment.")] = None,
    last: Annotated[int | None, typer.Option(min=1, help="Only so many, the newest.")] = None,
    as_of: AsOfOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """The audit trail: who did what, when, why, to what."""
    with open_store(store) as lab:
        entries = lab.trail(
            as_of, person=person, batch=batch, comparison=comparison, since=since, until=until, last=last
        )
    if as_json:
        from sameline.reports.documents import trail_document

        write_json(trail_document(entries))
        return
    from sameline.reports.history import trail_text

    write(trail_text(entries))


def verify(
    checkpoints: Annotated[
        list[Path] | None,
        typer.Option("--checkpoint", help="A checkpoint's file that the ledger must still agree with."),
    ] = None,
    since: Annotated[
        Path | None, typer.Option(help="A checkpoint's file: check only what came after it, and that it still holds.")
    ] = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Check all records, and compute every conclusion again.

    Every finding is named, and then the exit code is 1.
    """
    given = [_checkpoint(path) for path in checkpoints or ()]
    with open_store(store) as lab:
        report = lab.verify(_progress(), given, None if since is None else _checkpoint(since))
    if as_json:
        from sameline.reports.documents import verification_document

        write_json(verification_document(report))
    else:
        from sameline.reports.history import verification_text

        write(verification_text(report))
    if report.findings:
        raise CheckFailedError(
            f"{len(report.findings)} findings: the records are not as they were recorded",
            where=store,
            advice="keep the file as it is, and compare it with a backup or a checkpoint",
        )


def _checkpoint(path: Path) -> Checkpoint:
    from sameline.ledger.checkpoint import parse_checkpoint

    try:
        return parse_checkpoint(path.read_bytes())
    except OSError as error:
        raise CallError("the checkpoint cannot be read", where=str(path), advice="check the file's name") from error


def _progress() -> Callable[[str, int, int], None] | None:
    if not sys.stderr.isatty():
        return None

    def tell(what: str, done: int, total: int) -> None:
        typer.echo(f"\r{what}: {done} of {total} checked", err=True, nl=done == total)

    return tell


def catch_up(as_json: JsonOption = False, store: StoreOption = DEFAULT_STORE, by: ByOption = None) -> None:
    """Bring comparisons up to date that were left behind.

    A power cut between an act and its answer can leave them behind; the next act does the same.
    """
    with open_store(store, by) as lab:
        outcome = lab.catch_up()
    if not outcome.conclusions and not outcome.behind:
        say("no comparison is behind")
    say_changes(outcome, as_json=as_json)
