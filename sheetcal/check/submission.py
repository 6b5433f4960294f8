"""Take a submitted workbook apart: issue record, readings, typed results and the formulas found."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from functools import lru_cache
from typing import Protocol

from sheetcal.check.wellformed import shape_faults, value_faults
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


class SpoiledRecord(NotOurs):
    """The issue record is there, but so altered that nothing can be rebuilt from it."""

    code = "record-altered"


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
    filled place; a series element has the id `run1.record_time[7]`. `stores_results`: whether any formula's cell
    holds a stored value; some programs save none.
    """

    record: IssueRecord
    record_whole: bool
    kind: SheetKind
    skeleton: Skeleton
    cells: Mapping[str, Cell]
    strangers: Mapping[str, Mapping[str, Cell]] = field(default_factory=dict)
    readings: Mapping[str, Value | list[Value]] = field(default_factory=dict)
    typed: Mapping[str, Value] = field(default_factory=dict)
    stores_results: bool = True


def take_apart(file: File, where: str) -> Submission:
    """The parts of a workbook of ours. Raises NotOurs (or a child) when it has no usable issue record."""
    record, whole = issue_record(file, where)
    _refuse(shape_faults(record), where)
    kind = _kind(record, where)
    plan = skeleton(kind, record.shape)
    _refuse(value_faults(record, kind, plan.places), where)
    cells, series, strangers = _by_place(file.cells, plan)
    readings: dict[str, Value | list[Value]] = {}
    typed: dict[str, Value] = {}
    stores = False
    for one, cell in cells.items():
        place = plan.places.get(one)
        if place is None or cell[1] is None:
            continue
        if place.field.step is None:
            readings[one] = _chosen(place, cell[1])
        elif cell[1] != "":
            typed[one] = cell[1]
            stores = stores or cell[2] is not None
    readings.update(series)
    return Submission(record, whole, kind, plan, cells, strangers, readings, typed, stores)


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
    except (Refused, ValueError, RecursionError):
        raise _spoiled(where, "it cannot be read") from None


def _refuse(faults: Iterable[str], where: str) -> None:
    """Raise on the first fault; a record too odd even to be looked at is faulty, too."""
    try:
        fault = next(iter(faults), None)
    except (TypeError, ValueError, AttributeError):
        fault = "it cannot be read"
    if fault is not None:
        raise _spoiled(where, fault)


def _spoiled(where: str, why: str) -> SpoiledRecord:
    what = f"its issue record was altered ({why})"
    return SpoiledRecord(where, what, "the record as issued", "Fill a fresh copy of the issued workbook.")


def _kind(record: IssueRecord, where: str) -> SheetKind:
    known = [version for name, version in versions() if name == record.kind]
    if not known:
        raise UnknownKind(where, f"kind {record.kind[:40]!r} is not known here", do="Update sheetcal.")
    if record.kind_version not in known:
        listed = ", ".join(str(one) for one in known)
        what = f"{record.kind} version {record.kind_version} is not known here"
        raise NewerVersion(where, what, f"version {listed}", "Update sheetcal.")
    return load(record.kind, record.kind_version)


def _chosen(place: Place, value: Value) -> Value:
    """A choice in the spelling of its list: spreadsheets hold `Void` and `void` to be the same."""
    choices = place.field.choices
    if isinstance(value, str) and isinstance(choices, tuple) and choices and value not in choices:
        return next((one for one in choices if one.casefold() == value.casefold()), value)
    return value


def _by_place(
    tabs: Cells, plan: Skeleton
) -> tuple[dict[str, Cell], dict[str, list[Value]], dict[str, dict[str, Cell]]]:
    """Cells by id, series by id, and cells outside every place by tab (they stay addressed by cell)."""
    found: dict[str, Cell] = {}
    series: dict[str, list[Value]] = {}
    strangers: dict[str, dict[str, Cell]] = {}
    homes = _homes(plan)
    for tab, cells in tabs.items():
        outside: dict[str, Cell] = {}
        ours = homes.get(tab, {})
        for address, cell in cells.items():
            home = ours.get(address)
            if home is None:
                outside[address] = cell
                continue
            one, index = home
            if index < 0:
                found[one] = cell
                continue
            if cell[1] is not None:
                _put(series.setdefault(one, []), index, cell[1])
            found[f"{one}[{index + 1}]"] = cell
        strangers[tab] = outside
    return found, series, strangers


def _put(values: list[Value], index: int, value: Value) -> None:
    values += [None] * (index + 1 - len(values))
    values[index] = value


class _ByIdentity:
    """A skeleton as a key: the same one each time, never compared piece by piece."""

    def __init__(self, plan: Skeleton) -> None:
        self.plan = plan

    def __hash__(self) -> int:
        return id(self.plan)

    def __eq__(self, other: object) -> bool:
        return isinstance(other, _ByIdentity) and other.plan is self.plan


def _homes(plan: Skeleton) -> dict[str, dict[str, tuple[str, int]]]:
    """tab -> cell -> (id, index) of every place; the index is that of a series element, else -1."""
    return _homes_of(_ByIdentity(plan))


@lru_cache(maxsize=64)
def _homes_of(key: _ByIdentity) -> dict[str, dict[str, tuple[str, int]]]:
    homes: dict[str, dict[str, tuple[str, int]]] = {}
    for place in key.plan.places.values():
        cells = homes.setdefault(place.tab, {})
        if not place.field.series:
            cells[place.cell] = (place.id, -1)
            continue
        letter = column_letter(place.column)
        for index in range(key.plan.shape.record_rows):
            cells[f"{letter}{place.row + index}"] = (place.id, index)
    return homes


def element_place(plan: Skeleton, one: str) -> tuple[Place, str]:
    """(place, cell) of an id that may name a series element."""
    name, _, rest = one.partition("[")
    place = plan.places[name]
    if not rest:
        return place, place.cell
    return place, f"{column_letter(place.column)}{place.row + int(rest[:-1]) - 1}"
