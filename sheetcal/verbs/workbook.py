"""Open one of our workbooks: what `fields`, `fill`, `explain`, `adopt` and `recompute` start from."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from sheetcal.archive.opening import read_workbook
from sheetcal.check.submission import Submission, take_apart
from sheetcal.check.verdict import gather
from sheetcal.errors import Refused
from sheetcal.excel.sheetfile import SheetFile
from sheetcal.formulas.compute import compute
from sheetcal.kinds.dates import iso
from sheetcal.model import Place, Value


@dataclass(frozen=True)
class Opened:
    """A workbook as read and as taken apart."""

    path: Path
    file: SheetFile
    parts: Submission


def open_workbook(path: str | Path) -> Opened:
    """Read a workbook of ours of any format. Raises BadInput or Refused when it cannot be read or is not ours."""
    file = read_workbook(path)
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


# What must be as issued, and readings that a rebuilt workbook would no longer show as they were typed.
ALTERED = (
    "record-altered",
    "label-altered",
    "constant-altered",
    "formula-altered",
    "formula-dimension",
    "result-typed-over",
    "reading-formula",
    "reading-error-value",
    "reading-date",
)


def refuse_altered(opened: Opened) -> None:
    """Raise Refused unless everything outside the readings is as issued, and every reading was typed."""
    case, _ = gather(opened.file, opened.parts)
    for one in case.found:
        if one.code in ALTERED:
            place = f", {one.sheet}!{one.cell}" if one.cell else f", {one.sheet}" if one.sheet else ""
            raise Refused(f"{opened.path.name}{place}", one.message, "the workbook as issued", "Run `sheetcal check`.")
