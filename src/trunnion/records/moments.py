"""Stated times: UTC, to the second, as people and ssh-keygen write them. A stated time proves nothing."""

from __future__ import annotations

import datetime
import re

from trunnion.errors import RecordError

_STATED = re.compile(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ")


def stated(text: str | None = None) -> str:
    """A time in the one form statements use, `2031-05-28T12:00:00Z`; the present when none is given."""
    if text is None:
        return datetime.datetime.now(datetime.UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    seconds(text)
    return text


def seconds(text: str) -> int:
    """Seconds since 1970 of a stated time; RecordError if it is none."""
    try:
        if not isinstance(text, str) or not _STATED.fullmatch(text):
            raise ValueError
        return int(datetime.datetime.strptime(text, "%Y-%m-%dT%H:%M:%S%z").timestamp())
    except (ValueError, OverflowError) as err:
        raise RecordError(f"{text!r} is no time", remedy="write it in UTC as 2031-05-28T12:00:00Z") from err


def verify_time(text: str) -> str:
    """A stated time as `ssh-keygen -O verify-time=` takes it."""
    seconds(text)
    return re.sub(r"[-:T]", "", text)


def end_of(day: str) -> str:
    """The last second of a day in UTC: what is issued on a day may carry any time stated on it."""
    return stated(f"{day}T23:59:59Z")
