"""`sameline add`, `sameline list`, `sameline restate`: what is registered."""

from __future__ import annotations

from typing import Annotated, Any

import typer

from sameline.cli.common import (
    DEFAULT_STORE,
    AsOfOption,
    ByOption,
    JsonOption,
    MaybeReasonOption,
    ReasonOption,
    StoreOption,
    open_store,
    say,
    say_changes,
    write,
    write_json,
)
from sameline.errors import CallError

add_app = typer.Typer(help="Register what is tested, with what, and by whom.", no_args_is_help=True)
restate_app = typer.Typer(help="State registered particulars anew; the old ones stay.", no_args_is_help=True)

KINDS = ("supplier", "material", "batch", "characteristic", "instrument", "person")

Code = Annotated[str, typer.Argument(help="A short code; it never changes.")]
Name = Annotated[str | None, typer.Option(help="The full name; the code if left out.")]
Note = Annotated[str | None, typer.Option(help="Anything worth knowing beside it.")]
Lower = Annotated[float | None, typer.Option(help="Lower specification limit.")]
Upper = Annotated[float | None, typer.Option(help="Upper specification limit.")]
Target = Annotated[float | None, typer.Option(help="Target value.")]
Margin = Annotated[float | None, typer.Option(help="The smallest difference that matters in use, in the unit.")]
Decimals = Annotated[int | None, typer.Option(min=0, max=12, help="Decimals reported.")]
Critical = Annotated[
    bool | None, typer.Option("--safety-critical/--not-safety-critical", help="A safety-critical part depends on it.")
]


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.add_typer(add_app, name="add")
    app.add_typer(restate_app, name="restate")
    app.command("list")(list_registered)


def _add(store: str, by: str | None, kind: str, code: str, reason: str | None, **particulars: Any) -> None:  # noqa: ANN401
    with open_store(store, by) as lab:
        entry = lab.add(kind, code, reason=reason, **particulars).entry
    say(f"{kind} {code} registered, entry {entry}")


