"""Figures and tables as plain text."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sameline.reports.text import count, interval, listed, number, p_value, percent, plain, table

FIGURES = st.floats(-1e9, 1e9, allow_nan=False)


@given(FIGURES, st.integers(0, 8))
def test_a_figure_is_rounded_with_its_sign_and_never_minus_zero(figure, decimals):
    text = number(figure, decimals).replace("\N{MINUS SIGN}", "-")
    assert float(text) == pytest.approx(figure, abs=0.5000001 * 10**-decimals + 1e-6)
    assert len(text.partition(".")[2]) == decimals
    assert not (text.startswith("-") and float(text) == 0)


@given(st.floats(0, 1))
def test_a_p_value_keeps_two_digits_and_never_rounds_to_zero_or_one(p):
    text = p_value(p)
    if p < 0.0001:
        assert text == "<0.0001"
    elif p > 0.9999:
        assert text == ">0.9999"
    else:
        assert 0 < float(text) <= 1
        assert float(text) == pytest.approx(p, rel=0.051, abs=0.0051 if p > 0.1 else 0)


@given(st.floats(1e-6, 1e6))
def test_a_stated_figure_keeps_its_digits(figure):
    assert float(plain(figure)) == pytest.approx(figure, rel=1e-11)
    assert plain(-figure) == "\N{MINUS SIGN}" + plain(figure)


WORDS = st.text(st.characters(codec="utf-8", categories=("L", "N", "P")), max_size=8)


@given(st.lists(st.tuples(WORDS, WORDS, WORDS), min_size=1, max_size=6))
def test_columns_are_aligned_and_no_line_ends_in_blanks(rows):
    lines = table(("first", "second", "third"), rows, "<><")
    assert len(lines) == len(rows) + 1
    assert not [line for line in lines if line != line.rstrip()]
    assert all(line.startswith("  ") or not line for line in lines)


def test_a_table_of_plain_letters_is_aligned_to_the_character():
    lines = table(("a", "figure"), [("long name", "1.5"), ("b", "12.25")], "<>", indent="")
    assert lines == ["a          figure", "long name     1.5", "b           12.25"]


@pytest.mark.parametrize(
    ("lower", "upper", "text"),
    [(None, None, "–"), (1.0, None, "from 1.0"), (None, -1.0, "up to −1.0"), (-0.04, 1.0, "0.0 to 1.0")],
)
def test_an_open_interval_says_so(lower, upper, text):
    assert interval(lower, upper, 1) == text


def test_words_for_counts_shares_and_lists():
    assert [count(n, "run") for n in (0, 1, 2)] == ["0 runs", "1 run", "2 runs"]
    assert count(2, "batch", "batches") == "2 batches"
    assert [percent(share) for share in (0.05, 0.95, 0.001)] == ["5 %", "95 %", "0.1 %"]
    assert listed(["a"]) == "a"
    assert listed(["a", "b", "c"]) == "a, b and c"
    assert listed(list("abcdefgh")) == "a, b, c, d, e, f and 2 more"
    assert number(None, 2) == plain(None) == p_value(None) == "–"
    assert number(math.pi, 0) == "3"
