"""The spread of a characteristic, and how much to test, as text and as documents."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from sameline.reports.text import count, interval, number, percent, plain, table

if TYPE_CHECKING:
    from sameline.conclusions.planning import Sizes
    from sameline.stats.nested.components import Spread
    from sameline.stats.nested.fit import NestedFit
    from sameline.stats.plans import Plan, PlanTable

_SAYS = {
    "batch": "from batch to batch",
    "run": "from run to run",
    "replicate": "from replicate to replicate",
    "total": "in all",
}


def spread_text(code: str, unit: str, decimals: int, fit: NestedFit, alpha: float = 0.05) -> list[str]:
    """Components as standard deviations with intervals and shares, and as repeatability and intermediate precision."""
    found = fit.spread(alpha)
    amounts = ", ".join(
        count(many, level, "batches" if level == "batch" else None)
        for level, many in fit.counts.items()
        if level != "group"
    )
    lines = [f"{code}: spread as standard deviations, {unit}; {amounts}", ""]
    rows = [_spread_row(row, decimals) for row in (*found.levels, *found.precision)]
    headings = ("", "sd", f"{percent(1 - alpha)} interval", "share of variance")
    lines += table(headings, rows, "<><>")
    lines += ["", f"  Intervals: {found.method}."]
    lines.append("  Repeatability, intermediate precision: as ISO 5725 has them; each material has a mean of its own.")
    if fit.cautions:
        lines += ["", "  Cautions:", *(f"  * {caution.text}" for caution in fit.cautions)]
    return lines


def _spread_row(row: Spread, decimals: int) -> tuple[str, ...]:
    shown = decimals + 2
    return (
        _SAYS.get(row.name, row.name),
        number(row.standard_deviation, shown),
        interval(row.lower, row.upper, shown),
        f"{100 * row.share:.0f} %",
    )


def spread_document(code: str, unit: str, fit: NestedFit, alpha: float = 0.05) -> dict[str, Any]:
    """The same for other programs."""
    found = fit.spread(alpha)
    return {
        "characteristic": code,
        "unit": unit,
        "counts": dict(fit.counts),
        "levels": [row._asdict() for row in found.levels],
        "precision": [row._asdict() for row in found.precision],
        "method": found.method,
        "alpha": alpha,
        "cautions": [caution.text for caution in fit.cautions],
    }


def sizes_text(found: Sizes, unit: str) -> list[str]:
    """Plans, what settles pairs, and the price of looking."""
    spreads = ", ".join(f"{level} {plain(round(v**0.5, 6))}" for level, v in found.components.items())
    lines = [f"standard deviations, {unit}: {spreads} ({found.source})"]
    if found.plans is None:
        lines.append(f"  {found.refusal}")
    else:
        lines += _plans_text(found.plans, unit)
    if found.price is not None:
        price = found.price
        lines.append(
            "  Looking without end has its price: until every interval is as short as the difference to either side, "
            f"{price.always} units a group instead of {price.single}."
        )
    if found.detectable:
        sizes = [difference for _, _, difference in found.detectable]
        low, high = f"{min(sizes):.3g}", f"{max(sizes):.3g}"
        spanned = low if low == high else f"{low} to {high}"
        lines.append(f"  The present data show a true difference of {spanned} {unit} with that power, at one look.")
    if found.settling:
        lines += ["", "To settle the undecided pairs at one look:"]
        lines += [f"  {each.text}" for each in found.settling]
    return lines


def _plans_text(plans: PlanTable, unit: str) -> list[str]:
    return [
        f"to show a true difference of {plain(plans.difference)} {unit} with power {percent(plans.power)}",
        f"among {plans.groups} groups at a family error rate of {percent(plans.alpha)}, at one look:",
        "",
        *table(_PLAN_HEADINGS, [_plan_row(p) for p in (plans.best, *plans.alternatives)], ">>>>>>>"),
        "",
        "  The first is the cheapest; numbers are for each group, values and cost for all together.",
    ]


_PLAN_HEADINGS = ("batches", "runs a batch", "replicates a run", "values", "cost", "half width", "power")


def _plan_row(p: Plan) -> tuple[str, ...]:
    batches = "–" if p.batches is None else str(p.batches)
    return (
        batches,
        str(p.runs),
        str(p.replicates),
        str(p.measurements),
        plain(round(p.cost, 6)),
        f"{p.half_width:.3g}",
        f"{p.power:.3f}",
    )


def sizes_document(found: Sizes, unit: str) -> dict[str, Any]:
    """The same for other programs; the power curve is (difference, power) of the cheapest plan."""
    from dataclasses import asdict

    plans = found.plans
    return {
        "unit": unit,
        "components": dict(found.components),
        "source": found.source,
        "refusal": found.refusal,
        "best": plans.best._asdict() if plans else None,
        "alternatives": [p._asdict() for p in plans.alternatives] if plans else [],
        "curve": [list(point) for point in plans.curve] if plans else [],
        "settling": [asdict(each) for each in found.settling],
        "detectable": [{"a": a, "b": b, "difference": difference} for a, b, difference in found.detectable],
        "price": asdict(found.price) if found.price else None,
    }
