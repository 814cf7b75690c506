"""Dates as the serial numbers that cells hold (ISO/IEC 29500-1, 18.17.4): days since 1900 or since 1904."""

from __future__ import annotations

import re
from datetime import UTC, date, datetime, timedelta

_FALSE_LEAP_DAY = 60  # the 1900 system counts a 29 February 1900 that never was: days before it are one lower
_TIME = re.compile(r"T?(\d{1,2}):(\d{2})(?::(\d{2}(?:\.\d*)?))?Z?")


def date_of_serial(serial: float, date1904: bool = False) -> datetime | None:
    """The moment of a serial number, to the second; None outside the years 1900 to 9999."""
    days = serial if date1904 or serial >= _FALSE_LEAP_DAY else serial + 1
    start = datetime(1904, 1, 1) if date1904 else datetime(1899, 12, 30)
    try:
        return start + timedelta(seconds=round(days * 86_400))
    except OverflowError:
        return None


def text_of_serial(serial: float, date1904: bool = False) -> str:
    """ "2024-03-01", with the time where there is one; a plain number outside the calendar."""
    moment = date_of_serial(serial, date1904)
    if moment is None:
        return f"{serial:.15g}"
    return moment.date().isoformat() if moment.time() == datetime.min.time() else moment.isoformat(" ")


def serial_of_text(text: str, date1904: bool = False) -> float | None:
    """The serial number of an ISO 8601 date, moment or time of day; None if it is none of these."""
    time = _TIME.fullmatch(text.strip())
    if time is not None:
        return (int(time[1]) * 3600 + int(time[2]) * 60 + float(time[3] or 0)) / 86_400
    try:
        moment = datetime.fromisoformat(text.strip())
    except ValueError:
        return None
    if moment.tzinfo is not None:
        moment = moment.astimezone(UTC).replace(tzinfo=None)
    start = date(1904, 1, 1) if date1904 else date(1899, 12, 30)
    since = moment - datetime.combine(start, datetime.min.time())
    days = since.days + since.seconds / 86_400 + since.microseconds / 86_400e6
    return days if date1904 or days > _FALSE_LEAP_DAY else days - 1
