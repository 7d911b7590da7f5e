"""Dunnett's distribution against outside numbers, exact probabilities, and a slow literal form.

Sources: C. W. Dunnett, A multiple comparison procedure for comparing several treatments with a control, J. Am. Statist.
Assoc. 50, 1955, 1096-1121 (one-sided table) and New tables for multiple comparisons with a control, Biometrics 20,
1964, 482-491 (two-sided table); reference cases (tests/reference/README.md); Student's t for one comparison.
"""

import itertools
import math
from collections.abc import Callable
from typing import Any

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.errors import StatsError
from sameline.stats.dunnett_distribution import dunnett_isf, dunnett_sf

EQUAL = math.sqrt(0.5)
SIDES = ("two-sided", "greater", "less")


def composite_nodes(edges: list[float], each: int) -> list[tuple[mpmath.mpf, mpmath.mpf]]:
    """Gauss-Legendre nodes and weights on each stretch between edges."""
    x, w = np.polynomial.legendre.leggauss(each)
    pairs = []
    for a, b in itertools.pairwise(edges):
        half = mpmath.mpf(b - a) / 2
        pairs += [(mpmath.mpf(a) + half * (1 + float(t)), half * float(u)) for t, u in zip(x, w, strict=True)]
    return pairs


def literal_sf(t: float, lambdas: list[float], df: float, *, two_sided: bool) -> float:
    """1 - P(every T_i within the limit) from the definition, in 30-digit arithmetic."""
    with mpmath.workdps(30):
        nu = mpmath.mpf(df)
        constant = nu ** (nu / 2) / (mpmath.gamma(nu / 2) * 2 ** (nu / 2 - 1))
        total = mpmath.mpf(0)
        most = 8.0 / math.sqrt(df) + 1.5
        for s, weight in composite_nodes([0.0, *(most * 0.6**j for j in range(5, -1, -1))], 11):
            density = constant * s ** (nu - 1) * mpmath.exp(-nu * s * s / 2)
            total += weight * density * literal_known_scale(t * s, lambdas, two_sided=two_sided)
        return float(total)


def literal_known_scale(w: mpmath.mpf, lambdas: list[float], *, two_sided: bool) -> mpmath.mpf:
    """∫ φ(z) [1 - Π {Φ((w - λz)/c) - Φ((-w - λz)/c)}] dz, the second term for two sides only."""
    total = mpmath.mpf(0)
    top = max(9.0, 9.0 + float(w))
    for z, weight in composite_nodes([top * (j / 8 - 1) for j in range(17)], 16):
        inside = mpmath.mpf(1)
        for weight_of_control in lambdas:
            lam = mpmath.mpf(weight_of_control)
            c = mpmath.sqrt(1 - lam * lam)
            inside *= mpmath.ncdf((w - lam * z) / c) - (mpmath.ncdf((-w - lam * z) / c) if two_sided else 0)
        total += weight * mpmath.npdf(z) * (1 - inside)
    return total


@pytest.mark.parametrize(
    ("t", "lambdas", "df", "two_sided"),
    [
        (7.0, [0.3, 0.6, 0.8], 12.0, True),
        (9.0, [0.5, 0.75], 20.0, False),
        (3.0, [0.2, 0.6, 0.6], 3.0, False),
    ],
)
@pytest.mark.slow
def test_agrees_with_the_literal_integral(t: float, lambdas: list[float], df: float, two_sided: bool):
    alternative = "two-sided" if two_sided else "greater"
    expected = literal_sf(t, lambdas, df, two_sided=two_sided)
    assert dunnett_sf(t, lambdas, df, alternative) == pytest.approx(expected, rel=1e-11, abs=0)


@pytest.mark.parametrize("lambdas", [[0.3], [0.1, 0.85], [0.5, 0.6, 0.7]])
@pytest.mark.parametrize("two_sided", [True, False])
def test_known_scale_agrees_with_the_literal_integral(lambdas: list[float], two_sided: bool):
    for w in (1.0, 7.0):
        with mpmath.workdps(30):
            expected = float(literal_known_scale(mpmath.mpf(w), lambdas, two_sided=two_sided))
        got = dunnett_sf(w, lambdas, math.inf, "two-sided" if two_sided else "greater")
        assert got == pytest.approx(expected, rel=1e-10, abs=0)


