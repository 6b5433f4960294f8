"""The tab with the list: the verdict in one sentence, then every finding with a jump to its cell."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

from sheetcal.office.addin.inside.spelling import position
from sheetcal.office.addin.inside.telling import MARK, Line, Told
from sheetcal.office.addin.inside.words import Words, list_names

TOP = 4  # rows above the first finding: verdict, when, a free one, the head
WIDTHS = (800, 3300, 1700, 8000, 5500, 5200)  # 1/100 mm
BOLD = 150.0  # com.sun.star.awt.FontWeight
LARGE = 14.0  # points
GREY = 0x5A5A5A
HEAD_COLOUR = 0xE4E4E4
LINE, LETTERS = 450, 120  # height of a line in 1/100 mm, letters that fit into it over the whole width
TOP_ALIGNED = 1  # com.sun.star.table.CellVertJustify2
LINK = "com.sun.star.text.TextField.URL"


def find(document: Any) -> str | None:
    """The name of our tab, known by its name and its first cell; None without one."""
    return next((name for name in document.Sheets.ElementNames if _is_ours(document.Sheets, name)), None)


def tab(document: Any) -> Any:
    """Our tab itself, or None."""
    name = find(document)
    return None if name is None else document.Sheets.getByName(name)


def _is_ours(sheets: Any, name: str) -> bool:
    if not name.startswith(list_names()):
        return False
    return bool(sheets.getByName(name).getCellByPosition(0, 0).getString().startswith(MARK))


def begin(document: Any, told: Told, words: Words, remarks: Sequence[str]) -> Any:
    """Put an empty list behind the other tabs: verdict and head. Its tab, not yet protected."""
    name = _free_name(document, words.say("tab"))
    document.Sheets.insertNewByName(name, document.Sheets.Count)
    sheet = document.Sheets.getByName(name)
    _top(sheet, told, words, remarks)
    return sheet


def fill(document: Any, sheet: Any, told: Told, words: Words) -> Iterator[None]:
    """A row for each finding, step by step, and what was not looked at; inside `protection.opened`."""
    for row, line in enumerate(told.lines, TOP):
        _finding(document, sheet, row, line, words)
        yield
    _bottom(sheet, TOP + len(told.lines) + 1, told)


def _free_name(document: Any, wanted: str) -> str:
    names = [wanted, *(f"{wanted} {number}" for number in range(2, 1000))]
    return next(one for one in names if not document.Sheets.hasByName(one))


def _top(sheet: Any, told: Told, words: Words, remarks: Sequence[str]) -> None:
    sheet.getCellByPosition(0, 0).setString(f"{MARK}{told.sentence}")
    sheet.getCellByPosition(0, 1).setString(" ".join([told.stand, *remarks]))
    for column, text in enumerate(words.head):
        sheet.getCellByPosition(column, TOP - 1).setString(text)
    for column, width in enumerate(WIDTHS):
        sheet.Columns.getByIndex(column).Width = width
    first = sheet.getCellByPosition(0, 0)
    first.CharWeight, first.CharHeight = BOLD, LARGE
    sheet.getCellByPosition(0, 1).CharColor = GREY
    head = sheet.getCellRangeByPosition(0, TOP - 1, len(WIDTHS) - 1, TOP - 1)
    head.CharWeight, head.CellBackColor = BOLD, HEAD_COLOUR


def _finding(document: Any, sheet: Any, row: int, line: Line, words: Words) -> None:
    weight = words.say(line.weight.capitalize())
    sheet.getCellByPosition(0, row).setValue(row - TOP + 1)
    for column, text in ((2, weight), (3, line.what), (4, line.cause), (5, line.do)):
        sheet.getCellByPosition(column, row).setString(text)
    _link(document, sheet.getCellByPosition(1, row), line)
    whole = sheet.getCellRangeByPosition(0, row, len(WIDTHS) - 1, row)
    whole.IsTextWrapped = True
    whole.VertJustify = TOP_ALIGNED
    whole.Rows.OptimalHeight = True


def _link(document: Any, place: Any, line: Line) -> None:
    if not can_be_shown(document, line.tab):
        place.setString(line.place)
        return
    link = document.createInstance(LINK)
    link.Representation = line.place
    link.URL = address(line)
    place.insertTextContent(place.createTextCursor(), link, False)


def can_be_shown(document: Any, tab: str) -> bool:
    """Whether there is such a tab and the user can see it."""
    return bool(tab and document.Sheets.hasByName(tab) and document.Sheets.getByName(tab).IsVisible)


def address(line: Line) -> str:
    """`#Results.F14`, `#'How computed'.A1`."""
    tab = line.tab if line.tab.isidentifier() else "'" + line.tab.replace("'", "''") + "'"
    return f"#{tab}.{line.cell or 'A1'}"


def _bottom(sheet: Any, row: int, told: Told) -> None:
    cell = sheet.getCellByPosition(0, row)
    cell.setString(told.not_checked)
    area = sheet.getCellRangeByPosition(0, row, len(WIDTHS) - 1, row)
    area.merge(True)
    area.IsTextWrapped = True
    area.VertJustify = TOP_ALIGNED
    area.CharColor = GREY
    sheet.Rows.getByIndex(row).Height = LINE * (1 + len(told.not_checked) // LETTERS)


def places(document: Any) -> list[tuple[str, str, str]]:
    """(tab, cell, what was found) of each finding with a place that can be shown, in order, each place once."""
    name = find(document)
    if name is None:
        return []
    sheet = document.Sheets.getByName(name)
    found: dict[tuple[str, str], str] = {}
    for row in range(TOP, TOP + 10_000):
        place, what = (sheet.getCellByPosition(column, row).getString() for column in (1, 3))
        if not what:
            break
        tab, _, cell = place.rpartition(" ")
        if _is_cell(cell) and can_be_shown(document, tab):
            found.setdefault((tab, cell), what)
    return [(tab, cell, what) for (tab, cell), what in found.items()]


def _is_cell(text: str) -> bool:
    try:
        position(text)
    except ValueError:
        return False
    return True


def remove(document: Any) -> None:
    """Take our tabs away; inside `protection.opened`."""
    while (name := find(document)) is not None and document.Sheets.Count > 1:
        document.Sheets.removeByName(name)
