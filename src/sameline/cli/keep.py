"""`sameline key`, `checkpoint`, `backup`, `copy`: what makes the records provable, and keeps them."""

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
    ReasonOption,
    StoreOption,
    open_store,
    say,
    write,
    write_json,
)
from sameline.errors import CallError

if TYPE_CHECKING:
    from sameline.records.findings import LedgerReport

key_app = typer.Typer(help="Keys that persons sign with: make, list, revoke.", no_args_is_help=True)

KeyFile = Annotated[Path, typer.Option("--key", help="Your private key's file.")]
Passphrase = Annotated[
    str | None,
    typer.Option(
        envvar="SAMELINE_PASSPHRASE", show_envvar=True, help="What opens the key's file; asked for if left out."
    ),
]


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.add_typer(key_app, name="key")
    app.command()(sign)
    app.command()(checkpoint)
    app.command()(backup)
    app.command()(copy)


@key_app.command("make")
def make_key(
    file: Annotated[Path, typer.Argument(help="The file to make for the private key. Keep it to yourself.")],
    passphrase: Passphrase = None,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Make a key pair: the private key in a file that a passphrase opens, the public one registered in the store."""
    from sameline.ledger.signatures import key_id, make_key_file

    if by is None:
        raise CallError("whose key is it?", advice="give --by CODE, or set SAMELINE_BY")
    with open_store(store, by) as lab:
        lab.listing("person")  # an unusable store is found before a key is made
        made = make_key_file(file, passphrase or _ask_twice())
        outcome = lab.register_key(by, made.public)
    say(f"key {key_id(made.public)} of {by} registered, entry {outcome.entry}; the private key is in {file}")


@key_app.command("list")
def list_keys(as_of: AsOfOption = None, as_json: JsonOption = False, store: StoreOption = DEFAULT_STORE) -> None:
    """List the public keys and whether they hold."""
    from sameline.reports.keys import keys_document, keys_text

    with open_store(store) as lab:
        keys = lab.keys(as_of)
    if as_json:
        write_json(keys_document(keys))
    else:
        write(keys_text(keys))


@key_app.command("revoke")
def revoke_key(
    name: Annotated[str, typer.Argument(help="The key's short name, as `sameline key list` shows it.")],
    reason: ReasonOption,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Revoke a lost or retired key: nothing signed with it from now on counts."""
    with open_store(store, by) as lab:
        outcome = lab.revoke_key(name, reason=reason)
    say(f"key {name} revoked, entry {outcome.entry}")


def sign(
    name: Annotated[str, typer.Argument(help="The comparison whose latest conclusion you sign.")],
    meaning: Annotated[str, typer.Option("--as", help="What your signature means: prepared, reviewed or approved.")],
    key: KeyFile,
    passphrase: Passphrase = None,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Sign a conclusion.

    The approver is another person than the one who prepared it. A later version is not signed by it.
    """
    from sameline.ledger.signatures import read_key_file

    with open_store(store, by) as lab:
        signed = lab.sign(name, meaning, read_key_file(key, passphrase or _ask("passphrase")))
    say(f"{signed.name} v{signed.version} signed as {meaning} by {by}")


def checkpoint(
    key: KeyFile,
    out: Annotated[Path, typer.Option(help="The file to write.")] = Path("checkpoint.txt"),
    passphrase: Passphrase = None,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Sign the ledger's size and root into a small text file.

    Mail it, print it, post it: it proves what was there.
    """
    from sameline.ledger.signatures import read_key_file

    if out.exists():
        raise CallError("there is a file here already", where=str(out), advice="name another with --out")
    with open_store(store, by) as lab:
        signed = lab.checkpoint(read_key_file(key, passphrase or _ask("passphrase")))
    out.write_bytes(signed.to_bytes())
    say(f"{out}: {signed.entries} entries, root {signed.root.hex()}")


def backup(
    path: Annotated[Path, typer.Argument(help="The file to make.")],
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Copy the store to a new file, and check the copy.

    Others may use the store meanwhile.
    """
    with open_store(store) as lab:
        _say_copied(str(path), lab.backup(path))


def copy(
    place: Annotated[str, typer.Argument(help="A new file, or the URL of an empty database.")],
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Copy the store to another database.

    SQLite or PostgreSQL; ledger and root stay what they are.
    """
    with open_store(store) as lab:
        report = lab.copy(place)
    _say_copied("the copy", report)  # a URL may hold a password


def _say_copied(place: str, report: LedgerReport) -> None:
    say(f"{place}: {report.entries} entries and {report.rows} rows copied and checked, root {report.root}")


def _ask(what: str) -> str:
    if not sys.stdin.isatty():
        raise CallError(f"the {what} must be given", advice="set SAMELINE_PASSPHRASE")
    return str(typer.prompt(what, hide_input=True, err=True))


def _ask_twice() -> str:
    first = _ask("passphrase for the new key")
    if _ask("the same again") != first:
        raise CallError("the two passphrases differ; nothing was made")
    return first
