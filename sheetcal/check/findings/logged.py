"""Readings of one workbook against what an instrument stored by itself: typed by habit, from another run, too late."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from datetime import datetime, timedelta
from functools import cached_property
from statistics import median
from typing import Protocol

from sheetcal import units
from sheetcal.check.case import Case, called
from sheetcal.check.sets.summary import Fired, Summary
from sheetcal.errors import SheetcalError

CALLED = {"water": "calorimeter_water", "mass": "sample_mass", "fired": "firing", "rise": "corrected_rise"}
NEAR = timedelta(minutes=45)  # a row that names the sample belongs to a run so near
CLOSE = timedelta(minutes=10)  # one that names nothing
FAR = timedelta(hours=3)  # one that names the run's own file
LATE = 30.0  # min between the log's and the typed time that no clock explains
HOUR = 60.0
RISE = "corrected_rise"
RISE_SHARE, RISE_STEP = 1e-3, 1e-3  # rises agree within 0.1 % or 1 mK: the instrument has a road of its own


class Reading(Protocol):
    """One row of an instrument's log."""

    @property
    def time(self) -> datetime: ...
    @property
    def instrument(self) -> str: ...
    @property
    def run(self) -> str: ...
    @property
    def quantity(self) -> str: ...
    @property
    def value(self) -> float: ...
    @property
    def unit(self) -> str: ...
    @property
    def line(self) -> int: ...


@dataclass(frozen=True)
class Log:
    """An instrument's log, by day."""

    rows: tuple[Reading, ...]

    @cached_property
    def by_day(self) -> Mapping[object, list[Reading]]:
        """Rows of each day."""
        found: dict[object, list[Reading]] = {}
        for row in self.rows:
            found.setdefault(row.time.date(), []).append(row)
        return found

    def around(self, moment: datetime) -> list[Reading]:
        """Rows of that day."""
        return self.by_day.get(moment.date(), [])


@dataclass(frozen=True)
class Match:
    """A row and the run it belongs to; `named`: the row names the run itself, not only the sample or the hour."""

    row: Reading
    run: str
    started: datetime
    named: bool


def look(case: Case, log: Log, book: Summary) -> None:
    """Findings on what differs between a workbook and the log."""
    found = list(matches(book, log))
    for match in found:
        _compare(case, match)
    _times(case, found)


def lines(book: Summary, log: Log) -> tuple[int, ...]:
    """The lines of the log that belong to runs of a workbook."""
    return tuple(sorted({match.row.line for match in matches(book, log)}))


def quantity(row: Reading) -> str:
    """What a row holds, in our words."""
    name = "_".join(row.quantity.lower().split())
    return CALLED.get(name, name)


def matches(book: Summary, log: Log) -> Iterator[Match]:
    """Each row of the days of this workbook with the run it belongs to, where there is one."""
    runs = [run for run in book.runs if run.started]
    rows = {row.line: row for run in runs if run.started for row in log.around(run.started)}
    samples = {lot.sample: lot.name for lot in book.lots}
    for row in rows.values():
        named = [run for run in runs if _names(row, run, book) and _gap(row, run) <= FAR]
        fitting = named or [run for run in runs if _may_be(row, run, book, samples.get(run.sample or "", ""))]
        if fitting:
            nearest = min(fitting, key=lambda run: _gap(row, run))
            yield Match(row, nearest.run, nearest.started or row.time, bool(named))


def _names(row: Reading, run: Fired, book: Summary) -> bool:
    """Whether a row names the run: by a file of it, or by issue id and number."""
    return bool(row.run) and row.run in (*run.files, f"{book.issue_id} {run.run}")


def _gap(row: Reading, run: Fired) -> timedelta:
    return abs(row.time - (run.started or datetime.min))


def _may_be(row: Reading, run: Fired, book: Summary, sample: str) -> bool:
    if row.run:
        return bool(sample) and sample in row.run and _gap(row, run) <= NEAR
    return row.instrument in (book.calorimeter, book.balance) and _gap(row, run) <= CLOSE


def _compare(case: Case, match: Match) -> None:
    one = _place(case, match)
    place = case.parts.skeleton.places.get(one)
    typed = case.number(one) if place else None
    if place is None or typed is None or one.partition("[")[0] in case.spoiled:
        return
    try:
        stored = units.convert(match.row.value, match.row.unit, place.field.unit or "1")
    except SheetcalError:
        return
    if abs(stored - typed) <= _slack(one, stored, place.field.resolution):
        return
    case.add(
        "instrument-log", one,
        f"{match.run}: {called(place.field.label)} is not what {match.row.instrument} stored at "
        f"{match.row.time:%Y-%m-%d %H:%M}", found=typed, expected=stored,
        likely_cause="typed by habit or from another run instead of read", effect=case.effect(one, {one: stored}),
    )  # fmt: skip


def _place(case: Case, match: Match) -> str:
    """The id a row is compared with: the rise typed where the instrument gave it, else the one computed."""
    name = quantity(match.row)
    if name == RISE and case.text(f"{match.run}.rise_source") == "instrument":
        name = "instrument_rise"
    return f"{match.run}.{name}"


def _slack(one: str, stored: float, step: float | None) -> float:
    if one.endswith(f".{RISE}"):
        return max(RISE_STEP, RISE_SHARE * abs(stored))
    return 0.501 * (step or 0.0) + 1e-9 * abs(stored)


def _times(case: Case, found: Iterable[Match]) -> None:
    """Firings that the log dates otherwise than the sheet, a clock that is wrong for all of them apart."""
    fired = [one for one in found if one.named and quantity(one.row) in ("firing", RISE, "instrument_rise")]
    gaps = {one.run: (one.row.time - one.started).total_seconds() / 60.0 for one in fired}
    usual = median(gaps.values()) if len(gaps) > 2 else 0.0
    clock = round(usual / HOUR) * HOUR
    for one in {match.run: match for match in fired}.values():
        gap = gaps[one.run] - clock
        if abs(gap) > LATE and abs(abs(gap) - HOUR) > 5.0:  # summer time
            case.add(
                "instrument-log", f"{one.run}.start",
                f"{one.run}: {one.row.instrument} stored the run {abs(gap):.0f} min "
                f"{'after' if gap > 0 else 'before'} the time typed", "warning",
                found=f"{one.started:%H:%M}", expected=f"{one.row.time:%H:%M}",
                likely_cause="the time or the day was typed wrong, or the log is another run's",
            )  # fmt: skip
