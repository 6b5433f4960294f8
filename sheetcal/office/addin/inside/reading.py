"""A copy of the open document's cells and of the facts around them, taken in bulk, some rows a step.

Storing the document through LibreOffice's filter would hold Calc for one to two seconds with its charts; reading the
cells in bulk takes a tenth of that, and can be done in steps. Nothing in the document changes.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Any

from sheetcal.office.addin.inside.spelling import xlsx_spelling

MOST_ROWS, MOST_COLUMNS, MOST_CELLS = 99_999, 702, 2_000_000
ROWS = 400  # a step
DATES = 2  # com.sun.star.sheet.CellFlags.DATETIME
ERRORS = 4  # com.sun.star.sheet.FormulaResult.ERROR
ERROR_TEXTS = {502: "#VALUE!", 503: "#NUM!", 519: "#VALUE!", 524: "#REF!", 525: "#NAME?", 532: "#DIV/0!", 32767: "#N/A"}
OTHER_ERROR = "#VALUE!"

Area = tuple[int, int, int, int]  # first column, first row, last column, last row; from 0


class TooLarge(Exception):
    """The document holds more cells than any worksheet of ours."""


@dataclass
class Tab:
    """One tab: values and formula texts row by row, from A1 on; `errors` and `unlocked` by (column, row).

    Merges, hidden rows and columns (first, last) and unlocked formulas come from `outline`.
    """

    name: str
    values: list[tuple[Any, ...]] = field(default_factory=list)
    formulas: list[tuple[str, ...]] = field(default_factory=list)
    dates: list[Area] = field(default_factory=list)
    errors: dict[tuple[int, int], str] = field(default_factory=dict)
    visible: bool = True
    protected: bool = False
    names: dict[str, str] = field(default_factory=dict)
    merges: list[Area] = field(default_factory=list)
    hidden_rows: list[tuple[int, int]] = field(default_factory=list)
    hidden_columns: list[tuple[int, int]] = field(default_factory=list)
    unlocked: set[tuple[int, int]] = field(default_factory=set)


@dataclass
class Copy:
    """The whole document as the checker needs it."""

    tabs: list[Tab] = field(default_factory=list)
    names: dict[str, str] = field(default_factory=dict)
    properties: dict[str, str] = field(default_factory=dict)
    date1904: bool = False
    automatic: bool = True
    iterates: bool = False
    as_shown: bool = False
    macros: bool = False
    outside: list[str] = field(default_factory=list)
    embedded: int = 0


def take(document: Any, copy: Copy, passed_over: tuple[str, ...] = ()) -> Iterator[None]:
    """Fill the copy with the document as it stands, without the tabs passed over, step by step. Raises TooLarge."""
    copy.tabs.clear()
    copy.names = _names(document.NamedRanges)
    copy.properties = _properties(document.DocumentProperties)
    first = document.NullDate
    copy.date1904 = (first.Year, first.Month, first.Day) == (1904, 1, 1)
    copy.automatic = bool(document.isAutomaticCalculationEnabled())
    copy.iterates = bool(document.IsIterationEnabled)
    copy.as_shown = bool(document.CalcAsShown)
    yield
    for sheet in _each(document.Sheets):
        if sheet.Name not in passed_over:
            yield from _tab(sheet, copy)


def _each(container: Any) -> list[Any]:
    return [container.getByIndex(index) for index in range(container.Count)]


def _tab(sheet: Any, copy: Copy) -> Iterator[None]:
    cursor = sheet.createCursor()
    cursor.gotoEndOfUsedArea(False)
    end = cursor.RangeAddress
    rows, columns = end.EndRow + 1, end.EndColumn + 1
    if rows > MOST_ROWS or columns > MOST_COLUMNS or rows * columns > MOST_CELLS:
        raise TooLarge(sheet.Name)
    tab = Tab(sheet.Name, visible=bool(sheet.IsVisible), protected=bool(sheet.isProtected()))
    tab.dates = [area_of(one) for one in sheet.queryContentCells(DATES).RangeAddresses]
    tab.errors = _errors(sheet)
    tab.names = _names(sheet.NamedRanges)
    copy.tabs.append(tab)
    yield
    for top in range(0, rows, ROWS):
        area = sheet.getCellRangeByPosition(0, top, columns - 1, min(top + ROWS, rows) - 1)
        tab.values += area.getDataArray()
        tab.formulas += area.getFormulaArray()
        yield


def area_of(address: Any) -> Area:
    """A range's place in plain numbers."""
    return address.StartColumn, address.StartRow, address.EndColumn, address.EndRow


def _errors(sheet: Any) -> dict[tuple[int, int], str]:
    found = {}
    for first, top, last, bottom in map(area_of, sheet.queryFormulaCells(ERRORS).RangeAddresses):
        for column in range(first, last + 1):
            for row in range(top, bottom + 1):
                code = sheet.getCellByPosition(column, row).getError()
                found[column, row] = ERROR_TEXTS.get(code, OTHER_ERROR)
    return found


def _names(container: Any) -> dict[str, str]:
    return {one.Name: xlsx_spelling(one.Content) for one in _each(container)}


def _properties(given: Any) -> dict[str, str]:
    """Own properties as texts; those the program keeps for itself have the names an .xlsx gives them."""
    own = given.UserDefinedProperties
    found = {one.Name: str(own.getPropertyValue(one.Name)) for one in own.PropertySetInfo.Properties}
    named = {"title": given.Title, "creator": given.Author, "subject": given.Subject, "description": given.Description}
    return {**found, **{name: text for name, text in named.items() if text}}
