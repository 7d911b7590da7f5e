from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sameline.intake.nearest import Nearest, looks

CODES = ("B-117", "B-171", "B-121", "B-0O1", "EP-70/3", "compression set")


@pytest.mark.parametrize(
    ("typed", "meant"),
    [
        ("B-1l7", "B-117"),
        ("B-I17", "B-117"),
        ("b-117", "B-117"),
        ("B\u2013117", "B-117"),
        ("B117", "B-117"),
        ("Ｂ－１１７", "B-117"),
        ("B-OO1", "B-0O1"),
        ("B-112", "B-121"),
        ("B-1177", "B-117"),
        ("EP-70/33", "EP-70/3"),
        ("compresion sett", "compression set"),
        ("zzzzzz", None),
        ("", None),
    ],
)
def test_the_code_that_was_probably_meant(typed: str, meant: str | None):
    assert Nearest(CODES).to(typed) == meant


def test_among_many_codes_one_slip_is_still_found_at_once():
    nearest = Nearest(f"B-{number:05d}" for number in range(50_000))
    assert nearest.to("B-l2345") == "B-12345"
    assert nearest.to("B-1234") is not None
    assert nearest.to("something else altogether") is None


@given(st.text(max_size=30))
def test_a_code_is_nearest_to_itself_and_any_text_has_an_answer(text: str):
    if looks(text):
        assert Nearest([text, "other"]).to(text) in (text, "other")
    assert Nearest(["a", "b"]).to(text) in ("a", "b", None)
