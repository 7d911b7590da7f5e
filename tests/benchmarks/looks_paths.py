"""Simulated histories of a comparison, and what each way of looking would claim; used by `looks_false_claims`."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from sameline.stats.looks.blocks import log_block_evidence
from sameline.stats.looks.closed import FEW, closed_p_few
from sameline.stats.looks.evidence import critical_t, log_e_value
from sameline.stats.looks.many import LEAD, closed_p_many, log_pair_evidence, pair_indices
from sameline.stats.looks.open_looks import PHI
from sameline.stats.studentized_range import studentized_range_isf

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Scene:
    """One row of a table.

    `arrivals`: "units" m independent values a group and look; "runs" one run a group and look; "unbalanced" a run for a
    random 60 % of the groups at each look, of 1 to 5 replicates. `run_sd`: spread between runs, replicates have 1.
    `shift`: of the last group, in standard deviations of a unit, from look `start` on (counted from 0).
    """

    groups: int
    looks: int
    arrivals: str
    run_sd: float = 0.0
    shift: float = 0.0
    start: int = 0
    per_look: int = 3
    spreads: tuple[float, ...] = ()


@dataclass(frozen=True)
class Paths:
    """(B, J, k) unit counts and means, (B, J) pooled sum of squares and df; the same for replicates; own variances."""

    n: Floats
    means: Floats
    ss: Floats
    df: Floats
    own_ss: Floats
    replicate_n: Floats
    replicate_means: Floats
    replicate_ss: Floats
    replicate_df: Floats

    @cached_property
    def welch(self) -> tuple[Floats, Floats, Floats, NDArray[np.bool_]]:
        """(B, J, M) |t|, df, squared standard error of each pair by its own variances; where they exist."""
        a, b = pair_indices(self.n.shape[-1])
        variance = self.own_ss / np.maximum(self.n - 1, 1) / np.maximum(self.n, 1)
        both = variance[..., a] + variance[..., b]
        there = (np.minimum(self.n[..., a], self.n[..., b]) > 1) & (both > 0)
        safe = np.where(there, both, 1.0)
        degrees = np.maximum(self.n - 1, 1)
        parts = variance[..., a] ** 2 / degrees[..., a] + variance[..., b] ** 2 / degrees[..., b]
        df = np.where(there, np.maximum(safe**2 / np.where(there, parts, 1.0), 1.0), 1.0)
        t = np.where(there, np.abs(self.means[..., b] - self.means[..., a]) / np.sqrt(safe), 0.0)
        return t, df, safe, there


def simulate(scene: Scene, size: int, seed: int) -> Paths:
    """Draws `size` histories."""
    rng = np.random.default_rng(seed)
    shape = (size, scene.looks, scene.groups)
    drift = np.zeros((scene.looks, scene.groups))
    if scene.arrivals == "units":
        m = scene.per_look
        drift[scene.start :, -1] = scene.shift
        spread = np.array(scene.spreads or (1.0,) * scene.groups)
        values = rng.standard_normal((*shape, m)) * spread[:, None] + drift[..., None]
        there = np.full(shape, float(m))
        n, means, own = cumulate(there, values.mean(-1), ((values - values.mean(-1, keepdims=True)) ** 2).sum(-1))
        return _paths(n, means, own, n, means, own)
    replicates = np.full(shape, 3.0)
    there = np.ones(shape)
    if scene.arrivals == "unbalanced":
        replicates = rng.integers(1, 6, shape).astype(float)
        there = (rng.random(shape) < 0.6).astype(float)
        there[:, :2] = 1.0
    unit_sd = math.sqrt(scene.run_sd**2 + 1 / 3)
    drift[scene.start :, -1] = scene.shift * unit_sd
    run = rng.standard_normal(shape) * scene.run_sd + rng.standard_normal(shape) / np.sqrt(replicates) + drift
    within = rng.chisquare(np.maximum(replicates - 1, 1e-9)) * (replicates > 1)
    zero = np.zeros(shape)
    n, means, own = cumulate(there, run, zero)
    return _paths(n, means, own, *cumulate(replicates * there, run, within * there))


def cumulate(counts: Floats, means: Floats, ss: Floats) -> tuple[Floats, Floats, Floats]:
    """Counts, means and sums of squares about the mean so far, along the looks."""
    n = np.cumsum(counts, 1)
    mean = np.cumsum(counts * means, 1) / np.maximum(n, 1e-300)
    raw = np.cumsum(counts * means**2 + ss, 1) - n * mean**2
    return n, mean, np.maximum(raw, 0.0)


def _paths(n: Floats, means: Floats, own: Floats, rn: Floats, rmeans: Floats, rown: Floats) -> Paths:
    return Paths(
        n,
        means,
        own.sum(-1),
        n.sum(-1) - (n > 0).sum(-1),
        own,
        rn,
        rmeans,
        rown.sum(-1),
        rn.sum(-1) - (rn > 0).sum(-1),
    )


def first_open(paths: Paths, alpha: float, asked: NDArray[np.bool_]) -> Floats:
    """(B,) first look (from 1) at which `judge_open`'s procedure claims an asked pair; inf for never.

    Looks at which the block of all groups stands cannot claim and are passed over; the others are closed pass by pass,
    up to the first claim.
    """
    todo = _may_claim(paths, alpha)
    first = np.full(todo.shape[0], np.inf)
    while True:
        rows = np.flatnonzero(todo.any(axis=1) & np.isinf(first))
        if rows.size == 0:
            return first
        looks = todo[rows].argmax(axis=1)
        p = closed_p(paths, rows, looks)
        claimed = (p[:, asked] <= alpha).any(axis=1)
        first[rows[claimed]] = looks[claimed] + 1.0
        todo[rows, looks] = False


def closed_p(paths: Paths, rows: NDArray[np.intp], looks: NDArray[np.intp]) -> Floats:
    """(r, M) closed p-values at chosen looks of chosen histories."""
    few = paths.n.shape[-1] <= FEW
    size = max(1, 2_000_000 // (4 ** min(paths.n.shape[-1], FEW))) if few else 50
    parts = []
    for at in range(0, rows.size, size):
        r, j = rows[at : at + size], looks[at : at + size]
        judge = closed_p_few if few else closed_p_many
        parts.append(judge(paths.means[r, j], paths.n[r, j], paths.ss[r, j], paths.df[r, j], PHI))
    return np.concatenate(parts)


def _may_claim(paths: Paths, alpha: float) -> NDArray[np.bool_]:
    """(B, J): whether the block of all groups is rejected, or for many groups could be."""
    groups = paths.n.shape[-1]
    if groups <= FEW:
        may = _bound_of_everyone(paths) >= -np.log(alpha)
        at = np.nonzero(may)
        logs = log_block_evidence(paths.means[at], paths.n[at], paths.ss[at], paths.df[at], PHI, everyone=True)
        may[at] = logs[..., 0] >= -np.log(alpha)
        return may
    n, df = paths.n[..., 0], paths.df
    sd = pooled_sd(paths)
    apart = (paths.means.max(-1) - paths.means.min(-1)) / sd * np.sqrt(n / 2)
    pair = apart >= critical_t(df, n / 2, PHI, alpha * 2 * (1 - LEAD) / (groups * (groups - 1)))
    away = np.abs(paths.means - paths.means.mean(-1, keepdims=True)).max(-1) * groups / (groups - 1)
    units = n * (groups - 1) / groups
    return pair | (away / sd * np.sqrt(units) >= critical_t(df, units, PHI, alpha * LEAD / groups))


def _bound_of_everyone(paths: Paths) -> Floats:
    """(B, J): no part of the mixture against "all equal" is above this, for no contrast explains more than all."""
    total = paths.n.sum(-1)
    centre = (paths.n * paths.means).sum(-1) / total
    between = (paths.n * (paths.means - centre[..., None]) ** 2).sum(-1)
    null_df = paths.df + (paths.n > 0).sum(-1) - 1
    least = np.where(paths.n > 0, paths.n, np.inf).min(-1) / 4
    # every part has at least a quarter of the smallest group's units, and shrinks by no more than all of it
    part = between / (paths.ss + between)
    return 0.5 * np.log(PHI / (PHI + least)) - 0.5 * null_df * np.log1p(-np.minimum(part, 1 - 1e-15))


def first_interval_miss(paths: Paths, alpha: float) -> Floats:
    """(B,) first look at which some pair's interval leaves out 0 (true when all means are equal); inf for never."""
    groups = paths.n.shape[-1]
    if is_even(paths.n):
        n = paths.n[..., 0]
        apart = (paths.means.max(-1) - paths.means.min(-1)) / pooled_sd(paths) * np.sqrt(n / 2)
        return first_true(apart >= critical_t(paths.df, n / 2, PHI, 2 * alpha / (groups * (groups - 1))))
    logs = log_pair_evidence(paths.means, paths.n, paths.ss, paths.df, PHI).max(-1)
    return first_true(logs >= np.log(groups * (groups - 1) / 2 / alpha))


