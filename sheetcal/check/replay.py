"""All results of a workbook again, from its readings and a given set of constants, by the kind's own formulas."""

from __future__ import annotations

from collections.abc import Mapping

from sheetcal.check.completeness import begun
from sheetcal.check.interpreter import Evaluator
from sheetcal.check.submission import Submission
from sheetcal.check.values import CellError
from sheetcal.kinds.record import constant_cells
from sheetcal.model import Place, Value

Stored = tuple[str, Value, "str | None"]


def replay(parts: Submission, changed: Mapping[str, Value] | None = None) -> dict[str, Value]:
    """Every result by id (blank None); `changed` replaces constants and readings by id.

    Formulas are those of the frozen kind, constants those of the issue record: what stands in the file's
    locked cells plays no part. Runs not begun stay blank.
    """
    evaluator = Evaluator(sheet_cells(parts, changed or {}), parts.skeleton.names)
    started = begun(parts.readings, parts.record)
    found: dict[str, Value] = {}
    for one, place in parts.skeleton.places.items():
        if place.formula is not None and _counts(place, started):
            value = evaluator.value(place.tab, place.cell)
            found[one] = str(value) if isinstance(value, CellError) else None if value == "" else value
    return found


def sheet_cells(parts: Submission, changed: Mapping[str, Value]) -> dict[str, dict[str, Stored]]:
    """The workbook's cells as they should be: readings as found, formulas and constants as issued."""
    cells: dict[str, dict[str, Stored]] = {tab: {} for tab in ("Front", "Readings", "Records", "Results")}
    started = begun(parts.readings, parts.record)
    for one, cell in parts.cells.items():
        place = parts.skeleton.places.get(one)
        if place is None:
            _element(parts, one, cell, cells)
        elif place.formula is None:
            cells[place.tab][place.cell] = (cell[0], cell[1], None)
    for place in parts.skeleton.places.values():
        if place.formula is not None and _counts(place, started):
            cells[place.tab][place.cell] = ("", None, place.formula)
    _replace_readings(parts, changed, cells)
    cells["Constants"] = _constants(parts, changed)
    return cells


def _counts(place: Place, started: set[str]) -> bool:
    scope = place.id.partition(".")[0]
    return not scope.startswith("run") or scope in started


def _element(parts: Submission, one: str, cell: Stored, cells: dict[str, dict[str, Stored]]) -> None:
    from sheetcal.check.submission import element_place

    place, address = element_place(parts.skeleton, one)
    cells[place.tab][address] = (cell[0], cell[1], None)


def _replace_readings(parts: Submission, changed: Mapping[str, Value], cells: dict[str, dict[str, Stored]]) -> None:
    for one, value in changed.items():
        place = parts.skeleton.places.get(one)
        if place is None:
            continue
        kind = "s" if isinstance(value, str) else "n"
        if value is None:
            cells[place.tab].pop(place.cell, None)
        else:
            cells[place.tab][place.cell] = (kind, value, None)


def _constants(parts: Submission, changed: Mapping[str, Value]) -> dict[str, Stored]:
    found: dict[str, Stored] = {}
    for one, cell, value, _ in constant_cells(parts.kind, parts.record):
        new = changed.get(one, value)
        if new is not None and new != "":
            found[cell] = ("s" if isinstance(new, str) else "n", new, None)
    return found
