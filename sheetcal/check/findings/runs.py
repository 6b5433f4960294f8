"""Runs against the logger, the day and each other: another run's file, titrants, controls."""

from __future__ import annotations

from datetime import datetime
from statistics import median

from sheetcal.check.case import Case
from sheetcal.kinds.dates import iso, moment_of

CLOCK_MINUTES = 10.0  # a logger started by hand is within this of the start typed


def look(case: Case) -> None:
    """Findings that need more than one run, or the run and its logger file."""
    _logger_start(case)
    if "sample" not in case.parts.kind.scopes:
        return
    _titrants(case)
    _controls(case)


def _day(case: Case, run: str) -> float | None:
    """The date of a run, where it is one."""
    return None if f"{run}.date" in case.spoiled else case.number(f"{run}.date")


def _moment(case: Case, run: str) -> datetime | None:
    """When a run was started; a program may have made a part of the day of the time typed."""
    return moment_of(_day(case, run), case.value(f"{run}.start"))


def _logger_start(case: Case) -> None:
    """A record that started at another time than the run; one common offset is the logger's clock."""
    offsets: dict[str, float] = {}
    for run in case.runs():
        moment, text = _moment(case, run), case.text(f"{run}.record_start")
        try:
            started = datetime.fromisoformat(text).replace(tzinfo=None)
        except ValueError:
            continue
        if moment is not None and run not in case.exchanged:
            offsets[run] = (started - moment).total_seconds() / 60.0
    if not offsets:
        return
    usual = median(offsets.values()) if len(offsets) > 2 else 0.0
    for run, offset in offsets.items():
        if abs(offset - usual) > CLOCK_MINUTES:
            case.add(
                "record-of-another-run", f"{run}.record_start",
                f"{run}: the logger file {case.text(f'{run}.record_file')} started {abs(offset):.0f} min "
                f"{'after' if offset > 0 else 'before'} the run",
                found=case.text(f"{run}.record_start"), expected=f"within {CLOCK_MINUTES:g} min of the start",
                likely_cause="the record of another run was loaded",
            )  # fmt: skip


def _titrants(case: Case) -> None:
    """Two titrants in one sample on one day: right when a bottle ran out, worth a look."""
    for sample in case.samples():
        lots: dict[float, dict[str, str]] = {}
        for run in case.runs(sample):
            day, lot = _day(case, run), case.text(f"{run}.titrant_lot")
            if day is not None and lot and case.is_counted(run):
                lots.setdefault(day, {}).setdefault(lot, run)
        for of_day in lots.values():
            if len(of_day) > 1:
                lot, run = min(of_day.items())
                others = sorted(set(of_day) - {lot})
                case.add(
                    "titrant-of-the-day", f"{run}.titrant_lot",
                    f"{run}: titrant {lot}, but {', '.join(others)} in another run of the sample that day", "note",
                    found=lot, expected=", ".join(others),
                    effect=case.effect(f"{run}.", {f"{run}.titrant_lot": others[0]}),
                )  # fmt: skip


def _controls(case: Case) -> None:
    """Every vessel needs a control on the day, on this sheet or cited."""
    covered: set[tuple[str, float]] = set()
    needing: dict[tuple[str, float], str] = {}
    for run in case.runs():
        if case.text(f"{run}.state") != "valid":
            continue
        day, vessel = _day(case, run), case.text(f"{run}.vessel")
        if day is None or not vessel:
            continue
        if case.text(f"{case.sample_of(run)}.role") == "control":
            covered.add((vessel, day))
        elif not case.text(f"{run}.control_ref") and not case.text("sheet.control_ref"):
            needing.setdefault((vessel, day), run)
    for (vessel, day), run in needing.items():
        if (vessel, day) not in covered:
            case.add(
                "control-missing", f"{run}.vessel",
                f"{run}: no control of vessel {vessel} on {iso(day, False)}, and none cited", "warning",
                likely_cause="the control stands in another workbook and was not cited",
            )  # fmt: skip
