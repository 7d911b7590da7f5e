"""How labels become text and values become numbers."""

from decimal import Decimal
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from sameline.errors import StatsError
from sameline.stats.labels import as_text, encode
from sameline.stats.samples import gather
from sameline.stats.values import read_values


@pytest.mark.parametrize(
    ("label", "text"),
    [
        ("lot 7", "lot 7"),
        (" lot 7 ", " lot 7 "),
        (np.str_("x"), "x"),
        (7, "7"),
        (7.0, "7"),
        (np.int64(7), "7"),
        (np.float32(7.0), "7"),
        (7.5, "7.5"),
        (-0.0, "0"),
        (True, "True"),
        (np.bool_(0), "False"),
        (Decimal("7.00"), "7"),
        (Decimal("7.10"), "7.10"),
        (Fraction(1, 2), "0.5"),
        (10**20, "100000000000000000000"),
        (None, ""),
        (float("nan"), ""),
    ],
)
def test_the_text_of_a_label(label: object, text: str):
    assert as_text(label) == text


@given(st.lists(st.text(min_size=1).filter(str.strip), min_size=1))
def test_labels_keep_their_text_and_their_order_of_first_appearance(given_labels: list[str]):
    labels, codes = encode(given_labels)
    assert labels == tuple(dict.fromkeys(given_labels))
    assert [labels[code] for code in codes] == given_labels


def test_infinite_number_as_a_label_is_its_text():
    assert as_text(float("inf")) == "inf"


@given(st.lists(st.integers(-(10**6), 10**6), min_size=1), st.sampled_from([0, 10**6, 10**9, 10**12]))
def test_an_offset_is_taken_off_exactly(numbers: list[int], offset: int):
    values = [(number + offset * 1000) / 1000 for number in numbers]
    read = read_values(values)
    assert [Fraction(a) + Fraction(read.origin) for a in read.centred.tolist()] == [Fraction(value) for value in values]


def test_decimals_are_centred_as_decimals():
    read = read_values(["1000000000000.4", "1000000000000.3", Decimal("1000000000000.7")])
    assert read.centred.tolist() == [0.0, -0.1, 0.3]


def test_means_under_a_large_offset_differ_as_without_it():
    small = gather(["0.4", "0.3", "0.7", "0.1"], list("AABB"))
    large = gather([f"1000000000000.{digit}" for digit in "4371"], list("AABB"))
    assert np.diff(large.deviation) == np.diff(small.deviation)
    assert large.ss.tolist() == small.ss.tolist()


@pytest.mark.parametrize(
    ("values", "where"),
    [
        ([1.0, "x"], "position 1"),
        ([None, 1.0], "position 0"),
        ([1, Decimal("inf")], "position 1"),
        (["", "1"], "position 0"),
    ],
)
def test_a_refused_value_is_named_by_its_position(values: list[object], where: str):
    with pytest.raises(StatsError, match=where):
        read_values(values)
