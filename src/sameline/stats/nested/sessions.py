"""The one crossed design of this work: batches tested together in sessions (days), which share what the day adds.

value ~ group + session + batch within group + run + replicate, all but the group random. What the batches of one
session share cancels in their differences. Runs are reduced to their size and mean; of batches and sessions the more
numerous is eliminated block by block (sparse), the other by a dense matrix of its own size.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import csr_array

from sameline.errors import StatsError
from sameline.stats.nested import jets
from sameline.stats.nested.contrasts import CorrelatedMeans
from sameline.stats.nested.estimate import Estimate, inverse, inverse_of_free
from sameline.stats.nested.layout import lower_units
from sameline.stats.nested.matrix_jets import MatrixJet
from sameline.stats.nested.reml import minimise

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from sameline.stats.nested.jets import Jet
    from sameline.stats.nested.levels import Chain

MOST_DENSE = 400
MOST_SHARED = 1_000_000
TOLD_APART = 1e-8
SMALL = 1_000_000  # entries of a dense matrix for the check of perfect fits, which large data do not have
NOTHING = 1e-20


@dataclass(frozen=True, slots=True)
class Crossed:
    """Runs of a crossed design.

    Args:
        random: components: "session", then the levels of the chain, top down; length t.
        size: values of each run, shape (m,).
        within_ss: sum of squares within runs, with `within_df`.
        within_df: values minus runs.
        centre: plain mean of the run means of each group about the origin, shape (k,).
        columns: group indicators, run mean about its group's centre, and indicators of the dense factor,
            shape (m, k + 1 + d).
        block: eliminated unit of each run, shape (m,).
        first: index in `random` of the eliminated factor.
        dense: index of the dense factor, or None.
        pairs: runs (left, right) that share an eliminated unit, each with itself too.
        products: see `_products`.
    """

    random: tuple[str, ...]
    size: NDArray[np.float64]
    within_ss: float
    within_df: int
    centre: NDArray[np.float64]
    columns: csr_array
    block: NDArray[np.intp]
    first: int
    dense: int | None
    pairs: tuple[NDArray[np.intp], NDArray[np.intp]]
    products: csr_array

    @property
    def k(self) -> int:
        """Groups."""
        return self.centre.size


def crossed_of(chain: Chain) -> Crossed:
    """Reduces values with sessions to runs.

    Raises:
        StatsError: more sessions and batches than the dense part can hold.
    """
    rows = chain.rows
    random = ("session", *chain.random)
    level = "run" if "run" in rows.units else "replicate"
    units = lower_units(rows.y, rows.units[level])
    group, session = rows.units["group"][units.starts], rows.units["session"][units.starts]
    runs_of_group = np.bincount(group)
    centre = np.bincount(group, units.mean) / runs_of_group
    first, dense, block, other = 0, None, session, None
    if "batch" in random:
        batch = rows.units["batch"][units.starts]
        first, dense, block, other = (0, 1, session, batch) if session.max() >= batch.max() else (1, 0, batch, session)
    wide = 0 if other is None else int(other.max()) + 1
    per_block = np.bincount(block).astype(float)
    if wide > MOST_DENSE or float(np.sum(per_block**2)) > MOST_SHARED:
        raise StatsError(
            f"{per_block.size} by {wide} sessions and batches are more than can be fitted together",
            where="sessions",
            advice="compare over a shorter time, or leave the sessions out of the model",
        )
    columns = [(group, np.ones(group.size)), (np.full(group.size, centre.size), units.mean - centre[group])]
    if other is not None:
        columns.append((other + centre.size + 1, np.ones(group.size)))
    design = _sparse(columns, centre.size + 1 + wide)
    pairs = _sharing(block)
    return Crossed(
        random=random,
        size=units.size.astype(float),
        within_ss=units.within_ss,
        within_df=rows.y.size - units.size.size,
        centre=centre,
        columns=design,
        block=block,
        first=first,
        dense=dense,
        pairs=pairs,
        products=_products(design, *pairs),
    )


def _sparse(columns: list[tuple[NDArray[np.intp], NDArray[np.float64]]], width: int) -> csr_array:
    m = columns[0][0].size
    at = (np.tile(np.arange(m), len(columns)), np.concatenate([place for place, _ in columns]))
    return csr_array((np.concatenate([value for _, value in columns]), at), shape=(m, width))


def _sharing(block: NDArray[np.intp]) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """All ordered pairs of runs of one block."""
    order = np.argsort(block, kind="stable")
    size = np.bincount(block)
    start = np.cumsum(size) - size
    repeats = size[block[order]]
    left = np.repeat(order, repeats)
    offset = np.arange(left.size) - np.repeat(np.cumsum(repeats) - repeats, repeats)
    return left, order[start[block[left]] + offset]


@dataclass(frozen=True, slots=True)
class CrossedCriterion:
    """Minus twice the REML log likelihood; fields as in `criterion.Criterion`, precision as a full matrix."""

    value: float
    gradient: NDArray[np.float64]
    hessian: NDArray[np.float64]
    information: NDArray[np.float64]
    means: NDArray[np.float64]
    precision: MatrixJet


def crossed_criterion(design: Crossed, theta: NDArray[np.float64]) -> CrossedCriterion:
    """Evaluates the criterion at components `theta`, shape (t,), residual above zero."""
    t, k = theta.size, design.k
    residual = jets.component(theta, t - 1)
    variance = _variance(design, theta)
    inverse_blocks, determinant = _eliminated(design, theta, variance)
    determinant = determinant + variance.log().total() + residual.log().scaled(design.within_df)
    volume = (float(determinant.value[0]), determinant.slope[:, 0], determinant.curve[:, :, 0])
    system = _system(design, inverse_blocks)
    if design.dense is not None:
        groups, rest = slice(0, k + 1), slice(k + 1, None)
        scaled = system.part(rest, rest).times_component(theta, design.dense).plus_identity()
        volume = _added(volume, scaled.log_determinant())
        side = system.part(rest, groups)
        inner = scaled.inverse().times_component(theta, design.dense)
        system = system.part(groups, groups) - side.transposed @ (inner @ side)
    precision, score = system.part(slice(0, k), slice(0, k)), system.part(slice(0, k), slice(k, k + 1))
    volume = _added(volume, precision.log_determinant())
    effect = precision.inverse() @ score
    fit = system.part(slice(k, k + 1), slice(k, k + 1)) - score.transposed @ effect
    squares = residual.reciprocal().scaled(design.within_ss)
    n = float(design.size.sum())
    constant = float(np.log(design.size).sum()) + (n - k) * math.log(2.0 * math.pi)
    return CrossedCriterion(
        value=volume[0] + float(fit.value[0, 0] + squares.value[0]) + constant,
        gradient=volume[1] + fit.slope[:, 0, 0] + squares.slope[:, 0],
        hessian=volume[2] + fit.curve[:, :, 0, 0] + squares.curve[:, :, 0],
        information=-0.5 * volume[2],
        means=design.centre + effect.value[:, 0],
        precision=precision,
    )


Volume = tuple[float, "NDArray[np.float64]", "NDArray[np.float64]"]


def _added(one: Volume, other: Volume) -> Volume:
    return one[0] + other[0], one[1] + other[1], one[2] + other[2]


def _variance(design: Crossed, theta: NDArray[np.float64]) -> Jet:
    """Variance of a run mean within its batch and session, per run."""
    slope = np.zeros((theta.size, design.size.size))
    slope[-1] = 1.0 / design.size
    value = theta[-1] / design.size
    if "run" in design.random[:-1]:
        slope[-2] = 1.0
        value = value + theta[-2]
    return jets.linear(value, slope)


def _eliminated(design: Crossed, theta: NDArray[np.float64], variance: Jet) -> tuple[Jet, Jet]:
    """Entries of the inverse covariance of the runs, given the dense factor, and its log determinant less the runs'."""
    a = variance.reciprocal()
    left, right = design.pairs
    t, blocks = theta.size, int(design.block.max()) + 1
    weights = csr_array((np.ones(design.block.size), (design.block, np.arange(design.block.size))))
    shared = (jets.component(theta, design.first) * a.mapped(weights)) + jets.constant(np.ones(blocks), t)
    shrink = jets.component(theta, design.first) * shared.reciprocal()
    at = design.block[left]
    between = (a.taken(left) * a.taken(right) * shrink.taken(at)).scaled(-1.0)
    own = a.taken(left).scaled((left == right).astype(float))
    return between + own, shared.log().total()


