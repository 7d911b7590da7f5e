"""Whether a batch's mean keeps its limits, and how well a supplier's batches do."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from sameline.errors import CallError
from sameline.records.registry import KINDS, codes, current, find, listing
from sameline.records.runs import Measurement, read_measurements
from sameline.reports.text import count

if TYPE_CHECKING:
    from sameline.records.store import Reading
    from sameline.stats.capability import Index
    from sameline.stats.conformity import Conformity, Measured
    from sameline.stats.nested.fit import NestedFit

RELEASES_NOTHING = (
    "safety-critical: this concerns the results of the batches tested. It releases no part; the product standard, "
    "local codes and a competent person decide"
)


@dataclass(frozen=True, slots=True)
class Limits:
    """A characteristic with its specification limits, as they held.

    Attributes:
        code, name, unit: of the characteristic.
        lower, upper: limits, or None.
        decimals: reported for single values.
        safety_critical: whether a safety-critical part depends on it.
        position: the ledger entry up to which the records were read.
    """

    code: str
    name: str
    unit: str
    lower: float | None
    upper: float | None
    decimals: int
    safety_critical: bool
    position: int


@dataclass(frozen=True, slots=True)
class BatchConformity:
    """A batch against its limits.

    Attributes:
        batch, material: codes.
        limits: of the characteristic.
        measured: the batch's mean with its standard uncertainty and degrees of freedom.
        other: another standard uncertainty that is in it, 0 where none was stated.
        runs, values: of the batch.
        basis: on what the uncertainty rests, in words.
        answers: one for each rule asked.
        probability: limiting probability of the rules that have one.
        cautions: what a reader must know.
    """

    batch: str
    material: str
    limits: Limits
    measured: Measured
    other: float
    runs: int
    values: int
    basis: str
    answers: tuple[Conformity, ...]
    probability: float
    cautions: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class SupplierCapability:
    """A supplier's batches against the limits.

    Attributes:
        supplier, material: codes.
        limits: of the characteristic.
        mean, deviation, df: of single results, with the deviation's degrees of freedom.
        counts: units by level.
        indices: see `sameline.stats.capability.performance`.
        alpha: 1 - the confidence of each interval.
        cautions: what a reader must know.
    """

    supplier: str
    material: str
    limits: Limits
    mean: float
    deviation: float
    df: float
    counts: dict[str, int]
    indices: tuple[Index, ...]
    alpha: float
    cautions: tuple[str, ...]


def read_conformity(
    reading: Reading,
    batch: str,
    characteristic: str,
    rules: Sequence[str],
    *,
    probability: float = 0.95,
    other: float = 0.0,
) -> BatchConformity:
    """A batch's mean against its limits; the spreads are those of all batches of its material.

    Args:
        reading: the view.
        batch: code.
        characteristic: code.
        rules: decision rules, of `sameline.stats.conformity.RULES`.
        probability: limiting probability of the rules that have one.
        other: another standard uncertainty, in the characteristic's unit, such as the calibration's.

    Raises:
        CallError: a code is not registered, there is no limit or no result, or the mean's uncertainty cannot be had.
        StatsError: a rule or figure cannot be meant.
    """
    from sameline.stats.conformity import Measured, combined, judge
    from sameline.stats.nested.fit import fit_nested

    find(reading.connection, KINDS["batch"], batch)
    limits = _limits(reading, characteristic)
    origin = {row["code"]: row for row in listing(reading, KINDS["batch"])}
    material = origin[batch]["material"]
    found = _measurements(reading, limits.code, {code for code, row in origin.items() if row["material"] == material})
    own = [m for code, m in found if code == batch and m.excluded is None]
    if not own:
        raise CallError(f"no result of {characteristic} is recorded for {batch}")
    bounds = sum(m.qualifier is not None for m in own)
    if bounds:
        raise CallError(f"{bounds} of {len(own)} values of {batch} are only bounds (such as <0.5), so it has no mean")
    kept = _kept(found)
    fit = fit_nested([m.value for _, m in kept], [code for code, _ in kept], None, [m.run for _, m in kept])
    means = fit.means()
    at = means.group.index(batch)
    error, df = means.standard_error[at], means.df[at]
    if error is None or df is None:
        raise CallError(f"the uncertainty of the mean of {batch} cannot be had: {fit.unseen}")
    measured = combined(Measured(means.mean[at], error, df), other)
    answers = [judge(measured, limits.lower, limits.upper, rule, probability=probability) for rule in rules]
    basis = f"run-to-run spread of {count(len(fit.groups), 'batch', 'batches')} of {material} together, nested model"
    cautions = [*(c.text for c in fit.cautions), *_aside([m for code, m in found if code == batch])]
    return BatchConformity(
        batch=batch,
        material=material,
        limits=limits,
        measured=measured,
        other=other,
        runs=len({m.run for m in own}),
        values=len(own),
        basis=basis,
        answers=tuple(answers),
        probability=probability,
        cautions=(*cautions, *_critical(limits)),
    )


def read_capability(
    reading: Reading, supplier: str, characteristic: str, *, material: str | None = None, alpha: float = 0.05
) -> SupplierCapability:
    """How a supplier's batches of one material keep the limits.

    Args:
        reading: the view.
        supplier: code.
        characteristic: code.
        material: code; may be left out where results of one material only are recorded.
        alpha: 1 - the confidence of each interval.

    Raises:
        CallError: a code is not registered, there is no limit, several materials, or too little data.
        StatsError: a figure cannot be meant.
    """
    from sameline.stats.capability import FEWEST_BATCHES, MANY_BATCHES, Process, performance, spread_df
    from sameline.stats.nested.fit import fit_nested

    find(reading.connection, KINDS["supplier"], supplier)
    limits = _limits(reading, characteristic)
    origin = {row["code"]: row for row in listing(reading, KINDS["batch"])}
    chosen = {c for c, row in origin.items() if row["supplier"] == supplier and material in (None, row["material"])}
    found = _measurements(reading, limits.code, chosen)
    kept = _kept(found)
    materials = sorted({origin[code]["material"] for code, _ in kept})
    if len(materials) > 1:
        raise CallError(f"{supplier} delivers {', '.join(materials)}", advice="choose one with --material")
    batches = len({code for code, _ in kept})
    if batches < FEWEST_BATCHES:
        raise CallError(
            f"too little is known: {count(batches, 'batch', 'batches')} of {supplier} with results of {characteristic}",
            advice=f"it takes {FEWEST_BATCHES} batches at least",
        )
    fit = fit_nested([m.value for _, m in kept], None, [code for code, _ in kept], [m.run for _, m in kept])
    total = next(row for row in fit.spread(alpha).precision if row.name == "total")
    means = fit.means(alpha)
    error = means.standard_error[0]
    if total.upper is None or error is None:
        raise CallError(f"the spread of {supplier}'s batches cannot be had from what is recorded")
    df = spread_df(total.standard_deviation, total.upper, alpha)
    process = Process(means.mean[0], total.standard_deviation, df, error)
    cautions = [
        "performance, not capability, in ISO 22514's terms: that the process is stable is not shown here",
        "the spread is that of single results: from batch to batch, and of the measurement itself",
        *_few(batches, MANY_BATCHES),
        *(c.text for c in fit.cautions),
        *_aside([m for _, m in found]),
        *_critical(limits),
    ]
    indices = performance(process, limits.lower, limits.upper, alpha)
    return SupplierCapability(
        supplier,
        materials[0],
        limits,
        process.mean,
        process.deviation,
        df,
        _counts(fit),
        indices,
        alpha,
        tuple(cautions),
    )


def _few(batches: int, many: int) -> list[str]:
    few = f"{batches} batches are few; {many} are usual (common practice, no source)"
    return [few] if batches < many else []


def _counts(fit: NestedFit) -> dict[str, int]:
    return {level: many for level, many in fit.counts.items() if level != "group"}


def _limits(reading: Reading, characteristic: str) -> Limits:
    which = find(reading.connection, KINDS["characteristic"], characteristic)
    stated = current(reading.connection, KINDS["characteristic"], which, reading.position)
    unit = next(row["unit"] for row in listing(reading, KINDS["characteristic"]) if row["code"] == characteristic)
    if stated["lower"] is None and stated["upper"] is None:
        raise CallError(
            f"{characteristic} has no specification limit",
            advice=f"`sameline restate characteristic {characteristic} --upper …` states one",
        )
    return Limits(
        code=characteristic,
        name=stated["name"] or characteristic,
        unit=unit,
        lower=stated["lower"],
        upper=stated["upper"],
        decimals=2 if stated["decimals"] is None else stated["decimals"],
        safety_critical=bool(stated["safety_critical"]),
        position=reading.position,
    )


def _measurements(reading: Reading, characteristic: str, batches: set[str]) -> list[tuple[str, Measurement]]:
    """Batch code and replicate, in order of run."""
    code = codes(reading.connection, KINDS["batch"])
    chosen = {which for which, name in code.items() if name in batches}
    which = find(reading.connection, KINDS["characteristic"], characteristic)
    return [(code[m.batch], m) for m in read_measurements(reading, characteristic=which, batches=chosen)]


def _kept(found: Sequence[tuple[str, Measurement]]) -> list[tuple[str, Measurement]]:
    return [(code, m) for code, m in found if m.excluded is None and m.qualifier is None]


def _aside(found: Sequence[Measurement]) -> list[str]:
    aside = [m.excluded for m in found if m.excluded is not None]
    bounds = sum(m.excluded is None and m.qualifier is not None for m in found)
    said = []
    if aside:
        said.append(f"{count(len(aside), 'value is', 'values are')} set aside ({', '.join(sorted(set(aside)))})")
    if bounds:
        said.append(f"{count(bounds, 'value')} left out: only bounds, such as <0.5")
    return said


def _critical(limits: Limits) -> list[str]:
    return [RELEASES_NOTHING] if limits.safety_critical else []
