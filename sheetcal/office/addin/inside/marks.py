"""Marks on cells: a comment that says what is wrong, and a style by weight that is laid over the cell.

The style comes through a condition that always holds, so the cell's own style and formats stay as they are, and taking
the condition away takes the look away. Comments and conditions are known again by their text, also in a file that was
saved with them, and they move with their cells. A cell that has the user's own comment keeps it and gets no second.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

from sheetcal.office.addin.inside.spelling import position
from sheetcal.office.addin.inside.telling import MARK, WEIGHTS, Line, comment
from sheetcal.office.addin.inside.words import Words

CONDITION = '"sheetcal mark"<>""'
STYLES = {weight: f"sheetcal {weight}" for weight in WEIGHTS}
LOOKS = {  # background, letters, their weight: told apart by brightness as well as by colour
    "error": (0xA4161A, 0xFFFFFF, 150.0),
    "warning": (0xFFD166, 0x3D2B00, 150.0),
    "note": (0xD9E8F6, 0x123A5E, 100.0),
}
MOST = 100  # cells with a comment; the list holds every finding
EXPRESSION = 9  # com.sun.star.sheet.ConditionOperator2 of a formula that decides by itself


def put(document: Any, lines: Sequence[Line], shut: Sequence[str], words: Words) -> None:
    """Mark the cells of the findings on the tabs that are open to us; inside `protection.opened`."""
    cells = _by_cell(document, lines, shut)
    if not cells:
        return
    if not shut:
        _make_styles(document)
    for (tab, cell), found in list(cells.items())[:MOST]:
        _comment(document.Sheets.getByName(tab), cell, comment(found, words))
    if not shut:
        for tab in dict.fromkeys(tab for tab, _ in cells):
            _paint(document, tab, {cell: found for (where, cell), found in cells.items() if where == tab})


def _by_cell(document: Any, lines: Sequence[Line], shut: Sequence[str]) -> dict[tuple[str, str], list[Line]]:
    cells: dict[tuple[str, str], list[Line]] = {}
    for one in lines:
        if one.cell and one.tab not in shut and document.Sheets.hasByName(one.tab):
            cells.setdefault((one.tab, one.cell), []).append(one)
    return cells


def _make_styles(document: Any) -> None:
    """LibreOffice lets styles be changed only while no tab is protected."""
    family = document.StyleFamilies.getByName("CellStyles")
    for weight, name in STYLES.items():
        if family.hasByName(name):
            continue
        family.insertByName(name, document.createInstance("com.sun.star.style.CellStyle"))
        style = family.getByName(name)
        style.CellBackColor, style.CharColor, style.CharWeight = LOOKS[weight]


def _comment(sheet: Any, cell: str, text: str) -> None:
    first = sheet.getCellByPosition(*position(cell))
    if not first.getAnnotation().getString():
        sheet.Annotations.insertNew(first.getCellAddress(), text)


def _paint(document: Any, tab: str, cells: dict[str, list[Line]]) -> None:
    """One condition a weight; a cell with several findings shows the gravest."""
    sheet = document.Sheets.getByName(tab)
    for weight in WEIGHTS:
        chosen = [cell for cell, found in cells.items() if min(map(_rank, found)) == WEIGHTS.index(weight)]
        if chosen:
            _condition(document, sheet, chosen, STYLES[weight])


def _rank(line: Line) -> int:
    return WEIGHTS.index(line.weight) if line.weight in WEIGHTS else len(WEIGHTS) - 1


def _condition(document: Any, sheet: Any, cells: list[str], style: str) -> None:
    ranges = document.createInstance("com.sun.star.sheet.SheetCellRanges")
    for cell in cells:
        ranges.addRangeAddress(sheet.getCellRangeByName(cell).getRangeAddress(), False)
    number = sheet.ConditionalFormats.createByRange(ranges)
    made = next(one for one in sheet.ConditionalFormats.getConditionalFormats() if number == one.ID)
    made.createEntry(0, 0)
    entry = made.getByIndex(0)
    entry.Operator = EXPRESSION
    entry.Formula1 = CONDITION
    entry.StyleName = style


def are_there(document: Any) -> bool:
    """Whether the document holds any mark of ours."""
    return any(_ours(sheet.Annotations) or list(_conditions(sheet)) for sheet in _sheets(document))


def remove(document: Any) -> None:
    """Take every mark of ours away where a tab is open to us; inside `protection.opened`."""
    styles = set(STYLES.values())
    for sheet in _sheets(document):
        for index in reversed(_ours(sheet.Annotations)):
            sheet.Annotations.removeByIndex(index)
        for number, style in list(_conditions(sheet)):
            sheet.ConditionalFormats.removeByID(number)
            styles.add(style)
    _drop_styles(document, styles)


def _sheets(document: Any) -> list[Any]:
    return [document.Sheets.getByIndex(index) for index in range(document.Sheets.Count)]


def _ours(annotations: Any) -> list[int]:
    return [n for n in range(annotations.Count) if annotations.getByIndex(n).getString().startswith(MARK)]


def _conditions(sheet: Any) -> Iterator[tuple[int, str]]:
    """(id, style) of each condition of ours; a file saved as .xlsx gives its style another name."""
    for one in sheet.ConditionalFormats.getConditionalFormats():
        entry = one.getByIndex(0) if one.getCount() == 1 else None
        if entry is not None and getattr(entry, "Formula1", "") == CONDITION:
            yield one.ID, entry.StyleName


def _drop_styles(document: Any, names: set[str]) -> None:
    family = document.StyleFamilies.getByName("CellStyles")
    for name in names:
        if family.hasByName(name) and family.getByName(name).isUserDefined():
            family.removeByName(name)
