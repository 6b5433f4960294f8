"""Workbooks to fill for the bench's tests: issued from the demonstration laboratory, evaluated by the cells."""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import datetime
from functools import cache
from io import StringIO
from pathlib import Path
from typing import Any

from sheetcal.formulas.compute import Engine
from sheetcal.inputs.lab import Lab
from sheetcal.inputs.lab_reader import read_lab
from sheetcal.inputs.worklist import read_worklist
from sheetcal.kinds import load, skeleton
from sheetcal.kinds.layout import Skeleton
from sheetcal.model import IssueRecord
from sheetcal.verbs.issuing import Order, build

DEMO = Path(__file__).parents[2] / "workbooks" / "demo"
MONDAY = datetime(2025, 3, 3, 6, 30)
CONTROL = {"sample_id": "BA-31", "role": "control", "expected_gross": "26456"}
FUEL_CLASSES = ("coal", "coke", "biomass", "recovered", "sludge", "liquid", "waste")


@cache
def lab() -> Lab:
    """The demonstration laboratory."""
    return read_lab(DEMO / "lab.toml")


def fuels() -> list[dict[str, str]]:
    """The measured fuels that come with the demonstration, without the lines on their source."""
    lines = (DEMO / "fuels.csv").read_text("utf-8").splitlines(keepends=True)
    return list(csv.DictReader(StringIO("".join(line for line in lines if not line.startswith("#")))))


def sample(name: str, fuel_class: str, **columns: str) -> dict[str, str]:
    """One row of a worklist."""
    return {"sample_id": name, "fuel_class": fuel_class, "role": "sample", **columns}


def issue(
    kind: str, folder: Path, rows: Sequence[Mapping[str, str]] = (), calorimeter: str = "CAL-A", **order: Any
) -> IssueRecord:
    """An issue record as `sheetcal issue` makes it, on the Monday of the demonstration week."""
    if rows:
        columns = list(dict.fromkeys(name for row in rows for name in row))
        path = folder / "worklist.csv"
        lines = [",".join(columns), *(",".join(f'"{row.get(name, "")}"' for name in columns) for row in rows)]
        path.write_text("\n".join(lines) + "\n", "utf-8")
        order["worklist"] = read_worklist(path)
    return build(Order(kind, lab=lab(), calorimeter=calorimeter, moment=MONDAY, **order))


def with_printed(record: IssueRecord, **values: Any) -> IssueRecord:
    """The record with other choices printed in every run, e.g. `rise_source`."""
    runs = range(1, record.shape.places * max(1, record.shape.samples) + 1)
    more = {f"run{run}.{name}": value for run in runs for name, value in values.items()}
    return replace(record, prefilled={**record.prefilled, **more})


@dataclass(frozen=True)
class Filled:
    """A filled workbook: its places, what was read, and the engine that computes it."""

    plan: Skeleton
    record: IssueRecord
    readings: dict[str, Any]
    engine: Engine

    def __getitem__(self, one: str) -> Any:
        return self.engine.value(one)

    def broken(self) -> list[str]:
        """Codes of all faults and duties that hold anywhere; notes and what only speaks while filling left out."""
        found = []
        for rule in self.plan.kind.rules:
            for place in self.plan.places.values():
                at_home = (place.field.scope, place.field.name) == (rule.scope, rule.place)
                silent = rule.code.startswith("live-") or rule.sort == "note"
                if at_home and not silent and self.engine.holds(place, rule):
                    found.append(f"{rule.code} at {place.id}")
        return found

    def outside(self) -> list[str]:
        """Readings without an open place, not among its choices, or outside a range that refuses or warns."""
        return [f"{one} = {value}" for one, value in self.readings.items() if self._fault(one, value)]

    def _fault(self, one: str, value: Any) -> bool:
        place = self.plan.places.get(one)
        if place is None or place.field.step or one in self.record.locked:
            return True
        choices = place.field.choices
        if isinstance(choices, tuple) and choices and value not in choices:
            return True
        own = {**self.record.ranges.get(place.field.key, {}), **self.record.ranges.get(one, {})}
        limits = [place.field.low, own.get("warn_low", place.field.warn_low)]
        tops = [place.field.high, own.get("warn_high", place.field.warn_high)]
        numbers = [n for n in (value if isinstance(value, list) else [value]) if isinstance(n, float)]
        low = max((limit for limit in limits if limit is not None), default=float("-inf"))
        high = min((limit for limit in tops if limit is not None), default=float("inf"))
        return any(not low <= number <= high for number in numbers)


def filled(record: IssueRecord, readings: dict[str, Any]) -> Filled:
    """Readings in their workbook."""
    plan = skeleton(load(record.kind), record.shape)
    return Filled(plan, record, readings, Engine(plan, record, readings))
