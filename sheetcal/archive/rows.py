"""Rows of changes.csv: what moved, by how much, and whether the customer would see it."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator
from dataclasses import dataclass, fields

from sheetcal.archive.evaluate import Evaluated, differ
from sheetcal.check.submission import Submission
from sheetcal.errors import printable
from sheetcal.kinds.dates import iso
from sheetcal.model import TABS, Place, Value

DANGEROUS = ("=", "+", "-", "@", "\t", "\r", "\n", "＝", "＋", "－", "＠")  # the wide forms count in some programs


@dataclass(frozen=True, slots=True)
class Row:
    """One result that moved or is stored differently; names are the columns of changes.csv."""

    file: str
    sha256: str
    issue_id: str
    kind: str
    kind_version: int
    profile: str
    measured_on: str
    calorimeter: str
    sample_id: str
    field: str
    label: str
    unit: str
    stored: Value
    old: Value
    new: Value
    change: float | None
    change_relative: float | None
    reported_old: Value
    reported_new: Value
    reported_changes: str
    limit: float | None
    change_of_limit: float | None
    uncertainty: float | None
    change_of_uncertainty: float | None
    cause: str
    status: str

    @property
    def moved(self) -> bool:
        """True where the new constants give another value."""
        return self.status in ("moved", "both")

    @property
    def seen(self) -> bool:
        """True for a reported figure that changes: the customer would see it."""
        return self.reported_changes == "yes" and (self.reported_old, self.reported_new) == (self.old, self.new)


COLUMNS = tuple(one.name for one in fields(Row))


def rows(file: str, sha256: str, found: Evaluated) -> Iterator[Row]:
    """A row for every result that moved, or whose stored value is not what its readings give; workbook order."""
    parts = found.parts
    for place in sorted(parts.skeleton.places.values(), key=_in_workbook):
        one, step = place.id, place.field.resolution
        if one not in found.before:
            continue
        moved = differ(found.before[one], found.after[one], step)
        # A program that drops all stored values says nothing; one value missing among others is a difference.
        stale = bool(parts.typed) and differ(parts.typed.get(one), found.before[one], step)
        if moved or stale:
            status = "both" if moved and stale else "moved" if moved else "stored-differs"
            yield _row(file, sha256, found, place, status)


def _in_workbook(place: Place) -> tuple[int, int, int]:
    return TABS.index(place.tab), place.row, place.column


def _row(file: str, sha256: str, found: Evaluated, place: Place, status: str) -> Row:
    one, parts, record = place.id, found.parts, found.parts.record
    old, new = found.before[one], found.after[one]
    change, relative = _difference(old, new)
    reported = one if place.field.step and place.field.step.reported else f"{one}_reported"
    reported_old, reported_new = found.before.get(reported), found.after.get(reported)
    limit = _limit(parts, place)
    return Row(
        file=file,
        sha256=sha256,
        issue_id=record.issue_id,
        kind=record.kind,
        kind_version=record.kind_version,
        profile=record.profile,
        measured_on=_measured_on(parts, place),
        calorimeter=record.settings.get("calorimeter", ""),
        sample_id=_sample_id(parts, place),
        field=one,
        label=place.field.label,
        unit=place.field.unit or "",
        stored=parts.typed.get(one),
        old=old,
        new=new,
        change=change,
        change_relative=relative,
        reported_old=reported_old,
        reported_new=reported_new,
        reported_changes="yes" if differ(reported_old, reported_new, None) else "no",
        limit=limit,
        change_of_limit=None if limit is None or change is None else change / limit,
        uncertainty=None,
        change_of_uncertainty=None,
        cause="; ".join(found.causes(one)) if status != "stored-differs" else "",
        status=status,
    )


def _difference(old: Value, new: Value) -> tuple[float | None, float | None]:
    if not isinstance(old, int | float) or not isinstance(new, int | float):
        return None, None
    change = float(new - old)
    return change, (change / abs(old) if old else None)


def _limit(parts: Submission, place: Place) -> float | None:
    """The repeatability limit, for heats per gram of a sample that has one."""
    if place.field.unit != "J/g" or place.sample is None:
        return None
    value = parts.record.prefilled.get(f"{place.sample}.repeatability_limit")
    return float(value) if isinstance(value, int | float) and value > 0 else None


def _sample_id(parts: Submission, place: Place) -> str:
    one = f"{place.sample}.sample_id"
    value = parts.record.prefilled.get(one, parts.readings.get(one)) if place.sample else None
    return "" if value is None else str(value)


def _measured_on(parts: Submission, place: Place) -> str:
    """Date of the run, or of the first run that the result can stand on."""
    block = place.id.partition(".")[0]
    blocks = [block] if f"{block}.date" in parts.skeleton.places else _dated(parts, place.sample)
    dates = [parts.readings.get(f"{one}.date") for one in blocks]
    known = [float(day) for day in dates if isinstance(day, int | float) and not isinstance(day, bool)]
    return iso(min(known), False) if known else ""


def _dated(parts: Submission, sample: str | None) -> list[str]:
    return [
        one.partition(".")[0]
        for one, place in parts.skeleton.places.items()
        if place.field.name == "date" and (sample is None or place.sample == sample)
    ]


def csv_text(listed: Iterable[Row], header: bool = True) -> str:
    """CSV as the contract asks: comma, LF, round-trip numbers, no cell that a spreadsheet would run."""
    names = [COLUMNS] if header else []
    return table_text([*names, *([getattr(row, name) for name in COLUMNS] for row in listed)])


def table_text(listed: Iterable[Iterable[Value]]) -> str:
    """Rows of cells as CSV."""
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerows([csv_cell(value) for value in row] for row in listed)
    return stream.getvalue()


def csv_cell(value: Value) -> str:
    """One cell: numbers round-trip, text made harmless."""
    if value is None:
        return ""
    if isinstance(value, bool | int | float):
        return repr(value)
    text = printable(value)
    return f"'{text}" if text.startswith(DANGEROUS) or value.startswith(DANGEROUS) else text