@pytest.mark.parametrize("df", [1.0, 2.0, 7.5, 100.0, 1e4])
@pytest.mark.parametrize("weight", [0.0, 0.3, EQUAL, 0.99])
def test_one_comparison_is_students_t(weight: float, df: float):
    for t in (0.01, 0.5, 2.0, 6.0, 30.0):
        with mpmath.workdps(40):
            nu, x = mpmath.mpf(df), mpmath.mpf(t)
            expected = float(mpmath.betainc(nu / 2, 0.5, 0, nu / (nu + x * x), regularized=True))
        if expected > 1e-280:
            assert dunnett_sf(t, [weight], df) == pytest.approx(expected, rel=5e-12, abs=0)
            assert dunnett_sf(t, [weight], df, "greater") == pytest.approx(expected / 2, rel=5e-12, abs=0)
            assert dunnett_sf(-t, [weight], df, "greater") == pytest.approx(1 - expected / 2, rel=5e-14, abs=0)


@pytest.mark.parametrize("m", [1, 2, 3, 10, 60])
@pytest.mark.parametrize("df", [1.0, 12.0, math.inf])
def test_equal_groups_exceed_zero_with_an_exact_probability(m: int, df: float):
    # with correlation 1/2 the chance that the control is the largest of m + 1 like values is 1/(m+1)
    assert dunnett_sf(0.0, [EQUAL] * m, df, "greater") == pytest.approx(1 - 1 / (m + 1), rel=1e-13)


@pytest.mark.parametrize(("one", "other"), [(0.3, 0.8), (0.1, 0.2), (0.95, 0.9)])
def test_two_comparisons_exceed_zero_with_sheppards_probability(one: float, other: float):
    # W. F. Sheppard, 1899: P(both normal values < 0) = 1/4 + arcsin(correlation)/(2 pi)
    expected = 0.75 - math.asin(one * other) / (2 * math.pi)
    assert dunnett_sf(0.0, [one, other], 9.0, "greater") == pytest.approx(expected, rel=1e-13)


def test_reference_values(dunnett_case: dict[str, Any], near: Callable[..., None]):
    expect, options, labels = dunnett_case["expect"], dunnett_case["options"], dunnett_case["data"]["group"]
    control, alternative = options["control"], options["alternative"]
    treated = [label for label in dict.fromkeys(labels) if label != control]
    n0 = labels.count(control)
    lambdas = [math.sqrt(labels.count(label) / (labels.count(label) + n0)) for label in treated]
    table = expect["comparisons"]
    near(dunnett_sf(np.array(table["t"]), lambdas, expect["df"], alternative), table["p"], atol=1e-11)
    alpha = options["alpha"] if "alpha" in options else 1 - options["conf_level"]
    near(abs(dunnett_isf(alpha, lambdas, expect["df"], alternative)), abs(expect["critical_value"]), rtol=1e-11)


# 5 % points for 1 to 9 comparisons of equal groups, as printed (here from memory): two-sided Dunnett (1964),
# one-sided Dunnett (1955). Half a unit in the last digit, and a little more for the tables' own rounding.
PRINTED = {
    ("two-sided", 10): (2.23, 2.57, 2.76, 2.89, 2.99, 3.07, 3.14, 3.19, 3.24),
    ("two-sided", 20): (2.09, 2.38, 2.54, 2.65, 2.73, 2.80, 2.86, 2.90, 2.95),
    ("two-sided", math.inf): (1.96, 2.21, 2.35, 2.44, 2.51, 2.57, 2.61, 2.65, 2.69),
    ("greater", 10): (1.81, 2.15, 2.34, 2.47, 2.56, 2.64, 2.70, 2.76, 2.81),
    ("greater", math.inf): (1.64, 1.92, 2.06, 2.16, 2.23, 2.29, 2.34, 2.38, 2.42),
}


@pytest.mark.parametrize(("alternative", "df"), PRINTED)
def test_dunnetts_tables(alternative: str, df: float):
    for m, printed in enumerate(PRINTED[alternative, df], start=1):
        assert dunnett_isf(0.05, [EQUAL] * m, df, alternative) == pytest.approx(printed, abs=0.0061), m


weights = st.lists(st.floats(0.0, 0.97), min_size=1, max_size=5)
freedoms = st.one_of(st.just(math.inf), st.floats(0, 4).map(lambda exponent: 10.0**exponent))


