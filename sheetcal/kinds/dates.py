"""Dates as spreadsheets store them: days since 1899-12-30, local time, no zone."""

from __future__ import annotations

from datetime import datetime, timedelta

EPOCH = datetime(1899, 12, 30)
FAR = "2999-12-31"
NEVER = "1900-01-01"  # the end of what never began


def serial(text: str) -> float:
    """ISO 8601 local date or date and time as a serial number; ValueError when it is neither."""
    moment = datetime.fromisoformat(text)
    if moment.tzinfo is not None:
        moment = moment.replace(tzinfo=None)
    gap = moment - EPOCH
    return gap.days + gap.seconds / 86400.0


def iso(number: float, with_time: bool | None = None) -> str:
    """A serial number as ISO text; the time is shown when there is one, unless told otherwise.

    A number that no calendar reaches stays one.
    """
    try:
        moment = EPOCH + timedelta(seconds=round(number * 86400.0))
    except OverflowError:
        return repr(number)
    show = bool(moment.hour or moment.minute or moment.second) if with_time is None else with_time
    return moment.isoformat(timespec="minutes") if show else moment.date().isoformat()


def moment_of(day: object, start: object) -> datetime | None:
    """Date (serial number) and time of the day as a workbook holds them, or None where they are no such thing.

    The time may be the text typed, `7:30`, or the part of a day that a program made of it.
    """
    if isinstance(day, bool) or not isinstance(day, float | int):
        return None
    if isinstance(start, bool) or not isinstance(start, float | int | str):
        return None
    try:
        if isinstance(start, str):
            typed = datetime.fromisoformat(f"{iso(day, False)}T{start.strip().rjust(5, '0')}")
            return typed.replace(tzinfo=None)
        return datetime.fromisoformat(iso(int(day) + float(start), True))
    except (ValueError, OverflowError):
        return None
