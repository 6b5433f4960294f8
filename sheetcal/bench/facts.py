"""What an issue record tells somebody at the bench: lots, vessels, people, limits, what is printed."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date, timedelta
from functools import cached_property

from sheetcal.errors import BadInput
from sheetcal.model import IssueRecord, Series, Value

Row = Mapping[str, Value]
Readings = dict[str, Value | Series]


@dataclass(frozen=True)
class Facts:
    """An issue record as the bench reads it."""

    record: IssueRecord

    def printed(self, one: str) -> Value:
        """What stands in a cell at issue, or None."""
        return self.record.prefilled.get(one)

    def number(self, one: str, default: float) -> float:
        """A printed number, or the default where none is printed."""
        value = self.printed(one)
        return float(value) if isinstance(value, int | float) else default

    def word(self, one: str, default: str = "") -> str:
        """A printed text, or the default."""
        value = self.printed(one)
        return value if isinstance(value, str) and value else default

    @cached_property
    def constants(self) -> dict[str, float]:
        """Constants of the workbook by name."""
        return {one.name: one.value for one in self.record.constants}

    def table(self, name: str) -> tuple[Row, ...]:
        """The rows of a look-up table; none where the workbook has no such table."""
        return self.record.tables.get(name, ())

    def usable(self, name: str, day: date) -> list[Row]:
        """Rows of a table that have begun and have not run out on a day."""
        return [row for row in self.table(name) if _in_force(row, day)]

    def setting(self, name: str) -> str:
        """One of the settings kept at issue; empty where there is none."""
        return self.record.settings.get(name, "")

    def first_day(self, weekend: bool = False) -> date:
        """The day of issue, or the next working day after it; for `weekend` the next Saturday."""
        day = date.fromisoformat(self.record.issued_at[:10])
        while (day.weekday() != 5) if weekend else (day.weekday() > 4):
            day += timedelta(days=1)
        return day

    def people(self, day: date) -> list[str]:
        """Ids of those who may do this kind of work on a day, else of everybody in the table."""
        rows = self.table("person")
        able = [row for row in rows if self.record.kind in words(row.get("may")) and _in_force(row, day)]
        return [str(row["id"]) for row in able or rows]

    def limit(self, key: str, end: str, default: float) -> float:
        """`warn_low` or `warn_high` of a range set at issue, by `scope.name` or id."""
        return float(self.record.ranges.get(key, {}).get(end, default))

    def open(self, readings: Readings) -> Readings:
        """The readings without those that are locked, printed already as they are, or empty."""
        locked = set(self.record.locked)
        return {
            one: value
            for one, value in readings.items()
            if one not in locked and value not in (None, "") and self.record.prefilled.get(one) != value
        }


def words(value: Value) -> list[str]:
    """The words of a list written in one cell."""
    return [one.strip() for one in str(value or "").split(",")]


def _in_force(row: Row, day: date) -> bool:
    until = str(row.get("valid_until") or row.get("calibrated_until") or "2999-12-31")[:10]
    since = str(row.get("valid_from") or row.get("standardised") or "1900-01-01")[:10]
    return since <= day.isoformat() < until


def next_day(day: date, weekend: bool = False) -> date:
    """The following day on which the laboratory works."""
    day += timedelta(days=1)
    while not weekend and day.weekday() > 4:
        day += timedelta(days=1)
    return day


def amount(row: Row, name: str, default: float | None = None) -> float:
    """A number of a table row. Raises BadInput where it is blank and there is no default."""
    value = row.get(name)
    if isinstance(value, int | float):
        return float(value)
    if default is None:
        raise BadInput(f"table row {row}", f"has no {name}", "a number", "Issue the workbook with it.")
    return default
