"""The studentized range against outside numbers, a slow literal form, and what must hold of any distribution.

Sources: H. L. Harter, Tables of range and studentized range, Ann. Math. Statist. 31, 1960, 1122-1147; mpmath integrals
published with SciPy; reference cases (tests/reference/README.md); Student's t for two groups.
"""

import itertools
import json
import math
from collections.abc import Callable
from pathlib import Path
from typing import Any

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.errors import StatsError
from sameline.stats.range_tail import log_quantile, log_sf
from sameline.stats.studentized_range import (
    studentized_range_cdf,
    studentized_range_isf,
    studentized_range_ppf,
    studentized_range_sf,
)

PUBLISHED = Path(__file__).parents[1] / "reference" / "studentized_range_cdf_mpmath.json"


def composite_nodes(edges: list[float], each: int) -> list[tuple[mpmath.mpf, mpmath.mpf]]:
    """Gauss-Legendre nodes and weights on each stretch between edges."""
    x, w = np.polynomial.legendre.leggauss(each)
    pairs = []
    for a, b in itertools.pairwise(edges):
        half = mpmath.mpf(b - a) / 2
        pairs += [(mpmath.mpf(a) + half * (1 + float(t)), half * float(u)) for t, u in zip(x, w, strict=True)]
    return pairs


def literal_sf(q: float, groups: int, df: float) -> float:
    """P(Q > q) from the definition in 30-digit arithmetic: the density of s, times the range's distribution at q·s."""
    with mpmath.workdps(30):
        nu, k = mpmath.mpf(df), groups
        constant = nu ** (nu / 2) / (mpmath.gamma(nu / 2) * 2 ** (nu / 2 - 1))
        most = min(9.0 / math.sqrt(df) + 2.0, 60.0 / q)
        edges = [0.0, *(most * 0.6**j for j in range(6, -1, -1))] if df < 50 else [0.1 * j for j in range(2, 19)]
        total = mpmath.mpf(0)
        for s, weight in composite_nodes(edges, 14):
            density = constant * s ** (nu - 1) * mpmath.exp(-nu * s * s / 2)
            total += weight * density * literal_range_sf(q * s, k)
        return float(total)


def literal_range_sf(w: mpmath.mpf, groups: int) -> mpmath.mpf:
    """P(range of k normal values > w): k ∫ φ(z) {Q(z)^(k-1) - [Q(z) - Q(z+w)]^(k-1)} dz."""
    total = mpmath.mpf(0)
    each = 16 if groups < 30 else 28
    for z, weight in composite_nodes([-8.5 - float(w) / 2 + 2.0 * j for j in range(9)], each):
        above, beyond = mpmath.erfc(z / mpmath.sqrt(2)) / 2, mpmath.erfc((z + w) / mpmath.sqrt(2)) / 2
        total += weight * mpmath.npdf(z) * (above ** (groups - 1) - (above - beyond) ** (groups - 1))
    return groups * total


LITERAL = [(9.0, 20, 10.0)]
MORE_LITERAL = [
    (40.0, 3, 1.0),
    (60.0, 200, 1.0),
    (300.0, 20, 2.0),
    (28.0, 4, 7.3),
    (10.5, 8, 300.0),
]


@pytest.mark.parametrize(("q", "groups", "df"), LITERAL)
def test_agrees_with_the_literal_integral(q: float, groups: int, df: float):
    assert studentized_range_sf(q, groups, df) == pytest.approx(literal_sf(q, groups, df), rel=1e-12, abs=0)


@pytest.mark.slow
@pytest.mark.parametrize(("q", "groups", "df"), MORE_LITERAL)
def test_agrees_with_the_literal_integral_on_more_cases(q: float, groups: int, df: float):
    assert studentized_range_sf(q, groups, df) == pytest.approx(literal_sf(q, groups, df), rel=1e-12, abs=0)


