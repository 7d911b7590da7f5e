"""When a run was tested, as laboratories write it, turned into a moment as the store keeps it.

ISO 8601 is read as it stands. Any other order of day, month and year is read only where it can mean one thing, or
where the file's map says the order. A local time that the clock showed twice, or never, is not guessed.
"""

from __future__ import annotations

import datetime as dt
import re
from dataclasses import dataclass
from typing import Literal

from sameline.records.moments import read_zone, utc_text

DateOrder = Literal["ymd", "dmy", "mdy"]

_MONTHS = ("jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec")
_CLOCK = (
    r"(?:[T,\s]\s*(\d{1,2}):(\d{2})(?::(\d{2})(?:[.,](\d{1,9}))?)?"
    r"\s*([AaPp]\.?[Mm]\.?)?\s*(Z|z|UTC|[+-]\d{2}:?\d{2})?)?"
)
_ISO = re.compile(r"(\d{4})-(\d{1,2})-(\d{1,2})" + _CLOCK, re.ASCII)
_COMPACT = re.compile(r"(\d{4})(\d{2})(\d{2})(?:T(\d{2})(\d{2})(?:(\d{2}))?(Z)?)?", re.ASCII)
_NUMBERS = re.compile(r"(\d{1,4})([./-])(\d{1,2})\2(\d{1,4})\.?" + _CLOCK, re.ASCII)
_NAMED = re.compile(
    r"(?:(\d{1,2})[.\s-]*([A-Za-z]{3,9})|([A-Za-z]{3,9})\s+(\d{1,2})),?[.\s,-]*(\d{4})" + _CLOCK, re.ASCII
)
_DAY_COUNT = re.compile(r"\d{5}(?:\.\d+)?", re.ASCII)
_ORDERS: tuple[DateOrder, ...] = ("ymd", "dmy", "mdy")
_OLDEST = 1950
_WRITE = "write it as 2026-03-04 or 2026-03-04T08:30"


@dataclass(frozen=True, slots=True)
class Moment:
    """A date cell as read.

    Attributes:
        utc: the moment as the store keeps it, or None where it could not be read.
        problem: what is wrong, or None.
        suggestion: what to do about it, or None.
        question: whether the problem can be answered rather than being a refusal.
    """

    utc: str | None
    problem: str | None = None
    suggestion: str | None = None
    question: bool = False


