"""Time stamps of messages: calendar or day-of-year form to whole nanoseconds, leap seconds counted in UTC.

Source of the form: CCSDS-504.0-B-2 section 6; of the leap seconds: IERS Bulletin C series, as published to 2017.
"""

from __future__ import annotations

import datetime
import re

_FORM = re.compile(
    r"(\d{4})-(?:(\d{2})-(\d{2})|(\d{3}))T(\d{2}):(\d{2}):(\d{2})(?:\.(\d+))?Z?"
)  # year, month and day or day of year, hour, minute, second, fraction
_BILLION = 10**9
_DAY = 86_400

#: Days (UTC) that ended with a second 60: the last days of June or December.
LEAP_DAYS = tuple(
    datetime.date(year, month, 30 if month == 6 else 31)
    for year, month in (
        (1972, 6), (1972, 12), (1973, 12), (1974, 12), (1975, 12), (1976, 12), (1977, 12), (1978, 12), (1979, 12),
        (1981, 6), (1982, 6), (1983, 6), (1985, 6), (1987, 12), (1989, 12), (1990, 12), (1992, 6), (1993, 6),
        (1994, 6), (1995, 12), (1997, 6), (1998, 12), (2005, 12), (2008, 12), (2012, 6), (2015, 6), (2016, 12),
    )
)  # fmt: skip


def nanoseconds(text: str, time_system: str = "UTC") -> int:
    """Whole nanoseconds of a time stamp since 2000-01-01T00:00:00 of its own time system.

    In UTC every leap second in between counts, and second 60 is taken only where there was one. Raises ValueError with
    the reason.
    """
    match = _FORM.fullmatch(text)
    if match is None:
        raise ValueError(f"'{text[:40]}' is no time of the form 2031-05-01T00:00:00.000")
    year, month, day, day_of_year = match[1], match[2], match[3], match[4]
    date = _date(int(year), month, day, day_of_year)
    hour, minute, second = int(match[5]), int(match[6]), int(match[7])
    utc = time_system.upper() == "UTC"
    last = 60 if utc and date in LEAP_DAYS and (hour, minute) == (23, 59) else 59
    if hour > 23 or minute > 59 or second > last:
        raise ValueError(f"'{text}' is no time of day")
    fraction = int(((match[8] or "") + "0" * 9)[:9])
    days = date.toordinal() - datetime.date(2000, 1, 1).toordinal()
    leaps = _leaps_before(date) if utc else 0
    return (days * _DAY + hour * 3600 + minute * 60 + second + leaps) * _BILLION + fraction


def _date(year: int, month: str | None, day: str | None, day_of_year: str | None) -> datetime.date:
    if day_of_year is None:
        return datetime.date(year, int(month or 0), int(day or 0))
    date = datetime.date(year, 1, 1) + datetime.timedelta(days=int(day_of_year) - 1)
    if date.year != year:
        raise ValueError(f"the year {year} has no day {day_of_year}")
    return date


def _leaps_before(date: datetime.date) -> int:
    """Leap seconds from 2000 to the start of `date`, negative before 2000."""
    start = datetime.date(2000, 1, 1)
    if date >= start:
        return sum(start <= leap < date for leap in LEAP_DAYS)
    return -sum(date <= leap < start for leap in LEAP_DAYS)


def epoch_text(count: int, time_system: str = "UTC", digits: int = 9) -> str:
    """The time stamp of a count from `nanoseconds`, with `digits` decimals of the second (0 to 9).

    The count is taken to the nearest step of that size first, so a second never prints as 60 but in a leap second.
    """
    step = 10 ** (9 - digits)
    count = (count + step // 2) // step * step
    utc = time_system.upper() == "UTC"
    date = datetime.date(2000, 1, 1) + datetime.timedelta(seconds=count // _BILLION)
    near = (1, 0, -1) if utc else (0,)  # leap seconds move midnight by less than a minute
    for candidate in (date + datetime.timedelta(days=shift) for shift in near):
        midnight = nanoseconds(f"{candidate.isoformat()}T00:00:00", time_system)
        if count >= midnight:
            return _clock_text(candidate, count - midnight, digits)
    raise ValueError("no such time")


def _clock_text(date: datetime.date, since_midnight: int, digits: int) -> str:
    whole, fraction = divmod(since_midnight, _BILLION)
    seconds = min(whole, _DAY - 1)
    hour, minute, second = seconds // 3600, seconds // 60 % 60, seconds % 60 + (whole - seconds)
    decimals = f".{fraction:09d}"[: digits + 1] if digits else ""
    return f"{date.isoformat()}T{hour:02d}:{minute:02d}:{second:02d}{decimals}"
