"""What must hold for any data: nothing but the values and their groups moves a figure."""

import math
from typing import Any

import numpy as np
import pytest
import scipy.stats
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from sameline.errors import StatsError
from sameline.stats import PROCEDURES, PairsResult, Procedure, anova, compare_pairs, kruskal_wallis, welch_anova

Rows = list[tuple[float, str]]
BY_NAME = pytest.mark.parametrize("procedure", PROCEDURES, ids=[procedure.name for procedure in PROCEDURES])


@st.composite
def rows(draw: st.DrawFn, most: int = 5, fewest_values: int = 2, groups: int | None = None) -> Rows:
    """Laboratory values with two decimals in a few groups; some group has a spread."""
    k = groups or draw(st.integers(2, most))
    cells = st.lists(st.integers(0, 2000), min_size=fewest_values, max_size=6)
    found = [draw(cells) for _ in range(k)]
    assume(any(len(set(cell)) > 1 for cell in found))
    return [(number / 100, label) for label, cell in zip("ABCDE", found, strict=False) for number in cell]


def compared(data: Rows, procedure: Procedure, **options: Any) -> PairsResult:  # noqa: ANN401 - options of all kinds
    values, labels = zip(*data, strict=True)
    options.setdefault("control", labels[0])
    if procedure.control == "none":
        del options["control"]
    try:
        return compare_pairs(values, labels, procedure.name, **options)
    except StatsError:
        assume(False)  # noqa: FBT003 - hypothesis's own signature
        raise


def figures(result: PairsResult) -> dict[frozenset[str], tuple[Any, ...]]:
    """The figures of each pair, for whichever of the two groups comes first."""
    found = {}
    for pair in result.pairs:
        ends = [pair.lower, pair.upper]
        if pair.a > pair.b and result.control is None:
            ends = [None if end is None else -end for end in reversed(ends)]
        magnitudes = [None if x is None else abs(x) for x in (pair.difference, pair.statistic)]
        found[frozenset((pair.a, pair.b))] = (
            *magnitudes,
            pair.standard_error,
            pair.df,
            pair.p_value,
            *ends,
            pair.verdict,
            pair.differs,
        )
    return found


@BY_NAME
@settings(max_examples=40)
@given(data=rows(fewest_values=1), seed=st.integers(0, 2**32 - 1))
def test_order_of_rows_and_groups_does_not_matter_to_the_last_bit(procedure: Procedure, data: Rows, seed: int):
    shuffled = [data[at] for at in np.random.default_rng(seed).permutation(len(data))]
    first = compared(data, procedure, control="A", margin=1.0)
    second = compared(shuffled, procedure, control="A", margin=1.0)
    assert figures(first) == figures(second)
    assert {group.label: group for group in first.groups} == {group.label: group for group in second.groups}
    assert (first.lines, first.display.letters, first.display.kind) == (
        second.lines,
        second.display.letters,
        second.display.kind,
    )
    assert [caution.code for caution in first.cautions] == [caution.code for caution in second.cautions]
    assert (first.anova and first.anova.F) == (second.anova and second.anova.F)


@settings(max_examples=40)
@given(data=rows(), seed=st.integers(0, 2**32 - 1))
def test_global_tests_do_not_know_the_order(data: Rows, seed: int):
    shuffled = [data[at] for at in np.random.default_rng(seed).permutation(len(data))]
    for test in (welch_anova, kruskal_wallis, anova):
        try:
            first = test(*zip(*data, strict=True))
        except StatsError:
            continue
        second = test(*zip(*shuffled, strict=True))
        assert (first.statistic, first.p_value) == (second.statistic, second.p_value)


@BY_NAME
@settings(max_examples=25)
@given(data=rows(), shift=st.integers(-10_000, 10_000), power=st.integers(-3, 3))
def test_shift_and_scale_carry_through(procedure: Procedure, data: Rows, shift: int, power: int):
    scale = 10.0**power
    moved = [(f"{(value + shift):.2f}e{power}", label) for value, label in data]
    as_text = [(f"{value:.2f}", label) for value, label in data]
    before, after = compared(as_text, procedure, margin=1.0), compared(moved, procedure, margin=scale)
    for old, new in zip(before.pairs, after.pairs, strict=True):
        assert new.difference == pytest.approx(old.difference * scale, rel=1e-12, abs=1e-12 * scale)
        for name in ("statistic", "df", "p_value"):
            one, other = getattr(old, name), getattr(new, name)
            assert other == (one if one is None else pytest.approx(one, rel=1e-10, abs=1e-300))
        if old.lower is not None:
            width = min(old.upper - old.lower, 1e3)
            for one, other in ((old.lower, new.lower), (old.upper, new.upper)):
                assert other == pytest.approx(one * scale, rel=1e-10, abs=1e-10 * width * scale)
        assert (new.verdict, new.differs) == (old.verdict, old.differs)


