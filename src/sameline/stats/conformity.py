"""Conformity of a measured quantity with its tolerance limits, its uncertainty taken into account.

What is known of the quantity Y after measuring it is a distribution about the estimate y with standard uncertainty u:
the normal, or Student's t with the degrees of freedom of u where these are few. The probability of conformity is

    p_c = P(T_L <= Y <= T_U) = F((T_U - y)/u) - F((T_L - y)/u),

F the distribution function; a limit that is not there counts as infinitely far. A decision rule compares y with
acceptance limits that lie a guard band g inside (guarded acceptance) or outside (guarded rejection) the tolerance
limits:

- simple acceptance: g = 0;
- guarded acceptance, guarded rejection: g = U = k u, the expanded uncertainty with k for a coverage of 95.45 %, which
  is 2 for the normal;
- ISO 14253-1: conformity is proven where y lies at least g inside, non-conformity where it lies at least g outside, and
  in between neither is; g = k u with the one-sided k for the limiting probability, 1.645 for 95 % and the normal;
- JCGM 106: the same three answers from p_c itself: it conforms where p_c is at least the limiting probability, does not
  where 1 - p_c is.

References: JCGM 106:2012, Evaluation of measurement data - The role of measurement uncertainty in conformity
assessment, 7.2 to 7.4 (probability of conformity), 7.6.3 (capability index), 8.2 and 8.3 (rules); ISO 14253-1:2017
(proving conformity); JCGM 100:2008, G.3 and G.4 (coverage factors and effective degrees of freedom).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from sameline.errors import StatsError
from sameline.stats.distributions import t_isf, t_sf

SIMPLE = "simple acceptance"
ACCEPTANCE = "guarded acceptance"
REJECTION = "guarded rejection"
ISO_14253 = "ISO 14253-1"
JCGM_106 = "JCGM 106"
RULES = (SIMPLE, ACCEPTANCE, REJECTION, ISO_14253, JCGM_106)

CONFORMS, NOT_CONFORMS, UNDECIDED = "conforms", "does not conform", "undecided"
COVERAGE_TAIL = 0.02275013194817921
"""P(Z > 2): the tail beyond a coverage factor of 2."""


@dataclass(frozen=True, slots=True)
class Measured:
    """What was measured.

    Args:
        estimate: y, in the unit of the limits.
        uncertainty: its standard uncertainty u >= 0, in the same unit.
        df: degrees of freedom of u; infinite for the normal.
    """

    estimate: float
    uncertainty: float
    df: float = math.inf


@dataclass(frozen=True, slots=True)
class Conformity:
    """The answer of a decision rule.

    Args:
        rule: one of `RULES`.
        verdict: "conforms", "does not conform" or "undecided".
        probability: of conformity, between 0 and 1.
        guard: width g of the guard band, in the unit of the limits; None where the rule has none.
        lower: lower acceptance limit; None where there is none.
        upper: upper acceptance limit; None likewise.
        capability: measurement capability index C_m = (T_U - T_L)/(4 u) of JCGM 106; None without both limits or u.
    """

    rule: str
    verdict: str
    probability: float
    guard: float | None
    lower: float | None
    upper: float | None
    capability: float | None


def probability_of_conformity(measured: Measured, lower: float | None, upper: float | None) -> float:
    """P(lower <= Y <= upper), each tail computed as such.

    Args:
        measured: what was measured; with u = 0 the answer is 0 or 1.
        lower: T_L, or None.
        upper: T_U, or None.

    Raises:
        StatsError: no limit is given, they are not in order, or a figure cannot be meant.
    """
    _check(measured, lower, upper)
    return 1.0 - sum(_outside(measured, lower, upper))


def judge(
    measured: Measured, lower: float | None, upper: float | None, rule: str, *, probability: float = 0.95
) -> Conformity:
    """Applies a decision rule.

    Args:
        measured: what was measured.
        lower: T_L, in the unit of the estimate, or None.
        upper: T_U, or None.
        rule: one of `RULES`.
        probability: limiting probability of `ISO 14253-1` and `JCGM 106`, at least 0.5 and below 1.

    Raises:
        StatsError: an argument cannot be meant.
    """
    _check(measured, lower, upper)
    if rule not in RULES:
        raise StatsError(f"there is no rule {rule!r}", where="rule", advice=f"one of {', '.join(RULES)}")
    if not 0.5 <= probability < 1.0:
        raise StatsError(
            f"a limiting probability of {probability:g} is none", where="probability", advice="such as 0.95"
        )
    conforming = probability_of_conformity(measured, lower, upper)
    guard = _guard(measured, rule, probability)
    inward = 0.0 if guard is None else -guard if rule == REJECTION else guard
    return Conformity(
        rule=rule,
        verdict=_verdict(measured, lower, upper, rule, guard, conforming, probability),
        probability=conforming,
        guard=guard,
        lower=None if lower is None or guard is None else lower + inward,
        upper=None if upper is None or guard is None else upper - inward,
        capability=_capability(measured, lower, upper),
    )


def combined(measured: Measured, other: float) -> Measured:
    """The same with another standard uncertainty, known without doubt, added in quadrature.

    The degrees of freedom are Welch and Satterthwaite's: df (u'/u)^4 (JCGM 100:2008, G.4).

    Raises:
        StatsError: the other is negative or not finite.
    """
    if not (math.isfinite(other) and other >= 0.0):
        raise StatsError(f"a standard uncertainty of {other:g} is none", advice="give a number of at least 0")
    total = math.hypot(measured.uncertainty, other)
    if measured.uncertainty == 0.0 or other == 0.0:
        return Measured(measured.estimate, total, measured.df if other == 0.0 else math.inf)
    return Measured(measured.estimate, total, measured.df * (total / measured.uncertainty) ** 4)


def _check(measured: Measured, lower: float | None, upper: float | None) -> None:
    if lower is None and upper is None:
        raise StatsError("there is no limit to conform to", where="limits", advice="state a lower or an upper one")
    figures = [measured.estimate, measured.uncertainty, *(x for x in (lower, upper) if x is not None)]
    if not all(math.isfinite(x) for x in figures) or measured.uncertainty < 0.0 or not measured.df > 0.0:
        raise StatsError("an estimate, uncertainty or limit is not a number that can be meant", where="measured")
    if lower is not None and upper is not None and not lower < upper:
        raise StatsError(f"the lower limit {lower:g} is not below the upper limit {upper:g}", where="limits")


def _outside(measured: Measured, lower: float | None, upper: float | None) -> tuple[float, float]:
    y, u = measured.estimate, measured.uncertainty
    if u == 0.0:
        return float(lower is not None and y < lower), float(upper is not None and y > upper)
    below = 0.0 if lower is None else float(t_sf((y - lower) / u, measured.df))
    above = 0.0 if upper is None else float(t_sf((upper - y) / u, measured.df))
    return below, above


def _guard(measured: Measured, rule: str, probability: float) -> float | None:
    if rule == JCGM_106:
        return None
    if rule == SIMPLE:
        return 0.0
    tail = 1.0 - probability if rule == ISO_14253 else COVERAGE_TAIL
    return float(t_isf(tail, measured.df)) * measured.uncertainty


def _verdict(
    measured: Measured,
    lower: float | None,
    upper: float | None,
    rule: str,
    guard: float | None,
    conforming: float,
    probability: float,
) -> str:
    if guard is None:
        outside = sum(_outside(measured, lower, upper))
        return CONFORMS if conforming >= probability else NOT_CONFORMS if outside >= probability else UNDECIDED
    low = -math.inf if lower is None else lower
    high = math.inf if upper is None else upper
    y = measured.estimate
    if rule == REJECTION:
        return CONFORMS if low - guard <= y <= high + guard else NOT_CONFORMS
    if low + guard <= y <= high - guard:
        return CONFORMS
    if rule != ISO_14253:
        return NOT_CONFORMS
    return UNDECIDED if low - guard < y < high + guard else NOT_CONFORMS


def _capability(measured: Measured, lower: float | None, upper: float | None) -> float | None:
    if lower is None or upper is None or measured.uncertainty == 0.0:
        return None
    return (upper - lower) / (4.0 * measured.uncertainty)
