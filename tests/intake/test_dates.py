from __future__ import annotations

import datetime as dt

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sameline.errors import SamelineError
from sameline.intake.dates import DateReader
from sameline.records.moments import read_moment

NOW = "2026-12-01T00:00:00.000000Z"
VIENNA = DateReader("Europe/Vienna", NOW)


@pytest.mark.parametrize(
    ("text", "utc"),
    [
        ("2026-03-04", "2026-03-03T23:00:00.000000Z"),
        ("2026-03-04T08:30", "2026-03-04T07:30:00.000000Z"),
        ("2026-07-04 08:30:15", "2026-07-04T06:30:15.000000Z"),
        ("2026-03-04T08:30:15.25+05:30", "2026-03-04T03:00:15.250000Z"),
        ("2026-03-04T08:30Z", "2026-03-04T08:30:00.000000Z"),
        ("2026-3-4", "2026-03-03T23:00:00.000000Z"),
        ("20260304T0830", "2026-03-04T07:30:00.000000Z"),
        ("25/03/2026", "2026-03-24T23:00:00.000000Z"),
        ("03/25/2026 8:30 pm", "2026-03-25T19:30:00.000000Z"),
        ("25.03.2026 08:30", "2026-03-25T07:30:00.000000Z"),
        ("07/07/2026", "2026-07-06T22:00:00.000000Z"),
        ("4 Mar 2026", "2026-03-03T23:00:00.000000Z"),
        ("March 4, 2026 12:05 AM", "2026-03-03T23:05:00.000000Z"),
    ],
)
def test_dates_that_can_mean_one_thing_are_read(text: str, utc: str):
    moment = VIENNA.read(text)
    assert (moment.utc, moment.problem) == (utc, None)


@pytest.mark.parametrize(
    ("text", "problem"),
    [
        ("03/04/26", "'03/04/26' could be 2003-04-26 or 2026-03-04 or 2026-04-03"),
        ("03/04/2026", "'03/04/2026' could be 2026-03-04 or 2026-04-03"),
        ("04.03.2026", "'04.03.2026' could be 2026-03-04 or 2026-04-03"),
        ("2026-02-30", "'2026-02-30' is no date in the calendar"),
        ("2026-03-04T25:00", "'2026-03-04T25:00' is no date in the calendar"),
        ("31/31/2026", "'31/31/2026' is no date"),
        ("2026-12-01T02:00", "'2026-12-01T02:00' is in the future"),
        ("46085.35", "'46085.35' is a number, not a date"),
        ("yesterday", "'yesterday' is not a date"),
        ("2026-W10-3T08:30", "'2026-W10-3T08:30' is not a date"),
        ("", "the date is empty"),
        ("0001-01-01", "'0001-01-01' lies outside the years that can be kept"),
        ("٢٠٢٦-٠٣-٠٤", "'٢٠٢٦-٠٣-٠٤' is not a date"),
    ],
)
def test_other_dates_are_refused_and_say_why(text: str, problem: str):
    moment = VIENNA.read(text)
    assert moment.utc is None
    assert moment.problem is not None
    assert moment.problem.startswith(problem)
    assert moment.suggestion


# Directive 2000/84/EC: clocks go forward on the last Sunday of March and back on that of October, at 01:00 UTC.
def test_a_local_time_that_came_twice_or_never_is_refused():
    twice, never = VIENNA.read("2026-10-25 02:30"), VIENNA.read("2026-03-29T02:30")
    assert twice.problem == "'2026-10-25 02:30' came twice in Europe/Vienna that day"
    assert twice.suggestion == "write the zone: 2026-10-25T02:30+02:00 or 2026-10-25T02:30+01:00"
    assert never.problem == "'2026-03-29T02:30' never was in Europe/Vienna: the clock skipped that hour"
    assert VIENNA.read("2026-10-25T02:30+01:00").utc == "2026-10-25T01:30:00.000000Z"


@pytest.mark.parametrize(
    ("order", "utc"),
    [
        ("dmy", "2026-04-03T00:00:00.000000Z"),
        ("mdy", "2026-03-04T00:00:00.000000Z"),
        ("ymd", "2003-04-26T00:00:00.000000Z"),
    ],
)
def test_the_order_that_a_map_states_settles_an_ambiguous_date(order, utc: str):
    assert DateReader("UTC", NOW, order).read("03/04/26").utc == utc


def test_a_stated_order_refuses_dates_that_do_not_fit_it():
    assert DateReader("UTC", NOW, "mdy").read("25/03/2026").problem == "'25/03/2026' is no date in the order mdy"


def test_a_year_long_ago_is_asked_about():
    moment = VIENNA.read("1926-03-04")
    assert moment.utc is not None
    assert moment.question


ZONES = ("UTC", "Europe/Vienna", "America/St_Johns", "Australia/Lord_Howe", "Asia/Kathmandu", "Africa/Casablanca")


@given(
    st.datetimes(dt.datetime(1940, 1, 1), dt.datetime(2027, 1, 1)),  # noqa: DTZ001 - local times are the matter here
    st.sampled_from(ZONES),
    st.sampled_from(["%Y-%m-%dT%H:%M", "%Y-%m-%d %H:%M:%S", "%Y-%m-%dT%H:%M:%SZ", "%Y-%m-%dT%H:%M+01:00"]),
)
def test_the_fast_path_gives_what_the_slow_one_gives_and_both_what_the_records_say(
    local: dt.datetime, zone: str, form: str
):
    text = local.strftime(form)
    reader = DateReader(zone, NOW)
    slow = reader._any(text)
    assert reader.read(text) == slow
    if slow.utc is not None:
        assert slow.utc == read_moment(text, zone)


@given(st.text(alphabet="0123456789-/.:TZ +APMam,Mar", max_size=24))
def test_any_text_gives_a_moment_or_a_reason(text: str):
    moment = VIENNA.read(text)
    assert (moment.utc is not None) or moment.problem
    fast = VIENNA._plain(text)
    assert fast is None or fast == VIENNA._any(text.strip())
    if moment.utc is not None and "T" in text and len(text) == 16:
        try:
            assert moment.utc == read_moment(text, "Europe/Vienna")
        except SamelineError:
            pytest.fail(f"{text!r} is a moment here and not in the records")
