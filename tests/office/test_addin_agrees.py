"""Every cell function, called in a real Calc as a function of the add-in, gives what it gives in Python."""

from __future__ import annotations

import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from calc_client import PREFIX, Calc

from sheetcal.cells import registry
from sheetcal.cells.registry import Argument, CellFunction
from sheetcal.errors import OutOfRange
from sheetcal.office.addin.build import unpack

sys.path.insert(0, str(Path(__file__).parents[1] / "cells"))
from cell_points import GOOD_POINTS, ErrorCell, edge_points, good_points

pytestmark = pytest.mark.office
WIDTH, LENGTH = 13, 60  # more than any function's arguments, more than any series of the points
NOT_AVAILABLE, WRONG_TYPE = "#N/A", "#VALUE!"


@pytest.fixture(scope="module")
def calc(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Calc]:
    """A Calc that has the add-in."""
    folder = tmp_path_factory.mktemp("addin")
    unpack(folder / "bundled")
    with Calc(folder / "user", f"-env:BUNDLED_EXTENSIONS={(folder / 'bundled').as_uri()}") as one:
        yield one


class Cases:
    """Calls to be made: values of single arguments on one tab, a row a call; series on another, a row each."""

    def __init__(self) -> None:
        self.values: list[list[Any]] = []
        self.series: list[list[Any]] = []
        self.formulas: list[str] = []

    def add(self, function: CellFunction, point: dict[str, Any]) -> None:
        row = len(self.formulas) + 1
        self.values.append([""] * WIDTH)
        arguments = [self._place(argument, point[argument.name], row, i) for i, argument in enumerate(function.args)]
        self.formulas.append(f"={PREFIX}{function.name}({';'.join(arguments)})")

    def _place(self, argument: Argument, value: Any, row: int, column: int) -> str:
        if argument.series:
            self.series.append([_content(one) for one in value] + [""] * (LENGTH - len(value)))
            end = "ABCDEFGHIJKLMNOPQRSTUVWXYZ"[(len(value) - 1) % 26]
            letters = end if len(value) <= 26 else chr(64 + (len(value) - 1) // 26) + end
            return f"$Series.A{len(self.series)}:{letters}{len(self.series)}"
        if isinstance(value, ErrorCell):
            return "NA()"
        if value == "":
            return '""'
        self.values[-1][column] = _content(value)
        cell = f"$Values.{chr(65 + column)}{row}"
        return cell if value is not None else f"{cell}:{chr(65 + column)}{row}"  # only a range shows a blank

    def results(self, calc: Calc) -> list[Any]:
        """What Calc makes of all of them, in one document and one recalculation."""
        calc.new(document="cases")
        calc.put(document="cases", tab="Values", column=0, row=0, rows=self.values)
        calc.put(document="cases", tab="Series", column=0, row=0, rows=self.series)
        calc.formulas(document="cases", tab="Calls", column=0, row=0, texts=self.formulas)
        calc.recalculate(document="cases")
        found = calc.read(document="cases", tab="Calls", cells=f"A1:A{len(self.formulas)}")
        calc.close(document="cases")
        return [row[0] for row in found]


def _content(value: Any) -> Any:
    return "" if value is None else value


def expected(function: CellFunction, point: dict[str, Any]) -> Any:
    """What the cell must show, told from Python's own guarded call and the types of the arguments."""
    for argument in function.args:
        if isinstance(point[argument.name], ErrorCell):
            return NOT_AVAILABLE  # NA() goes through
    if any(not argument.series and _wrong(argument, point[argument.name]) for argument in function.args):
        return WRONG_TYPE
    try:
        result = registry.call(function.name, **point)
    except (OutOfRange, ArithmeticError, LookupError, ValueError):
        return NOT_AVAILABLE
    if function.unit is None:
        return result or ""
    return NOT_AVAILABLE if result is None or result == "" or result != result else float(result)


def _wrong(argument: Argument, value: Any) -> bool:
    if value is None or value == "":
        return False
    return isinstance(value, str) != argument.text


def agrees(wanted: Any, found: Any, largest_term: float) -> bool:
    if isinstance(wanted, str) or isinstance(found, str):
        return bool(wanted == found)
    return bool(abs(wanted - found) <= 1e-12 * max(abs(wanted), largest_term))


def test_every_function_agrees_at_twenty_points_and_at_its_edges(calc: Calc) -> None:
    cases = Cases()
    asked: list[tuple[CellFunction, dict[str, Any]]] = []
    for function in registry.all():
        for point in good_points(function) + edge_points(function):
            cases.add(function, point)
            asked.append((function, point))
    found = cases.results(calc)
    wrong = []
    counted: dict[str, dict[Any, int]] = {}
    for (function, point), shown in zip(asked, found, strict=True):
        wanted = expected(function, point)
        kind = wanted if wanted in (NOT_AVAILABLE, WRONG_TYPE) else "result"
        kinds = counted.setdefault(function.name, {})
        kinds[kind] = kinds.get(kind, 0) + 1
        if not agrees(wanted, shown, 25.0 if function.name.endswith("_SCATTER") else 0.0):
            wrong.append((function.name, point, wanted, shown))
    assert not wrong, (len(wrong), wrong[:5])
    assert set(counted) == {function.name for function in registry.all()}
    assert min(kinds["result"] for kinds in counted.values()) >= GOOD_POINTS
    total = {kind: sum(kinds.get(kind, 0) for kinds in counted.values()) for kind in ("result", "#N/A", "#VALUE!")}
    print(f"\n{len(asked)} calls of {len(counted)} functions in a real Calc: {total}")
    assert total["#N/A"] > 500 and total["#VALUE!"] > 300