@add_app.command()
def supplier(
    code: Code,
    name: Name = None,
    note: Note = None,
    reason: MaybeReasonOption = None,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Register a supplier."""
    _add(store, by, "supplier", code, reason, name=name or code, note=note)


@add_app.command()
def material(
    code: Code,
    name: Name = None,
    note: Note = None,
    reason: MaybeReasonOption = None,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Register a material: a formulation or grade."""
    _add(store, by, "material", code, reason, name=name or code, note=note)


@add_app.command()
def instrument(
    code: Code,
    name: Name = None,
    note: Note = None,
    reason: MaybeReasonOption = None,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Register an instrument."""
    _add(store, by, "instrument", code, reason, name=name or code, note=note)


@add_app.command()
def person(
    code: Code,
    name: Name = None,
    role: Annotated[str | None, typer.Option(help="For example analyst, quality engineer, approver.")] = None,
    reason: MaybeReasonOption = None,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Register a person."""
    _add(store, by, "person", code, reason, name=name or code, role=role)


@add_app.command()
def batch(
    code: Code,
    material: Annotated[str, typer.Option(help="Code of its material.")],
    supplier: Annotated[str, typer.Option(help="Code of its supplier.")],
    supplier_lot: Annotated[str | None, typer.Option(help="The supplier's own number for it.")] = None,
    received: Annotated[str | None, typer.Option(help="Day it was received, such as 2026-03-04.")] = None,
    note: Note = None,
    reason: MaybeReasonOption = None,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Register a batch of a material from a supplier."""
    _add(
        store,
        by,
        "batch",
        code,
        reason,
        material=material,
        supplier=supplier,
        supplier_lot=supplier_lot,
        received=_day(received),
        note=note,
    )


@add_app.command()
def characteristic(
    code: Code,
    unit: Annotated[str, typer.Option(help="Its unit, such as MPa, %, mm; 1 for a figure without unit.")],
    name: Name = None,
    method: Annotated[str | None, typer.Option(help="The test method, such as ISO 37 type 2.")] = None,
    lower: Lower = None,
    upper: Upper = None,
    target: Target = None,
    margin: Margin = None,
    decimals: Decimals = None,
    safety_critical: Critical = False,
    note: Note = None,
    reason: MaybeReasonOption = None,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """Register a characteristic: what is measured, by which method, and what size of difference matters."""
    from sameline.intake.units import check_unit

    _check_figures(lower, upper, target, margin)
    _add(
        store,
        by,
        "characteristic",
        code,
        reason,
        unit=check_unit(unit),
        name=name or code,
        method=method,
        lower=lower,
        upper=upper,
        target=target,
        margin=margin,
        decimals=decimals,
        safety_critical=int(bool(safety_critical)),
        note=note,
    )


@restate_app.command("batch")
def restate_batch(
    code: Code,
    reason: ReasonOption,
    material: Annotated[str | None, typer.Option(help="Code of its material.")] = None,
    supplier: Annotated[str | None, typer.Option(help="Code of its supplier.")] = None,
    supplier_lot: Annotated[str | None, typer.Option(help="The supplier's own number for it.")] = None,
    received: Annotated[str | None, typer.Option(help="Day it was received.")] = None,
    note: Note = None,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """State a batch's particulars anew."""
    _restate(
        store,
        by,
        "batch",
        code,
        reason,
        material=material,
        supplier=supplier,
        supplier_lot=supplier_lot,
        received=_day(received),
        note=note,
    )


@restate_app.command("characteristic")
def restate_characteristic(
    code: Code,
    reason: ReasonOption,
    name: Name = None,
    method: Annotated[str | None, typer.Option(help="The test method.")] = None,
    lower: Lower = None,
    upper: Upper = None,
    target: Target = None,
    margin: Margin = None,
    decimals: Decimals = None,
    safety_critical: Critical = None,
    note: Note = None,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """State a characteristic's particulars anew; comparisons that take their margin from it are answered again."""
    _check_figures(lower, upper, target, margin)
    _restate(
        store,
        by,
        "characteristic",
        code,
        reason,
        name=name,
        method=method,
        lower=lower,
        upper=upper,
        target=target,
        margin=margin,
        decimals=decimals,
        safety_critical=None if safety_critical is None else int(safety_critical),
        note=note,
    )


@restate_app.command("run")
def restate_run(
    run: Annotated[int, typer.Argument(help="Number of the run.")],
    reason: ReasonOption,
    batch: Annotated[str | None, typer.Option(help="Code of the batch that was tested.")] = None,
    at: Annotated[str | None, typer.Option(help="When it was tested.")] = None,
    analyst: Annotated[str | None, typer.Option(help="Who tested.")] = None,
    instrument: Annotated[str | None, typer.Option(help="Code of the instrument.")] = None,
    session: Annotated[str | None, typer.Option(help="Label of the occasion.")] = None,
    note: Note = None,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """State a run's particulars anew; its values stay, and so do the old particulars."""
    with open_store(store, by) as lab:
        changes = {
            "batch": batch,
            "tested_at": lab.moment(at),
            "analyst": analyst,
            "instrument": instrument,
            "session": session,
            "note": note,
        }
        given = {name: value for name, value in changes.items() if value is not None}
        if not given:
            raise CallError("there is nothing to state anew", advice="give at least one of the options")
        outcome = lab.amend_run(run, reason=reason, **given)
    say(f"run {run} restated, entry {outcome.entry}")
    say_changes(outcome)


def _restate(store: str, by: str | None, kind: str, code: str, reason: str, **changes: Any) -> None:  # noqa: ANN401
    given = {column: value for column, value in changes.items() if value is not None}
    if not given:
        raise CallError("there is nothing to state anew", advice="give at least one of the options")
    with open_store(store, by) as lab:
        outcome = lab.restate(kind, code, reason=reason, **given)
    say(f"{kind} {code} restated, entry {outcome.entry}")
    say_changes(outcome)


def list_registered(
    kind: Annotated[str, typer.Argument(help=f"One of {', '.join(KINDS)}.")],
    as_json: JsonOption = False,
    as_of: AsOfOption = None,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """List what is registered of a kind."""
    singular = {"batches": "batch", "people": "person"}.get(kind, kind.removesuffix("s"))
    if singular not in KINDS:
        raise CallError(f"nothing is registered as {kind!r}", advice=f"one of {', '.join(KINDS)}")
    with open_store(store) as lab:
        rows = lab.listing(singular, as_of)
    if as_json:
        write_json(rows)
        return
    from sameline.reports.registered import registered_text

    write(registered_text(singular, rows))


def _check_figures(lower: float | None, upper: float | None, target: float | None, margin: float | None) -> None:
    import math

    for word, figure in (("lower limit", lower), ("upper limit", upper), ("target", target), ("margin", margin)):
        if figure is not None and not math.isfinite(figure):
            raise CallError(f"the {word} is {figure}", advice="give a number")
    if lower is not None and upper is not None and not lower < upper:
        raise CallError(f"the lower limit {lower:g} is not below the upper limit {upper:g}")
    if margin is not None and margin <= 0:
        raise CallError(f"the margin is {margin:g}", advice="it is the smallest difference that matters, above 0")


def _day(text: str | None) -> str | None:
    import datetime as dt

    if text is None:
        return None
    try:
        return dt.date.fromisoformat(text.strip()).isoformat()
    except ValueError as error:
        raise CallError(f"{text!r} is not a day", advice="write it as 2026-03-04") from error
