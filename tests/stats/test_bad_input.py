"""What cannot be meant is a typed refusal with advice, or a stated result; never a warning, never NaN in a verdict."""

import math
from decimal import Decimal
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.errors import StatsError
from sameline.stats import (
    PROCEDURES,
    VERDICTS,
    anova,
    cochran_critical,
    cochran_test,
    compare_pairs,
    equivalent_pairs,
    esd_test,
    grubbs_test,
    kruskal_wallis,
    levene_test,
    mandel_statistics,
    shapiro_test,
    welch_anova,
)

GROUPS = ["A"] * 3 + ["B"] * 3 + ["C"] * 3
VALUES = [1.0, 1.2, 1.1, 2.0, 2.3, 2.1, 1.4, 1.5, 1.7]
NAMES = [procedure.name for procedure in PROCEDURES]


@pytest.mark.parametrize(
    "options",
    [
        {"procedure": "tukey"},
        {"alpha": 0.0},
        {"alpha": 1.0},
        {"alpha": math.nan},
        {"alpha": "0.05"},
        {"alpha": True},
        {"margin": 0},
        {"margin": -1.0},
        {"margin": math.inf},
        {"margin": math.nan},
        {"margin": "1"},
        {"alternative": "sideways"},
        {"alternative": "less"},
        {"procedure": "dunnett"},
        {"procedure": "dunnett", "control": "D"},
        {"procedure": "dunnett", "control": "a"},
        {"procedure": "dunnett", "control": ""},
        {"procedure": "tukey-kramer", "control": "A"},
        {"procedure": "games-howell", "control": "A"},
        {"procedure": "steel-dwass", "control": "A"},
    ],
    ids=str,
)
def test_options_that_cannot_be_meant(options: dict[str, Any]):
    with pytest.raises(StatsError) as refusal:
        compare_pairs(VALUES, GROUPS, **options)
    assert refusal.value.where
    assert refusal.value.advice


@pytest.mark.parametrize(
    ("values", "groups"),
    [
        ([], []),
        (VALUES, ["A"] * 9),
        (VALUES, GROUPS[:8]),
        (VALUES[:8], GROUPS),
        (np.array(VALUES).reshape(3, 3), GROUPS),
        (VALUES, np.array(GROUPS).reshape(3, 3)),
        ([VALUES, VALUES], GROUPS),
        ([[1.0], [1.0, 2.0]], ["A", "B"]),
        ("123456789", GROUPS),
        (VALUES, "AAABBBCCC"),
        (np.array(VALUES, complex), GROUPS),
        (np.array([True] * 9), GROUPS),
        ([*VALUES[:8], True], GROUPS),
        ([*VALUES[:8], "<0.5"], GROUPS),
        ([*VALUES[:8], "1,5"], GROUPS),
        ([*VALUES[:8], "1_5"], GROUPS),
        ([*VALUES[:8], "1." + "3" * 80], GROUPS),
        ([*VALUES[:8], 1e200], GROUPS),
        ([*VALUES[:8], Decimal("1e400")], GROUPS),
        ([value * 1e-200 for value in VALUES], GROUPS),
        (VALUES, [object()] * 9),
        (VALUES, [*GROUPS[:8], ("C",)]),
    ],
)
def test_values_and_groups_that_cannot_be_meant(values: Any, groups: Any):  # noqa: ANN401 - of all kinds
    with pytest.raises(StatsError):
        compare_pairs(values, groups)


@pytest.mark.parametrize("name", NAMES)
def test_groups_of_one_value_each(name: str):
    control = "A" if name == "dunnett" else None
    if name in {"steel-dwass", "dunn"}:
        result = compare_pairs([1.0, 2.0, 4.0], ["A", "B", "C"], name)
        assert set(result.verdicts) == {"undecided"}
        return
    with pytest.raises(StatsError, match="one value only"):
        compare_pairs([1.0, 2.0, 4.0], ["A", "B", "C"], name, control=control)


@pytest.mark.parametrize("name", NAMES)
def test_one_group_of_one_value(name: str):
    control = "A" if name == "dunnett" else None
    result = compare_pairs([*VALUES[:6], 9.0], [*GROUPS[:6], "C"], name, control=control)
    single = [pair for pair in result.pairs if "C" in pair[:2]]
    if name in {"games-howell", "welch-holm"}:
        assert {pair.p_value for pair in single} == {None}
        assert len(result.not_estimable) == 2
        assert "one value" in result.not_estimable["A", "C"]
    else:
        assert all(0 < pair.p_value <= 1 for pair in single)
    assert result.groups[2].sd is None