@pytest.mark.parametrize("groups", [3, 20, 200, 1000])
def test_known_scale_agrees_with_the_literal_integral(groups: int):
    for w in (2.0, 6.0, 12.0, 30.0):
        with mpmath.workdps(150):
            expected = float(literal_range_sf(mpmath.mpf(w), groups))
        assert studentized_range_sf(w, groups, math.inf) == pytest.approx(expected, rel=3e-12, abs=0)


@pytest.mark.parametrize("df", [1.0, 1.3, 2.0, 5.0, 17.5, 100.0, 1e4, math.inf])
def test_two_groups_are_students_t(df: float):
    for q in (0.01, 0.5, 1.0, 3.0, 6.0, 12.0, 40.0, 1e3):
        x = mpmath.mpf(q) / mpmath.sqrt(2)
        if math.isinf(df):
            expected = mpmath.erfc(x / mpmath.sqrt(2))
        else:
            with mpmath.workdps(40):
                nu = mpmath.mpf(df)
                expected = mpmath.betainc(nu / 2, 0.5, 0, nu / (nu + x * x), regularized=True)
        if expected > 1e-280:
            assert studentized_range_sf(q, 2, df) == pytest.approx(float(expected), rel=5e-12, abs=0), (q, df)


def test_published_cdf_values_of_mpmath():
    published = json.loads(PUBLISHED.read_text(encoding="utf-8"))
    assert len(published["rows"]) == 72
    for q, groups, df, atol, rtol, expected in published["rows"]:
        got = studentized_range_cdf(q, groups, df)
        assert abs(got - expected) <= atol + rtol * expected, (q, groups, df)


def test_reference_values(studentized_range_case: dict[str, Any], near: Callable[..., None]):
    what, grid = studentized_range_case["options"]["what"], studentized_range_case["expect"]["grid"]
    k, df = np.array(grid["k"]), np.array([float(v) for v in grid["df"]])
    for groups in np.unique(k):
        rows = np.flatnonzero(k == groups)
        column = {name: np.array([float(grid[name][row]) for row in rows]) for name in grid if not name.endswith("_r")
                  and name not in ("k", "df", "r_rel_error", "cdf_own")}  # fmt: skip
        if what == "quantile":
            near(studentized_range_isf(column["alpha"], int(groups), df[rows]), column["q"], rtol=1e-11)
            near(studentized_range_ppf(1 - column["alpha"], int(groups), df[rows]), column["q"], rtol=1e-11)
        elif what == "cdf":
            near(studentized_range_cdf(column["q"], int(groups), df[rows]), column["cdf"], atol=1e-11)
        else:
            near(studentized_range_sf(column["q"], int(groups), df[rows]), column["p_upper"], rtol=1e-11)


# Upper 5 % and 1 % points for k = 2 .. 10 as printed by Harter (1960), here from memory; one unit in the last digit is
# allowed, because later printings differ by that much.
HARTER = {
    (0.05, 2): (6.085, 8.331, 9.798, 10.88, 11.74, 12.44, 13.03, 13.54, 13.99),
    (0.05, 5): (3.635, 4.602, 5.218, 5.673, 6.033, 6.330, 6.582, 6.802, 6.995),
    (0.05, 10): (3.151, 3.877, 4.327, 4.654, 4.912, 5.124, 5.305, 5.461, 5.599),
    (0.05, 20): (2.950, 3.578, 3.958, 4.232, 4.445, 4.620, 4.768, 4.896, 5.008),
    (0.05, math.inf): (2.772, 3.314, 3.633, 3.858, 4.030, 4.170, 4.286, 4.387, 4.474),
    (0.01, 5): (5.702, 6.976, 7.804, 8.421, 8.913, 9.321, 9.669, 9.972, 10.24),
    (0.01, 10): (4.482, 5.270, 5.769, 6.136, 6.428, 6.669, 6.875, 7.055, 7.213),
    (0.01, math.inf): (3.643, 4.120, 4.403, 4.603, 4.757, 4.882, 4.987, 5.078, 5.157),
}


