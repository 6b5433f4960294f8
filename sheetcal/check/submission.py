"""Take a submitted workbook apart: issue record, readings, typed results and the formulas found."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Protocol

from sheetcal.errors import Refused
from sheetcal.kinds import Skeleton, load, skeleton, versions
from sheetcal.kinds.layout import column_letter
from sheetcal.kinds.record import from_rows
from sheetcal.model import IssueRecord, Place, SheetKind, Value

RECORD_TAB = "Issue record"
Cell = tuple[str, Value, "str | None"]
Cells = Mapping[str, Mapping[str, Cell]]


class File(Protocol):
    """What a reader gives; `excel.sheetfile.SheetFile` is one."""

    @property
    def cells(self) -> Cells: ...


class NotOurs(Refused):
    """The workbook has no issue record this version can use; `code` is the finding's code."""

    code = "record-missing"


class UnknownKind(NotOurs):
    """The record names a kind that is not known here."""

    code = "kind-unknown"


class NewerVersion(NotOurs):
    """The record names a version of a kind that is not known here."""

    code = "version-unknown"


@dataclass(frozen=True)
class Submission:
    """A workbook of ours as it came back.

    `readings` by id: numbers as float (dates as serial numbers), text as str, series as lists that end at the
    last filled row with None for a gap; blanks are absent. `cells` by id hold (type, value, formula) of every
    filled place; a series element has the id `run1.record_time[7]`.
    """

    record: IssueRecord
    record_whole: bool
    kind: SheetKind
    skeleton: Skeleton
    cells: Mapping[str, Cell]
    strangers: Mapping[str, Mapping[str, Cell]] = field(default_factory=dict)
    readings: Mapping[str, Value | list[Value]] = field(default_factory=dict)
    typed: Mapping[str, Value] = field(default_factory=dict)


def take_apart(file: File, where: str) -> Submission:
    """The parts of a workbook of ours. Raises NotOurs (or a child) when it has no usable issue record."""
    record, whole = issue_record(file, where)
    kind = _kind(record, where)
    plan = skeleton(kind, record.shape)
    cells, series, strangers = _by_place(file.cells, plan)
    readings: dict[str, Value | list[Value]] = {}
    typed: dict[str, Value] = {}
    for one, cell in cells.items():
        place = plan.places.get(one)
        if place is None or cell[1] is None:
            continue
        if place.field.step:
            typed[one] = cell[1]
        else:
            readings[one] = cell[1]
    readings.update(series)
    return Submission(record, whole, kind, plan, cells, strangers, readings, typed)


def issue_record(file: File, where: str) -> tuple[IssueRecord, bool]:
    """The issue record and whether it is whole. Raises NotOurs."""
    rows = file.cells.get(RECORD_TAB, {})
    texts = []
    number = 1
    while (cell := rows.get(f"A{number}")) is not None:
        value = rows.get(f"B{number}")
        texts.append((str(cell[1]), "" if value is None or value[1] is None else str(value[1])))
        number += 1
    if not texts:
        raise NotOurs(where, "has no issue record", "a workbook issued by sheetcal", "Issue one and fill that.")
    try:
        return from_rows(texts, where)
    except Refused as fault:
        raise NotOurs(fault.where, fault.what, fault.expected, fault.do) from None


def _kind(record: IssueRecord, where: str) -> SheetKind:
    known = [version for name, version in versions() if name == record.kind]
    if not known:
        raise UnknownKind(where, f"kind {record.kind} is not known here", do="Update sheetcal.")
    if record.kind_version not in known:
        raise NewerVersion(where, f"{record.kind} version {record.kind_version}", f"{known}", "Update sheetcal.")
    return load(record.kind, record.kind_version)


def _by_place(
    tabs: Cells, plan: Skeleton
) -> tuple[dict[str, Cell], dict[str, list[Value]], dict[str, dict[str, Cell]]]:
    """Cells by id, series by id, and cells outside every place by tab (they stay addressed by cell)."""
    found: dict[str, Cell] = {}
    series: dict[str, list[Value]] = {}
    strangers: dict[str, dict[str, Cell]] = {}
    spans = _series_cells(plan)
    for tab, cells in tabs.items():
        outside: dict[str, Cell] = {}
        for address, cell in cells.items():
            place = plan.at.get((tab, address))
            if place is not None:
                found[place.id] = cell
            elif (tab, address) in spans:
                one, index = spans[tab, address]
                if cell[1] is not None:
                    _put(series.setdefault(one, []), index, cell[1])
                found[f"{one}[{index + 1}]"] = cell
            else:
                outside[address] = cell
        strangers[tab] = outside
    return found, series, strangers


def _put(values: list[Value], index: int, value: Value) -> None:
    values += [None] * (index + 1 - len(values))
    values[index] = value


_spans: dict[int, tuple[Skeleton, dict[tuple[str, str], tuple[str, int]]]] = {}


def _series_cells(plan: Skeleton) -> dict[tuple[str, str], tuple[str, int]]:
    """(tab, cell) -> (id, index) of every element of every series; kept for the skeletons in use."""
    kept = _spans.get(id(plan))
    if kept is not None and kept[0] is plan:
        return kept[1]
    spans = {
        (place.tab, f"{column_letter(place.column)}{place.row + index}"): (place.id, index)
        for place in plan.places.values()
        if place.field.series
        for index in range(plan.shape.record_rows)
    }
    if len(_spans) > 64:
        _spans.clear()
    _spans[id(plan)] = (plan, spans)
    return spans


def element_place(plan: Skeleton, one: str) -> tuple[Place, str]:
    """(place, cell) of an id that may name a series element."""
    name, _, rest = one.partition("[")
    place = plan.places[name]
    if not rest:
        return place, place.cell
    return place, f"{column_letter(place.column)}{place.row + int(rest[:-1]) - 1}"
