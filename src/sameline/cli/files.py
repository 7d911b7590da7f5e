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
    from collections.abc import Callable, Iterable

    from sameline.intake.rawfiles import RawFile
    from sameline.lab import Lab, Taken


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.command()(take)


def take(
    files: Annotated[list[str], typer.Argument(metavar="FILE…", help="The files; - for standard input.")],
    check: Annotated[bool, typer.Option("--check", help="Only report what is in them; record nothing.")] = False,
    as_they_stand: Annotated[bool, typer.Option("--as-they-stand", help="Record values that are asked about.")] = False,
    good_runs: Annotated[
        Path | None,
        typer.Option("--good-runs", help="Record the runs without a fault; write the rest into this folder."),
    ] = None,
    only_map: Annotated[
        str | None, typer.Option("--map", help="Read with this heading map, where several fit.")
    ] = None,
    mark: Annotated[
        Path | None, typer.Option("--mark", help="Write a copy of an XLSX file with the cells of findings marked.")
    ] = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Take in files of results: every new run, or none.

    Runs that are recorded already are passed over.
    """
    with open_store(store, by) as lab:
        opened = _opened(files)
        if mark is not None:
            opened = [_marked(lab, opened, mark, only_map)]
        taken = lab.take(
            opened,
            check_only=check,
            as_they_stand=as_they_stand,
            good_runs=good_runs,
            only_map=only_map,
            progress=_progress(),
        )
    if check:
        _report(taken, as_json=as_json)
        return
    _show(taken, as_json=as_json)


def _marked(lab: Lab, files: list[Path | str | RawFile], out: Path, only_map: str | None) -> RawFile:
    """Write the marked copy of a workbook if there is anything to mark; returns the workbook, read once."""
    from sameline.intake.marked import marked_copy
    from sameline.intake.rawfiles import RawFile, load

    if len(files) != 1:
        raise CallError("--mark takes one file", advice="take the others in by themselves")
    if out.exists():
        raise CallError("there is a file here already", where=str(out), advice="name another with --mark")
    raw = files[0] if isinstance(files[0], RawFile) else load(files[0])
    found = lab.take([raw], check_only=True, only_map=only_map).intake
    if found.findings:
        out.write_bytes(marked_copy(raw, found))
        marks = f"{len(found.findings)} finding{'s' if len(found.findings) > 1 else ''} marked"
        say(f"{out}: a copy of {raw.name} with {marks}; mend the original, not the copy")
    return raw


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
    findings = [str(finding) for finding in taken.intake.findings]
    if as_json:
        write_json({"runs": len(taken.intake.runs), "recorded_already": taken.passed, "findings": findings})
    else:
        _say_all(taken.passed)
        say(f"{len(taken.intake.runs)} runs without a fault; nothing was recorded, as asked")
    if findings:
        raise FindingsError("the files have findings", findings)


def _show(taken: Taken, *, as_json: bool) -> None:
    from sameline.lab.outcomes import by_source
    from sameline.reports.documents import outcome_document
    from sameline.reports.runs import runs_summary

    _say_all(taken.passed)
    if as_json:
        write_json([outcome_document(outcome.entry, outcome.runs, outcome.conclusions) for outcome in taken.outcomes])
    for (source, drafts), outcome in zip(by_source(taken.intake), taken.outcomes, strict=True):
        if as_json:
            say_behind(outcome)
            continue
        say(f"{source.name}: taken in, entry {outcome.entry}")
        write(runs_summary(outcome.runs, drafts, taken.facts))
        say_changes(outcome)
    _say_left(taken)


def _say_left(taken: Taken) -> None:
    """Say what was not taken, and where it waits."""
    if not taken.intake.refusals:
        return
    say("not everything was taken in:")
    _say_all(f"  {finding}" for finding in taken.intake.refusals)
    _say_all(f"{path}: the rest, to be mended and taken in" for path in taken.rest)


def _say_all(lines: Iterable[str]) -> None:
    for line in lines:
        say(line)
