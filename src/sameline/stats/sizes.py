"""How many values a group: the power of Tukey's pairs and of Dunnett's comparisons with a control, and its inverses.

The power is that of one comparison whose means truly differ by `difference`: the chance that its simultaneous test
finds it, P(|T'| > critical value) with T' noncentral t, noncentrality difference/(sd·sqrt(1/n_a + 1/n_b)). Both tails
count for a two-sided test. Tukey's critical value is that of the studentized range over √2, Dunnett's his own. Assumes
normal values with one standard deviation in all groups.

A value is an independent unit: a replicate where replicates are independent evidence about the group, a run's mean
where runs are, with `sd` the standard deviation of such means (`run_mean_sd`).

References: J. W. Tukey, The problem of multiple comparisons, 1953; C. W. Dunnett, J. Am. Statist. Assoc. 50, 1955,
1096-1121 and Biometrics 20, 1964, 482-491 (the control's share: most power a value with about n_0 = n·sqrt(m)).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

import numpy as np

from sameline.errors import StatsError
from sameline.stats.dunnett_distribution import Alternative, dunnett_isf
from sameline.stats.noncentral_t import exceedance, noncentrality
from sameline.stats.studentized_range import studentized_range_isf

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray

    Array = NDArray[np.float64]

Procedure = Literal["tukey-kramer", "dunnett"]

_MOST_VALUES = 1_000_000


@dataclass(frozen=True, slots=True)
class Design:
    """What is to be compared, without yet saying how many values.

    Attributes:
        groups: the number of groups, the control among them.
        procedure: "tukey-kramer" for all pairs or "dunnett" for comparisons with a control.
        alpha: the error rate of all comparisons together.
        alternative: for Dunnett: "two-sided", "greater" or "less".
        control_ratio: for Dunnett: values of the control for each value of another group, rounded up.
    """

    groups: int
    procedure: Procedure = "tukey-kramer"
    alpha: float = 0.05
    alternative: Alternative = "two-sided"
    control_ratio: float = 1.0

    def __post_init__(self) -> None:
        """Refuse what cannot be a design.

        Raises:
            StatsError: fewer than two groups, an unknown procedure, an error rate or a control's share out of range, or
                a one-sided or unequal design for all pairs.
        """
        if self.groups != int(self.groups) or self.groups < 2:
            raise StatsError(f"a comparison needs at least 2 groups, got {self.groups}", where="groups")
        if self.procedure not in ("tukey-kramer", "dunnett"):
            raise StatsError(
                f"no sizes for the procedure {self.procedure!r}",
                where="procedure",
                advice="use tukey-kramer or dunnett",
            )
        if not 0.0 < self.alpha < 1.0:
            raise StatsError(f"an error rate lies between 0 and 1, got {self.alpha}", where="alpha")
        if not 0.0 < self.control_ratio < math.inf:
            raise StatsError(f"the control's share must be above 0, got {self.control_ratio}", where="control_ratio")
        if self.procedure == "tukey-kramer" and (self.alternative != "two-sided" or self.control_ratio != 1.0):
            raise StatsError("all pairs have two sides and no control", where="procedure", advice="use dunnett")

    @property
    def two_sided(self) -> bool:
        """Whether both tails count."""
        return self.alternative == "two-sided"

    def control_values(self, n: int) -> int:
        """Return how many values the control has, or the first of a pair."""
        return math.ceil(self.control_ratio * n - 1e-9) if self.procedure == "dunnett" else n

    def total(self, n: int) -> int:
        """Return the number of values in all."""
        return self.control_values(n) + (self.groups - 1) * n

    def critical(self, df: float, weights: ArrayLike) -> float:
        """Return the critical value on the scale of t; `weights` are Dunnett's."""
        if self.procedure == "dunnett":
            return abs(dunnett_isf(self.alpha, weights, df, self.alternative))
        return float(studentized_range_isf(self.alpha, self.groups, df)) / math.sqrt(2.0)