@pytest.mark.parametrize(("alpha", "df"), HARTER)
def test_harters_table(alpha: float, df: float):
    for groups, printed in enumerate(HARTER[alpha, df], start=2):
        unit = 0.01 if printed > 10 else 0.001
        assert studentized_range_isf(alpha, groups, df) == pytest.approx(printed, abs=1.01 * unit), groups


@given(
    alpha=st.floats(-12, -0.31).map(lambda exponent: 10.0**exponent),
    groups=st.integers(2, 200),
    df=st.one_of(st.just(math.inf), st.floats(0, 6).map(lambda exponent: 10.0**exponent)),
)
@settings(max_examples=60, deadline=None)
def test_quantile_and_tail_undo_each_other(alpha: float, groups: int, df: float):
    q = studentized_range_isf(alpha, groups, df)
    assert studentized_range_sf(q, groups, df) == pytest.approx(alpha, rel=1e-11, abs=0)


@given(
    p=st.floats(-60, -0.31).map(lambda exponent: 10.0**exponent),
    groups=st.sampled_from([2, 3, 7, 40, 200]),
    df=st.one_of(st.just(math.inf), st.floats(0, 4).map(lambda exponent: 10.0**exponent)),
)
@settings(max_examples=40, deadline=None)
def test_lower_quantile_and_lower_tail_undo_each_other(p: float, groups: int, df: float):
    q = studentized_range_ppf(p, groups, df)
    assert studentized_range_cdf(q, groups, df) == pytest.approx(p, rel=1e-10, abs=0)


@pytest.mark.parametrize("df", [1.0, 3.5, 40.0, math.inf])
@pytest.mark.parametrize("groups", [2, 3, 30, 200])
def test_both_tails_add_to_one(groups: int, df: float):
    q = np.array([0.3, 1.0, 2.0, 3.0, 4.0, 5.0, 7.0, 10.0])
    total = studentized_range_cdf(q, groups, df) + studentized_range_sf(q, groups, df)
    assert np.allclose(total, 1.0, rtol=0, atol=3e-13)


def test_lower_tail_of_a_narrow_range_is_the_leading_power():
    # as w goes to 0, P(range <= w) goes to k w^(k-1) ∫ φ^k = √k (2π)^(-(k-1)/2) w^(k-1)
    for groups in (2, 3, 10, 40):
        expected = math.sqrt(groups) * (1e-6 / math.sqrt(2 * math.pi)) ** (groups - 1)
        assert studentized_range_cdf(1e-6, groups, math.inf) == pytest.approx(expected, rel=1e-10, abs=0)


@pytest.mark.parametrize("df", [1.0, 2.0, 6.5, 30.0, 1e3, 1e6])
@pytest.mark.parametrize("groups", [3, 40, 200])
def test_the_curve_over_q_agrees_with_pair_by_pair(groups: int, df: float):
    q = 10.0 ** np.linspace(-1, 1.6, 60)
    one_by_one = np.exp(log_sf(q, groups, np.full_like(q, df)))
    assert np.allclose(studentized_range_sf(q, groups, df), one_by_one, rtol=2e-12, atol=1e-290)


@pytest.mark.parametrize("alpha", [0.5, 0.05, 1e-8])
@pytest.mark.parametrize("groups", [3, 40, 200])
def test_the_curve_over_df_agrees_with_pair_by_pair(groups: int, alpha: float):
    df = 2.0 ** np.linspace(0, 21, 40)
    one_by_one = np.exp(log_quantile(np.full_like(df, np.log(alpha)), groups, df))
    assert np.allclose(studentized_range_isf(alpha, groups, df), one_by_one, rtol=2e-13, atol=0)


