"""Pages for print: head and foot, page n of m, room for signatures, nothing hidden and no column cut off.

Worker side: 3.9 syntax, standard library and uno.
"""

from __future__ import annotations

from typing import Any

from sheetcal.office.jobs import Header

SMALL = 0.9  # programs measure widths a little differently
EDGE = 700  # the least margin, in hundredths of a millimetre
HEADS = 2  # rows with title and identity, repeated on every page
LINE = "_" * 30
SIGNED = 2700  # the height of a foot with signatures; a height that grows is not seen when a tab is fitted on one page
BOLD = 150.0
FONT, SIZE = "Arial", 8


def prepare_pages(document: Any, header: Header | None) -> None:
    """Change the page style of every tab that is printed. Without a header only scale and page numbers are seen to."""
    styles = document.getStyleFamilies().getByName("PageStyles")
    header = header or Header("", "")
    areas = dict(header.areas)
    sizes = {tab: (widths, heights) for tab, widths, heights in header.sizes}
    first = True
    document.unprotect("")  # or no hidden tab could be shown
    for sheet in document.getSheets():
        name = sheet.getName()
        if name in areas:
            _show_all(sheet)
            _widen(sheet, *sizes.get(name, ((), ())))
        if sheet.IsVisible:
            parts = _parts(sheet, areas.get(name, ""))
            sheet.setPrintAreas(tuple(parts))
            style = styles.getByName(sheet.PageStyle)
            _fit(style, _width(sheet, max(one.EndColumn for one in parts)))
            _head(style, header, name)
            _foot(document, style, header, header.sign if first else ())
            first = False


def _show_all(sheet: Any) -> None:
    """Nothing stays hidden, no row and no column; title and identity stand on every page."""
    sheet.IsVisible = True
    sheet.unprotect("")
    if not sheet.isProtected():  # else with a password of somebody's own: it is printed as it is
        sheet.getRows().IsVisible = True
        sheet.getColumns().IsVisible = True
    rows = sheet.getCellRangeByPosition(0, 0, 0, HEADS - 1).getRangeAddress()
    sheet.setTitleRows(rows)
    sheet.setPrintTitleRows(True)


def _widen(sheet: Any, widths: tuple[int, ...], heights: tuple[tuple[int, int], ...]) -> None:
    """A column or row made so small that it cuts off what it holds gets its size back."""
    columns, rows = sheet.getColumns(), sheet.getRows()
    for number, width in enumerate(widths):
        column = columns.getByIndex(number)
        if column.Width < SMALL * width:
            column.Width = width
    for number, height in heights:
        row = rows.getByIndex(number - 1)
        if row.Height < SMALL * height:
            row.Height = height


def _parts(sheet: Any, area: str) -> list[Any]:
    """The areas that were asked for, or all that is filled: once a tab has an area, those without are not printed."""
    if area:
        return [sheet.getCellRangeByName(one).getRangeAddress() for one in area.split(",")]
    cursor = sheet.createCursor()
    cursor.gotoEndOfUsedArea(False)
    cursor.gotoStartOfUsedArea(True)
    end = cursor.getRangeAddress()
    return [sheet.getCellRangeByPosition(0, 0, end.EndColumn, end.EndRow).getRangeAddress()]


def _width(sheet: Any, last: int) -> int:
    """Hundredths of a millimetre from the first column to the last that is printed."""
    columns = sheet.getColumns()
    return sum(columns.getByIndex(number).Width for number in range(last + 1))


def _fit(style: Any, width: int) -> None:
    """One page wide and off the edges; a scale that the workbook states is kept where nothing is cut off by it."""
    for side in ("LeftMargin", "RightMargin", "TopMargin", "BottomMargin"):
        setattr(style, side, max(EDGE, getattr(style, side)))
    room = style.Width - style.LeftMargin - style.RightMargin
    if (
        style.ScaleToPages
        or style.ScaleToPagesX > 1
        or (not style.ScaleToPagesX and width * style.PageScale > 100 * room)
    ):
        style.ScaleToPagesX, style.ScaleToPagesY = 1, 0


def _head(style: Any, header: Header, tab: str) -> None:
    style.HeaderIsOn, style.HeaderIsShared, style.FirstPageHeaderIsShared = True, True, True
    content = style.RightPageHeaderContent
    _write(content.LeftText, header.left)
    _write(content.CenterText, f"{header.center}: {tab}" if header.center else tab)
    _write(content.RightText, header.right)
    style.RightPageHeaderContent = content


def _foot(document: Any, style: Any, header: Header, sign: tuple[str, ...]) -> None:
    """Whose sheet, what the checker says, page n of m; on the first page above it the lines for signatures."""
    style.FooterIsOn, style.FooterIsShared, style.FirstPageFooterIsShared = True, True, not sign
    content = style.RightPageFooterContent
    _feet(document, content, header, ("", "", ""))
    style.RightPageFooterContent = content
    if sign:
        style.FooterIsDynamicHeight, style.FooterHeight = False, SIGNED
        content = style.FirstPageFooterContent
        _feet(document, content, header, tuple(f"{who}\n\n\n{LINE}\ndate, name, signature\n\n" for who in sign))
        style.FirstPageFooterContent = content


def _feet(document: Any, content: Any, header: Header, above: tuple[str, ...]) -> None:
    """The three parts of one foot. above: what stands above each."""
    _write(content.LeftText, above[0] + header.foot)
    _write(content.CenterText, above[1] + header.note)
    _strong(content.CenterText, len(header.note))
    text = content.RightText
    _write(text, above[2] + "page ")
    _append(text, document.createInstance("com.sun.star.text.TextField.PageNumber"))
    end = text.createTextCursor()
    end.gotoEnd(False)
    text.insertString(end, " of ", False)
    _append(text, document.createInstance("com.sun.star.text.TextField.PageCount"))
    _look(text)


def _write(text: Any, words: str) -> None:
    text.setString(words)
    _look(text)


def _look(text: Any) -> None:
    cursor = text.createTextCursor()
    cursor.gotoEnd(True)
    cursor.CharFontName, cursor.CharHeight = FONT, SIZE


def _strong(text: Any, letters: int) -> None:
    """What the checker says is not to be overlooked: the last letters in bold."""
    cursor = text.createTextCursor()
    cursor.gotoEnd(False)
    cursor.goLeft(letters, True)
    cursor.CharWeight = BOLD


def _append(text: Any, field: Any) -> None:
    end = text.createTextCursor()
    end.gotoEnd(False)
    text.insertTextContent(end, field, False)
