"""Slips that come with a program which stores no results are found as well: edited and saved by openpyxl."""

from __future__ import annotations

from collections.abc import Callable
from io import BytesIO

import pytest
from openpyxl import Workbook, load_workbook

from sheetcal.planting import Sheet
from sheetcal.verbs import selftesting

Edit = Callable[[Workbook, Sheet], None]


def _put(one: str, value: object) -> Edit:
    def edit(book: Workbook, sheet: Sheet) -> None:
        tab, cell = sheet.where(one)
        book[tab][cell].value = value

    return edit


def _hide(book: Workbook, sheet: Sheet) -> None:
    book["Readings"].row_dimensions[sheet.plan.places["run1.current"].row].hidden = True


def _unprotect(book: Workbook, sheet: Sheet) -> None:
    book["Results"].protection.sheet = False


def _add(book: Workbook, sheet: Sheet) -> None:
    book.create_sheet("My sums")


def _insert(book: Workbook, sheet: Sheet) -> None:
    book["Readings"].insert_rows(sheet.plan.places["run1.current"].row)


def _rename(book: Workbook, sheet: Sheet) -> None:
    book["Results"].title = "Results old"


CASES: dict[str, tuple[Edit, str, str]] = {
    "typed over": (_put("sheet.enthalpy", 2251.0), "result-typed-over", "sheet.enthalpy"),
    "formula rewritten": (_put("run1.electrical_heat", "=E5*1.002"), "formula-altered", "run1.electrical_heat"),
    "decimal comma": (_put("run1.current", "2,5208"), "reading-decimal-comma", "run1.current"),
    "text": (_put("run1.current", "2.52O8"), "reading-not-number", "run1.current"),
    "truth": (_put("run2.voltage", True), "reading-not-number", "run2.voltage"),
    "error": (_put("run2.voltage", "#N/A"), "reading-error-value", "run2.voltage"),
    "emptied": (_put("run2.voltage", None), "reading-missing", "run2.voltage"),
    "constant": (_put("Constants!C6", 8.31), "constant-altered", "Constants!C6"),
    "label": (_put("Readings!B14", "Current, corrected"), "label-altered", "Readings!B14"),
    "row hidden": (_hide, "cells-hidden", "run1.current"),
    "row inserted": (_insert, "label-altered", "Readings"),
    "protection off": (_unprotect, "protection-off", "Results"),
    "tab added": (_add, "tab-added", "My sums"),
    "tab renamed": (_rename, "tab-missing", "Results"),
}


def _saved(edit: Edit | None) -> tuple[Sheet, bytes]:
    sheet = selftesting.sheets("vaporisation")[0]
    book, target = load_workbook(BytesIO(sheet.data)), BytesIO()
    if edit:
        edit(book, sheet)
    book.save(target)
    return sheet, target.getvalue()


def test_a_workbook_only_saved_again_says_nothing() -> None:
    """No stored values is no finding."""
    _, data = _saved(None)
    verdict = selftesting.checked(data)
    assert verdict.findings == () and verdict.sound


@pytest.mark.parametrize("name", CASES)
def test_a_slip_is_found(name: str) -> None:
    """Its code, in its cell."""
    edit, code, at = CASES[name]
    sheet, data = _saved(edit)
    tab, cell = sheet.where(at)
    found = [(one.code, one.sheet, one.cell or "") for one in selftesting.checked(data).findings]
    assert any(one[:2] == (code, tab) and (one[2] == cell or not cell) for one in found), found