def _system(design: Crossed, entries: Jet) -> MatrixJet:
    """C'V⁻¹C for the columns C, with derivatives: all of them by one product with `design.products`."""
    t, width = entries.slope.shape[0], design.columns.shape[1]
    upper = np.triu_indices(t)
    stack = np.concatenate((entries.value[None], entries.slope, entries.curve[upper]))
    matrices = np.ascontiguousarray((design.products @ stack.T).T).reshape(-1, width, width)
    curve = np.empty((t, t, width, width))
    curve[upper] = matrices[t + 1 :]
    curve[upper[1], upper[0]] = matrices[t + 1 :]
    return MatrixJet(matrices[0], matrices[1 : t + 1], curve)


def _products(columns: csr_array, left: NDArray[np.intp], right: NDArray[np.intp]) -> csr_array:
    """The linear map from entries V⁻¹[left, right] to the entries of C'V⁻¹C, row by row."""
    each, width = np.diff(columns.indptr), columns.shape[1]
    most = int(each.max())
    at = np.minimum(columns.indptr[:-1, None] + np.arange(most), columns.indices.size - 1)
    real = np.arange(most) < each[:, None]
    place, value = columns.indices[at], np.where(real, columns.data[at], 0.0)
    rows = place[left][:, :, None] * width + place[right][:, None, :]
    weights = value[left][:, :, None] * value[right][:, None, :]
    pair = np.broadcast_to(np.arange(left.size)[:, None, None], rows.shape)
    return csr_array((weights.ravel(), (rows.ravel(), pair.ravel())), shape=(width * width, left.size))


