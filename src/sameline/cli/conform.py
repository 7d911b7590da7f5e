"""`sameline conform`, `sameline capability`: a batch, and a supplier's batches, against the specification limits."""

from __future__ import annotations

from typing import Annotated

import typer

from sameline.cli.common import DEFAULT_STORE, AsOfOption, JsonOption, StoreOption, open_store, write, write_json


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.command()(conform)
    app.command()(capability)


def conform(
    batch: Annotated[str, typer.Argument(help="Code of the batch.")],
    characteristic: Annotated[str, typer.Argument(help="Code of the characteristic.")],
    rule: Annotated[
        list[str] | None,
        typer.Option(
            help="simple acceptance, guarded acceptance, guarded rejection, ISO 14253-1 or JCGM 106; "
            "may be given more than once. All, if left out."
        ),
    ] = None,
    probability: Annotated[float, typer.Option(help="Limiting probability of ISO 14253-1 and JCGM 106.")] = 0.95,
    other: Annotated[
        float, typer.Option("--other-uncertainty", help="Another standard uncertainty, such as the calibration's.")
    ] = 0.0,
    as_of: AsOfOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Say whether a batch keeps its specification limits.

    By its mean, with the mean's uncertainty taken into account.
    """
    from sameline.reports.conformity import read_conformity
    from sameline.reports.conformity_text import conformity_document, conformity_text
    from sameline.stats.conformity import RULES

    with open_store(store) as lab, lab.reading(as_of) as reading:
        found = read_conformity(reading, batch, characteristic, rule or RULES, probability=probability, other=other)
    if as_json:
        write_json(conformity_document(found))
    else:
        write(conformity_text(found))


def capability(
    supplier: Annotated[str, typer.Argument(help="Code of the supplier.")],
    characteristic: Annotated[str, typer.Argument(help="Code of the characteristic.")],
    material: Annotated[str | None, typer.Option(help="Only batches of this material.")] = None,
    alpha: Annotated[float, typer.Option(help="1 - the confidence of each interval.")] = 0.05,
    as_of: AsOfOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Say how well a supplier's batches keep the limits.

    As performance indices with intervals.
    """
    from sameline.reports.conformity import read_capability
    from sameline.reports.conformity_text import capability_document, capability_text

    with open_store(store) as lab, lab.reading(as_of) as reading:
        found = read_capability(reading, supplier, characteristic, material=material, alpha=alpha)
    if as_json:
        write_json(capability_document(found))
    else:
        write(capability_text(found))
