"""Rows of changes.csv: what moved, by how much, and whether the customer would see it."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, fields

from sheetcal.archive.changed import Changes
from sheetcal.check.submission import Submission
from sheetcal.kinds.dates import iso
from sheetcal.model import Place, Value

REPORTED_OF = ("_reported",)
DANGEROUS = ("=", "+", "-", "@", "\t", "\r")


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


COLUMNS = tuple(one.name for one in fields(Row))


def differ(one: Value, other: Value, step: float | None) -> bool:
    """Whether two values differ beyond the replay tolerance."""
    if isinstance(one, int | float) and isinstance(other, int | float):
        return abs(one - other) > 1e-9 * max(abs(one), abs(other)) + 1e-6 * (step or 0.0)
    blank = (None, "")
    return (one in blank) != (other in blank) or (one not in blank and one != other)


def rows(
    file: str,
    sha256: str,
    parts: Submission,
    old: Mapping[str, Value],
    new: Mapping[str, Value],
    changes: Changes,
) -> Iterator[Row]:
    """A row for every result that moved, or whose stored value is not what its readings give."""
    for one, place in parts.skeleton.places.items():
        if one not in old:
            continue
        moved = differ(old[one], new[one], place.field.resolution)
        stored = parts.typed.get(one)
        stale = stored is not None and differ(stored, old[one], place.field.resolution)
        if moved or stale:
            status = "both" if moved and stale else "moved" if moved else "stored-differs"
            yield _row(file, sha256, parts, place, old, new, changes, status)


def _row(
    file: str,
    sha256: str,
    parts: Submission,
    place: Place,
    old: Mapping[str, Value],
    new: Mapping[str, Value],
    changes: Changes,
    status: str,
) -> Row:
    one, record = place.id, parts.record
    change, relative = _difference(old[one], new[one])
    reported = one if place.field.step and place.field.step.reported else f"{one}_reported"
    reported_old, reported_new = old.get(reported), new.get(reported)
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
        sample_id=str(record.prefilled.get(f"{place.sample}.sample_id", "")) if place.sample else "",
        field=one,
        label=place.field.label,
        unit=place.field.unit or "",
        stored=parts.typed.get(one),
        old=old[one],
        new=new[one],
        change=change,
        change_relative=relative,
        reported_old=reported_old,
        reported_new=reported_new,
        reported_changes="yes" if reported_old != reported_new else "no",
        limit=limit,
        change_of_limit=None if limit is None or change is None else change / limit,
        uncertainty=None,
        change_of_uncertainty=None,
        cause="; ".join(dict.fromkeys(changes.causes[c] for c in causes_of(parts, one, changes))) if change else "",
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
    return float(value) if isinstance(value, int | float) else None


def _measured_on(parts: Submission, place: Place) -> str:
    """Date of the run, or of the first run that the result can stand on."""
    block = place.id.partition(".")[0]
    runs = [block] if block.startswith("run") else _runs(parts, place.sample)
    dates = [parts.readings.get(f"{run}.date") for run in runs]
    known = [float(day) for day in dates if isinstance(day, int | float)]
    return iso(min(known), False) if known else ""


def _runs(parts: Submission, sample: str | None) -> list[str]:
    return [
        one.partition(".")[0]
        for one, place in parts.skeleton.places.items()
        if place.field.key == "run.date" and (sample is None or place.sample == sample)
    ]


def causes_of(parts: Submission, one: str, changes: Changes) -> list[str]:
    """The changed constants a result stands on, found by following its inputs down."""
    found: dict[str, None] = {}
    seen: set[str] = set()
    stack = [one]
    while stack:
        current = stack.pop()
        place = parts.skeleton.places.get(current)
        if current in seen or place is None or place.field.step is None:
            continue
        seen.add(current)
        for reference in place.field.step.args.values():
            for target in _targets(parts, place, reference):
                for changed in changes.values:
                    if changed.partition("[")[0] == target and _used(parts, place, changed):
                        found[changed] = None
                stack.append(target)
    return list(found)


def _targets(parts: Submission, place: Place, reference: str) -> tuple[str, ...]:
    try:
        return parts.skeleton.resolve(place, reference)
    except KeyError:  # a rule's code, not a reference
        return ()


def _used(parts: Submission, place: Place, changed: str) -> bool:
    """Whether the look-up row that changed is the one this place looks up."""
    if not changed.startswith("table."):
        return True
    _, table, rest = changed.split(".", 2)
    entry = parts.record.tables[table][int(rest.partition("[")[2][:-1]) - 1]
    assert place.field.step is not None
    for name in ("lot", "vessel"):
        reference = place.field.step.args.get(name)
        if reference is not None:
            key = parts.readings.get(parts.skeleton.resolve(place, reference)[0])
            return key is not None and str(key).lower() == str(entry.get("lot", entry.get("id"))).lower()
    return True


def csv_text(listed: list[Row], header: bool = True) -> str:
    """CSV as the contract asks: comma, LF, round-trip numbers, no cell that a spreadsheet would run."""
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    if header:
        writer.writerow(COLUMNS)
    for row in listed:
        writer.writerow([csv_cell(getattr(row, name)) for name in COLUMNS])
    return stream.getvalue()


def csv_cell(value: Value) -> str:
    """One cell: numbers round-trip, text made harmless."""
    if value is None:
        return ""
    if isinstance(value, bool | int | float):
        return repr(value)
    text = "".join(c if c.isprintable() else f"\\x{ord(c):02x}" for c in value)
    return f"'{text}" if text.startswith(DANGEROUS) else text