def estimate_crossed(chain: Chain, place: NDArray[np.intp]) -> Estimate:
    """Fits value ~ group + session + the chain's levels by REML, groups in the order of `place`.

    Raises:
        StatsError: the design cannot tell the session's spread from another, or is too large.
    """
    design = crossed_of(chain)
    _refuse_saturated(design)
    t = len(design.random)
    scale = float(np.var(chain.rows.y)) + np.finfo(float).tiny
    starts = [np.full(t, scale / t), scale * np.array([1e-3] * (t - 1) + [1.0])]
    _refuse_confounded(design, crossed_criterion(design, starts[0]).information)
    theta, found = minimise(lambda at: crossed_criterion(design, at), starts)
    w = found.precision
    return Estimate(
        random=design.random,
        theta=theta,
        criterion=found.value,
        means=found.means[place],
        spread=CorrelatedMeans.of(w.value, w.slope, w.curve).taken(place),
        expected=inverse(found.information),
        observed=inverse_of_free(0.5 * found.hessian, theta > 0.0),
        criterion_at=lambda at: crossed_criterion(design, at),
    )


def _refuse_saturated(design: Crossed) -> None:
    """Where the run is the residual, sessions and batches must leave it something."""
    if design.within_df > 0:
        return
    runs, k = design.size.size, design.k
    sessions = int(design.block.max()) + 1
    left = runs - sessions - (design.columns.shape[1] - k - 1)
    if runs * (runs + sessions) <= SMALL:
        blocks = np.eye(sessions)[design.block]
        columns = design.columns.toarray()
        y = columns[:, k]
        matrix = np.hstack((np.delete(columns, k, axis=1), blocks))
        solution, _, rank, _ = np.linalg.lstsq(matrix, y)
        left = runs - int(rank)
        if float(np.sum((y - matrix @ solution) ** 2)) <= NOTHING * float(np.sum(y**2)):
            left = 0
    if left <= 0:
        raise StatsError(
            "sessions and batches account for every run: nothing is left to judge a difference by",
            where="sessions",
            advice="replicate some runs, test batches in more sessions, or leave the sessions out",
        )


def _refuse_confounded(design: Crossed, information: NDArray[np.float64]) -> None:
    diagonal = np.diag(information)
    with_session = diagonal[0] > TOLD_APART * diagonal.max()
    if with_session:
        scale = 1.0 / np.sqrt(np.maximum(diagonal, np.finfo(float).tiny))
        if np.linalg.eigvalsh(information * scale[:, None] * scale)[0] > TOLD_APART:
            return
    others = ", ".join(design.random[1:])
    raise StatsError(
        f"the spread from session to session cannot be told apart from that of {others} or from the groups",
        where="sessions",
        advice="test several batches in one session and one batch in several sessions, or leave the sessions out",
    )