@dataclass(frozen=True, slots=True)
class Size:
    """A number of values a group, and what it buys.

    Attributes:
        n: values in each group (other than the control).
        n_control: values of the control; the same as n for all pairs.
        total: values in all.
        df: degrees of freedom within groups.
        critical: the critical value on the scale of t (times √2 it is that of Tukey's range).
        power: the chance of finding the difference.
        power_below: the same with one value a group less; None where that leaves no degrees of freedom.
    """

    n: int
    n_control: int
    total: int
    df: int
    critical: float
    power: float
    power_below: float | None


def run_mean_sd(run_sd: float, replicate_sd: float, replicates: int) -> float:
    """Return the standard deviation of a run's mean, for sizes counted in runs: sqrt(run_sd² + replicate_sd²/m).

    Args:
        run_sd: standard deviation between runs, at least 0, in the characteristic's unit.
        replicate_sd: standard deviation of replicates within a run, at least 0.
        replicates: replicates m in each run, at least 1.

    Raises:
        StatsError: a figure out of range, or no deviation at all.
    """
    if not (0.0 <= run_sd < math.inf and 0.0 <= replicate_sd < math.inf):
        raise StatsError("a standard deviation must be at least 0", where="run_sd")
    if replicates != int(replicates) or replicates < 1:
        raise StatsError(f"a run has at least one replicate, got {replicates}", where="replicates")
    return _positive(math.hypot(run_sd, replicate_sd / math.sqrt(replicates)), "the standard deviation")


def size_for(design: Design, difference: float, sd: float, power: float = 0.8) -> Size:
    """Return the smallest number of values a group that finds `difference` with the wanted power.

    Args:
        design: what is to be compared.
        difference: the true difference that must not be missed, in the characteristic's unit, above 0.
        sd: the standard deviation of a value within its group, in the same unit, above 0.
        power: the wanted chance of finding it, between alpha and 1.

    Raises:
        StatsError: figures out of range, or more than a million values a group.
    """
    effect = _positive(difference, "difference") / _positive(sd, "sd")
    _check_power(power, design.alpha)
    low = _fewest(design)
    if _power(design, low, effect)[0] < power:
        high = 2 * low
        while _power(design, high, effect)[0] < power:
            low, high = high, 2 * high
            if high > _MOST_VALUES:
                raise StatsError(
                    f"more than {_MOST_VALUES} values a group would be needed",
                    where="difference",
                    advice="ask for a larger difference, or make the measurement more precise",
                )
        while high - low > 1:
            middle = (low + high) // 2
            low, high = (low, middle) if _power(design, middle, effect)[0] >= power else (middle, high)
        low = high
    return _size(design, low, effect)


def power_curve(design: Design, n: int, differences: ArrayLike, sd: float) -> Array:
    """Return the power for each true difference with n values a group.

    Args:
        design: what is to be compared.
        n: values a group, at least 2 (1 if the control brings degrees of freedom).
        differences: shape (d,), at least 0, in the characteristic's unit.
        sd: the standard deviation of a value within its group, above 0.

    Returns:
        Shape (d,), chances between 0 and 1.

    Raises:
        StatsError: figures out of range.
    """
    effects = np.atleast_1d(np.asarray(differences, dtype=np.float64)) / _positive(sd, "sd")
    if not ((effects >= 0.0) & np.isfinite(effects)).all():
        raise StatsError("a difference must be at least 0", where="differences")
    if n != int(n) or n < _fewest(design):
        raise StatsError(f"{n} values a group leave no degrees of freedom", where="n", advice="use at least 2")
    df, critical = _limits(design, int(n))
    root = _root(design, int(n))
    return np.array(
        [exceedance(critical, df, effect * root, two_sided=design.two_sided) for effect in effects.tolist()]
    )