@given(st.lists(st.tuples(st.floats(0, 60), st.floats(1, 500)), min_size=1, max_size=12), st.integers(2, 60))
@settings(max_examples=40, deadline=None)
def test_no_value_depends_on_its_company(pairs: list[tuple[float, float]], groups: int):
    q, df = np.array(pairs).T
    together = studentized_range_sf(np.append(q, 1.0), groups, np.append(df, 1.5))[:-1]
    backwards = studentized_range_sf(np.append(q, 1.0)[::-1], groups, np.append(df, 1.5)[::-1])[1:][::-1]
    assert together.tolist() == backwards.tolist()
    one_df = studentized_range_sf(q, groups, 7.0)
    assert one_df.tolist() == [studentized_range_sf(one, groups, 7.0) for one in q]


def test_tail_falls_with_q_and_grows_with_groups():
    q = np.linspace(0.1, 40, 800)
    previous = np.zeros_like(q)
    for groups in (2, 3, 5, 20, 100, 200):
        tail = studentized_range_sf(q, groups, 9.0)
        assert (np.diff(tail)[tail[1:] < 0.9999] < 0).all()
        assert (np.diff(tail) <= 1e-12).all()
        assert (tail > previous)[previous < 0.9999].all()
        previous = tail


@pytest.mark.parametrize("df", [1.0, 99.9, 100.1, 1e12, 1e19, 1e300, math.inf])
@pytest.mark.parametrize("groups", [2, 200, 10_000])
def test_extremes_stay_finite_and_ordered(groups: int, df: float):
    q = np.array([0.0, 1e-320, 1e-300, 1e-9, 1e-3, 1.0, 10.0, 60.0, 1e10, 1e150, 1e200, 1e308, math.inf])
    upper, lower = studentized_range_sf(q, groups, df), studentized_range_cdf(q, groups, df)
    assert np.isfinite(upper).all()
    assert np.isfinite(lower).all()
    assert (np.diff(upper) <= 1e-13).all()
    assert (np.diff(lower) >= -1e-13).all()
    one_by_one = studentized_range_sf(q, groups, np.full_like(q, df))
    assert np.allclose(upper, one_by_one, rtol=3e-12, atol=1e-280)
    for level in (1e-250, 1e-100, 0.5, 0.999, 1 - 1e-9):
        at = studentized_range_isf(level, groups, df)
        assert studentized_range_sf(at, groups, df) == pytest.approx(level, rel=1e-10, abs=0)
        below = studentized_range_ppf(level, groups, df)
        assert studentized_range_cdf(below, groups, df) == pytest.approx(level, rel=1e-10, abs=0)


def test_shapes_and_ends():
    assert isinstance(studentized_range_sf(3.0, 4, 10), float)
    assert studentized_range_sf([[3.0], [4.0]], 4, [5.0, 6.0, math.inf]).shape == (2, 3)
    assert studentized_range_isf([0.05, 0.01], 4, 10).shape == (2,)
    assert studentized_range_sf(np.array([]), 4, 10).shape == (0,)
    assert studentized_range_sf([-1.0, 0.0, math.inf], 4, 10).tolist() == [1.0, 1.0, 0.0]
    assert studentized_range_cdf([-1.0, 0.0, math.inf], 4, 10).tolist() == [0.0, 0.0, 1.0]


@pytest.mark.parametrize(
    ("call", "word"),
    [
        (lambda: studentized_range_sf(math.nan, 3, 5), "not a number"),
        (lambda: studentized_range_sf(3.0, 1, 5), "groups"),
        (lambda: studentized_range_sf(3.0, 2.5, 5), "groups"),
        (lambda: studentized_range_sf(3.0, 10**6, 5), "groups"),
        (lambda: studentized_range_sf(3.0, 3, 0.5), "degrees of freedom"),
        (lambda: studentized_range_sf(3.0, 3, math.nan), "degrees of freedom"),
        (lambda: studentized_range_isf(0.0, 3, 5), "between 0 and 1"),
        (lambda: studentized_range_ppf(1.0, 3, 5), "between 0 and 1"),
        (lambda: studentized_range_isf(math.nan, 3, 5), "not a number"),
    ],
)
def test_refusals_say_what_is_wrong(call: Callable[[], float], word: str):
    with pytest.raises(StatsError, match=word):
        call()
