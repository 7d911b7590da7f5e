"""`sameline compare`, `differ`, `history`: a question, its answer, and how the answer came about."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from sameline.cli.common import (
    DEFAULT_STORE,
    AsOfOption,
    ByOption,
    JsonOption,
    MaybeReasonOption,
    StoreOption,
    open_store,
    say,
    say_changes,
    write,
    write_json,
)
from sameline.errors import CallError

if TYPE_CHECKING:
    from sameline.lab import Lab


def add_to(app: typer.Typer) -> None:
    """Add this file's commands."""
    app.command()(compare)
    app.command()(differ)
    app.command()(history)
    app.command()(diagnose)


def compare(
    name: Annotated[str, typer.Argument(help="The comparison's name.")],
    characteristic: Annotated[str, typer.Option("--characteristic", "-c", help="Code of what is compared.")],
    groups: Annotated[
        list[str] | None, typer.Argument(help="Codes of the groups; all that pass the filter if left out.")
    ] = None,
    of: Annotated[str, typer.Option(help="What the groups are: batch, material or supplier.")] = "batch",
    material: Annotated[str | None, typer.Option(help="Only batches of this material.")] = None,
    supplier: Annotated[str | None, typer.Option(help="Only batches from this supplier.")] = None,
    tested_from: Annotated[str | None, typer.Option(help="Only runs tested from this day on.")] = None,
    model: Annotated[
        str | None, typer.Option(help="nested (runs within batches; the default), pooled, unequal or ranks.")
    ] = None,
    procedure: Annotated[
        str | None,
        typer.Option(
            help="tukey-kramer, dunnett, bonferroni, holm, sidak, games-howell, welch-holm, steel-dwass or dunn."
        ),
    ] = None,
    unit: Annotated[
        str, typer.Option(help="Without nesting, what counts as one value: run, batch or replicate.")
    ] = "run",
    alpha: Annotated[float, typer.Option(help="Family error rate.")] = 0.05,
    control: Annotated[str | None, typer.Option(help="Code of the group that the others are compared with.")] = None,
    alternative: Annotated[str, typer.Option(help="With a control: two-sided, less or greater.")] = "two-sided",
    margin: Annotated[
        float | None, typer.Option(help="Smallest difference that matters; the characteristic's if left out.")
    ] = None,
    looks: Annotated[
        str,
        typer.Option(help="open (any number of looks, no end), planned (up to a stated amount of data), or single."),
    ] = "open",
    units: Annotated[
        int | None,
        typer.Option(help="With planned or single looks: the final number of units, of all groups together."),
    ] = None,
    spending: Annotated[str | None, typer.Option(help="With planned looks: obrien-fleming or pocock.")] = None,
    known_spread: Annotated[
        bool,
        typer.Option("--known-spread", help="Where batches have one run each, use other batches' run-to-run spread."),
    ] = False,
    sessions: Annotated[
        bool, typer.Option("--sessions", help="Take out of the differences what the batches of one session share.")
    ] = False,
    window: Annotated[
        int | None, typer.Option(help="With open looks: evidence also starts anew every so many units.")
    ] = None,
    window_months: Annotated[
        int | None, typer.Option(help="The same, every so many calendar months of testing.")
    ] = None,
    reason: MaybeReasonOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
    by: ByOption = None,
) -> None:
    """State a comparison, best before its data.

    Stated again under its name, it is a new revision; the old one stays readable.
    """
    from sameline.conclusions.statements import settled
    from sameline.records.comparisons import Statement

    with open_store(store, by) as lab:
        statement = settled(
            Statement(
                name=name,
                characteristic=characteristic,
                grouping=of,
                groups=tuple(groups or ()),
                of_material=material,
                of_supplier=supplier,
                tested_from=lab.moment(tested_from),
                unit=unit,
                alpha=alpha,
                control=control,
                alternative=alternative,
                margin=margin,
                looks=looks,
                final_units=units,
                spending=spending,
                known_spread=known_spread,
                sessions=sessions,
                window_units=window,
                window_months=window_months,
            ),
            model=model,
            procedure=procedure,
        )
        outcome = lab.compare(statement, reason=reason)
    say(f"{name}: stated, entry {outcome.entry} ({statement.procedure} on the {statement.model} model)")
    say_changes(outcome, as_json=as_json)


