"""What was printed at issue: the issue record, labels, units, locked readings, constants and their names."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from itertools import groupby

from sheetcal.check.case import Case, called, is_number
from sheetcal.check.findings import named
from sheetcal.check.reasons import of_constant, of_place
from sheetcal.check.replay import printed
from sheetcal.check.submission import Cell
from sheetcal.kinds.layout import VALUE_COLUMN
from sheetcal.kinds.record import constant_cells, constants_sha256, sha256
from sheetcal.kinds.words import printed_label, printed_unit
from sheetcal.model import Finding, Place, Value

TOLERANCE = 1e-9
RECORD_TAB = "Issue record"
GRID = {"label": "B", "unit": "C"}
RECORDS = {"label": "D", "unit": "E"}
SHIFTED = 5  # as many labels of one tab elsewhere: its rows were moved, not its words changed
MOST = 12  # as many altered constants: the whole tab was pasted over or moved
PROPERTIES = ("sheetcal_issue_id", "sheetcal_record_sha256")


def look(case: Case, properties: Mapping[str, str]) -> None:
    """Findings on the record, on labels and units, on locked readings, on constants."""
    _record(case, properties)
    _words(case)
    _locked(case)
    before = len(case.found)
    _constants(case)
    named.look(case)
    if len(case.found) - before > MOST:
        more = f"{len(case.found) - before} constants and names are not those issued: fill a fresh copy of the workbook"
        case.found[before:] = [replace(case.found[before], message=more, found=None, expected=None, likely_cause=None)]


def _record(case: Case, properties: Mapping[str, str]) -> None:
    record = case.parts.record
    named = [properties.get(name, own) == own for name, own in zip(PROPERTIES, _own(case), strict=True)]
    signs = {
        "its own hash does not fit": case.parts.record_whole,
        "its layout is another": record.skeleton_sha256 in ("", case.parts.skeleton.sha256),
        "its id is not the one printed": record.prefilled.get("sheet.issue_id", record.issue_id) == record.issue_id,
        "its constants are not the set printed": _same_set(case),
        "the file's properties name another": all(named),
    }
    wrong = [what for what, right in signs.items() if not right]
    if wrong:
        message = f"the issue record was altered after issue: {', '.join(wrong)}"
        case.found.append(
            Finding(
                "record-altered", "fault", "error", message, RECORD_TAB, action="reject",
                likely_cause="somebody edited the hidden tab, or pasted it from another workbook",
            )
        )  # fmt: skip


def _own(case: Case) -> tuple[str, str]:
    """What the file's properties must name."""
    return case.parts.record.issue_id, sha256(case.parts.record)


def _same_set(case: Case) -> bool:
    stated = case.parts.record.prefilled.get("sheet.constants_id")
    return stated is None or stated == constants_sha256(case.parts.record)[:16]


def _locked(case: Case) -> None:
    """Printed labels and locked readings that no longer hold what was printed, blank ones included."""
    for one, place in case.parts.skeleton.places.items():
        locked = place.field.locked or one in case.parts.record.locked
        if not locked or place.field.step is not None or place.tab in case.shifted:
            continue
        found, right = case.parts.readings.get(one), printed(case.parts, one)
        if isinstance(found, list) or close(found, right):
            continue
        case.altered.add(one)
        message = f"{called(place.field.label)}: what was printed at issue was changed"
        causes = of_place(case, one, found, right)
        case.add(
            "label-altered", one, message, found=found, expected=right, effect=case.effect(one, wrong={one: found}),
            likely_cause=causes[0] if causes else None, causes=tuple(causes),
        )  # fmt: skip


def _words(case: Case) -> None:
    """Labels and units beside the places; rows that moved together are one finding for their tab."""
    off = [
        fault for place in case.parts.skeleton.places.values() if _leads(place) for fault in _word_faults(case, place)
    ]
    for tab, listed in groupby(off, key=lambda fault: fault[0]):
        faults = list(listed)
        if len(faults) >= SHIFTED:
            case.shifted.add(tab)
            message = f"{len(faults)} labels of this tab are not where they were printed: rows or columns were moved"
            _, cell, found, expected, _ = faults[0]
            faults = [(tab, cell, found, expected, message)]
        for _, cell, found, expected, message in faults:
            case.found.append(
                Finding("label-altered", "fault", "error", message, tab, cell, None, found, expected, action="reject")
            )


def _leads(place: Place) -> bool:
    """Whether a label stands beside the place: it is the first of its row."""
    return not place.field.series and (place.tab == "Records" or place.column == VALUE_COLUMN)


def _word_faults(case: Case, place: Place) -> list[tuple[str, str, Value, Value, str]]:
    """(tab, cell, found, expected, message) of a place's label and unit where they differ."""
    columns = RECORDS if place.tab == "Records" else GRID
    cells = case.parts.strangers.get(place.tab, {})
    faults = []
    for what, letter in columns.items():
        cell = f"{letter}{place.row}"
        found = cells.get(cell, ("", None, None))
        right: Value = printed_label(place.field) if what == "label" else printed_unit(case.parts.record, place.field)
        if (found[1] or None) != (right or None) or found[2] is not None:
            message = f"{called(place.field.label)}: the printed {what} was changed"
            faults.append((place.tab, cell, found[1], right, message))
    return faults


def _constants(case: Case) -> None:
    """Constants that no longer hold what the issue record says."""
    stored = case.cells.get("Constants", {})
    for one, cell, value, _ in constant_cells(case.parts.kind, case.parts.record):
        found: Cell = stored.get(cell, ("", None, None))
        if close(found[1], value) and (found[2] is None or found[1] in (None, "")):
            continue
        case.altered.add(one)
        causes = of_constant(case, one, found[1], value)
        name = one.partition(".")[2]
        told = found[2] or found[1]
        case.found.append(
            Finding(
                "constant-altered", "fault", "error", f"constant {name} is not the one issued", "Constants", cell, None,
                told, value, causes[0] if causes else None, action="reject", causes=tuple(causes),
                effect=case.effect(one, wrong={one: found[1]}),
            )
        )  # fmt: skip


def close(one: Value, other: Value) -> bool:
    """The same number to nine digits, the same text, or both blank."""
    if is_number(one) and is_number(other):
        return abs(one - other) <= TOLERANCE * max(abs(one), abs(other), 1e-300)
    return (one in (None, "") and other in (None, "")) or (type(one) is type(other) and one == other)