def test_a_group_of_one_value_says_that_it_leans_on_the_others():
    result = compare_pairs([*VALUES[:6], 9.0], [*GROUPS[:6], "C"])
    assert "single-values" in {caution.code for caution in result.cautions}


def test_margins_without_intervals_are_said_not_to_be_judged():
    result = compare_pairs(VALUES, GROUPS, "holm", margin=5.0)
    assert "equivalent" not in result.verdicts
    assert "margin-not-judged" in {caution.code for caution in result.cautions}


def test_a_hundred_thousand_groups():
    values, groups = np.arange(200_000) % 7 / 10 + np.arange(200_000) // 2 % 3, np.arange(200_000) // 2
    table = anova(values, groups)
    assert table.df_between == 99_999
    with pytest.raises(StatsError, match="100000 groups have 4999950000 pairs"):
        compare_pairs(values, groups)
    assert 0 <= kruskal_wallis(values, groups).p_value <= 1


@pytest.mark.parametrize("name", NAMES)
@settings(max_examples=60)
@given(
    rows=st.lists(
        st.tuples(
            st.sampled_from([0.0, 1.0, -1.0, 0.1, 1e-9, 1e12, 1e-150, -1e150, math.nan, math.inf, 3.25]),
            st.sampled_from(["A", "B", "C", "D", "a ", ""]),
        ),
        max_size=14,
    ),
    margin=st.sampled_from([None, 0.5, 1e-12]),
)
def test_anything_gives_a_refusal_or_a_stated_result(name: str, rows: list[tuple[float, str]], margin: float | None):
    values, groups = [value for value, _ in rows], [label for _, label in rows]
    control = groups[0] if name == "dunnett" and groups else None
    try:
        result = compare_pairs(values, groups, name, control=control, margin=margin)
    except StatsError:
        return
    frame = result.frame()
    for at, pair in enumerate(result.pairs):
        assert pair.verdict in VERDICTS
        figures = [cell for cell in pair if isinstance(cell, float)]
        assert not any(math.isnan(figure) for figure in figures)
        assert (pair.p_value is None) == ((pair.a, pair.b) in result.not_estimable)
        assert frame["verdict"][at] == pair.verdict
    assert result.cautions is not None
    assert len(result.groups) == len(set(groups))


@pytest.mark.parametrize(
    "call",
    [
        lambda: grubbs_test([1.0, 2.0]),
        lambda: grubbs_test([1.0, 1.0, 1.0]),
        lambda: grubbs_test([1.0, 1.0, 5.0]),
        lambda: grubbs_test([1.0, 2.0, 4.0], alternative="up"),
        lambda: grubbs_test([1.0, 2.0, math.nan]),
        lambda: grubbs_test([1.0, 2.0, 4.0], alpha=2),
        lambda: esd_test([1.0, 2.0, 4.0, 9.0], 3),
        lambda: esd_test([1.0, 2.0, 4.0, 9.0], 0),
        lambda: esd_test([1.0, 2.0, 4.0, 9.0], 1.5),  # type: ignore[arg-type]
        lambda: esd_test([1.0, 1.0, 1.0, 9.0, 10.0], 3),
        lambda: cochran_test([1.0, 1.0, 2.0, 2.5], ["A", "A", "B", "B"]),
        lambda: cochran_critical(0.05, 1, 5),
        lambda: mandel_statistics(VALUES[:8], GROUPS[:8]),
        lambda: mandel_statistics(VALUES[:6], GROUPS[:6]),
        lambda: mandel_statistics([1, 2, 1, 2, 1, 2], list("AABBCC")),
        lambda: shapiro_test([1.0, 2.0], ["A", "A"]),
        lambda: shapiro_test([1.0] * 5, ["A"] * 5),
        lambda: shapiro_test(list(range(5001)), ["A"] * 5001),
        lambda: levene_test(VALUES, GROUPS, center="mode"),
        lambda: welch_anova([*VALUES[:6], 9.0], [*GROUPS[:6], "C"]),
        lambda: kruskal_wallis([1.0] * 9, GROUPS),
        lambda: anova([1.0, 2.0, 3.0], ["A", "B", "C"]),
        lambda: equivalent_pairs(VALUES, GROUPS, None),  # type: ignore[arg-type]
        lambda: equivalent_pairs(VALUES, GROUPS, 0.0),
        lambda: equivalent_pairs(VALUES, GROUPS, 1.0, alpha=0.5),
    ],
)
def test_other_tests_refuse_what_they_cannot_answer(call: Any):  # noqa: ANN401 - calls of all kinds
    with pytest.raises(StatsError):
        call()
