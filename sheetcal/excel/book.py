"""What every tab of one workbook is drawn from: record, layout, values, looks, numbers of the fields."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from openpyxl.workbook import Workbook
from openpyxl.worksheet.worksheet import Worksheet

from sheetcal.excel.marks import is_locked, is_look
from sheetcal.excel.styles import SIZE, Looks
from sheetcal.excel.tabrows import TabRows
from sheetcal.kinds.dates import serial
from sheetcal.kinds.display import number_format
from sheetcal.kinds.layout import Skeleton
from sheetcal.model import TABS, IssueRecord, Place, SheetKind, Value

Values = Mapping[str, "Value | list[Value]"]


@dataclass
class Book:
    """One workbook while it is written."""

    kind: SheetKind
    record: IssueRecord
    skeleton: Skeleton
    values: Values
    workbook: Workbook
    looks: Looks
    tables: dict[str, TabRows]
    numbers: dict[str, int] = field(default_factory=dict)

    @classmethod
    def begin(cls, kind: SheetKind, record: IssueRecord, layout: Skeleton, values: Values) -> Book:
        """A workbook with its seven empty tabs."""
        workbook = Workbook()
        workbook.worksheets[0].title = TABS[0]
        for tab in TABS[1:]:
            workbook.create_sheet(tab)
        tables = {tab: TabRows(tab) for tab in TABS}
        return cls(kind, record, layout, values, workbook, Looks(workbook), tables, field_numbers(kind))

    def sheet(self, tab: str) -> Worksheet:
        """openpyxl's sheet of a tab."""
        return self.workbook[tab]

    def is_spare(self, run: int) -> bool:
        """Whether a run place lies beyond the runs its sample (or the sheet) requires."""
        shape = self.skeleton.shape
        sample, turn = divmod(run - 1, max(1, shape.places))
        stated = self.record.prefilled.get(f"sample{sample + 1}.runs_required") if shape.samples else None
        return turn >= (stated if isinstance(stated, int | float) else shape.runs)

    def places(self, tab: str) -> list[Place]:
        """The places on one tab, in workbook order."""
        return [one for one in self.skeleton.places.values() if one.tab == tab]

    def open_places(self, tab: str) -> list[Place]:
        """The readings on one tab that can be typed."""
        return [one for one in self.places(tab) if not is_locked(self.record, one)]

    def value(self, place: Place) -> Value:
        """What stands in a cell: dates as serial numbers, text that is no date as it is."""
        stated = self.record.prefilled.get(place.id)
        if place.id not in self.record.locked:
            stated = self.values.get(place.id, stated)  # type: ignore[assignment]  # only series are lists
        return self._cell(place, stated)

    def series(self, place: Place) -> list[Value]:
        """The elements of a series, in order."""
        stated = self.values.get(place.id, self.record.prefilled.get(place.id))
        listed = stated if isinstance(stated, (list, tuple)) else [stated]
        return [self._cell(place, one) for one in listed]

    @staticmethod
    def _cell(place: Place, value: Value) -> Value:
        if place.field.type in ("date", "datetime") and isinstance(value, str):
            try:
                return serial(value)
            except ValueError:
                return value
        return value

    def style(self, place: Place) -> int:
        """The style number of a place's cell."""
        shown = number_format(place.field.resolution, place.field.type)
        largest = SIZE - 1 if place.tab == "Records" else SIZE + 1
        return self.looks(look_of(self.record, place), shown, largest)

    def put(self, place: Place) -> None:
        """Write one cell of the skeleton: value, or formula with its stored value."""
        self.tables[place.tab].put(place.row, place.column, self.style(place), self.value(place), place.formula)


def is_text(place: Place) -> bool:
    """Whether a place holds words."""
    return place.field.type in ("text", "choice")


def look_of(record: IssueRecord, place: Place) -> str:
    """The look of a place: what is typed, given or computed."""
    if place.field.step:
        if is_look(place):
            return "look"
        return "result_text" if is_text(place) else "reported" if place.field.step.reported else "result"
    look = "given" if is_locked(record, place) else "input"
    if place.field.type == "datetime":
        return f"{look}_moment"
    return f"{look}_text" if is_text(place) else look


def field_numbers(kind: SheetKind) -> dict[str, int]:
    """A number for each line, in the order of the blocks: the same on paper and on the screen."""
    listed = [one.key for block in kind.blocks for one in kind.fields if one.block == block.id and not one.beside]
    return {key: number for number, key in enumerate(listed, start=1)}
