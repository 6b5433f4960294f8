"""All results of a workbook by the cell functions: what the writer stores beside each formula."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from sheetcal.cells import registry
from sheetcal.formulas.expressions import expression_value
from sheetcal.kinds.dates import serial
from sheetcal.kinds.layout import Skeleton
from sheetcal.model import IssueRecord, Place, Rule, Value

Readings = Mapping[str, "Value | list[Value]"]


def compute(skeleton: Skeleton, record: IssueRecord, readings: Readings) -> dict[str, Value]:
    """Every result by id; None where it stays blank.

    readings: by field id, dates as ISO text, series as lists; what the record printed is added by itself.
    """
    engine = Engine(skeleton, record, readings)
    return {one: engine.value(one) for one, place in skeleton.places.items() if place.field.step}


class Engine:
    """Evaluates steps on demand and remembers them; constants and tables come from the issue record."""

    def __init__(self, skeleton: Skeleton, record: IssueRecord, readings: Readings) -> None:
        self.skeleton = skeleton
        self.readings = {**record.prefilled, **readings}
        self.rules: dict[str, Rule] = {rule.code: rule for rule in skeleton.kind.rules}
        self.known: dict[str, Any] = {f"const.{one.name}": one.value for one in record.constants}
        self._tables(record)

    def _tables(self, record: IssueRecord) -> None:
        for table, columns in self.skeleton.kind.tables.items():
            rows = record.tables.get(table, ())
            for column in columns:
                name, _, unit = column.partition(":")
                values = [row.get(name) for row in rows] or [None]
                dated = [serial(one) if unit == "date" and isinstance(one, str) else one for one in values]
                self.known[f"table.{table}.{name}"] = dated

    def value(self, one: str) -> Any:
        """The content of a place, constant or table column: number, text, None, or a list for a series."""
        if one in self.known:
            return self.known[one]
        place = self.skeleton.places[one]
        self.known[one] = None  # a kind's steps form no circle; a test holds it
        self.known[one] = self._result(place) if place.field.step else self._reading(place)
        return self.known[one]

    def _reading(self, place: Place) -> Any:
        value = self.readings.get(place.id)
        if place.field.series:
            return list(value) if isinstance(value, list) else [value]
        if place.field.type in ("date", "datetime") and isinstance(value, str):
            try:
                return serial(value)
            except ValueError:
                return value
        return None if value == "" else value

    def _result(self, place: Place) -> Value:
        step = place.field.step
        assert step is not None
        if not step.cell:
            return self._first_rule(place, list(step.args.values()))
        function = registry.get(step.cell)
        args = {}
        for argument in function.args:
            reference = step.args.get(argument.name)
            if reference is not None:
                args[argument.name] = self._argument(place, reference, argument.series)
        value = registry.evaluate(step.cell, args)
        return None if value == "" else value

    def _argument(self, place: Place, reference: str, series: bool) -> Any:
        ids = self.skeleton.resolve(place, reference)
        if not series:
            return self.value(ids[0])
        values = [self.value(one) for one in ids]
        return values[0] if len(values) == 1 and isinstance(values[0], list) else values

    def _first_rule(self, place: Place, codes: list[str]) -> Value:
        for code in codes:
            if self.holds(place, self.rules[code]):
                return self.rules[code].text
        return None

    def holds(self, place: Place, rule: Rule) -> bool:
        """Whether a rule's limit is broken, judged from where `place` stands."""

        def lookup(reference: str) -> Any:
            ids = self.skeleton.resolve(place, reference)
            return self.value(ids[0]) if len(ids) == 1 else [self.value(one) for one in ids]

        return expression_value(rule.when, lookup)
