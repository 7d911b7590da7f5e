from __future__ import annotations

import dataclasses
from collections.abc import Callable

import pytest

from sameline.intake.far import Far
from sameline.intake.files import Intake
from sameline.intake.slips import slipped
from sameline.records.drafts import CharacteristicFacts, DraftMeasurement, Register

Take = Callable[..., Intake]


def run_of(*texts: str) -> list[DraftMeasurement]:
    return [DraftMeasurement(number, text, float(text)) for number, text in enumerate(texts, 1)]


@pytest.mark.parametrize(
    ("texts", "said"),
    [
        (("60.1", "601", "60.5"), ["601 is about 10 times the other replicates of its run"]),
        (("60.1", "0.605", "60.5"), ["0.605 is about 1/100 of the other replicates of its run"]),
        (("-12.5", "-12.6", "-1250"), ["-1250 is about 100 times the other replicates of its run"]),
        (("60.1", "61", "60.5"), []),
        (("60.1", "601"), []),
        (("1", "10", "100"), []),
        (("0", "0", "60"), []),
        (("60", "350", "61"), []),
    ],
)
def test_a_replicate_a_power_of_ten_from_the_others_is_asked_about(texts: tuple[str, ...], said: list[str]):
    assert [problem for _, problem in slipped(run_of(*texts))] == said


def test_a_slip_in_a_first_file_is_asked_about_at_its_row(take: Take):
    rows = "".join(f"B-117,HA,2026-03-04,{value}\n" for value in ("60.1", "60.5", "606", "60.2"))
    (finding,) = take("batch,characteristic,tested_at,value\n" + rows).findings
    assert (finding.row, finding.column, finding.text, finding.question) == (4, "value", "606", True)


def test_what_is_recorded_decides_where_enough_is_recorded(take: Take):
    rows = "".join(f"B-117,TS,2026-03-04,{value}\n" for value in ("12.5", "12.6", "12.5", "125"))
    (finding,) = take("batch,characteristic,tested_at,value\n" + rows).findings
    assert finding.suggestion == "a slipped decimal point: was 12.5 meant?"


@pytest.mark.parametrize(
    ("number", "suggestion"),
    [
        ("125", "a slipped decimal point: was 12.5 meant?"),
        ("1.25", "a slipped decimal point: was 12.5 meant?"),
        ("0.125", "a slipped decimal point: was 12.5 meant?"),
        ("1250", "a slipped decimal point: was 12.50 meant?"),
        ("12500", "a slipped decimal point: was 12.500 meant?"),
        ("-125", "is it meant?"),
        ("21.5", "two digits swapped: was 12.5 meant?"),
        ("15.2", "two digits swapped: was 12.5 meant?"),
        ("112.5", "a digit typed twice: was 12.5 meant?"),
        ("19.9", "is it meant?"),
        ("1.25e2", "is it meant?"),
    ],
)
def test_the_slip_that_explains_a_far_value_is_named(number: str, suggestion: str):
    far = Far(CharacteristicFacts("TS", "MPa", mean=12.5, spread=0.3))
    doubt = far.doubt(number, float(number), float)
    assert doubt is not None
    assert doubt[1] == suggestion


def test_far_is_six_standard_deviations_and_no_less_than_the_resolution():
    far = Far(CharacteristicFacts("TS", "MPa", mean=12.5, spread=0.5))
    assert far.doubt("15.5", 15.5, float) is None
    assert far.doubt("15.6", 15.6, float) is not None
    steady = Far(CharacteristicFacts("HA", "Shore A", mean=60.0, spread=0.0, decimals=0))
    assert steady.doubt("66", 66.0, float) is None
    assert steady.doubt("67", 67.0, float) is not None
    for facts in (None, CharacteristicFacts("X", "1"), CharacteristicFacts("X", "1", mean=1.0, spread=0.0)):
        assert Far(facts).doubt("1e300", 1e300, float) is None


def test_a_censored_result_is_never_far(take: Take):
    assert take("batch,characteristic,tested_at,value\nB-117,TS,2026-03-04,<0.5\n").findings == ()


def test_the_characteristics_of_a_register_decide_alone(take: Take, register: Register):
    facts = {"TS": dataclasses.replace(register.characteristics["TS"], mean=None, spread=None)}
    text = "batch,characteristic,tested_at,value\nB-117,TS,2026-03-04,125\n"
    assert take(text, register=dataclasses.replace(register, characteristics=facts)).findings == ()
