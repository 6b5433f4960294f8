"""What the lab file says of a workbook's runs on their own day: another heat capacity in force, a balance run out."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import datetime

from sheetcal.check.submission import Submission
from sheetcal.inputs.lab import Calibration, Lab
from sheetcal.kinds.dates import moment_of
from sheetcal.model import Finding, Value


def out_of_force(parts: Submission, lab: Lab) -> tuple[Finding, ...]:
    """Findings against the lab file as it is now, one for each vessel and calibration, one for the balance."""
    return (*_calibrations(parts, lab), *_balance(parts, lab))


def _moments(parts: Submission) -> Iterator[tuple[str, datetime]]:
    """Runs that were started, in their order."""
    for one, day in parts.readings.items():
        run, _, name = one.partition(".")
        if name == "date" and run.startswith("run"):
            start = parts.readings.get(f"{run}.start")
            moment = None if isinstance(day, list) or isinstance(start, list) else moment_of(day, start)
            if moment is not None:
                yield run, moment


def _calibrations(parts: Submission, lab: Lab) -> Iterator[Finding]:
    """Runs of a fuel workbook whose vessel had been calibrated anew before they were fired."""
    if "sample" not in parts.kind.scopes:
        return
    told: set[tuple[str, str]] = set()
    for run, moment in _moments(parts):
        vessel = str(parts.readings.get(f"{run}.vessel") or "")
        row = next((row for row in parts.record.tables.get("vessel", ()) if row.get("id") == vessel), None)
        now = lab.calibration_at(vessel, moment) if row else None
        if row is None or now is None or not _moved(row.get("calibration"), row.get("heat_capacity"), now):
            continue
        if (vessel, now.issue) not in told:
            told.add((vessel, now.issue))
            yield _superseded(parts, run, moment, vessel, row["heat_capacity"], now)


def _moved(issue: Value, value: Value, now: Calibration) -> bool:
    """Whether another calibration, with another value, was in force; a restated value is said elsewhere."""
    return now.issue != issue and isinstance(value, float | int) and abs(value - now.value) > 1e-9 * now.value


def _superseded(parts: Submission, run: str, moment: datetime, vessel: str, value: Value, now: Calibration) -> Finding:
    place = parts.skeleton.places[f"{run}.effective_heat_capacity"]
    message = (
        f"{run}: on {moment:%Y-%m-%d %H:%M} vessel {vessel} had been calibrated anew (workbook {now.issue}, in force "
        f"since {now.valid_from:%Y-%m-%d %H:%M})"
    )
    cause = "the workbook was issued before that calibration was adopted: recompute it with the lab file"
    return Finding(
        "calibration-superseded", "fault", "warning", message, place.tab, place.cell, place.id, value, now.value, cause
    )


def _balance(parts: Submission, lab: Lab) -> Iterator[Finding]:
    """A balance that the lab file now says had run out on the day, though the workbook did not know."""
    name = parts.readings.get("sheet.balance")
    balance = next((one for one in lab.balances if one.id == name), None)
    if balance is None or balance.calibrated_until is None:
        return
    for run, moment in _moments(parts):
        if moment.date() > balance.calibrated_until:
            place = parts.skeleton.places[f"{run}.date"]
            message = f"{run}: by the lab file the calibration of balance {balance.id} had run out on this day"
            yield Finding(
                "balance-expired", "fault", "warning", message, place.tab, place.cell, place.id,
                moment.date().isoformat(), f"until {balance.calibrated_until.isoformat()}",
            )  # fmt: skip
            return
