"""`sameline map`: how files with other headings are read, said once and kept."""

from __future__ import annotations

import sys
from dataclasses import replace
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
    write,
    write_json,
)
from sameline.errors import CallError

if TYPE_CHECKING:
    from sameline.intake.dates import DateOrder
    from sameline.intake.headings import HeadingMap, MapColumn

_ORDERS: dict[str, DateOrder] = {"dmy": "dmy", "mdy": "mdy", "ymd": "ymd"}
map_app = typer.Typer(help="Heading maps: how files with other headings are read.", no_args_is_help=True)


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.add_typer(map_app, name="map")


@map_app.command()
def propose(
    file: Annotated[str, typer.Argument(metavar="FILE", help="A file of the kind.")],
    name: Annotated[str, typer.Option("--name", help="The map's name, such as 'tensile rig'.")] = "",
    keep: Annotated[bool, typer.Option("--keep", help="Keep the map as it is shown.")] = False,
    column: Annotated[
        list[str] | None,
        typer.Option("--column", help="What a column is: 'Probe=batch', 'Fmax=value:TS', 'Remark=ignore'."),
    ] = None,
    constant: Annotated[
        list[str] | None, typer.Option("--constant", help="What holds for the whole file: 'analyst=tore'.")
    ] = None,
    dates: Annotated[str | None, typer.Option("--dates", help="Order of the dates: dmy, mdy or ymd.")] = None,
    sheet: Annotated[str | None, typer.Option("--sheet", help="The sheet to look at.")] = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Propose how to read files like this one, and keep it when you agree."""
    from sameline.intake.proposals import propose_map
    from sameline.reports.maps import map_document, proposal_text

    with open_store(store, by) as lab:
        with lab.register() as register:
            proposal = propose_map(file, register, name=name, sheet=sheet)
        form = _told(proposal.map, column or (), constant or (), dates)
        if as_json:
            write_json(map_document(form))
        else:
            write(proposal_text(proposal, form))
        if not keep and not _agreed(form):
            say("not kept; with --name and --keep it is")
            return
        outcome = lab.keep_map(form)
    say(f"map {form.name!r} kept, entry {outcome.entry}; `sameline take` reads files like this with it from now on")


@map_app.command("list")
def list_maps(as_of: AsOfOption = None, as_json: JsonOption = False, store: StoreOption = DEFAULT_STORE) -> None:
    """List the heading maps that are kept, and what they say."""
    from sameline.reports.maps import map_document, maps_text

    with open_store(store) as lab:
        maps = lab.maps(as_of)
    if as_json:
        write_json([{"entry": entry, **map_document(form)} for entry, form in maps])
    else:
        write(maps_text(maps))


def _agreed(form: HeadingMap) -> bool:
    """Whether a person who looks on says yes."""
    return bool(form.name) and not form.missing() and sys.stdin.isatty() and typer.confirm("Keep it so?", err=True)


def _told(
    form: HeadingMap, columns: list[str] | tuple[()], constants: list[str] | tuple[()], dates: str | None
) -> HeadingMap:
    """The proposed map with what the person says laid over it."""
    said = dict(_pair(text, "--column", "'Probe=batch'") for text in columns)
    strange = said.keys() - {column.heading for column in form.columns}
    if strange:
        raise CallError(f"there is no column {min(strange)!r}", advice="write the heading as the file has it")
    fixed = dict(form.constants) | dict(_pair(text, "--constant", "'analyst=tore'") for text in constants)
    order = None if dates is None else _ORDERS.get(dates)
    if dates is not None and order is None:
        raise CallError(f"{dates!r} is no order of dates", advice="dmy, mdy or ymd")
    made = replace(
        form,
        columns=tuple(_said(column, said.get(column.heading)) for column in form.columns),
        constants=tuple(fixed.items()),
    )
    return made if order is None else replace(made, date_order=order)


def _said(column: MapColumn, word: str | None) -> MapColumn:
    if word is None:
        return column
    field, _, code = word.partition(":")
    if field != "value":
        return replace(column, field=field, characteristic=None, unit=None, replicate=None)
    return replace(column, field=field, characteristic=code or column.characteristic)


def _pair(text: str, option: str, example: str) -> tuple[str, str]:
    name, sign, value = text.rpartition("=")
    if not (name.strip() and sign and value.strip()):
        raise CallError(f"{option} {text!r} is not of the form name=value", advice=f"for example {option} {example}")
    return name, value.strip()
