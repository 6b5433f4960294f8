"""All results of a workbook again, from its readings and a given set of constants, by the kind's own formulas."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from functools import cached_property

from sheetcal.check.completeness import begun
from sheetcal.check.interpreter import PER_PLACE, Evaluator
from sheetcal.check.submission import Submission, element_place
from sheetcal.check.values import CellError
from sheetcal.kinds.dates import serial
from sheetcal.kinds.record import constant_cells
from sheetcal.model import Place, Value

Stored = tuple[str, Value, "str | None"]
Tabs = dict[str, dict[str, Stored]]
GRID_TABS = ("Front", "Readings", "Records", "Results")


def replay(parts: Submission, changed: Mapping[str, Value] | None = None) -> dict[str, Value]:
    """Every result by id (blank None); `changed` replaces constants and readings by id."""
    whole = Replay(parts)
    return whole.values(whole.results, changed)


def sheet_cells(parts: Submission, changed: Mapping[str, Value]) -> Tabs:
    """The workbook's cells as they should be, some of them changed."""
    return Replay(parts).cells(changed)


class Replay:
    """A workbook as it should be: readings as found; labels, formulas and constants as issued.

    Formulas are those of the frozen kind, constants those of the issue record: what stands in the file's locked
    cells plays no part. Runs not begun stay blank.
    """

    def __init__(self, parts: Submission) -> None:
        self.parts = parts
        self.started = begun(parts.readings, parts.record)
        self.results = [
            one for one, place in parts.skeleton.places.items() if place.formula is not None and self._counts(place)
        ]

    @cached_property
    def tabs(self) -> Tabs:
        """The cells, nothing changed."""
        tabs: Tabs = {tab: {} for tab in GRID_TABS}
        plan = self.parts.skeleton
        for one, cell in self.parts.cells.items():
            place, address = element_place(plan, one)
            if place.formula is None:
                tabs[place.tab][address] = (cell[0], cell[1], None)
        for one in self.parts.record.locked:
            put(tabs, plan.places[one], plan.places[one].cell, printed(self.parts, one))
        for one in self.results:
            place = plan.places[one]
            tabs[place.tab][place.cell] = ("", None, place.formula)
        tabs["Constants"] = {}
        for _, address, value, _ in constant_cells(self.parts.kind, self.parts.record):
            _set(tabs["Constants"], address, value)
        return tabs

    @cached_property
    def _constants(self) -> dict[str, str]:
        return {one: cell for one, cell, _, _ in constant_cells(self.parts.kind, self.parts.record)}

    def evaluator(self, changed: Mapping[str, Value] | None = None) -> Evaluator:
        """The workbook's cells with some of them changed.

        `changed` by id: readings (also one element), constants, results (a number in place of the formula); a
        result given as text that starts with `=` gets that formula.
        """
        plan = self.parts.skeleton
        return Evaluator(self.cells(changed) if changed else self.tabs, plan.names, work=PER_PLACE * len(plan.places))

    def cells(self, changed: Mapping[str, Value]) -> Tabs:
        """The cells by tab and address with some of them changed, see `evaluator`."""
        tabs = {tab: dict(cells) for tab, cells in self.tabs.items()}
        for one, value in changed.items():
            self._change(tabs, one, value)
        return tabs

    def _change(self, tabs: Tabs, one: str, value: Value) -> None:
        if one in self._constants:
            _set(tabs["Constants"], self._constants[one], value)
        elif one.partition("[")[0] in self.parts.skeleton.places:
            place, address = element_place(self.parts.skeleton, one)
            if place.formula is not None and isinstance(value, str) and value.startswith("="):
                tabs[place.tab][address] = ("", None, value)
            else:
                put(tabs, place, address, value)

    def values(self, ids: Iterable[str], changed: Mapping[str, Value] | None = None) -> dict[str, Value]:
        """Some results by id, blank None."""
        return read_off(self.evaluator(changed), self.parts, ids)

    def _counts(self, place: Place) -> bool:
        return not place.id.startswith("run") or place.id.partition(".")[0] in self.started


def read_off(evaluator: Evaluator, parts: Submission, ids: Iterable[str]) -> dict[str, Value]:
    """The values of some places by id, as JSON knows them."""
    places = parts.skeleton.places
    return {one: plain(evaluator.value(places[one].tab, places[one].cell)) for one in ids}


def plain(value: object) -> Value:
    """A cell's value as JSON knows it: error values as their text, an empty text as blank."""
    if isinstance(value, CellError):
        return str(value)
    if isinstance(value, bool | float | str):
        return None if value == "" else value
    return None


def printed(parts: Submission, one: str) -> Value:
    """What was printed at a place, as its cell holds it: dates as serial numbers."""
    value = parts.record.prefilled.get(one)
    if isinstance(value, str) and parts.skeleton.places[one].field.type in ("date", "datetime"):
        try:
            return serial(value)
        except ValueError:
            return value
    return value


def put(tabs: Tabs, place: Place, address: str, value: Value) -> None:
    """Set or clear one cell of a place."""
    _set(tabs[place.tab], address, value)


def _set(cells: dict[str, Stored], address: str, value: Value) -> None:
    if value is None or value == "":
        cells.pop(address, None)
        return
    kind = "s" if isinstance(value, str) else "b" if isinstance(value, bool) else "n"
    cells[address] = (kind, value if isinstance(value, bool | str) else float(value), None)
