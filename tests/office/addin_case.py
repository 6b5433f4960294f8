"""Calls of cell functions as they stand in a sheet: references to values and ranges on tabs of their own."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Any

from calc_client import PREFIX, Calc

from sheetcal.cells.registry import Argument, CellFunction

sys.path.insert(0, str(Path(__file__).parents[1] / "cells"))
from cell_points import ErrorCell

WIDTH, LENGTH = 13, 60  # more than any function's arguments, more than any series of the points


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

    def fill(self, calc: Calc, document: str) -> None:
        """Write them into a new document."""
        calc.new(document=document)
        calc.put(document=document, tab="Values", column=0, row=0, rows=self.values)
        calc.put(document=document, tab="Series", column=0, row=0, rows=self.series)
        calc.formulas(document=document, tab="Calls", column=0, row=0, texts=self.formulas)

    def results(self, calc: Calc) -> list[Any]:
        """What Calc makes of all of them, in one document and one recalculation."""
        self.fill(calc, "cases")
        calc.recalculate(document="cases")
        found = calc.read(document="cases", tab="Calls", cells=f"A1:A{len(self.formulas)}")
        calc.close(document="cases")
        return [row[0] for row in found]


def _content(value: Any) -> Any:
    return "" if value is None else value
