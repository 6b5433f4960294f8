"""What an outside check is: named rows with their deviations, from one source, under one tolerance."""

from __future__ import annotations

import csv
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

from sheetcal.cells import registry

HERE = Path(__file__).parent
Deviations = Iterator[tuple[str, float]]

CHECKS: list[Check] = []


@dataclass(frozen=True)
class Check:
    """`deviations` yields (row name, deviation in `unit`); all `rows` must lie within `tolerance`."""

    source: str
    what: str
    rows: int
    tolerance: float
    unit: str
    deviations: Callable[[], Deviations]
    module: str

    @cached_property
    def measured(self) -> list[tuple[str, float]]:
        return list(self.deviations())

    @property
    def largest(self) -> float:
        return max(abs(deviation) for _, deviation in self.measured)

    def hold(self) -> None:
        """Assert the number of rows and the tolerance, naming the rows beyond it."""
        assert len(self.measured) == self.rows, f"{self.source}: {len(self.measured)} rows, not {self.rows}"
        beyond = [f"{name}: {off:.3g} {self.unit}" for name, off in self.measured if not abs(off) <= self.tolerance]
        assert not beyond, f"{self.source}, {self.what}, tolerance {self.tolerance:g}: " + "; ".join(beyond)


def outside(source: str, rows: int, tolerance: float, unit: str) -> Callable[[Callable[[], Deviations]], Check]:
    """Register a generator of deviations; its docstring says what is compared."""

    def register(deviations: Callable[[], Deviations]) -> Check:
        what = (deviations.__doc__ or "").strip().rstrip(".")
        check = Check(source, what, rows, tolerance, unit, deviations, deviations.__module__)
        CHECKS.append(check)
        return check

    return register


def of(module: str) -> list[Check]:
    """The checks that a module registered."""
    return [check for check in CHECKS if check.module == module]


def table(name: str) -> list[dict[str, str]]:
    """The rows of a file of this folder."""
    with (HERE / name).open(encoding="utf-8", newline="") as lines:
        return list(csv.DictReader(lines))


def value(name: str, **args: Any) -> float:
    """A cell function's number; raises where its guard leaves a blank."""
    result = registry.call(name, **args)
    assert isinstance(result, float | int) and not isinstance(result, bool), f"{name} gives {result!r}"
    return float(result)


def percent(found: float, expected: float) -> float:
    """Relative deviation in per cent."""
    return 100.0 * (found / expected - 1.0)
