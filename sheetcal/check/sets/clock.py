"""Two runs of two workbooks in one calorimeter at one time."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import datetime, timedelta

from sheetcal.check.sets.said import Run, Said, distinct, every_run, same
from sheetcal.check.sets.summary import Summary

SHORTEST = 8.0  # min a firing takes at least, where no record shows how long it took
SLACK = 2.0  # min that a start is typed wrong by honest people
FIRED = ("calibration", "fuel")


def look(books: list[Summary]) -> Iterator[Said]:
    """Runs that count and start before the one before them in the same calorimeter can be over."""
    for runs in _by_calorimeter(books):
        before: Run | None = None
        for run in runs:
            if before and _overlap(before, run) and _apart(before, run):
                yield from _said(before, run)
            if before is None or _end(run) >= _end(before):
                before = run


def _apart(before: Run, run: Run) -> bool:
    """Whether they stand in two workbooks that are not the same throughout; else it is said elsewhere."""
    return before.book is not run.book and not same(before.book, run.book)


def _by_calorimeter(books: list[Summary]) -> Iterator[list[Run]]:
    groups: dict[str, list[Run]] = {}
    for run in every_run(distinct(books)):
        if run.book.kind in FIRED and run.book.calorimeter and run.fired.started and run.fired.counts:
            groups.setdefault(run.book.calorimeter, []).append(run)
    for runs in groups.values():
        yield sorted(runs, key=_start)


def _start(run: Run) -> datetime:
    return run.fired.started or datetime.min


def _end(run: Run) -> datetime:
    return _start(run) + timedelta(minutes=run.fired.minutes or SHORTEST)


def _overlap(before: Run, run: Run) -> bool:
    over = (_end(before) - _start(run)).total_seconds() / 60.0
    return over > SLACK and not _hour_twice(_start(run))


def _hour_twice(moment: datetime) -> bool:
    """In the night in which clocks are put back an hour comes twice: times cannot be put in order then."""
    night = moment.weekday() == 6 and moment.hour < 4
    return night and ((moment.month == 10 and moment.day >= 25) or (moment.month in (4, 11) and moment.day <= 7))


def _said(before: Run, run: Run) -> Iterator[Said]:
    blamed, other = (run, before) if run.book.checked else (before, run)
    if not blamed.book.checked:
        return
    message = (
        f"{blamed.fired.run}: started at {_start(blamed):%Y-%m-%d %H:%M} in {run.book.calorimeter}, "
        f"{other.name} at {_start(other):%H:%M}: the two overlap"
    )
    found = f"{_start(run) - _start(before)}".removesuffix(":00") + " h between the starts"
    cause = "a time, a date or the calorimeter was typed wrong"
    facts = {"found": found, "likely_cause": cause}
    yield Said("runs-overlap", blamed.book.file, blamed.at("start"), message, "warning", facts)
