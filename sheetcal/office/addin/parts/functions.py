"""The component that Calc asks for the cell functions; it runs inside LibreOffice's Python."""

from __future__ import annotations

import os
import sys
from typing import Any, Callable

import uno
import unohelper

# In front of everything: another sheetcal that this Python may know must not answer for the functions of the add-in.
sys.path.insert(0, os.path.join(os.path.dirname(__file__), "pythonpath"))

from sheetcal.cells import registry
from sheetcal.office.addin.inside.answers import answer

NAME = "org.sheetcal.Functions"
SERVICES = ("com.sun.star.sheet.AddIn", NAME)
LARGE = 4096  # cells; of a larger range only the part is fetched that the sheet uses


class Functions(unohelper.Base, uno.getClass("org.sheetcal.XFunctions")):  # type: ignore[misc]  # known to LibreOffice
    """One method for each cell function, named as it is."""

    def __init__(self, context: Any) -> None:
        self.context = context

    def __getattr__(self, name: str) -> Callable[..., Any]:
        try:
            function = registry.get(name)
        except KeyError:
            raise AttributeError(name) from None
        ranges = [place for place, argument in enumerate(function.args) if argument.series]

        def method(*given: Any) -> Any:
            values = list(given)
            for place in ranges:
                values[place] = contents(values[place])
            return answer(function, values)

        self.__dict__[name] = method  # found at once from now on
        return method


def contents(cells: Any) -> Any:
    """What a range holds, row by row; None for no range. Raises ValueError for one over several sheets."""
    if cells is None:
        return None
    # Of $One.$A$1:$Two.$A$9 only the first sheet would be read: a sum without the rest, and nobody would know.
    if ":" in cells.AbsoluteName.rpartition(".")[0]:
        raise ValueError("a range over several sheets")
    place = cells.getRangeAddress()
    rows, columns = place.EndRow - place.StartRow + 1, place.EndColumn - place.StartColumn + 1
    return (used(cells, place) if rows * columns > LARGE else cells).getDataArray()


def used(cells: Any, place: Any) -> Any:
    """The range without the rows and columns behind everything that its sheet holds; never empty."""
    cursor = cells.getSpreadsheet().createCursor()
    cursor.gotoEndOfUsedArea(False)
    end = cursor.getRangeAddress()
    right = max(min(place.EndColumn, end.EndColumn), place.StartColumn) - place.StartColumn
    down = max(min(place.EndRow, end.EndRow), place.StartRow) - place.StartRow
    return cells.getCellRangeByPosition(0, 0, right, down)


g_ImplementationHelper = unohelper.ImplementationHelper()
g_ImplementationHelper.addImplementation(Functions, NAME, SERVICES)
