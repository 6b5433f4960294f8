"""Dates in their order: issued, done, analysed, checked, saved. A day and a month exchanged give themselves away."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from datetime import UTC, date, datetime, timedelta

from sheetcal.check.case import Case, called
from sheetcal.kinds.dates import iso

ONE = timedelta(days=1)  # time zones: the day of a stamp in UTC may be the day before or after in the laboratory
LAST_MONTH_DAY = 12


def look(case: Case, properties: Mapping[str, str]) -> None:
    """A finding for each date that cannot be; what stands on a run's date that was plainly mistyped is not judged."""
    issued = _stamp(case.parts.record.issued_at)
    if issued is None or not case.witnessed.started:
        return
    latest, why = _latest(properties, issued)
    _file(case, properties, issued)
    copied = bool(case.parts.record.cites)  # a revised copy is issued after the work, which its original shows
    for one, day in _dates(case):
        if _is_done(one) and day < issued - ONE and not copied:
            _add(case, one, day, "lies before the day of issue", (issued, latest))
        elif day > latest:
            _add(case, one, day, why, (issued, latest))
    _checked(case, issued, latest)


def _stamp(text: str | None) -> date | None:
    try:
        return datetime.fromisoformat((text or "").replace("Z", "+00:00")).date()
    except ValueError:
        return None


def _latest(properties: Mapping[str, str], issued: date) -> tuple[date, str]:
    """The last day anything on the sheet can have been done, and what is wrong with a later one.

    A file that a program saved after it was issued carries that moment; else only today is certain.
    """
    today = datetime.now(UTC).date() + ONE
    saved = _stamp(properties.get("modified"))
    unsaved = properties.get("modified") == properties.get("created")
    if saved is None or unsaved or not issued - ONE <= saved < today:
        return today, "lies in the future"
    return saved + ONE, "lies after the day the file was last saved"


def _file(case: Case, properties: Mapping[str, str], issued: date) -> None:
    saved = _stamp(properties.get("modified"))
    if saved is not None and saved < issued - ONE:
        case.add(
            "file-before-issue", "sheet.issued_at",
            f"the file was last saved on {saved}, before the workbook was issued", "note", found=saved.isoformat(),
            expected=f"{issued} or later", likely_cause="the clock of a computer, or properties edited by hand",
        )  # fmt: skip


def _dates(case: Case) -> Iterator[tuple[str, date]]:
    """Every date typed that is one, in workbook order; runs that are not begun have none."""
    for one, place in case.parts.skeleton.places.items():
        fld = place.field
        typed = fld.type in ("date", "datetime") and fld.step is None and not fld.locked
        if typed and one in case.parts.readings and one not in case.parts.record.locked and one not in case.mistyped:
            day = _day(case, one)
            if day is not None:
                yield one, day


def _day(case: Case, one: str) -> date | None:
    value = case.parts.readings.get(one)
    if isinstance(value, bool) or not isinstance(value, float | int):
        return None
    return _stamp(iso(float(value), False))


def _is_done(one: str) -> bool:
    """Whether a date is that of work on this workbook: analyses may have been made before."""
    return one.endswith(".date") or one == "sheet.checked_at"


def _add(case: Case, one: str, day: date, what: str, between: tuple[date, date]) -> None:
    place, _ = case.place(one)
    causes = tuple(_causes(day, between))
    case.add(
        "date-order", one, f"{called(place.field.label)}: {day} {what}", "warning", found=day.isoformat(),
        expected=f"{between[0]} to {between[1]}", likely_cause=causes[0] if causes else None, causes=causes,
    )  # fmt: skip
    if causes and one.endswith(".date"):
        case.spoiled.add(one)


def _causes(day: date, between: tuple[date, date]) -> Iterator[str]:
    first, last = between
    if day.day <= LAST_MONTH_DAY and day.day != day.month:
        turned = date(day.year, day.day, day.month)
        if first - ONE <= turned <= last:
            yield f"day and month were probably exchanged: {turned}"
    for year in (day.year + 1, day.year - 1, first.year):
        try:
            moved = day.replace(year=year)
        except ValueError:
            continue
        if moved != day and first - ONE <= moved <= last:
            yield f"the year was probably mistyped: {moved}"
            return


def _checked(case: Case, issued: date, latest: date) -> None:
    """Checked before it was done: one run that lies alone after the check has the wrong date, else the check has."""
    checked = _day(case, "sheet.checked_at")
    if checked is None or any(one.field == "sheet.checked_at" for one in case.found):
        return
    runs = [(f"{run}.date", day) for run in case.runs() if (day := _day(case, f"{run}.date")) is not None]
    late = [(one, day) for one, day in runs if day > checked and one not in case.spoiled]
    if late and len(late) * 2 < len(runs):
        for one, day in late:
            _add(case, one, day, f"lies after the sheet was checked ({checked})", (issued, checked))
    elif late:
        last = max(day for _, day in late)
        _add(case, "sheet.checked_at", checked, f"lies before the last run ({last})", (last, latest))
