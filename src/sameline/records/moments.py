"""Moments in time: kept as UTC, ISO 8601, to the microsecond, ending in Z, so that text order is time order."""

from __future__ import annotations

import datetime as dt
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from sameline.errors import CallError


def utc_text(moment: dt.datetime) -> str:
    """The moment as the store keeps it, for example "2026-03-04T08:30:00.000000Z". It must carry a zone."""
    if moment.tzinfo is None:
        raise CallError("a moment needs a time zone", where=moment.isoformat())
    return moment.astimezone(dt.UTC).strftime("%Y-%m-%dT%H:%M:%S.%fZ")


def read_zone(name: str) -> ZoneInfo:
    """The time zone of this IANA name."""
    try:
        return ZoneInfo(name)
    except (ZoneInfoNotFoundError, ValueError, IsADirectoryError) as error:
        raise CallError(
            f"no time zone is called {name!r}", advice="use an IANA name such as Europe/Vienna or UTC"
        ) from error


def read_moment(text: str, zone: str) -> str:
    """A moment written in ISO 8601 as the store keeps it; without a zone of its own it is in `zone` (IANA name).

    A date alone is that day's beginning.
    """
    try:
        moment = dt.datetime.fromisoformat(text.strip())
    except ValueError as error:
        raise CallError(
            f"{text!r} is not a date or time",
            advice="write it as 2026-03-04 or 2026-03-04T08:30, with a zone if it has one",
        ) from error
    if moment.tzinfo is None:
        moment = moment.replace(tzinfo=read_zone(zone))
    try:
        return utc_text(moment)
    except OverflowError as error:
        raise CallError(f"{text!r} lies outside the years that can be kept") from error