class DateReader:
    """Reads the dates of one table.

    Args:
        zone: IANA name of the zone that moments written without one are in.
        now: the present moment as the store keeps moments.
        order: the order of day, month and year, where the file's map says it.
    """

    def __init__(self, zone: str, now: str, order: DateOrder | None = None) -> None:
        self._zone = read_zone(zone)
        self._zone_name = zone
        self._is_utc = zone == "UTC"
        self._now = now
        self._order = order

    def read(self, text: str) -> Moment:
        """The moment that this text means."""
        return self._plain(text) or self._any(text.strip())

    def _plain(self, text: str) -> Moment | None:
        """The fast path: "2026-03-04T08:30" or with seconds, without a zone and without doubt.

        It must give what `_any` gives (a test compares them).
        """
        if len(text) not in (16, 19) or text[4] != "-" or text[7] != "-" or text[10] not in "T " or not text.isascii():
            return None
        try:
            local = dt.datetime.fromisoformat(text)
        except ValueError:
            return None
        if local.tzinfo is not None or local.year < _OLDEST:
            return None
        if not self._is_utc:
            early = local.replace(tzinfo=self._zone)
            offset = early.utcoffset()
            if offset is None or offset != early.replace(fold=1).utcoffset():
                return None
            local -= offset
        utc = local.isoformat(timespec="microseconds") + "Z"
        return Moment(utc) if utc <= self._now else None

    def _any(self, text: str) -> Moment:
        if not text:
            return Moment(None, "the date is empty", _WRITE)
        try:
            local = self._local(text)
        except ValueError as error:
            return Moment(None, f"{text!r} is no date in the calendar: {error}", _WRITE)
        if isinstance(local, Moment):
            return local
        return self._placed(text, local)

    def _local(self, text: str) -> dt.datetime | Moment:
        if found := _ISO.fullmatch(text):
            year, month, day, *clock = found.groups()
            return _at(int(year), int(month), int(day), clock)
        if (found := _COMPACT.fullmatch(text)) and self._order in (None, "ymd"):
            year, month, day, hour, minute, second, zone = found.groups()
            return _at(int(year), int(month), int(day), [hour, minute, second, None, None, zone])
        if found := _NAMED.fullmatch(text):
            day_a, name_a, name_b, day_b, year, *clock = found.groups()
            month_name = (name_a or name_b)[:3].lower()
            if month_name in _MONTHS:
                return _at(int(year), _MONTHS.index(month_name) + 1, int(day_a or day_b), clock)
        if found := _NUMBERS.fullmatch(text):
            first, _, second, third, *clock = found.groups()
            return self._ordered(text, (first, second, third), clock)
        if _DAY_COUNT.fullmatch(text):
            day = dt.date(1899, 12, 30) + dt.timedelta(days=int(text.partition(".")[0]))
            advice = (
                f"as a spreadsheet's count of days it would be {day}; give the cell a date format or write the date"
            )
            return Moment(None, f"{text!r} is a number, not a date", advice)
        return Moment(None, f"{text!r} is not a date", _WRITE)

    def _ordered(self, text: str, parts: tuple[str, str, str], clock: list[str | None]) -> dt.datetime | Moment:
        """The date of three numbers: the one reading there is, or the one that the stated order gives."""
        orders = _ORDERS if self._order is None else (self._order,)
        readings = {order: day for order in orders if (day := _reading(parts, order))}
        days = sorted(set(readings.values()))
        if len(days) == 1:
            return _at(days[0].year, days[0].month, days[0].day, clock)
        if not days:
            stated = f" in the order {self._order}" if self._order else ""
            return Moment(None, f"{text!r} is no date{stated}", _WRITE)
        could = " or ".join(day.isoformat() for day in days)
        advice = "write the date as year-month-day, or state the order of dates in the file's map"
        return Moment(None, f"{text!r} could be {could}", advice)

    def _placed(self, text: str, local: dt.datetime) -> Moment:
        """The moment of a local time: with its own zone, or in the laboratory's where the clock leaves no doubt."""
        if local.tzinfo is None:
            early = local.replace(tzinfo=self._zone)
            if early.utcoffset() != early.replace(fold=1).utcoffset():
                return self._at_clock_change(text, early)
            local = early
        try:
            utc = utc_text(local)
        except (OverflowError, ValueError):
            return Moment(None, f"{text!r} lies outside the years that can be kept", _WRITE)
        if utc > self._now:
            return Moment(
                None, f"{text!r} is in the future (it is now {self._now[:16]}Z)", "give the day it was tested"
            )
        if local.year < _OLDEST:
            return Moment(utc, f"{text!r} is before {_OLDEST}", "is the year right?", question=True)
        return Moment(utc)

    def _at_clock_change(self, text: str, early: dt.datetime) -> Moment:
        late = early.replace(fold=1)
        back = early.astimezone(dt.UTC).astimezone(self._zone).replace(tzinfo=None)
        if back != early.replace(tzinfo=None):
            return Moment(None, f"{text!r} never was in {self._zone_name}: the clock skipped that hour", _WRITE)
        shown = " or ".join(moment.isoformat(timespec="minutes") for moment in (early, late))
        return Moment(None, f"{text!r} came twice in {self._zone_name} that day", f"write the zone: {shown}")


def _reading(parts: tuple[str, str, str], order: DateOrder) -> dt.date | None:
    """The date of three numbers in this order; two figures for a year are of this century."""
    texts = dict(zip(order, parts, strict=True))
    if len(texts["y"]) not in (2, 4) or len(texts["m"]) > 2 or len(texts["d"]) > 2:
        return None
    year = int(texts["y"]) + (2000 if len(texts["y"]) == 2 else 0)
    try:
        return dt.date(year, int(texts["m"]), int(texts["d"]))
    except ValueError:
        return None


def _at(year: int, month: int, day: int, clock: list[str | None]) -> dt.datetime:
    """The moment on a day at a clock time; it has a zone where the clock has one.

    Raises:
        ValueError: there is no such day or time.
    """
    hour_text, minute, second, fraction, half, zone = clock
    hour = int(hour_text or 0)
    if half:
        if not 1 <= hour <= 12:
            raise ValueError("the hour of am or pm must be in 1..12")
        hour = hour % 12 + (12 if half[0] in "pP" else 0)
    micro = int((fraction or "0").ljust(6, "0")[:6])
    return dt.datetime(year, month, day, hour, int(minute or 0), int(second or 0), micro, tzinfo=_offset(zone))


def _offset(zone: str | None) -> dt.tzinfo | None:
    if zone is None:
        return None
    if zone in ("Z", "z", "UTC"):
        return dt.UTC
    sign = -1 if zone[0] == "-" else 1
    hours, minutes = int(zone[1:3]), int(zone[-2:])
    if minutes > 59:
        raise ValueError("a zone's minutes must be in 0..59")
    return dt.timezone(sign * dt.timedelta(hours=hours, minutes=minutes))
