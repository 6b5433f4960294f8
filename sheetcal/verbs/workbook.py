"""Open one of our workbooks: what `fields`, `fill`, `explain`, `adopt` and `recompute` start from."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from sheetcal.check.submission import Submission, element_place, take_apart
from sheetcal.errors import Refused
from sheetcal.excel.reader import read
from sheetcal.excel.sheetfile import SheetFile
from sheetcal.formulas.compute import compute
from sheetcal.kinds.dates import iso
from sheetcal.kinds.record import constant_cells
from sheetcal.model import Place, Value


@dataclass(frozen=True)
class Opened:
    """A workbook as read and as taken apart."""

    path: Path
    file: SheetFile
    parts: Submission


def open_workbook(path: str | Path) -> Opened:
    """Read a workbook of ours. Raises BadInput or Refused when it cannot be read or is not ours."""
    file = read(Path(path))
    return Opened(Path(path), file, take_apart(file, Path(path).name))


def readings_iso(parts: Submission) -> dict[str, Value | list[Value]]:
    """All readings by id, dates as ISO text: the form the writer and `compute` take."""
    found: dict[str, Value | list[Value]] = {}
    for one, value in parts.readings.items():
        place = parts.skeleton.places[one]
        found[one] = shown(place, value) if not isinstance(value, list) else value
    return found


def shown(place: Place, value: Value) -> Value:
    """A stored value as people write it: dates as ISO text."""
    if place.field.type in ("date", "datetime") and isinstance(value, float | int) and not isinstance(value, bool):
        return iso(float(value), None if place.field.type == "datetime" else False)
    return value


def results(parts: Submission) -> dict[str, Value]:
    """Every result by the cell functions."""
    return compute(parts.skeleton, parts.record, readings_iso(parts))


def refuse_altered(opened: Opened) -> None:
    """Raise Refused unless everything outside the readings is as issued."""
    where, parts = opened.path.name, opened.parts
    if not parts.record_whole:
        raise Refused(where, "its issue record was altered", "an unaltered workbook", "Run `sheetcal check`.")
    for one, place in parts.skeleton.places.items():
        cell = parts.cells.get(one)
        if place.formula is not None and not _same(cell[2] if cell else None, place.formula):
            raise Refused(
                f"{where}, {place.where}",
                f"the formula of {one} was altered",
                "the issued one",
                "Run `sheetcal check`.",
            )
    _refuse_labels(opened)


def _refuse_labels(opened: Opened) -> None:
    where, parts = opened.path.name, opened.parts
    for one in parts.record.locked:
        place, _ = element_place(parts.skeleton, one)
        if shown(place, parts.readings.get(one)) != parts.record.prefilled[one]:  # type: ignore[arg-type]
            raise Refused(
                f"{where}, {place.where}",
                f"{one} was altered",
                f"{parts.record.prefilled[one]!r}",
                "Run `sheetcal check`.",
            )
    stored = opened.file.cells.get("Constants", {})
    for one, cell, value, _ in constant_cells(parts.kind, parts.record):
        found = stored.get(cell, ("", None, None))[1]
        if value not in (None, "") and found != value:
            raise Refused(f"{where}, Constants!{cell}", f"{one} was altered", f"{value}", "Run `sheetcal check`.")


def _same(found: str | None, expected: str) -> bool:
    from sheetcal.check.formula import canonical

    return found == expected or (found is not None and canonical(found) == canonical(expected))
