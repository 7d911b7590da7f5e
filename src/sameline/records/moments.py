"""Moments in time: kept as UTC, ISO 8601, to the microsecond, ending in Z, so that text order is time order."""

from __future__ import annotations

import datetime as dt
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from sameline.errors import CallError


def utc_text(moment: dt.datetime) -> str:
    """The moment as the store keeps it, for example "2026-03-04T08:30:00.000000Z". It must carry a zone."""
    if moment.tzinfo is None:
        raise CallError("a moment needs a time zone", where=moment.isoformat())
    return moment.astimezone(dt.UTC).replace(tzinfo=None).isoformat(timespec="microseconds") + "Z"


def read_zone(name: str) -> ZoneInfo:
    """The time zone of this IANA name."""
    try:
        return ZoneInfo(name)
    except (ZoneInfoNotFoundError, ValueError, IsADirectoryError) as error:
        raise CallError(
            f"no time zone is called {name!r}", advice="use an IANA name such as Europe/Vienna or UTC"
        ) from error


def read_moment(text: str, zone: str, *, whole_day: bool = False) -> str:
    """A moment written in ISO 8601 as the store keeps it; without a zone of its own it is in `zone` (IANA name).

    Args:
        text: the date or time.
        zone: the laboratory's time zone.
        whole_day: whether a date alone means the end of its day (the next one's beginning) instead of its beginning.

    Raises:
        CallError: it is no date or time, or one that cannot be kept.
    """
    try:
        moment = dt.datetime.fromisoformat(text.strip())
        if whole_day and is_date(text):
            moment += dt.timedelta(days=1)
    except ValueError as error:
        raise CallError(
            f"{text!r} is not a date or time",
            advice="write it as 2026-03-04 or 2026-03-04T08:30, with a zone if it has one",
        ) from error
    except OverflowError as error:
        raise CallError(f"{text!r} lies outside the years that can be kept") from error
    if moment.tzinfo is None:
        moment = moment.replace(tzinfo=read_zone(zone))
    try:
        return utc_text(moment)
    except OverflowError as error:
        raise CallError(f"{text!r} lies outside the years that can be kept") from error


def is_date(text: str) -> bool:
    """Whether the text is a date without a time."""
    try:
        dt.date.fromisoformat(text.strip())
    except ValueError:
        return False
    return True
