"""Whatever small data come: figures that are figures, or a typed refusal with advice. Warnings are errors here."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.errors import StatsError
from sameline.stats.nested import KnownSpread, NestedFit, fit_nested


@st.composite
def calls(draw: st.DrawFn) -> dict[str, object]:
    n = draw(st.integers(1, 16))
    places = draw(st.integers(0, 3))
    values = draw(st.lists(st.floats(-3, 3).map(lambda x: round(x, places)), min_size=n, max_size=n))
    scale = draw(st.sampled_from([1.0, 1e-3, 1e4]))

    def labels(most: int) -> object:
        column = st.lists(st.sampled_from("ABCD"[:most]), min_size=n, max_size=n)
        return draw(st.none() | column)

    call = {"groups": labels(3), "batches": labels(4), "runs": labels(4), "sessions": labels(3)}
    known = draw(st.sampled_from([None, None, KnownSpread.stated(0.5, 8, "validation")]))
    return {"values": [scale * value for value in values], "known": known, **call}


def check_figures(fit: NestedFit) -> None:
    means = fit.means()
    for column in (means.mean, means.lower, means.upper):
        assert all(cell is None or math.isfinite(cell) for cell in column)
    for column in (means.standard_error, means.df):
        assert all(cell is None or 0 < cell < math.inf for cell in column)
    assert all(value >= 0 for value in fit.components.values())
    for row in fit.spread().levels:
        assert row.lower is None or 0 <= row.lower <= row.upper < math.inf
    fit.replicates_as_units()


def check_pairs(fit: NestedFit) -> None:
    for adjust, control in (
        ("tukey", None),
        ("holm", None),
        ("bonferroni", fit.groups[0]),
        ("dunnett", fit.groups[-1]),
    ):
        pairs = fit.pairs(adjust=adjust, control=control, margin=1.0)
        for pair in pairs.pairs:
            if pair.p_value is None:
                assert pairs.not_estimable[pair.a, pair.b]
                assert pair.verdict == "undecided"
            else:
                assert 0 <= pair.p_value <= 1
                assert 0 < pair.standard_error < math.inf
        assert len(pairs.frame()) == len(pairs.pairs)


@given(calls())
@settings(max_examples=60, deadline=None)
def test_an_answer_or_a_refusal_with_advice(call: dict[str, object]):
    advice: str | None = "none needed"
    try:
        fit = fit_nested(**call)
        check_figures(fit)
        if len(fit.groups) > 1:
            check_pairs(fit)
    except StatsError as refused:
        advice = refused.advice
    assert advice


def test_nothing_varies_and_a_known_spread_does_not_help_where_it_is_not_used():
    with pytest.raises(StatsError, match="nothing varies"):
        fit_nested([0.0] * 6, ["A"] * 6, list("xxyyzz"), known=KnownSpread.stated(0.5, 8, "x"))


def test_sessions_and_batches_that_fit_every_run_are_refused():
    with pytest.raises(StatsError, match="account for every run"):
        fit_nested([-0.139, -0.042, 0.01], ["A"] * 3, list("xxy"), sessions=list("stt"))
    additive = np.add.outer([0.0, 7.0], [1.0, 2.0, 4.0]).ravel()
    with pytest.raises(StatsError, match="account for every run"):
        fit_nested(additive, list("ABC") * 2, sessions=list("sssttt"))