def pooled_sd(paths: Paths) -> Floats:
    """(B, J) pooled standard deviation; inf, so that nothing can be claimed, where no degrees of freedom are there."""
    return np.where(paths.df > 0, np.sqrt(paths.ss / np.maximum(paths.df, 1.0)), np.inf)


def first_true(hit: NDArray[np.bool_]) -> Floats:
    """(B,) first look (from 1) that is true; inf for never."""
    return np.where(hit.any(axis=1), hit.argmax(axis=1) + 1.0, np.inf)


def largest_q(n: Floats, means: Floats, ss: Floats, df: Floats) -> Floats:
    """(B, J) largest studentized difference, pooled variance."""
    sd = np.where(df > 0, np.sqrt(ss / np.maximum(df, 1.0)), np.inf)
    if is_even(n):
        return (means.max(-1) - means.min(-1)) * np.sqrt(n[..., 0]) / sd
    a, b = pair_indices(n.shape[-1])
    gap = np.abs(means[..., b] - means[..., a]) / np.sqrt(0.5 / n[..., a] + 0.5 / n[..., b])
    return gap.max(-1) / sd


def is_even(n: Floats) -> bool:
    """Whether all groups have the same number of units at every look."""
    return bool((n == n[..., :1]).all())


def critical_q(rate: Floats, groups: int, df: Floats) -> Floats:
    """Studentized range quantiles for few distinct (rate, df), by table; arguments of one shape (B, ...)."""
    if df.ndim == 2 and (df == df[:1]).all() and (rate == rate[:1]).all():
        return np.broadcast_to(studentized_range_isf(rate[:1], groups, np.maximum(df[:1], 1.0)), df.shape)
    keys = (np.maximum(df, 1.0) + 1j * rate).ravel()
    unique, back = np.unique(keys, return_inverse=True)
    table = np.asarray(studentized_range_isf(unique.imag, groups, unique.real))
    return table[back.ravel()].reshape(rate.shape)


