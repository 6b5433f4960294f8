"""What a balance may look at: readings, constants and tables of one workbook, and the value before."""

from __future__ import annotations

from collections.abc import Mapping
from functools import lru_cache
from math import isfinite

from sheetcal.check.balance.measure import Measure
from sheetcal.model import IssueRecord, SheetKind, Value

Row = Mapping[str, Value]
Readings = Mapping[str, "Value | list[Value]"]
STEP_OF_VALUE = 1e-9  # what two ways of the same sum may differ in, as a share
STEP_OF_DISPLAY = 1e-6  # and as a share of the displayed step


class Book:
    """The evidence of one workbook.

    Raises nothing: whatever is absent, blank or of the wrong type is None.
    """

    def __init__(self, kind: SheetKind, record: IssueRecord, readings: Readings) -> None:
        self.kind = kind
        self.shape = record.shape
        self.tables = record.tables
        self.printed = record.prefilled
        self.readings: Readings = {**record.prefilled, **readings}
        self.constants = {one.name: one.value for one in record.constants}
        self._rows: dict[tuple[str, str, Value], Row | None] = {}

    def number(self, one: str) -> float | None:
        """The reading as a number."""
        return as_number(self.readings.get(one))

    def text(self, one: str) -> str | None:
        """The reading as text, None where it is blank."""
        value = self.readings.get(one)
        return value if isinstance(value, str) and value.strip() else None

    def series(self, one: str) -> list[Value]:
        """The list of a series up to its last filled row."""
        value = self.readings.get(one)
        listed = list(value) if isinstance(value, list) else []
        while listed and listed[-1] is None:
            listed.pop()
        return listed

    def constant(self, name: str, otherwise: float) -> float:
        """A constant printed in the workbook, or what the method takes without it."""
        return self.constants.get(name, otherwise)

    def row(self, table: str, column: str, key: Value) -> Row | None:
        """The first row of a printed table whose `column` holds `key`."""
        place = (table, column, key)
        if place not in self._rows:
            rows = self.tables.get(table, ())
            self._rows[place] = next((row for row in rows if row.get(column) == key), None)
        return self._rows[place]

    def looked_up(self, table: str, column: str, key: Value, wanted: str) -> float | None:
        """One number of that row."""
        row = None if key is None else self.row(table, column, key)
        return None if row is None else as_number(row.get(wanted))

    def runs_of(self, sample: int) -> range:
        """The numbers of the runs a sample owns."""
        places = self.shape.places
        return range((sample - 1) * places + 1, sample * places + 1)

    def begun(self) -> frozenset[str]:
        """The blocks (`run3`, `sample1`) that hold any reading beyond what was printed at issue."""
        printed = self.printed
        filled = (
            one
            for one, value in self.readings.items()
            if value is not None and value != [] and printed.get(one) != value
        )
        return frozenset(one.partition(".")[0] for one in filled)


class Road:
    """One way through a workbook's results.

    With `results` it is the road stage by stage: the value before is what the sheet holds, taken as exact.
    Without, the value before is the balance's own, its tolerance carried along: the road end to end.
    """

    def __init__(self, results: Mapping[str, Value] | None = None) -> None:
        self.results = results
        self.own: dict[str, Measure] = {}

    def before(self, one: str) -> Measure | None:
        """The value before, None where it is not known."""
        if self.results is None:
            return self.own.get(one)
        value = as_number(self.results.get(one))
        return None if value is None else Measure(value)

    def put(self, one: str, measure: Measure | None) -> None:
        """Note a balance; one that cannot be drawn up, or left the numbers, is not noted."""
        if measure is not None and isfinite(measure.value) and isfinite(measure.tolerance):
            self.own[one] = measure

    def note(self, one: str, own: Measure | None) -> Measure | None:
        """Note a balance and hand on what the next line stands on."""
        self.put(one, own)
        return self.before(one)


def as_number(value: object) -> float | None:
    """A finite number, None for anything else; a truth value or a text is no number."""
    kind = type(value)
    if kind is float or kind is int:
        number = float(value)  # type: ignore[arg-type]  # the type was just asked for
        return number if isfinite(number) else None
    return None


def exact(value: float, resolution: float | None) -> float:
    """What two exact ways to the same value may differ in."""
    return STEP_OF_VALUE * abs(value) + STEP_OF_DISPLAY * (resolution or 0.0)


@lru_cache(maxsize=65536)
def key_of(one: str) -> str:
    """`run3.mass` -> `run.mass`."""
    scope, _, name = one.partition(".")
    return f"{scope.rstrip('0123456789')}.{name}"


@lru_cache(maxsize=32)
def speaking(kind: SheetKind) -> Mapping[str, float]:
    """Field key and displayed step of every result whose balance speaks."""
    return {
        one.key: one.resolution or 0.0 for one in kind.fields if one.step is not None and one.step.balance == "speaks"
    }