@given(st.floats(-12, -0.02).map(lambda exponent: 10.0**exponent), weights, freedoms, st.sampled_from(SIDES))
@settings(max_examples=40, deadline=None)
def test_critical_value_and_tail_undo_each_other(alpha: float, lambdas: list[float], df: float, alternative: str):
    critical = dunnett_isf(alpha, lambdas, df, alternative)
    assert dunnett_sf(critical, lambdas, df, alternative) == pytest.approx(alpha, rel=1e-11, abs=0)


@given(st.floats(-30, 30), weights, freedoms)
@settings(max_examples=40, deadline=None)
def test_less_is_greater_in_the_mirror_and_order_does_not_matter(t: float, lambdas: list[float], df: float):
    assert dunnett_sf(t, lambdas, df, "less") == dunnett_sf(-t, lambdas, df, "greater")
    assert dunnett_sf(t, lambdas, df) == dunnett_sf(-t, lambdas[::-1], df)


def test_bounds_of_single_and_independent_comparisons():
    # Slepian and Šidák: between one comparison's p and what independent comparisons would give
    t, m, df = np.linspace(0.5, 8, 30), 6, math.inf
    single = dunnett_sf(t, [0.0], df)
    joint = dunnett_sf(t, [0.4, 0.5, 0.6, 0.7, 0.8, 0.9], df)
    assert (joint > single).all()
    assert (joint <= -np.expm1(m * np.log1p(-single)) * (1 + 1e-12)).all()


def test_unequal_weights_meet_equal_ones():
    t = np.linspace(0.2, 9, 25)
    apart = dunnett_sf(t, [EQUAL - 1e-9, EQUAL, EQUAL + 1e-9], 8.0)
    assert np.allclose(apart, dunnett_sf(t, [EQUAL] * 3, 8.0), rtol=1e-8, atol=0)


def test_few_controls_need_fine_steps():
    # λ² = n/(n + n0) = 400/402: the given control's mean decides nearly all; doubling resolution by splitting λ agrees
    lam = math.sqrt(400 / 402)
    t = np.array([0.5, 2.0, 4.0, 7.0])
    together = dunnett_sf(t, [lam] * 8, 30.0)
    finer = dunnett_sf(t, [lam] * 8 + [math.sqrt(4000 / 4002)], 30.0)
    assert (finer > together).all()
    assert np.allclose(finer, together, rtol=0.12)


@pytest.mark.parametrize("df", [1.0, 50.0, 1e6, 1e300, math.inf])
@pytest.mark.parametrize("lambdas", [[0.0], [0.9999], [0.5, 0.9], [0.1] * 50])
@pytest.mark.parametrize("alternative", SIDES)
def test_extremes_stay_finite(lambdas: list[float], df: float, alternative: str):
    t = np.array([-math.inf, -1e308, -10.0, -1e-320, 0.0, 1e-320, 1e-5, 1.0, 1e5, 1e308, math.inf])
    assert np.isfinite(dunnett_sf(t, lambdas, df, alternative)).all()
    for level in (1e-250, 0.6, 0.999):
        critical = dunnett_isf(level, lambdas, df, alternative)
        assert dunnett_sf(critical, lambdas, df, alternative) == pytest.approx(level, rel=1e-10, abs=0)


def test_shapes():
    assert isinstance(dunnett_sf(2.0, [0.5], 10), float)
    assert isinstance(dunnett_isf(0.05, [0.5], 10), float)
    assert dunnett_sf([[1.0, 2.0]], [0.5, 0.6], 10).shape == (1, 2)
    assert dunnett_sf([0.0, math.inf], [0.5], 10).tolist() == [1.0, 0.0]
    assert dunnett_sf([-math.inf, math.inf], [0.5], 10, "greater").tolist() == [1.0, 0.0]


@pytest.mark.parametrize(
    ("call", "word"),
    [
        (lambda: dunnett_sf(math.nan, [0.5], 5), "not a number"),
        (lambda: dunnett_sf(2.0, [], 5), "weight"),
        (lambda: dunnett_sf(2.0, [1.0], 5), "weight"),
        (lambda: dunnett_sf(2.0, [0.5], 0.5), "degrees of freedom"),
        (lambda: dunnett_sf(2.0, [0.5], 5, "both"), "alternative"),
        (lambda: dunnett_isf(1.0, [0.5], 5), "between 0 and 1"),
    ],
)
def test_refusals_say_what_is_wrong(call: Callable[[], float], word: str):
    with pytest.raises(StatsError, match=word):
        call()
