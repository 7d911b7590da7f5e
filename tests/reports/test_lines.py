"""The lines drawn beside the means say what the pairs say, for whatever pairs there are."""

from __future__ import annotations

from itertools import combinations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from sameline.records.answers import GroupAnswer
from sameline.reports.lines import bars, by_mean, drawn_lines, lines_of
from sameline.stats.lines import lines


def answers(labels, means, letters) -> list[GroupAnswer]:
    return [
        GroupAnswer(at, label, 1, 1, 1, float(mean), None, None, None, letters[label])
        for at, (label, mean) in enumerate(zip(labels, means, strict=True))
    ]


@st.composite
def conclusions(draw):
    """Groups with their means, and which pairs are shown to differ: far apart mostly, or anyhow."""
    k = draw(st.integers(2, 9))
    labels = [f"L-{number}" for number in draw(st.permutations(range(k)))]
    means = np.array(draw(st.lists(st.integers(0, 12), min_size=k, max_size=k)), float)
    if draw(st.booleans()):
        differs = np.abs(means[:, None] - means[None, :]) > draw(st.integers(0, 6))
    else:
        cells = draw(st.lists(st.booleans(), min_size=k * k, max_size=k * k))
        upper = np.triu(np.array(cells).reshape(k, k), 1)
        differs = upper | upper.T
    return labels, means, differs


@given(conclusions())
def test_two_groups_share_a_bar_exactly_if_they_are_not_shown_to_differ(case):
    labels, means, differs = case
    display = lines(labels, means, differs)
    groups = answers(labels, means, display.letters)
    drawing = {group.label: bars(group, list(drawn_lines(groups))) for group in groups}
    for i, j in combinations(range(len(labels)), 2):
        first, second = drawing[labels[i]].ljust(99), drawing[labels[j]].ljust(99)
        share = any(a == b == "│" for a, b in zip(first, second, strict=True))
        assert share == (not differs[i, j])


@given(conclusions())
def test_bars_of_lines_run_without_a_gap_and_step_to_the_right(case):
    labels, means, differs = case
    display = lines(labels, means, differs)
    groups = by_mean(answers(labels, means, display.letters))
    names = list(drawn_lines(groups))
    rows = [bars(group, names) for group in groups]
    starts = []
    for column in range(len(names)):
        at = [row for row, text in enumerate(rows) if text[2 * column : 2 * column + 1] == "│"]
        starts.append(at[0])
        if display.kind == "lines":
            assert at == list(range(at[0], at[-1] + 1))
    assert starts == sorted(starts)


@given(conclusions())
def test_the_listed_lines_are_the_sets_of_the_display(case):
    labels, means, differs = case
    display = lines(labels, means, differs)
    listed = list(drawn_lines(answers(labels, means, display.letters)).values())
    assert {tuple(line) for line in listed} == set(display.sets)


def test_the_fifty_third_line_has_a_name_of_two_characters():
    """Sixty groups, each not shown to differ from its neighbour only: fifty-nine lines."""
    k = 60
    labels = [f"L-{number:02}" for number in range(k)]
    differs = np.abs(np.subtract.outer(np.arange(k), np.arange(k))) > 1
    display = lines(labels, np.arange(k), differs)
    groups = answers(labels, np.arange(k), display.letters)
    assert len(drawn_lines(groups)) == k - 1
    assert {len(lines_of(group)) for group in groups} == {1, 2}
    assert list(drawn_lines(groups).values()) == [labels[at : at + 2] for at in range(k - 1)]


def test_a_group_without_a_mean_is_on_no_line():
    groups = [*answers(["A", "B"], [2, 1], {"A": "a", "B": "a"}), GroupAnswer(9, "C", 0, 0, 0, *[None] * 4, "")]
    assert [group.label for group in by_mean(groups)] == ["B", "A"]
    assert drawn_lines(groups) == {"a": ["B", "A"]}
