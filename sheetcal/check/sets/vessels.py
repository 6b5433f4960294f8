"""Firings of a vessel counted through all workbooks, and controls that stand in another one."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import datetime

from sheetcal.check.sets.clock import FIRED
from sheetcal.check.sets.said import Run, Said, distinct, every_run
from sheetcal.check.sets.summary import Summary
from sheetcal.kinds.dates import iso

Day = tuple[str, float]


def firings(books: list[Summary]) -> Iterator[Said]:
    """Every firing beyond those that a vessel had left when they were counted."""
    counts = _counted(books)
    for vessel, runs in _by_vessel(books).items():
        dated = sorted(counts.get(vessel, {}).items())
        for number, (since, left) in enumerate(dated):
            until = dated[number + 1][0] if number + 1 < len(dated) else datetime.max
            fired = [run for run in runs if since <= _start(run) < until]
            for place, run in enumerate(fired, start=1):
                if place > left and run.book.checked:
                    yield _beyond(run, vessel, place, left, since)


def _counted(books: list[Summary]) -> dict[str, dict[datetime, float]]:
    """By vessel: how many firings were left at each moment of counting."""
    found: dict[str, dict[datetime, float]] = {}
    for tally in {tally for book in books for tally in book.tallies}:
        if tally.counted is not None:
            held = found.setdefault(tally.vessel, {})
            held[tally.counted] = min(tally.left, held.get(tally.counted, tally.left))
    return found


def _by_vessel(books: list[Summary]) -> dict[str, list[Run]]:
    """Runs that were fired, void ones too, by the vessel the logger names, else the one typed; in time order."""
    found: dict[str, list[Run]] = {}
    for run in every_run(distinct(books)):
        if run.book.kind in FIRED and run.fired.started and run.fired.vessel:
            found.setdefault(run.fired.vessel, []).append(run)
    return {vessel: sorted(runs, key=_start) for vessel, runs in found.items()}


def _start(run: Run) -> datetime:
    return run.fired.started or datetime.min


def _beyond(run: Run, vessel: str, place: int, left: float, since: datetime) -> Said:
    message = (
        f"{run.fired.run}: STOP: firing {place} of vessel {vessel} since {since:%Y-%m-%d}, when {left:.0f} were left: "
        "out of service until it is tested"
    )
    return Said(
        "vessel-out-of-service", run.book.file, run.at("vessel"), message, "error",
        {"found": float(place), "expected": f"at most {left:.0f}", "action": "stop"},
    )  # fmt: skip


def covered(books: list[Summary]) -> set[Day]:
    """(vessel, day) of every control that was fired and lies within its limits."""
    return {
        (run.fired.typed_vessel, run.fired.day)
        for run in every_run(books)
        if run.fired.role == "control" and run.fired.day is not None and _passed(run)
    }


def _passed(run: Run) -> bool:
    limit = run.book.control_action
    return run.fired.counts and run.fired.control is not None and (limit is None or abs(run.fired.control) <= limit)


def answered(books: list[Summary]) -> dict[str, set[str]]:
    """By checked file the runs whose vessel has its control of the day in another workbook of the set."""
    days = covered(books)
    found: dict[str, set[str]] = {}
    for run in every_run(book for book in books if book.checked):
        if run.fired.day is not None and (run.fired.typed_vessel, run.fired.day) in days:
            found.setdefault(run.book.file, set()).add(run.fired.run)
    return found


def cited(books: list[Summary]) -> Iterator[Said]:
    """Controls cited in a workbook that is at hand and holds no sound one of that vessel and day."""
    by_id = {book.issue_id: book for book in books}
    days = covered(books)
    for book in books:
        told: set[Day] = set()
        for run in every_run([book] if book.checked and book.kind == "fuel" else []):
            source = _source(run.fired.cites or book.control_ref, by_id)
            if source is None or run.fired.day is None or run.fired.role == "control" or not run.fired.counts:
                continue
            day = (run.fired.typed_vessel, run.fired.day)
            if day not in days | told and run.fired.typed_vessel:
                told.add(day)
                yield _not_there(run, source)


def _source(text: str, by_id: dict[str, Summary]) -> Summary | None:
    """The workbook that a reference names by its issue id."""
    return next((by_id[word] for word in text.replace(",", " ").split() if word in by_id), None)


def _not_there(run: Run, source: Summary) -> Said:
    message = (
        f"{run.fired.run}: the control cited stands in {source.file}, which holds no sound control of vessel "
        f"{run.fired.typed_vessel} on {iso(run.fired.day or 0.0, False)}"
    )
    place = run.at("control_ref") if run.fired.cites else "sheet.control_ref"
    return Said(
        "control-not-there", run.book.file, place, message, "warning",
        {"found": run.fired.cites or run.book.control_ref, "likely_cause": "another workbook or run was meant"},
    )  # fmt: skip
