"""What lies around the cells and decides about a worksheet: merges, what is hidden, what was unlocked, what is foreign.

LibreOffice lists none of it at once, so it is asked for step by step, a slice at a time behind the copy of the cells.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from sheetcal.office.addin.inside.reading import Area, Copy, Tab, area_of

FORMULAS = 16  # com.sun.star.sheet.CellFlags.FORMULA
DATE = 2  # com.sun.star.util.NumberFormat
EARLIEST, LATEST = 15_000.0, 402_000.0  # 1941, and 2999 for what never runs out
AMBIGUOUS = "AMBIGUOUS_VALUE"  # com.sun.star.beans.PropertyState
CHART = "12dcae26-281f-416f-a234-c3086127382e"
OBJECT = "com.sun.star.drawing.OLE2Shape"
PROTECTION = "CellProtection"


def look(document: Any, copy: Copy) -> Iterator[None]:
    """Fill the copy with all of it, step by step; tabs that have gone meanwhile are passed over."""
    copy.macros = _macros(document)
    copy.outside = _outside(document)
    yield
    for tab in copy.tabs:
        if document.Sheets.hasByName(tab.name) and tab.values:
            yield from _tab(document, document.Sheets.getByName(tab.name), tab, copy)


def _tab(document: Any, sheet: Any, tab: Tab, copy: Copy) -> Iterator[None]:
    right, bottom = len(tab.values[0]) - 1, len(tab.values) - 1
    whole = sheet.getCellRangeByPosition(0, 0, right, bottom)
    seen = [area_of(one) for one in whole.queryVisibleCells().RangeAddresses]
    tab.hidden_rows = _gaps([(top, end) for _, top, _, end in seen], bottom)
    tab.hidden_columns = _gaps([(first, last) for first, _, last, _ in seen], right)
    yield
    for shape in (sheet.DrawPage.getByIndex(index) for index in range(sheet.DrawPage.Count)):
        copy.embedded += shape.ShapeType == OBJECT and str(shape.CLSID).lower() != CHART
        yield
    yield from _computed_dates(document, sheet, tab)
    yield from _unlocked(sheet, tab)
    yield from _merges(sheet, tab, (0, 0, right, bottom))


def _gaps(spans: list[tuple[int, int]], last: int) -> list[tuple[int, int]]:
    """What of 0 to last no span covers."""
    gaps, reached = [], -1
    for start, end in [*sorted(spans), (last + 1, last + 1)]:
        if start > reached + 1:
            gaps.append((reached + 1, start - 1))
        reached = max(reached, end)
    return gaps


def _computed_dates(document: Any, sheet: Any, tab: Tab) -> Iterator[None]:
    """Formulas that show a date: LibreOffice lists only typed dates, so numbers that may be one are asked."""
    kinds: dict[int, bool] = {}
    for row, (values, formulas) in enumerate(zip(tab.values, tab.formulas)):
        for column, value in enumerate(values):
            if formulas[column][:1] == "=" and isinstance(value, float) and EARLIEST <= value <= LATEST:
                key = sheet.getCellByPosition(column, row).NumberFormat
                if key not in kinds:
                    kinds[key] = bool(document.NumberFormats.getByKey(key).Type & DATE)
                if kinds[key]:
                    tab.dates.append((column, row, column, row))
                yield


def _unlocked(sheet: Any, tab: Tab) -> Iterator[None]:
    """Formulas in cells that are not locked; where all are alike one question settles it."""
    formulas = sheet.queryContentCells(FORMULAS)
    alike = formulas.Count and formulas.getPropertyState(PROTECTION).value != AMBIGUOUS
    if not formulas.Count or (alike and formulas.CellProtection.IsLocked):
        return
    for first, top, last, bottom in map(area_of, formulas.RangeAddresses):
        for column in range(first, last + 1):
            for row in range(top, bottom + 1):
                if not sheet.getCellByPosition(column, row).CellProtection.IsLocked:
                    tab.unlocked.add((column, row))
                yield


def _merges(sheet: Any, tab: Tab, whole: Area) -> Iterator[None]:
    """Every merge, by halving: a range is asked whether it holds one."""
    waiting = [whole]
    while waiting:
        first, top, last, bottom = waiting.pop()
        cells = sheet.getCellRangeByPosition(first, top, last, bottom)
        yield
        if not cells.getIsMerged():
            continue
        if (first, top) == (last, bottom):
            cursor = sheet.createCursorByRange(cells)
            cursor.collapseToMergedArea()
            tab.merges.append(area_of(cursor.RangeAddress))
        elif bottom > top:
            middle = (top + bottom) // 2
            waiting += [(first, top, last, middle), (first, middle + 1, last, bottom)]
        else:
            middle = (first + last) // 2
            waiting += [(first, top, middle, bottom), (middle + 1, top, last, bottom)]


def _macros(document: Any) -> bool:
    libraries = document.BasicLibraries
    return any(libraries.getByName(name).ElementNames for name in libraries.ElementNames)


def _outside(document: Any) -> list[str]:
    """Other files this document draws cells from."""
    links = [document.AreaLinks, document.SheetLinks, document.ExternalDocLinks]
    found = [str(name) for one in links if hasattr(one, "ElementNames") for name in one.ElementNames]
    areas = [str(document.AreaLinks.getByIndex(index).Url) for index in range(document.AreaLinks.Count)]
    return [*found, *areas, *(["DDE"] if document.DDELinks.ElementNames else [])]
