"""Pages for print: a header, page n of m at the foot, and no column cut off.

Worker side: 3.9 syntax, standard library and uno.
"""

from __future__ import annotations

from typing import Any

from sheetcal.office.jobs import Header


def prepare_pages(document: Any, header: Header | None) -> None:
    """Change the page style of every visible tab."""
    styles = document.getStyleFamilies().getByName("PageStyles")
    visible = {sheet.PageStyle for sheet in document.getSheets() if sheet.IsVisible}
    for name in sorted(visible):
        style = styles.getByName(name)
        _fit(style)
        if header is not None:
            _head(style, header)
        _number(document, style)


def _fit(style: Any) -> None:
    """One page wide, unless the workbook says itself how it is to fit."""
    if not (style.ScaleToPagesX or style.ScaleToPages):
        style.ScaleToPagesX, style.ScaleToPagesY = 1, 0


def _head(style: Any, header: Header) -> None:
    style.HeaderIsOn, style.HeaderIsShared, style.FirstPageHeaderIsShared = True, True, True
    content = style.RightPageHeaderContent
    content.LeftText.setString(header.left)
    content.CenterText.setString("")
    content.RightText.setString(header.right)
    style.RightPageHeaderContent = content


def _number(document: Any, style: Any) -> None:
    """Page n of m, over all tabs."""
    style.FooterIsOn, style.FooterIsShared, style.FirstPageFooterIsShared = True, True, True
    style.FirstPageNumber = 0
    content = style.RightPageFooterContent
    content.LeftText.setString("")
    content.RightText.setString("")
    text = content.CenterText
    text.setString("page ")
    _append(text, document.createInstance("com.sun.star.text.TextField.PageNumber"))
    end = text.createTextCursor()
    end.gotoEnd(False)
    text.insertString(end, " of ", False)
    _append(text, document.createInstance("com.sun.star.text.TextField.PageCount"))
    style.RightPageFooterContent = content


def _append(text: Any, field: Any) -> None:
    end = text.createTextCursor()
    end.gotoEnd(False)
    text.insertTextContent(end, field, False)
