"""`sameline init`: make a store."""

from __future__ import annotations

from typing import Annotated

import typer

from sameline.cli.common import DEFAULT_STORE, ByOption, StoreOption, say
from sameline.errors import CallError


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.command()(init)


def init(
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
    name: Annotated[str | None, typer.Option(help="Your full name.")] = None,
    role: Annotated[str | None, typer.Option(help="What you do, such as quality engineer.")] = None,
    laboratory: Annotated[str, typer.Option(help="The laboratory's name.")] = "Laboratory",
    zone: Annotated[str, typer.Option(help="Its time zone; moments written without a zone are in it.")] = "UTC",
    upgrade: Annotated[bool, typer.Option("--upgrade", help="Bring an older store to this Sameline's schema.")] = False,
) -> None:
    """Make a store, with yourself as its first person."""
    from sameline.lab import make_lab

    if by is None and not upgrade:
        raise CallError("who makes the store?", advice="give --by CODE, a short code for yourself")
    with make_lab(store, by=by or "", person_name=name, role=role, name=laboratory, zone=zone, upgrade=upgrade):
        say(f"{store}: {'upgraded' if upgrade else 'ready'}")