def first_union(paths: Paths, rate: float, growth: float, *, own_spreads: bool) -> Floats:
    """(B,) first look at which judged looks, each with its share of `rate`, claim a pair; inf for never."""
    number = judged_numbers(paths.n.sum(-1), growth)
    rates = rate / (np.maximum(number, 1) * (np.maximum(number, 1) + 1.0))
    groups = paths.n.shape[-1]
    if not own_spreads:
        crossed = largest_q(paths.n, paths.means, paths.ss, paths.df) >= critical_q(rates, groups, paths.df)
        return first_true(crossed & (number > 0))
    t, df, _, there = paths.welch
    q = t * math.sqrt(2.0)
    there = there & (number[..., None] > 0)
    df = np.where(there, np.minimum(np.floor(df), 400.0), 1.0)
    spread = np.broadcast_to(rates[..., None], df.shape)
    crossed = np.zeros(df.shape, dtype=bool)
    # only what a range of two groups would reject can be rejected: most entries need no quantile
    near = there & (q > 2.8)
    crossed[near] = q[near] >= critical_q(spread[near], groups, df[near])
    return first_true(crossed.any(-1))


def first_contrasts(paths: Paths, alpha: float, unit_sd: float) -> Floats:
    """(B,) first look at which `judge_open_contrasts` claims any pair, contrasts by Welch; inf for never.

    With the pairs' evidence alone some pair is claimed exactly when Bonferroni claims the best one.
    """
    t, df, squared_error, there = paths.welch
    logs = np.where(there, log_e_value(t, df, unit_sd**2 / squared_error, PHI), 0.0)
    return first_true(logs.max(-1) >= np.log(logs.shape[-1] / alpha))


def judged_numbers(units: Floats, growth: float) -> NDArray[np.int64]:
    """(B, J): number of the judged look, 0 for a look that is not judged."""
    number = np.zeros(units.shape, dtype=np.int64)
    count, last = np.zeros(units.shape[0], dtype=np.int64), np.zeros(units.shape[0])
    for look in range(units.shape[1]):
        judged = units[:, look] >= growth * last
        count += judged
        last = np.where(judged, units[:, look], last)
        number[:, look] = np.where(judged, count, 0)
    return number


def first_naive(paths: Paths, alpha: float, *, replicates: bool = False) -> Floats:
    """(B,) first look at which Tukey-Kramer, repeated at alpha at every look, claims a pair; inf for never."""
    groups = paths.n.shape[-1]
    seen = (paths.n, paths.means, paths.ss, paths.df)
    if replicates:
        seen = (paths.replicate_n, paths.replicate_means, paths.replicate_ss, paths.replicate_df)
    q = largest_q(*seen)
    return first_true((q >= critical_q(np.full(q.shape, alpha), groups, seen[3])) & (seen[3] > 0))
