"""`sameline watch`: take in the files that an instrument drops into a folder."""

from __future__ import annotations

import time
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from sameline.cli.common import DEFAULT_STORE, ByOption, StoreOption, open_store, say, say_changes
from sameline.errors import CallError

if TYPE_CHECKING:
    from sameline.lab.watching import Folder, Handled


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.command()(watch)


def watch(
    folder: Annotated[Path, typer.Argument(help="The folder into which files are dropped.")],
    once: Annotated[bool, typer.Option("--once", help="Go through the folder once and end.")] = False,
    make: Annotated[bool, typer.Option("--make", help="Make the folder if it is not there.")] = False,
    settle: Annotated[
        float, typer.Option(min=0, max=3600, help="Seconds for which a file must not have changed.")
    ] = 2.0,
    as_they_stand: Annotated[bool, typer.Option("--as-they-stand", help="Record values that are asked about.")] = False,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Take in the files dropped into a folder.

    Those that are recorded go to taken/, those with findings to held/.
    """
    from sameline.lab.watching import Folder, make_folder

    if Path(store).is_file() and Path(store).resolve().parent == folder.resolve():
        raise CallError("the store lies in this folder", where=str(folder), advice="watch another; the store stays")
    if make:
        make_folder(folder)
    watched = Folder(folder)
    open_store(store, by).close()  # an unusable store is told at once, not with the first file
    watched.complete()
    if not once:
        say(f"watching {folder}; stop with Ctrl-C")
    held = False
    while True:
        time.sleep(settle)
        held |= _go_through(watched, store, by, as_they_stand=as_they_stand)
        if once:
            break
    if held:
        raise typer.Exit(1)


def _go_through(watched: Folder, store: str, by: str | None, *, as_they_stand: bool) -> bool:
    """Handle what is complete; returns whether a file was held."""
    from sameline.lab.watching import handle

    held = False
    for path in watched.complete():
        with open_store(store, by) as lab:
            done = handle(lab, path, as_they_stand=as_they_stand)
        _tell(done)
        held |= done.held
    return held


def _tell(done: Handled) -> None:
    if done.place is None:
        say(f"{done.name}: left where it is")
    elif done.held:
        say(f"{done.name}: held, with its findings beside it: {done.place}")
    elif done.taken is None:
        say(f"{done.name}: nothing new; moved to {done.place}")
    else:
        entries = ", ".join(str(outcome.entry) for outcome in done.taken.outcomes)
        say(f"{done.name}: taken in, entry {entries}; moved to {done.place}")
    for line in done.says:
        say(f"  {line}")
    for outcome in done.taken.outcomes if done.taken else ():
        say_changes(outcome)
