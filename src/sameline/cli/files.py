"""`sameline take`: bring in files of results."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from sameline.cli.common import (
    DEFAULT_STORE,
    ByOption,
    JsonOption,
    StoreOption,
    open_store,
    say,
    say_behind,
    say_changes,
    write,
    write_json,
)
from sameline.errors import CallError, FindingsError

if TYPE_CHECKING:
    from collections.abc import Callable

    from sameline.intake.rawfiles import RawFile
    from sameline.lab import Taken


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.command()(take)


def take(
    files: Annotated[list[str], typer.Argument(metavar="FILE…", help="The files; - for standard input.")],
    check: Annotated[bool, typer.Option("--check", help="Only report what is in them; record nothing.")] = False,
    as_they_stand: Annotated[bool, typer.Option("--as-they-stand", help="Record values that are asked about.")] = False,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Take in files of results: every run of a file, or none."""
    with open_store(store, by) as lab:
        taken = lab.take(_opened(files), check_only=check, as_they_stand=as_they_stand, progress=_progress())
    if check:
        _report(taken, as_json=as_json)
        return
    _show(taken, as_json=as_json)


def _opened(files: list[str]) -> list[Path | str | RawFile]:
    if "-" not in files:
        return list(files)
    from sameline.intake.rawfiles import load_stream

    if files.count("-") > 1:
        raise CallError("standard input can be read only once")
    return [load_stream(sys.stdin.buffer) if file == "-" else file for file in files]


def _progress() -> Callable[[str, int], None] | None:
    """Tell how many rows were read, where a person looks on."""
    if not sys.stderr.isatty():
        return None

    def tell(name: str, rows: int) -> None:
        if rows:
            typer.echo(f"\r{name}: {rows} rows read", err=True, nl=False)

    return tell


def _report(taken: Taken, *, as_json: bool) -> None:
    findings = taken.intake.findings
    if as_json:
        write_json({"runs": len(taken.intake.runs), "findings": [str(f) for f in findings]})
    else:
        say(f"{len(taken.intake.runs)} runs without a fault; nothing was recorded, as asked")
    if findings:
        raise FindingsError("the files have findings", [str(f) for f in findings])


def _show(taken: Taken, *, as_json: bool) -> None:
    from sameline.lab.outcomes import by_source
    from sameline.reports.documents import outcome_document
    from sameline.reports.runs import runs_summary

    if as_json:
        write_json([outcome_document(outcome.entry, outcome.runs, outcome.conclusions) for outcome in taken.outcomes])
    for (source, drafts), outcome in zip(by_source(taken.intake), taken.outcomes, strict=True):
        if as_json:
            say_behind(outcome)
            continue
        say(f"{source.name}: taken in, entry {outcome.entry}")
        write(runs_summary(outcome.runs, drafts, taken.facts))
        say_changes(outcome)
