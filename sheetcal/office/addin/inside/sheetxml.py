"""One tab of the copy as a worksheet part of an .xlsx."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any
from xml.sax.saxutils import escape

from sheetcal.office.addin.inside.reading import Tab
from sheetcal.office.addin.inside.spelling import column_letters, xlsx_spelling

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
DATE_STYLE, UNLOCKED_STYLE = 1, 2  # places in the list of styles
TRUTHS = {"TRUE": "1", "FALSE": "0"}


def worksheet(tab: Tab) -> str:
    """The part's text, without the XML declaration."""
    columns = "".join(
        f'<col min="{first + 1}" max="{last + 1}" width="9" hidden="1"/>' for first, last in tab.hidden_columns
    )
    merges = "".join(f'<mergeCell ref="{_ref(first, top)}:{_ref(last, end)}"/>' for first, top, last, end in tab.merges)
    return "".join(
        (
            f'<worksheet xmlns="{MAIN}">',
            f"<cols>{columns}</cols>" if columns else "",
            f"<sheetData>{''.join(_rows(tab))}</sheetData>",
            '<sheetProtection sheet="1" objects="1" scenarios="1"/>' if tab.protected else "",
            f"<mergeCells>{merges}</mergeCells>" if merges else "",
            "</worksheet>",
        )
    )


def _ref(column: int, row: int) -> str:
    return f"{column_letters(column)}{row + 1}"


def _styles(tab: Tab) -> dict[tuple[int, int], int]:
    """Which cells show a date, and which formulas are not locked."""
    dates = {
        (column, row): DATE_STYLE
        for first, top, last, bottom in tab.dates
        for column in range(first, last + 1)
        for row in range(top, bottom + 1)
    }
    return {**dates, **dict.fromkeys(tab.unlocked, UNLOCKED_STYLE)}


def _rows(tab: Tab) -> Iterator[str]:
    letters = [column_letters(index) for index in range(len(tab.values[0]) if tab.values else 0)]
    hidden = {row for first, last in tab.hidden_rows for row in range(first, last + 1)}
    styles = _styles(tab)
    for row, (values, formulas) in enumerate(zip(tab.values, tab.formulas)):
        cells = "".join(
            _cell(f'r="{letters[column]}{row + 1}"', value, formula, styles.get((column, row)), tab, (column, row))
            for column, (value, formula) in enumerate(zip(values, formulas))
            if formula
        )
        if cells or row in hidden:
            yield f'<row r="{row + 1}"{HIDDEN if row in hidden else ""}>{cells}</row>'


HIDDEN = ' hidden="1"'


def _cell(ref: str, value: Any, text: str, style: int | None, tab: Tab, place: tuple[int, int]) -> str:
    given = ref if style is None else f'{ref} s="{style}"'
    if text.startswith(("=", "{=")):
        return _computed(given, value, text, tab.errors.get(place))
    if isinstance(value, str):
        return f'<c {given} t="inlineStr"><is><t xml:space="preserve">{text_of(value)}</t></is></c>'
    if text in TRUTHS:
        return f'<c {given} t="b"><v>{TRUTHS[text]}</v></c>'
    return f"<c {given}><v>{value!r}</v></c>"


def _computed(given: str, value: Any, text: str, error: str | None) -> str:
    array = f' t="array" ref={given.split()[0][2:]}' if text.startswith("{") else ""
    inner = text[2:-1] if array else text[1:]
    formula = f"<f{array}>{text_of(xlsx_spelling(inner))}</f>"
    if error is not None or value is None:
        return f'<c {given} t="e">{formula}<v>{error or "#VALUE!"}</v></c>'
    if isinstance(value, str):
        return f'<c {given} t="str">{formula}<v>{text_of(value)}</v></c>'
    return f"<c {given}>{formula}<v>{value!r}</v></c>"


def text_of(text: str) -> str:
    """As XML holds it."""
    return escape(clean(text))


def clean(text: str) -> str:
    """Without the characters XML cannot hold."""
    return "".join(one for one in text if one >= " " or one in "\t\n\r") if not text.isprintable() else text
