"""Brackets hold every pair once and never overlap."""

from __future__ import annotations

import itertools

from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.reports.pictures.brackets import brackets

PLACES = 12
ALL = list(itertools.combinations(range(PLACES), 2))
PAIRS = st.sets(st.sampled_from(ALL))


@given(PAIRS)
@settings(max_examples=200, deadline=None, derandomize=True)
def test_every_pair_is_held_once(pairs):
    held = [tuple(sorted((b.at, other))) for b in brackets(pairs) for other in b.others]
    assert sorted(held) == sorted(pairs)


@given(PAIRS)
@settings(max_examples=200, deadline=None, derandomize=True)
def test_two_on_one_level_have_no_place_in_common(pairs):
    found = brackets(pairs)
    for one, other in itertools.combinations(found, 2):
        if one.level == other.level:
            assert one.last < other.first or other.last < one.first


@given(PAIRS)
@settings(max_examples=50, deadline=None, derandomize=True)
def test_the_order_in_which_pairs_come_changes_nothing(pairs):
    assert brackets(sorted(pairs)) == brackets(sorted(pairs, reverse=True)) == brackets([(b, a) for a, b in pairs])


def test_one_group_that_differs_from_all_takes_one_bracket():
    (only,) = brackets([(0, 5), (1, 5), (5, 3)])
    assert (only.at, only.others, only.level) == (5, (0, 1, 3), 0)


def test_all_pairs_of_twelve_take_one_level_a_group():
    assert max(b.level for b in brackets(ALL)) == PLACES - 2


def test_no_pair_no_bracket():
    assert brackets([]) == []