def size_curve(design: Design, sizes: ArrayLike, difference: float, sd: float) -> Array:
    """Return the power for each number of values a group, for one true difference.

    Args:
        design: what is to be compared.
        sizes: shape (s,), whole numbers of values a group.
        difference: as in `size_for`.
        sd: as in `size_for`.

    Raises:
        StatsError: figures out of range.
    """
    counts = np.atleast_1d(np.asarray(sizes)).tolist()
    return np.array([power_curve(design, n, [_positive(difference, "difference")], sd)[0] for n in counts])


def detectable_differences(
    design: Design, n: ArrayLike, sd: float, power: float = 0.8, control: int = 0, df: float | None = None
) -> Array:
    """Return the smallest true difference that data of these sizes find with the wanted power, pair by pair.

    Args:
        design: what was compared; its `control_ratio` is not used.
        n: shape (k,), values in each group, at least 1.
        sd: the standard deviation within groups, the root of the mean square, above 0.
        power: the wanted chance, between alpha and 1.
        control: for Dunnett: the control's place among the groups.
        df: degrees of freedom of sd; by default all values less the number of groups.

    Returns:
        For all pairs shape (k, k), symmetric, 0 on the diagonal; for Dunnett shape (k,), 0 at the control.

    Raises:
        StatsError: figures out of range, no degrees of freedom, or sizes that do not fit the design.
    """
    counts = np.asarray(n, dtype=np.float64)
    if counts.shape != (design.groups,) or not (counts >= 1).all():
        raise StatsError(f"the design has {design.groups} groups of at least one value each", where="n")
    freedom = float(counts.sum() - design.groups) if df is None else df
    if not freedom >= 1.0:
        raise StatsError(
            "no degrees of freedom are left for the spread", where="n", advice="give some group two values"
        )
    _check_power(power, design.alpha)
    if not 0 <= control < design.groups:
        raise StatsError(f"there is no group {control}", where="control")
    others = np.arange(design.groups) != control
    weights = np.sqrt(counts[others] / (counts[others] + counts[control]))
    ncp = noncentrality(design.critical(freedom, weights), freedom, power, two_sided=design.two_sided)
    each = _positive(sd, "sd") * ncp * np.sqrt(1.0 / counts[:, None] + 1.0 / counts[None, :])
    np.fill_diagonal(each, 0.0)
    return np.asarray(each[control] if design.procedure == "dunnett" else each)


def _size(design: Design, n: int, effect: float) -> Size:
    """Return the size with its power, and the power of one less."""
    power, df, critical = _power(design, n, effect)
    below = _power(design, n - 1, effect)[0] if n > _fewest(design) else None
    return Size(n, design.control_values(n), design.total(n), df, critical, power, below)


def _power(design: Design, n: int, effect: float) -> tuple[float, int, float]:
    """Return power, degrees of freedom and critical value."""
    df, critical = _limits(design, n)
    return exceedance(critical, df, effect * _root(design, n), two_sided=design.two_sided), df, critical


def _limits(design: Design, n: int) -> tuple[int, float]:
    """Return degrees of freedom and critical value with n values a group."""
    df = design.total(n) - design.groups
    weight = math.sqrt(n / (n + design.control_values(n)))
    return df, design.critical(df, [weight] * (design.groups - 1))


def _root(design: Design, n: int) -> float:
    """Return what turns difference/sd into the noncentrality: 1/sqrt(1/n_a + 1/n_b)."""
    return 1.0 / math.sqrt(1.0 / n + 1.0 / design.control_values(n))


def _fewest(design: Design) -> int:
    """Return the smallest n that leaves degrees of freedom."""
    return 1 if design.total(1) > design.groups else 2


def _positive(value: float, name: str) -> float:
    """Return a figure above 0, checked."""
    if not 0.0 < value < math.inf:
        raise StatsError(f"{name} must be above 0, got {value}", where=name)
    return float(value)


def _check_power(power: float, alpha: float) -> None:
    """Refuse a power that no size, or every size, has."""
    if not alpha < power < 1.0:
        raise StatsError(f"the wanted power lies between alpha ({alpha}) and 1, got {power}", where="power")
