"""`sameline spread`, `sameline size`: how values scatter, and how much to test."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from sameline.cli.common import DEFAULT_STORE, AsOfOption, JsonOption, StoreOption, open_store, write, write_json
from sameline.errors import CallError

if TYPE_CHECKING:
    from sameline.conclusions.planning import Sizes
    from sameline.lab import Lab
    from sameline.stats.plans import Costs


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.command()(spread)
    app.command()(size)


def spread(
    characteristic: Annotated[str, typer.Argument(help="Code of the characteristic.")],
    material: Annotated[str | None, typer.Option(help="Only batches of this material.")] = None,
    supplier: Annotated[str | None, typer.Option(help="Only batches from this supplier.")] = None,
    tested_from: Annotated[str | None, typer.Option(help="Only runs tested from this day on.")] = None,
    tested_before: Annotated[str | None, typer.Option(help="Only runs tested before this day.")] = None,
    as_of: AsOfOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Say how a characteristic scatters.

    From batch to batch, from run to run, from replicate to replicate.
    """
    from sameline.reports.sizes import spread_document, spread_text

    with open_store(store) as lab:
        unit, decimals = _facts(lab, characteristic)
        fit = lab.spread(
            characteristic,
            as_of=as_of,
            material=material,
            supplier=supplier,
            tested_from=tested_from,
            tested_before=tested_before,
        )
    if as_json:
        write_json(spread_document(characteristic, unit, fit))
    else:
        write(spread_text(characteristic, unit, decimals, fit))


def size(
    name: Annotated[
        str | None, typer.Argument(help="A comparison: its spreads, groups, margin and error rate.")
    ] = None,
    characteristic: Annotated[
        str | None, typer.Option("--characteristic", "-c", help="Instead: the spreads of this characteristic.")
    ] = None,
    batch_sd: Annotated[float | None, typer.Option(help="Instead: standard deviation from batch to batch,")] = None,
    run_sd: Annotated[float | None, typer.Option(help="from run to run,")] = None,
    replicate_sd: Annotated[float | None, typer.Option(help="and from replicate to replicate.")] = None,
    groups: Annotated[int, typer.Option(help="Number of groups to be compared.")] = 2,
    difference: Annotated[
        float | None, typer.Option(help="The difference to be shown; the margin if left out.")
    ] = None,
    power: Annotated[float, typer.Option(help="Chance of showing it.")] = 0.8,
    alpha: Annotated[float, typer.Option(help="Family error rate.")] = 0.05,
    procedure: Annotated[str, typer.Option(help="tukey, dunnett, bonferroni or none.")] = "tukey",
    of_batches: Annotated[
        bool, typer.Option("--of-batches", help="The groups are batches: plan runs, not batches.")
    ] = False,
    cost_batch: Annotated[float, typer.Option(help="What one more batch costs,")] = 0.0,
    cost_run: Annotated[float, typer.Option(help="one more run,")] = 0.0,
    cost_replicate: Annotated[float, typer.Option(help="and one more replicate, in one unit.")] = 1.0,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Say how much to test.

    How many batches, runs and replicates to plan, and what would settle an undecided pair.
    """
    from sameline.conclusions.planning import Wanted, sizes
    from sameline.stats.plans import Costs

    costs = Costs(cost_batch, cost_run, cost_replicate)
    given = {"batch": batch_sd, "run": run_sd, "replicate": replicate_sd}
    stated = {level: sd * sd for level, sd in given.items() if sd is not None}
    if (name is not None) + (characteristic is not None) + bool(stated) != 1:
        raise CallError(
            "from which spreads?", advice="name a comparison, or give --characteristic, or --run-sd and others"
        )
    if name is not None:
        found, unit = _of_comparison(store, name, power, difference, costs)
    elif stated:
        wanted = Wanted(groups, _needed(difference), power, alpha, procedure, costs)
        found, unit = sizes(stated, "as given", wanted), "in the unit given"
    else:
        components, margin, unit = _of_characteristic(store, characteristic or "", of_batches=of_batches)
        wanted = Wanted(groups, _needed(difference or margin), power, alpha, procedure, costs)
        found = sizes(components, f"{characteristic} as recorded", wanted)
    _write(found, unit, as_json=as_json)


def _of_comparison(store: str, name: str, power: float, difference: float | None, costs: Costs) -> tuple[Sizes, str]:
    with open_store(store) as lab:
        found = lab.sizes(name, power=power, difference=difference, costs=costs)
        return found, lab.subject(lab.conclusion(name)).unit


def _of_characteristic(store: str, code: str, *, of_batches: bool) -> tuple[dict[str, float], float | None, str]:
    """Components, margin and unit of a characteristic."""
    with open_store(store) as lab:
        row = next((row for row in lab.listing("characteristic") if row["code"] == code), None)
        unit, _ = _facts(lab, code)
        components = dict(lab.spread(code).components)
    if of_batches:
        components.pop("batch", None)
    return components, row["margin"] if row else None, unit


def _write(found: Sizes, unit: str, *, as_json: bool) -> None:
    from sameline.reports.sizes import sizes_document, sizes_text

    if as_json:
        write_json(sizes_document(found, unit))
    else:
        write(sizes_text(found, unit))


def _needed(difference: float | None) -> float:
    if difference is None:
        raise CallError("which difference is to be shown?", advice="give --difference")
    return difference


def _facts(lab: Lab, characteristic: str) -> tuple[str, int]:
    with lab.register() as register:
        if characteristic not in register.characteristics:
            raise CallError(
                f"no characteristic is registered as {characteristic!r}",
                advice="`sameline list characteristics` shows them",
            )
        facts = register.characteristics[characteristic]
    return facts.unit, 2 if facts.decimals is None else facts.decimals
