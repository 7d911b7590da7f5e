"""Conformity against the worked examples of JCGM 106:2012, from memory, and against what its formulas say."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats as peer

from sameline.errors import StatsError
from sameline.stats.conformity import (
    ACCEPTANCE,
    CONFORMS,
    ISO_14253,
    JCGM_106,
    NOT_CONFORMS,
    REJECTION,
    RULES,
    SIMPLE,
    UNDECIDED,
    Measured,
    combined,
    judge,
    probability_of_conformity,
)

# JCGM 106:2012, worked examples of clause 7 (values from memory): a Zener diode's breakdown voltage, V <= -5.40 V; a
# container's burst strength, B >= 490 kPa; a motor oil's viscosity, 12.5 to 16.3 mm2/s.
EXAMPLES = {
    "upper limit, Zener diode": (Measured(-5.47, 0.05), None, -5.40, 0.92, 0.005),
    "lower limit, burst strength": (Measured(509.7, 8.6), 490.0, None, 0.99, 0.005),
    "both limits, viscosity": (Measured(13.6, 1.8), 12.5, 16.3, 0.66, 0.005),
}


@pytest.mark.parametrize("example", EXAMPLES)
def test_the_probability_is_that_of_the_guide(example):
    measured, lower, upper, printed, rounding = EXAMPLES[example]
    assert probability_of_conformity(measured, lower, upper) == pytest.approx(printed, abs=rounding)


def test_guarded_rejection_is_the_speed_limit_of_the_guide():
    """JCGM 106:2012, 8.3.3 (from memory): at 100 km/h with u = 2 % of the speed and 99.9 %, 107 km/h is the limit."""
    tail, relative = 0.001, 0.02
    limit = 100 / (1 - relative * peer.norm.isf(tail))
    assert round(limit) == 107
    assert probability_of_conformity(Measured(limit, relative * limit), None, 100.0) == pytest.approx(tail)


def test_the_guard_band_of_guarded_acceptance_is_the_expanded_uncertainty():
    """JCGM 106:2012, 8.3.2: w = U with U = 2 u; the coverage factor for few degrees of freedom is JCGM 100's."""
    answer = judge(Measured(10.0, 0.5), 8.0, 12.0, ACCEPTANCE)
    assert (answer.lower, answer.upper) == pytest.approx((9.0, 11.0))
    assert answer.capability == pytest.approx(4 / (4 * 0.5))
    # JCGM 100:2008, Table G.2, 95.45 %, 10 degrees of freedom: 2.28 (from memory)
    assert judge(Measured(10.0, 1.0, 10), 0.0, 20.0, ACCEPTANCE).guard == pytest.approx(2.28, abs=0.005)


def test_the_guard_band_of_iso_14253_1_is_one_sided():
    """ISO 14253-1:2017: limiting probability 95 %, guard band factor 1.65 (from memory)."""
    assert judge(Measured(10.0, 1.0), 0.0, 20.0, ISO_14253).guard == pytest.approx(1.645, abs=0.0005)


VERDICTS = {
    SIMPLE: (CONFORMS, CONFORMS, CONFORMS, NOT_CONFORMS, NOT_CONFORMS),
    ACCEPTANCE: (CONFORMS, NOT_CONFORMS, NOT_CONFORMS, NOT_CONFORMS, NOT_CONFORMS),
    REJECTION: (CONFORMS, CONFORMS, CONFORMS, CONFORMS, NOT_CONFORMS),
    ISO_14253: (CONFORMS, UNDECIDED, UNDECIDED, UNDECIDED, NOT_CONFORMS),
    JCGM_106: (CONFORMS, UNDECIDED, UNDECIDED, UNDECIDED, NOT_CONFORMS),
}


@pytest.mark.parametrize("rule", RULES)
def test_each_rule_has_its_answers_from_well_inside_to_well_outside(rule):
    found = [judge(Measured(y, 1.0), None, 100.0, rule).verdict for y in (97.0, 99.0, 100.0, 101.0, 103.0)]
    assert tuple(found) == VERDICTS[rule]


@given(
    y=st.floats(-50, 50),
    u=st.floats(1e-3, 20),
    width=st.floats(0.1, 40),
    df=st.one_of(st.floats(1, 200), st.just(math.inf)),
)
@settings(max_examples=60, deadline=None, derandomize=True)
def test_the_probability_is_the_integral_of_a_peer(y, u, width, df):
    shape = peer.norm if math.isinf(df) else peer.t(df)
    expected = shape.cdf((width / 2 - y) / u) - shape.cdf((-width / 2 - y) / u)
    assert probability_of_conformity(Measured(y, u, df), -width / 2, width / 2) == pytest.approx(expected, abs=1e-9)


@given(y=st.floats(90, 110), u=st.floats(1e-3, 5))
@settings(max_examples=60, deadline=None, derandomize=True)
def test_with_one_limit_the_rules_of_proof_agree(y, u):
    """With one limit, y is the guard band inside exactly where the probability reaches its limit."""
    measured = Measured(y, u)
    if min(abs(abs(y - 100.0) / u - 1.6448536269514722), 1.0) > 1e-9:
        assert judge(measured, None, 100.0, ISO_14253).verdict == judge(measured, None, 100.0, JCGM_106).verdict


def test_another_uncertainty_is_added_with_welch_and_satterthwaites_degrees_of_freedom():
    found = combined(Measured(5.0, 3.0, 4.0), 4.0)
    assert found.uncertainty == pytest.approx(5.0)
    assert found.df == pytest.approx(4.0 * (5.0 / 3.0) ** 4)
    assert combined(Measured(5.0, 3.0, 4.0), 0.0) == Measured(5.0, 3.0, 4.0)
    assert combined(Measured(5.0, 0.0, 4.0), 1.0).df == math.inf


def test_without_uncertainty_the_answer_is_plain():
    assert probability_of_conformity(Measured(5.0, 0.0), None, 5.0) == 1.0
    assert probability_of_conformity(Measured(5.1, 0.0), None, 5.0) == 0.0


@pytest.mark.parametrize(
    ("measured", "lower", "upper", "rule", "probability"),
    [
        (Measured(1.0, 1.0), None, None, SIMPLE, 0.95),
        (Measured(1.0, 1.0), 2.0, 2.0, SIMPLE, 0.95),
        (Measured(1.0, -1.0), 0.0, 2.0, SIMPLE, 0.95),
        (Measured(math.nan, 1.0), 0.0, 2.0, SIMPLE, 0.95),
        (Measured(1.0, 1.0, 0.0), 0.0, 2.0, SIMPLE, 0.95),
        (Measured(1.0, 1.0), 0.0, 2.0, "fair play", 0.95),
        (Measured(1.0, 1.0), 0.0, 2.0, JCGM_106, 0.4),
        (Measured(1.0, 1.0), 0.0, 2.0, JCGM_106, 1.0),
    ],
)
def test_what_cannot_be_meant_is_refused(measured, lower, upper, rule, probability):
    with pytest.raises(StatsError):
        judge(measured, lower, upper, rule, probability=probability)


def test_a_negative_uncertainty_to_add_is_refused():
    with pytest.raises(StatsError):
        combined(Measured(1.0, 1.0), -0.1)
