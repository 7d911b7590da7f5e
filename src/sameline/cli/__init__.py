"""The command line: one command group a file; no rule of the laboratory lives here.

Messages go to standard error, data to standard output. Exit codes: 0 done; 1 the answer is no; 2 the call was wrong;
3 the store cannot be used. This file turns an error into a message and a code, once.
"""

from __future__ import annotations

import sys

import typer

from sameline.cli import (
    ask,
    audit,
    bench,
    conform,
    correct,
    files,
    keep,
    maps,
    picture,
    plan,
    recorded,
    register,
    setup,
    sheet,
    tour,
    watch,
)
from sameline.errors import FindingsError, SamelineError

app = typer.Typer(
    name="sameline",
    help="Records of a quality-control laboratory, and the defended answer to: which lots really differ?",
    no_args_is_help=True,
    add_completion=False,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
)
STOPPED = 130
"""The exit code where a person stopped the command."""

for group in (
    setup,
    register,
    bench,
    sheet,
    files,
    maps,
    watch,
    recorded,
    correct,
    ask,
    plan,
    picture,
    conform,
    audit,
    keep,
    tour,
):
    group.add_to(app)


def main() -> None:
    """Run the command line and end the process with its exit code."""
    sys.exit(run(sys.argv[1:]))


def run(arguments: list[str]) -> int:
    """Run one command; returns the exit code."""
    try:
        code = int(app(arguments, standalone_mode=False) or 0)
    except SamelineError as error:
        say_error(error)
        code = error.exit_code
    except typer.TyperException as error:
        say_call(error)
        code = 2
    except typer.Abort:
        code = STOPPED
    except SystemExit:  # typer's answer to a reader of the output that went away, such as `| head`
        code = 0
    if code == STOPPED:  # typer's answer to the keyboard
        typer.echo("stopped; what was not confirmed is not recorded", err=True)
    return code


def say_call(error: typer.TyperException) -> None:
    """Write what is wrong with a call, and where its form is told."""
    typer.echo(f"sameline: {error.format_message().rstrip('.')}", err=True)
    command = getattr(getattr(error, "ctx", None), "command_path", "sameline")
    typer.echo(f"  `{command} --help` tells how it is called", err=True)


def say_error(error: SamelineError) -> None:
    """Write what is wrong, where, and what to do; every finding on a line of its own."""
    place = f"{error.where}: " if error.where else ""
    typer.echo(f"sameline: {place}{error.message}", err=True)
    if isinstance(error, FindingsError):
        for finding in error.findings:
            typer.echo(f"  {finding}", err=True)
    if error.advice:
        typer.echo(f"  {error.advice}", err=True)
