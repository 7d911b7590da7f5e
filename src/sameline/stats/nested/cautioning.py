"""What a reader of a nested fit must know before leaning on it."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from sameline.stats.cautions import Caution

if TYPE_CHECKING:
    from collections.abc import Iterator

    from sameline.stats.nested.estimate import Estimate
    from sameline.stats.nested.known_spread import KnownSpread
    from sameline.stats.nested.levels import Chain, Collapsed

FAR_APART = 2.0
FEW_DF = 3.0


def of_fit(
    chain: Chain,
    collapsed: tuple[Collapsed, ...],
    estimate: Estimate,
    unused: KnownSpread | None,
    used: KnownSpread | None,
) -> tuple[Caution, ...]:
    """All cautions of one fit, in a fixed order."""
    found = [*_levels(chain, collapsed), *_labels(chain), *_degrees_of_freedom(estimate), *_known(unused, used)]
    return tuple(found)


def _levels(chain: Chain, collapsed: tuple[Collapsed, ...]) -> Iterator[Caution]:
    for gone in collapsed:
        yield Caution(f"collapsed-{gone.level}", gone.meaning)
    rows = chain.rows
    if len(rows.groups) < 2:
        return
    for level in chain.random[:-1]:
        of_unit = np.unique(rows.units[level], return_index=True)[1]
        alone = np.bincount(rows.units["group"][of_unit])[rows.place] == 1
        if alone.any():
            names = ", ".join(group for group, one in zip(rows.groups, alone, strict=True) if one)
            yield Caution(
                f"one-{level}",
                f"one {level} only in {names}: its spread from {level} to {level} is taken from the other groups",
            )


def _labels(chain: Chain) -> Iterator[Caution]:
    reused = chain.rows.reused
    if reused:
        names = ", ".join(repr(label) for label in reused[:5]) + (" …" if len(reused) > 5 else "")
        yield Caution(
            "batch-in-two-groups", f"batch {names} stands in more than one group and counts as another batch in each"
        )


def _degrees_of_freedom(estimate: Estimate) -> Iterator[Caution]:
    zero = [name for name, value in zip(estimate.random, estimate.theta, strict=True) if value <= 0.0]
    if zero:
        yield Caution(
            "component-at-zero",
            f"the spread from {' and '.join(f'{name} to {name}' for name in zero)} is estimated at zero, which a small "
            "number of units often does by chance; Kenward-Roger keeps the level's place in the degrees of freedom, "
            "Satterthwaite drops it",
        )
    k = estimate.means.size
    a, b = (np.arange(k - 1), np.arange(1, k)) if k > 1 else (np.zeros(0, np.intp), np.zeros(0, np.intp))
    contrasts = estimate.spread.differences(a, b) if k > 1 else estimate.spread.means()
    kept, dropped = (estimate.judged(contrasts, method)[1] for method in ("kenward-roger", "satterthwaite"))
    ratio = float(np.max(np.maximum(dropped / kept, kept / dropped)))
    if ratio > FAR_APART:
        worst = int(np.argmax(np.maximum(dropped / kept, kept / dropped)))
        yield Caution(
            "degrees-of-freedom",
            f"degrees of freedom are {kept[worst]:.3g} by Kenward-Roger and {dropped[worst]:.3g} by Satterthwaite, "
            f"a factor of {ratio:.2g}: trust the fewer",
        )
    if float(kept.min()) < FEW_DF:
        yield Caution(
            "few-degrees-of-freedom",
            f"the spread rests on {kept.min():.2g} degree{'' if kept.min() == 1.0 else 's'} of freedom: "
            "intervals are wide and depend on few units",
        )


def _known(unused: KnownSpread | None, used: KnownSpread | None) -> Iterator[Caution]:
    if unused is not None:
        yield Caution("known-spread-unused", "the known run-to-run spread was not needed: the runs here show their own")
    if used is not None:
        source = used.source or ", ".join(used.batches)
        yield Caution(
            "known-spread",
            f"the run-to-run spread is not from these data but from {source} (standard deviation {used.run**0.5:.4g}, "
            f"{used.df:.3g} degrees of freedom)",
        )