def differ(
    name: Annotated[str | None, typer.Argument(help="The comparison; every comparison in a table if left out.")] = None,
    version: Annotated[int | None, typer.Option(help="This version of its conclusion instead of the latest.")] = None,
    all_pairs: Annotated[bool, typer.Option("--all", help="List the pairs that are not shown to differ too.")] = False,
    contrast: Annotated[
        str | None,
        typer.Option(
            help="Show beside it what this look alone would say (look), or one on replicates or runs as units."
        ),
    ] = None,
    as_of: AsOfOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Say which groups differ, and how sure that is.

    The groups in order of mean, the lines beside them, and the pairs that are shown to differ.
    """
    with open_store(store) as lab:
        if name is None:
            _overview(lab, as_of, as_json=as_json)
        else:
            _one(lab, name, version, as_of, contrast, all_pairs=all_pairs, as_json=as_json)


def _overview(lab: Lab, as_of: str | None, *, as_json: bool) -> None:
    rows = lab.overview(as_of)
    if as_json:
        from sameline.reports.documents import overview_document

        write_json(overview_document(rows))
        return
    from sameline.reports.differ import overview_text

    write(overview_text(rows))


def _one(
    lab: Lab, name: str, version: int | None, as_of: str | None, contrast: str | None, *, all_pairs: bool, as_json: bool
) -> None:
    conclusion = lab.conclusion(name, version, as_of)
    subject, behind = lab.subject(conclusion), lab.is_behind(conclusion) and version is None and as_of is None
    unit = None if contrast in (None, "look") else _contrast_unit(contrast or "")
    naive = None if unit is None else lab.contrast(conclusion, unit)
    signed = lab.signatures(conclusion)
    from sameline.reports.keys import signatures_document, signatures_text

    if as_json:
        from dataclasses import asdict

        from sameline.reports.documents import conclusion_document

        document = conclusion_document(conclusion, subject, behind=behind)
        document["signatures"] = signatures_document(signed)
        if naive is not None:
            document["contrast"] = {"units": contrast, "pairs": [asdict(pair) for pair in naive.pairs]}
        write_json(document)
        return
    from sameline.reports.differ import contrast_text, differ_text, single_look_text

    write(differ_text(conclusion, subject, behind=behind, all_pairs=all_pairs))
    if contrast == "look":
        write(single_look_text(conclusion, subject))
    if naive is not None and unit is not None:
        write(contrast_text(conclusion, naive, subject, unit))
    write(signatures_text(signed, conclusion))


def _contrast_unit(word: str) -> str:
    unit = {"replicates": "replicate", "replicate": "replicate", "runs": "run", "run": "run", "run means": "run"}.get(
        word
    )
    if unit is None:
        raise CallError(f"there is no contrast {word!r}", advice="one of look, replicates, runs")
    return unit


def history(
    name: Annotated[str, typer.Argument(help="The comparison.")],
    as_of: AsOfOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Say how a conclusion came about, version by version.

    When, by whose act, at which look, which verdicts turned, and why.
    """
    with open_store(store) as lab:
        versions = lab.history(name, as_of)
    if as_json:
        from sameline.reports.documents import history_document

        write_json(history_document(versions))
        return
    from sameline.reports.history import history_text

    write(history_text(versions))


def diagnose(
    name: Annotated[str, typer.Argument(help="The comparison.")],
    version: Annotated[int | None, typer.Option(help="This version of its conclusion instead of the latest.")] = None,
    as_of: AsOfOption = None,
    as_json: JsonOption = False,
    store: StoreOption = DEFAULT_STORE,
) -> None:
    """Look again at the data behind a conclusion.

    Tests of all groups, of equal spread, of shape and of equivalence, and what the outlier tests flag.
    """
    with open_store(store) as lab:
        conclusion = lab.conclusion(name, version, as_of)
        found, subject = lab.diagnose(conclusion), lab.subject(conclusion)
    if as_json:
        from sameline.reports.diagnosis import diagnosis_document

        write_json(diagnosis_document(found, conclusion))
        return
    from sameline.reports.diagnosis import diagnosis_text

    write(diagnosis_text(found, conclusion, subject))
