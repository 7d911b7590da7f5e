"""Lines, letters and the matrix: right for every pattern, and as few letters as can be where that is provable."""

import itertools
import re
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from numpy.typing import NDArray

from sameline.errors import StatsError
from sameline.stats.letters import cover, letter_name
from sameline.stats.lines import MOST_LETTERS, Display, lines

Bools = NDArray[np.bool_]


def symmetric(upper: Bools) -> Bools:
    upper = np.triu(upper, 1)
    return upper | upper.T


def labelled(k: int) -> list[str]:
    return [f"g{number}" for number in range(k)]


def assert_tells_the_pairs(display: Display, labels: list[str], differs: Bools):
    """Sharing a letter is exactly not being shown to differ, and every set is as large as it can be."""
    letters = {label: set(re.findall(r"[a-zA-Z]\d*", display.letters[label])) for label in labels}
    place = {label: at for at, label in enumerate(labels)}
    for a, b in itertools.combinations(labels, 2):
        assert bool(letters[a] & letters[b]) != differs[place[a], place[b]]
    for members in display.sets:
        inside = [place[label] for label in members]
        outside = [at for at in range(len(labels)) if at not in inside]
        assert all(differs[at, inside].any() for at in outside), "a set that could be larger"


def fewest_by_trying_all(alike: Bools) -> int:
    """The smallest number of cliques that cover all edges and vertices, by definition."""
    k = len(alike)
    cliques = [
        members
        for size in range(1, k + 1)
        for members in itertools.combinations(range(k), size)
        if all(alike[a, b] for a, b in itertools.combinations(members, 2))
    ]
    maximal = [c for c in cliques if not any(set(c) < set(other) for other in cliques)]
    wanted = {(a, b) for a, b in itertools.combinations(range(k), 2) if alike[a, b]} | {(a, a) for a in range(k)}
    covers = [set(itertools.combinations(c, 2)) | {(a, a) for a in c} for c in maximal]
    for number in range(1, len(maximal) + 1):
        for chosen in itertools.combinations(covers, number):
            if set().union(*chosen) == wanted:
                return number
    raise AssertionError("maximal cliques cover every edge")


def test_reference_letters(letters_case: dict[str, Any]):
    data, want = letters_case["data"], letters_case["expect"]
    place = {label: at for at, label in enumerate(data["group"])}
    differs = np.zeros((len(place), len(place)), bool)
    for a, b, p in zip(*(data["pairs"][name] for name in ("group1", "group2", "p")), strict=True):
        differs[place[a], place[b]] = differs[place[b], place[a]] = p < letters_case["options"]["alpha"]
    assert differs.tolist() == want["verdict_significant"]
    got = lines(data["group"], range(len(place)), differs)
    assert_tells_the_pairs(got, data["group"], differs)
    every = {frozenset(members) for members in want["letters"]}
    assert {frozenset(members) for members in got.sets} <= every
    assert len(got.sets) == want["min_letters"]
    assert got.fewest


@given(differs=st.integers(2, 12).flatmap(lambda k: arrays(bool, (k, k))), seed=st.integers(0, 2**32 - 1))
def test_any_pattern_is_told_right(differs: Bools, seed: int):
    differs = symmetric(differs)
    labels = labelled(len(differs))
    means = np.random.default_rng(seed).permutation(len(differs)).astype(float)
    got = lines(labels, means, differs)
    assert_tells_the_pairs(got, labels, differs)
    assert got.order == tuple(labels[at] for at in np.argsort(means))
    rank = {label: at for at, label in enumerate(got.order)}
    contiguous = all(rank[s[-1]] - rank[s[0]] == len(s) - 1 for s in got.sets)
    assert (got.kind == "lines") == contiguous
    assert all([rank[label] for label in s] == sorted(rank[label] for label in s) for s in got.sets)


@settings(max_examples=60)
@given(differs=arrays(bool, (6, 6)))
def test_letters_are_the_fewest_there_can_be(differs: Bools):
    alike = ~symmetric(differs)
    found = cover(alike, most=MOST_LETTERS)
    assert found is not None
    assert found.fewest
    assert len(found.sets) == fewest_by_trying_all(alike)


def test_ordinary_unequal_sizes_break_lines_and_letters_take_over():
    # A from B and C from D are not shown to differ, B and C between them are: no stretch can say that.
    differs = symmetric(np.array([[0, 0, 1, 0], [0, 0, 1, 1], [0, 0, 0, 0], [0, 0, 0, 0]], bool))
    got = lines("ABCD", [1, 2, 3, 4], differs)
    assert got.kind == "letters"
    assert got.letters == {"A": "ab", "B": "a", "C": "c", "D": "bc"}
    assert got.sets == (("A", "B"), ("A", "D"), ("C", "D"))


def test_lines_are_drawn_in_order_of_mean():
    differs = symmetric(np.array([[0, 1, 0], [0, 0, 0], [0, 0, 0]], bool))
    got = lines(["high", "low", "middle"], [9.0, 1.0, 5.0], differs)
    assert got.kind == "lines"
    assert got.sets == (("low", "middle"), ("middle", "high"))
    assert got.letters == {"low": "a", "middle": "ab", "high": "b"}


def test_separate_pairs_need_few_letters_where_maximal_sets_are_two_to_the_hundredth():
    differs = np.zeros((200, 200), bool)
    differs[np.arange(0, 200, 2), np.arange(1, 200, 2)] = True
    differs = symmetric(differs)
    got = lines(labelled(200), range(200), differs)
    assert got.kind == "letters"
    assert len(got.sets) <= 20
    assert_tells_the_pairs(got, labelled(200), differs)


def test_beyond_the_stated_number_the_matrix_remains():
    differs = symmetric(np.random.default_rng(11).random((120, 120)) < 0.4)
    got = lines(labelled(120), range(120), differs)
    assert (got.kind, got.sets, dict(got.letters)) == ("matrix", (), {})
    assert np.array_equal(got.differs, differs)


def test_the_answer_is_the_same_every_time():
    differs = symmetric(np.random.default_rng(5).random((60, 60)) < 0.2)
    first, second = (lines(labelled(60), range(60), differs) for _ in range(2))
    assert first.sets == second.sets


def test_letter_names_never_repeat():
    names = [letter_name(number) for number in range(520)]
    assert names[:3] == ["a", "b", "c"]
    assert (names[51], names[52]) == ("Z", "a1")
    assert len(set(names)) == 520


@pytest.mark.parametrize(
    ("labels", "means", "differs"),
    [
        ("AB", [1.0], np.zeros((2, 2), bool)),
        ("AA", [1.0, 2.0], np.zeros((2, 2), bool)),
        ("AB", [1.0, np.nan], np.zeros((2, 2), bool)),
        ("AB", [1.0, 2.0], np.array([[False, True], [False, False]])),
        ("", [], np.zeros((0, 0), bool)),
    ],
)
def test_what_cannot_be_meant_is_refused(labels: str, means: list[float], differs: Bools):
    with pytest.raises(StatsError):
        lines(labels, means, differs)
