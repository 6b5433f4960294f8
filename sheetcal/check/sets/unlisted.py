"""Runs that an instrument stored and no workbook at hand holds."""

from __future__ import annotations

from collections.abc import Iterator

from sheetcal.check.findings.logged import RISE, Log, Reading, quantity
from sheetcal.check.sets.said import Said
from sheetcal.check.sets.summary import Lot, Summary

RUNS = ("firing", RISE, "instrument_rise", "gross")
SHORTEST = 3  # letters of a sample's name that is looked for in a longer one


def look(books: list[Summary], log: Log) -> Iterator[Said]:
    """One finding for each run of a sample in the log that stands on no workbook, checked or earlier."""
    known = {line for book in books for line in book.logged}
    owners = [(lot, book) for book in books if book.checked for lot in book.lots if len(lot.name) >= SHORTEST]
    told: set[str] = set()
    for row in log.rows:
        owner = _owner(row, owners) if row.line not in known and row.run not in told else None
        if owner:
            told.add(row.run)
            yield _said(row, *owner)


def _owner(row: Reading, owners: list[tuple[Lot, Summary]]) -> tuple[Lot, Summary] | None:
    """The sample whose name stands in the run's; the longest where several do."""
    fitting = [one for one in owners if one[0].name in row.run]
    return max(fitting, key=lambda one: len(one[0].name), default=None)


def _said(row: Reading, lot: Lot, book: Summary) -> Said:
    runs = sum(run.sample == lot.sample for run in book.runs)
    what = "fired" if quantity(row) in RUNS else "weighed for"
    message = (
        f"{lot.sample}: run {row.run} was {what} at {row.time:%Y-%m-%d %H:%M} by the log of {row.instrument}, and "
        f"stands on no workbook at hand (runs here: {runs})"
    )
    cause = "a run was left out: every run made belongs on the sheet, void with its reason if it does not count"
    facts = {"found": row.run, "likely_cause": cause}
    return Said("log-run-missing", book.file, f"{lot.sample}.sample_id", message, "warning", facts)
