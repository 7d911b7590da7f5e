"""What the commands share: the store and the acting person, opening a lab, and saying what an act did."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING, Annotated, Any

import typer

from sameline.errors import CallError

if TYPE_CHECKING:
    from collections.abc import Iterable

    from sameline.lab import Lab, Outcome

StoreOption = Annotated[
    str,
    typer.Option("--store", envvar="SAMELINE_STORE", help="The store: a file, or a database URL.", show_envvar=True),
]
ByOption = Annotated[
    str | None, typer.Option("--by", envvar="SAMELINE_BY", help="Code of the person acting.", show_envvar=True)
]
JsonOption = Annotated[bool, typer.Option("--json", help="Write JSON for other programs.")]
AsOfOption = Annotated[
    str | None, typer.Option("--as-of", help="As the records were: an entry's number, a date, or a date and time.")
]
ReasonOption = Annotated[str, typer.Option("--reason", help="Why; it stands in the audit trail.")]
MaybeReasonOption = Annotated[str | None, typer.Option("--reason", help="Why, if there is something to say.")]

DEFAULT_STORE = "lab.db"
NEGATIVE_VALUES = {"ignore_unknown_options": True}
"""Settings of commands whose arguments are values: -42 is a value there, not an option."""


def open_store(store: str, by: str | None = None) -> Lab:
    """The laboratory that a command works on."""
    from sameline.lab import open_lab

    return open_lab(store, by=by)


def check_no_option(values: Iterable[str]) -> None:
    """Refuse a misspelt option among values, where negative values are let through.

    Raises:
        CallError: one of them is no value but looks like an option.
    """
    for value in values:
        if value.startswith("--") or (value.startswith("-") and value[1:2].isalpha()):
            raise CallError(f"there is no option {value}", advice="the command with --help lists its options")


def write(lines: Iterable[str]) -> None:
    """Write lines of text to standard output."""
    for line in lines:
        typer.echo(line)


def write_json(document: Any) -> None:  # noqa: ANN401 - any JSON value
    """Write a JSON document to standard output."""
    typer.echo(json.dumps(document, ensure_ascii=False, indent=2, allow_nan=False))


def say(line: str) -> None:
    """Write a message to standard error."""
    typer.echo(line, err=True)


def say_changes(outcome: Outcome, *, as_json: bool = False) -> None:
    """Say in one line each what an act changed; with `as_json`, as a document on standard output."""
    from sameline.reports.changes import change_line

    if as_json:
        from sameline.reports.documents import outcome_document

        write_json(outcome_document(outcome.entry, outcome.runs, outcome.conclusions))
    else:
        write(change_line(conclusion) for conclusion in outcome.conclusions)
    say_behind(outcome)


def say_behind(outcome: Outcome) -> None:
    """Say which comparisons an act left behind, and why."""
    for name, reason in outcome.behind:
        say(f"{name} is BEHIND: it could not be brought up to date ({reason}); the next act tries again")
