"""The run-to-run spread known from elsewhere, for comparisons of batches that have one run each.

With one run a batch the run's own spread is in every difference and cannot be seen in the data. It can be brought in:

* from other batches that have several runs of the same characteristic: they join the fit as further groups that are
  not compared, so that their evidence on both components counts with its own weight (REML, Kenward-Roger);
* as a figure from the method's validation: the variance of a mean of n replicates of one run is then
  θ_run + θ_replicate/n, with degrees of freedom combined from both sources (Satterthwaite 1946, Biometrics Bull.
  2:110-114).

Either way the conclusion names the source.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING, Any

import numpy as np

from sameline.errors import StatsError
from sameline.stats.labels import as_text
from sameline.stats.nested.contrasts import Contrasts, IndependentMeans
from sameline.stats.nested.estimate import Estimate, estimate_nested
from sameline.stats.nested.layout import layout_of, lower_units
from sameline.stats.nested.levels import chain_of
from sameline.stats.nested.rows import read_rows

if TYPE_CHECKING:
    from collections.abc import Iterable

    from sameline.stats.nested.levels import Chain
    from sameline.stats.nested.rows import Rows


@dataclass(frozen=True, slots=True)
class KnownSpread:
    """Run-to-run spread from outside the data compared.

    Args:
        run: variance between runs of one batch.
        run_error: sampling variance of `run`, 2 run²/df for a chi-squared estimate.
        replicate: variance between replicates of one run, or None where the source has none.
        replicate_error: its sampling variance.
        shared_error: sampling covariance of the two.
        includes_replicate: whether `run` holds the replicates' spread as well (every run of the source had one value).
        batches: labels of the batches it comes from, in order of first appearance; () for a stated figure.
        source: a few words for the conclusion.
        data: values, batches and runs it was estimated from; None for a stated figure.
    """

    run: float
    run_error: float
    replicate: float | None = None
    replicate_error: float = 0.0
    shared_error: float = 0.0
    includes_replicate: bool = False
    batches: tuple[str, ...] = ()
    source: str = ""
    data: tuple[tuple[float, ...], tuple[str, ...], tuple[str, ...]] | None = field(default=None, repr=False)

    @property
    def df(self) -> float:
        """Degrees of freedom of `run`, 2 run² / Var; 0 for a component estimated at zero."""
        return 2.0 * self.run**2 / self.run_error

    @staticmethod
    def stated(run_sd: float, df: float, source: str, *, includes_replicate: bool = False) -> KnownSpread:
        """From a figure: a standard deviation from run to run with its degrees of freedom.

        Args:
            run_sd: in the values' unit.
            df: its degrees of freedom.
            source: a few words for the conclusion.
            includes_replicate: it is that of single values from different runs (intermediate precision).

        Raises:
            StatsError: the deviation or the degrees of freedom are not above zero.
        """
        if not (np.isfinite(run_sd) and run_sd > 0 and df > 0):
            raise StatsError(
                f"a run-to-run deviation of {run_sd!r} with {df!r} degrees of freedom cannot be meant",
                where="known",
                advice="give a standard deviation above 0, in the values' unit, and how many degrees of freedom it has",
            )
        variance = float(run_sd) ** 2
        return KnownSpread(variance, 2.0 * variance**2 / df, includes_replicate=includes_replicate, source=source)


def known_spread(values: Iterable[Any], batches: Iterable[Any], runs: Iterable[Any], source: str = "") -> KnownSpread:
    """Estimates the run-to-run spread of a characteristic from batches that have several runs.

    Args:
        values: measured values, shape (n,).
        batches: batch of each value; batches with one run contribute their replicates only.
        runs: run of each value within its batch.
        source: a few words for the conclusion; made from the batches' labels if empty.

    Raises:
        StatsError: no batch has a second run, or the input cannot be read.
    """
    given = [list(column) for column in (values, batches, runs)]
    rows = read_rows(given[0], given[1], None, given[2], None)
    chain = chain_of(rows)
    if "run" not in chain.random:
        raise StatsError(
            "no batch here has a second run, so the spread from run to run cannot be seen",
            where="runs",
            advice="take the spread from batches that have several runs, or state it with its degrees of freedom",
        )
    estimate = estimate_nested(layout_of(chain), rows.place)
    data = (
        tuple(float(value) for value in given[0]),
        tuple(as_text(label) for label in given[1]),
        tuple(as_text(label) for label in given[2]),
    )
    return replace(_from_estimate(estimate, rows.groups, source), data=data)


def _from_estimate(estimate: Estimate, batches: tuple[str, ...], source: str) -> KnownSpread:
    source = source or f"{len(batches)} batches with several runs"
    theta, error = estimate.theta, estimate.expected
    if len(theta) == 1:
        return KnownSpread(float(theta[0]), float(error[0, 0]), includes_replicate=True, batches=batches, source=source)
    return KnownSpread(
        run=float(theta[0]),
        run_error=float(error[0, 0]),
        replicate=float(theta[1]),
        replicate_error=float(error[1, 1]),
        shared_error=float(error[0, 1]),
        batches=batches,
        source=source,
    )


def estimate_with(chain: Chain, known: KnownSpread) -> Estimate:
    """Means of groups with one run each, judged with a known run-to-run spread.

    Raises:
        StatsError: neither the data nor the source have replicates, and the source does not include their spread.
    """
    return _stated(chain, known) if known.data is None else _joined(chain.rows, known.data)


def _joined(rows: Rows, data: tuple[tuple[float, ...], tuple[str, ...], tuple[str, ...]]) -> Estimate:
    """One fit of the groups compared and the source's batches, which stay out of the comparison."""
    values, batches, runs = data
    codes = rows.units["group"].tolist()
    joint = read_rows(
        [*(rows.y + rows.origin).tolist(), *values],
        [*(f"0{code:09d}" for code in codes), *(f"1{label}" for label in batches)],
        None,
        [*("one" for _ in codes), *runs],
        None,
    )
    estimate = estimate_nested(layout_of(chain_of(joint)), joint.place)
    return estimate.taken(rows.place, joint.origin - rows.origin)


def _stated(chain: Chain, known: KnownSpread) -> Estimate:
    """Replicates of the data's own runs give the replicate component; without any, the known one stands in."""
    rows = chain.rows
    units = lower_units(rows.y, rows.units["group"])
    k, within_df = units.size.size, rows.y.size - units.size.size
    error = np.diag([known.run_error, 0.0])
    replicate = 0.0
    if within_df and units.within_ss > 0.0:
        replicate = units.within_ss / within_df
        error[1, 1] = 2.0 * replicate**2 / within_df
    elif known.replicate is not None:
        replicate = known.replicate
        error[1, 1], error[0, 1] = known.replicate_error, known.shared_error
        error[1, 0] = error[0, 1]
    elif not (known.includes_replicate or within_df):
        raise StatsError(
            "there is one value a run and no known spread between replicates",
            where="known",
            advice="give a known spread of single values from run to run, or replicate the runs",
        )
    share = 1.0 / units.size
    spread = IndependentMeans(
        Contrasts(
            (known.run + replicate * share)[rows.place],
            np.stack([np.ones(k), share])[:, rows.place],
            np.zeros((2, 2, k)),
        )
    )
    theta = np.array([known.run, replicate])
    return Estimate(("run", "replicate"), theta, None, units.mean[rows.place], spread, error, error)