@BY_NAME
@settings(max_examples=25)
@given(data=rows())
def test_other_labels_carry_through(procedure: Procedure, data: Rows):
    names = {"A": "zeta", "B": "lot 7", "C": "Ä", "D": "-", "E": "0"}
    before, after = compared(data, procedure), compared([(v, names[label]) for v, label in data], procedure)
    assert [(names[p.a], names[p.b], *p[2:]) for p in before.pairs] == [tuple(p) for p in after.pairs]
    if len(set(before.question.samples.mean.tolist())) == len(before.labels):  # equal means go by label
        assert [[names[label] for label in line] for line in before.lines] == after.lines


@BY_NAME
@settings(max_examples=40)
@given(
    data=rows(), alpha=st.sampled_from([0.01, 0.05, 0.2, 0.5]), side=st.sampled_from(["two-sided", "less", "greater"])
)
def test_an_interval_leaves_out_zero_exactly_when_p_is_below_alpha(
    procedure: Procedure, data: Rows, alpha: float, side: str
):
    options = {} if procedure.control == "none" else {"alternative": side}
    result = compared(data, procedure, alpha=alpha, **options)
    for pair in result.pairs:
        assert pair.differs == (pair.p_value is not None and pair.p_value < alpha)
        if pair.lower is not None and pair.upper is not None:
            assert (pair.lower > 0 or pair.upper < 0) == pair.differs
            assert pair.lower <= pair.difference <= pair.upper or procedure.family == "ranks"
            assert procedure.intervals
        assert pair.p_value is None or 0 <= pair.p_value <= 1


@BY_NAME
@settings(max_examples=25)
@given(data=rows(most=5))
def test_the_display_tells_the_pairs(procedure: Procedure, data: Rows):
    result = compared(data, procedure)
    if result.control is not None:
        assert result.lines == []
        return
    together = [set(line) for line in result.lines]
    for pair in result.pairs:
        assert any({pair.a, pair.b} <= line for line in together) != pair.differs


@settings(max_examples=60)
@given(data=rows(groups=2))
def test_tukey_kramer_and_dunnett_with_two_groups_are_the_t_test(data: Rows):
    groups = [[value for value, label in data if label == name] for name in "AB"]
    assume(all(len(set(group)) > 1 for group in groups))  # the peer warns otherwise
    peer = scipy.stats.ttest_ind(groups[1], groups[0])
    ends = peer.confidence_interval(0.95)
    values, labels = zip(*data, strict=True)
    for options in (
        {"procedure": "tukey-kramer"},
        {"procedure": "dunnett", "control": "A"},
        {"procedure": "bonferroni"},
    ):
        (pair,) = compare_pairs(values, labels, **options).pairs
        scale = math.sqrt(2) if options["procedure"] == "tukey-kramer" else 1
        assert abs(pair.statistic) == pytest.approx(abs(peer.statistic) * scale, rel=1e-8, abs=1e-8)
        assert pair.p_value == pytest.approx(peer.pvalue, rel=1e-7)
        assert (pair.lower, pair.upper) == pytest.approx((ends.low, ends.high), rel=1e-8, abs=1e-8)


@settings(max_examples=40)
@given(data=rows())
def test_sharper_procedures_are_sharper(data: Rows):
    values, labels = zip(*data, strict=True)
    p = {
        name: compare_pairs(values, labels, name).columns.p_value
        for name in ("bonferroni", "sidak", "holm", "tukey-kramer")
    }
    loose = p["bonferroni"] * (1 + 1e-9)
    assert np.all(p["sidak"] <= loose)
    assert np.all(p["holm"] <= loose)
    assert np.all(p["tukey-kramer"] <= loose)


def test_a_second_call_gives_the_same_bits():
    data = [(value, label) for label in "ABCD" for value in np.random.default_rng(3).normal(10, 1, 7).tolist()]
    values, labels = zip(*data, strict=True)
    for procedure in PROCEDURES:
        control = "A" if procedure.control == "needed" else None
        first, second = (compare_pairs(values, labels, procedure.name, control=control) for _ in range(2))
        assert first.pairs == second.pairs
