"""Marks on cells: a comment that says what is wrong, and a cell style of ours by weight.

The look a cell had before is kept on a hidden cell of the tab with the list, natively, so that it survives saving in
either format and comes back whole. Comments are known again by their first word. A cell that has the user's own
comment keeps it and gets no second; a cell that its sheet itself paints (out of range) shows that paint.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

from sheetcal.office.addin.inside.looks import carry, names
from sheetcal.office.addin.inside.spelling import column_letters, position
from sheetcal.office.addin.inside.telling import MARK, WEIGHTS, Line, comment
from sheetcal.office.addin.inside.words import Words

STYLES = {weight: f"sheetcal {weight}" for weight in WEIGHTS}
LOOKS = {  # background, letters, their weight; pale, so that value and comment sign stay readable
    "error": (0xFFC4BC, 0x7A0010, 150.0),
    "warning": (0xFFE08A, 0x3D2B00, 150.0),
    "note": (0xD9E8F6, 0x123A5E, 100.0),
}
MOST = 100  # cells with a comment; the list holds every finding
MOST_STYLED = 200  # cells with a style, all cells of a range counted
COMMENT = 8  # com.sun.star.sheet.CellFlags.ANNOTATION
TAB, CELL, KEPT, AT, SAID = HIDDEN = range(26, 31)  # columns of the list: which cell, its look; which cell, its comment


def put(document: Any, lines: Sequence[Line], shut: Sequence[str], keep: Any, words: Words) -> Iterator[None]:
    """Mark the cells of the findings on the tabs open to us, step by step; inside `protection.opened`.

    `keep`: the tab with the list, or None where none could be made; then there is nowhere to keep looks, and no
    style is given.
    """
    cells = _by_cell(document, lines, shut)
    for column in HIDDEN if keep is not None else ():
        keep.Columns.getByIndex(column).IsVisible = False
    for row, ((tab, cell), found) in enumerate(list(cells.items())[:MOST]):
        _comment(document.Sheets.getByName(tab), cell, comment(found, words), keep, row)
        yield
    if keep is not None and not shut and cells:
        _make_styles(document)
        yield from _paint(document, cells, keep)


def _by_cell(document: Any, lines: Sequence[Line], shut: Sequence[str]) -> dict[tuple[str, str], list[Line]]:
    cells: dict[tuple[str, str], list[Line]] = {}
    for one in lines:
        if one.cell and one.tab not in shut and document.Sheets.hasByName(one.tab):
            cells.setdefault((one.tab, one.cell), []).append(one)
    return cells


def _comment(sheet: Any, cell: str, text: str, keep: Any, row: int) -> None:
    """Write it and note it down, so that words the user adds to it can be told from ours."""
    first = sheet.getCellByPosition(*position(cell))
    if first.getAnnotation().getString():
        return
    sheet.Annotations.insertNew(first.getCellAddress(), text)
    if keep is not None:
        keep.getCellByPosition(AT, row).setString(_place(sheet, *position(cell)))
        keep.getCellByPosition(SAID, row).setString(text)


def _place(sheet: Any, column: int, row: int) -> str:
    return f"{sheet.Name}!{column_letters(column)}{row + 1}"


def _make_styles(document: Any) -> None:
    """LibreOffice lets styles be changed only while no tab is protected."""
    family = document.StyleFamilies.getByName("CellStyles")
    for weight, name in STYLES.items():
        if not family.hasByName(name):
            family.insertByName(name, document.createInstance("com.sun.star.style.CellStyle"))
        style = family.getByName(name)
        style.CellBackColor, style.CharColor, style.CharWeight = LOOKS[weight]


def _paint(document: Any, cells: dict[tuple[str, str], list[Line]], keep: Any) -> Iterator[None]:
    """Give each cell the style of its gravest finding, and note where it was and how it looked."""
    looks = names(keep.getCellByPosition(KEPT, 0))
    for row, ((tab, cell), rank) in enumerate(_gravest(document, cells)):
        keep.getCellByPosition(TAB, row).setString(tab)
        keep.getCellByPosition(CELL, row).setString(cell)
        target = document.Sheets.getByName(tab).getCellRangeByName(cell)
        carry(target, keep.getCellByPosition(KEPT, row), looks)
        target.CellStyle = STYLES[WEIGHTS[rank]]
        yield


def _gravest(document: Any, cells: dict[tuple[str, str], list[Line]]) -> list[tuple[tuple[str, str], int]]:
    """Every single cell of the findings with the rank of its gravest one."""
    ranks: dict[tuple[str, str], int] = {}
    for (tab, area), found in cells.items():
        rank = min(map(_rank, found))
        for cell in _single(document.Sheets.getByName(tab), area):
            ranks[tab, cell] = min(rank, ranks.get((tab, cell), rank))
    return list(ranks.items())[:MOST_STYLED]


def _rank(line: Line) -> int:
    return WEIGHTS.index(line.weight) if line.weight in WEIGHTS else len(WEIGHTS) - 1


def _single(sheet: Any, area: str) -> Iterator[str]:
    """Every cell of `F14` or `A6:A63`, up to the most that are painted."""
    place = sheet.getCellRangeByName(area).getRangeAddress()
    rows = range(place.StartRow, min(place.EndRow, place.StartRow + MOST_STYLED) + 1)
    columns = range(place.StartColumn, min(place.EndColumn, place.StartColumn + MOST_STYLED) + 1)
    return (f"{column_letters(column)}{row + 1}" for row in rows for column in columns)


def are_there(document: Any) -> bool:
    """Whether the document holds any mark of ours."""
    family = document.StyleFamilies.getByName("CellStyles")
    return any(map(family.hasByName, STYLES.values())) or any(_ours(one.Annotations) for one in _sheets(document))


def remove(document: Any, keep: Any) -> Iterator[None]:
    """Take every mark of ours away where a tab is open to us, step by step; inside `protection.opened`."""
    said = _noted(keep) if keep is not None else {}
    for sheet in _sheets(document):
        for place in [one.Position for one in map(sheet.Annotations.getByIndex, _ours(sheet.Annotations))]:
            _uncomment(sheet, place, said)
            yield
    if keep is not None:
        yield from _give_back(document, keep)
    family = document.StyleFamilies.getByName("CellStyles")
    for name in STYLES.values():
        if family.hasByName(name):
            family.removeByName(name)


def _noted(keep: Any) -> dict[str, str]:
    """Our comments by place, as they were written."""
    rows = keep.getCellRangeByPosition(AT, 0, SAID, MOST - 1).getDataArray()
    return {str(place): str(text) for place, text in rows if place}


def _uncomment(sheet: Any, place: Any, said: dict[str, str]) -> None:
    """Remove a comment of ours; what the user wrote behind it stays."""
    cell = sheet.getCellByPosition(place.Column, place.Row)
    text = cell.getAnnotation().getString()
    ours = said.get(_place(sheet, place.Column, place.Row), text)
    theirs = text[len(ours) :].strip() if text.startswith(ours) else ""
    cell.clearContents(COMMENT)
    if theirs:
        sheet.Annotations.insertNew(place, theirs)


def _give_back(document: Any, keep: Any) -> Iterator[None]:
    """Let every painted cell look as before; a cell that looks otherwise by now was changed by somebody else."""
    looks = names(keep.getCellByPosition(KEPT, 0))
    for row in range(MOST_STYLED):
        tab, cell = (keep.getCellByPosition(column, row).getString() for column in (TAB, CELL))
        if not document.Sheets.hasByName(tab):
            break
        target = document.Sheets.getByName(tab).getCellRangeByName(cell)
        if target.CellStyle in STYLES.values():
            carry(keep.getCellByPosition(KEPT, row), target, looks)
        yield


def _sheets(document: Any) -> list[Any]:
    return [document.Sheets.getByIndex(index) for index in range(document.Sheets.Count)]


def _ours(annotations: Any) -> list[int]:
    return [n for n in range(annotations.Count) if annotations.getByIndex(n).getString().startswith(MARK)]
