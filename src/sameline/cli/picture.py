"""`sameline picture`: what is concluded and recorded, as SVG, as PNG, or as text for a terminal."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from sameline.cli.common import (
    DEFAULT_STORE,
    AsOfOption,
    JsonOption,
    StoreOption,
    open_store,
    say,
    write,
    write_json,
)
from sameline.errors import CallError

if TYPE_CHECKING:
    from collections.abc import Sequence

    from sameline.lab import Lab
    from sameline.records.answers import Conclusion
    from sameline.reports.pictures.drawing import Picture

picture_app = typer.Typer(no_args_is_help=True, help="Draw what is concluded and recorded.")

Name = Annotated[str, typer.Argument(help="The comparison.")]
Code = Annotated[str, typer.Argument(help="Code of the characteristic.")]
ToOption = Annotated[
    list[Path] | None,
    typer.Option("--to", help="A file to write, .svg or .png; may be given more than once. Without it, text."),
]
WidthOption = Annotated[float, typer.Option("--width", help="In mm; 85 is a column of a page, 170 its text.")]
VersionOption = Annotated[int | None, typer.Option(help="This version of its conclusion instead of the latest.")]
MaterialOption = Annotated[str | None, typer.Option(help="Only batches of this material.")]
SupplierOption = Annotated[str | None, typer.Option(help="Only batches from this supplier.")]

FORMS = (".svg", ".png")
PAGE = 170.0


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.add_typer(picture_app, name="picture")


@picture_app.command()
def groups(
    name: Name,
    version: VersionOption = None,
    alike: Annotated[
        bool, typer.Option("--alike", help="Mark the pairs not shown to differ, instead of those that are.")
    ] = False,
    to: ToOption = None,
    width: WidthOption = PAGE,
    as_of: AsOfOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Every run and replicate, group means with intervals, limits, lines, and what differs."""
    from sameline.reports.pictures.content import read_concluded_runs
    from sameline.reports.pictures.groups import ALIKE, DIFFER, groups_picture

    files = _files(to)
    with open_store(store) as lab:
        conclusion = lab.conclusion(name, version, as_of)
        subject, behind = lab.subject(conclusion), _behind(lab, conclusion, version, as_of)
        with lab.reading() as reading:
            runs = read_concluded_runs(reading, conclusion)
    marks = ALIKE if alike else DIFFER
    _put(groups_picture(conclusion, subject, runs, width=width, marks=marks, behind=behind), files, as_json=as_json)


@picture_app.command()
def pairs(
    name: Name,
    version: VersionOption = None,
    to: ToOption = None,
    width: WidthOption = PAGE,
    as_of: AsOfOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Differences with their simultaneous intervals, against zero and the margin."""
    from sameline.reports.pictures.content import read_concluded_runs
    from sameline.reports.pictures.pairs import pairs_picture

    files = _files(to)
    with open_store(store) as lab:
        conclusion = lab.conclusion(name, version, as_of)
        subject, behind = lab.subject(conclusion), _behind(lab, conclusion, version, as_of)
        with lab.reading() as reading:
            runs = read_concluded_runs(reading, conclusion)
    _put(pairs_picture(conclusion, subject, runs, width=width, behind=behind), files, as_json=as_json)


@picture_app.command()
def evidence(
    name: Name,
    pair: Annotated[
        list[str] | None, typer.Argument(help="Two of its groups; the pair judged longest and best if left out.")
    ] = None,
    to: ToOption = None,
    width: WidthOption = PAGE,
    as_of: AsOfOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """One pair's difference, interval and verdict, look by look."""
    from sameline.reports.pictures.content import read_concluded_runs
    from sameline.reports.pictures.evidence import evidence_picture, strongest_pair

    files = _files(to)
    if pair and len(pair) != 2:
        raise CallError(f"a pair is of two groups, not {len(pair)}", advice="name both, or none")
    with open_store(store) as lab:
        versions = lab.history(name, as_of)
        if not versions:
            raise CallError(f"{name!r} had no conclusion by then", advice="choose a later moment")
        latest = versions[-1]
        subject, behind = lab.subject(latest), _behind(lab, latest, None, as_of)
        with lab.reading() as reading:
            runs = read_concluded_runs(reading, latest)
    chosen = (pair[0], pair[1]) if pair else strongest_pair(versions)
    _put(evidence_picture(versions, subject, runs, chosen, width=width, behind=behind), files, as_json=as_json)


@picture_app.command("over-time")
def over_time(
    characteristic: Code,
    material: MaterialOption = None,
    supplier: SupplierOption = None,
    last: Annotated[int | None, typer.Option(min=1, help="Only so many batches, the newest.")] = None,
    to: ToOption = None,
    width: WidthOption = PAGE,
    as_of: AsOfOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Batches in order, with limits, the spread of runs, amendments and exclusions."""
    from sameline.reports.pictures.content import read_shown
    from sameline.reports.pictures.over_time import over_time_picture

    files = _files(to)
    with open_store(store) as lab, lab.reading(as_of) as reading:
        shown = read_shown(reading, characteristic, material=material, supplier=supplier, last=last)
    _put(over_time_picture(shown, width=width), files, as_json=as_json)


@picture_app.command()
def spread(
    characteristic: Code,
    material: MaterialOption = None,
    supplier: SupplierOption = None,
    to: ToOption = None,
    width: WidthOption = PAGE,
    as_of: AsOfOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Variance components: from batch to batch, run to run, replicate to replicate."""
    from sameline.reports.pictures.content import read_shown
    from sameline.reports.pictures.spread import spread_picture

    files = _files(to)
    with open_store(store) as lab:
        with lab.reading(as_of) as reading:
            shown = read_shown(reading, characteristic, material=material, supplier=supplier)
        fit = lab.spread(characteristic, as_of=as_of, material=material, supplier=supplier)
    _put(spread_picture(fit, shown, width=width), files, as_json=as_json)


@picture_app.command()
def power(
    name: Name,
    difference: Annotated[
        float | None, typer.Option(help="The difference to be shown; the margin if left out.")
    ] = None,
    wanted: Annotated[float, typer.Option("--power", help="Chance of showing it.")] = 0.8,
    to: ToOption = None,
    width: WidthOption = PAGE,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """The power curve of the cheapest plan that `sameline size` finds for a comparison."""
    from sameline.reports.pictures.power import power_picture

    files = _files(to)
    with open_store(store) as lab:
        conclusion = lab.conclusion(name)
        unit = lab.subject(conclusion).unit
        found = lab.sizes(name, power=wanted, difference=difference)
    _put(power_picture(found, name, unit, position=conclusion.position, width=width), files, as_json=as_json)


def _behind(lab: Lab, conclusion: Conclusion, version: int | None, as_of: str | None) -> bool:
    return version is None and as_of is None and lab.is_behind(conclusion)


def _files(to: Sequence[Path] | None) -> list[Path]:
    files = list(to or ())
    for file in files:
        if file.suffix.lower() not in FORMS:
            raise CallError(
                f"a picture cannot be written as {file.name!r}", advice="name a file ending in .svg or .png"
            )
    return files


def _put(picture: Picture, files: Sequence[Path], *, as_json: bool) -> None:
    for file in files:
        content = picture.svg() if file.suffix.lower() == ".svg" else picture.png()
        try:
            file.write_bytes(content)
        except OSError as error:
            raise CallError(f"it cannot be written: {error.strerror}", where=str(file)) from error
        say(f"{file}: written")
    if as_json:
        document = {"title": picture.title, "caption": picture.caption, "files": [str(file) for file in files]}
        write_json({**document, "text": list(picture.text)})
    elif not files:
        write(picture.text)
