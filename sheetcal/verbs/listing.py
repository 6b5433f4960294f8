"""`fields`: every field of a workbook with what stands in it."""

from __future__ import annotations

from typing import Any

from sheetcal.check.submission import Submission
from sheetcal.errors import printable
from sheetcal.model import TABS, Field, Place, Value
from sheetcal.verbs.workbook import shown


def field_rows(parts: Submission) -> list[dict[str, Any]]:
    """One row a field, in workbook order, keys as the contract gives them."""
    order = sorted(parts.skeleton.places.values(), key=_in_workbook)
    return [_row(parts, place) for place in order]


def _in_workbook(place: Place) -> tuple[int, int, int]:
    return TABS.index(place.tab), place.row, place.column


def _row(parts: Submission, place: Place) -> dict[str, Any]:
    fld = place.field
    cell = parts.cells.get(place.id)
    low, high = _limits(parts, place)
    return {
        "id": place.id,
        "label": fld.label,
        "sheet": place.tab,
        "cell": place.cell,
        "unit": fld.unit,
        "role": fld.role,
        "scope": place.id.partition(".")[0],
        "value": _value(parts, place),
        "formula": cell[2] if cell else None,
        "sample": place.sample,
        "type": fld.type,
        "low": low,
        "high": high,
        "resolution": fld.resolution,
        "required": fld.needed is not None,
        "locked": fld.locked or place.id in parts.record.locked,
        "origin": _origin(parts, place, fld),
    }


def _value(parts: Submission, place: Place) -> Value | list[Value]:
    if place.field.series:
        series = parts.readings.get(place.id, [])
        return series if isinstance(series, list) else [series]
    cell = parts.cells.get(place.id)
    value = cell[1] if cell else None
    return None if value == "" else shown(place, value)


def _limits(parts: Submission, place: Place) -> tuple[float | None, float | None]:
    own = parts.record.ranges.get(place.id) or parts.record.ranges.get(place.field.key) or {}
    return own.get("low", place.field.low), own.get("high", place.field.high)


def _origin(parts: Submission, place: Place, fld: Field) -> str:
    return "worklist" if fld.origin == "worklist" and place.id in parts.record.prefilled else fld.origin


def field_text(row: dict[str, Any]) -> str:
    """One line of the listing for people."""
    value = row["value"]
    if isinstance(value, list):
        filled = [one for one in value if one is not None]
        shown_value = f"{len(filled)} values"
    else:
        shown_value = "" if value is None else f"{value:.10g}" if isinstance(value, float) else str(value)
    unit = "" if row["unit"] in (None, "1") else row["unit"]
    place = f"{row['sheet']}!{row['cell']}"
    return printable(f"{row['id']:<38} {place:<20} {row['role']:<8} {shown_value} {unit}".rstrip())
