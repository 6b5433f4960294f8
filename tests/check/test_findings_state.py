"""What was done to the workbook as a whole is said once, with its tab, and an untouched workbook raises none of it."""

from __future__ import annotations

import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest
from openpyxl import Workbook, load_workbook
from openpyxl.styles import Protection
from openpyxl.workbook.defined_name import DefinedName

from sheetcal.model import Finding
from sheetcal.verbs.checking import Against, check_path

WORKBOOKS = Path(__file__).parents[2] / "workbooks"
FILLED = sorted(WORKBOOKS.glob("*-filled.xlsx"))
STATE = (
    "tab-missing", "tab-added", "cells-hidden", "cells-merged", "cell-unlocked", "protection-off", "macros-present",
    "outside-link", "object-embedded", "calculation-as-displayed", "calculation-by-hand", "calculation-in-circles",
    "calendar-of-1904",
)  # fmt: skip
Change = Callable[[Workbook], None]


def _state(path: Path) -> list[Finding]:
    return [one for one in check_path(str(path), Against()).findings if one.code in STATE]


def _saved(source: Path, folder: Path, change: Change) -> Path:
    """A workbook changed by openpyxl; it drops stored values, which is no matter here."""
    book = load_workbook(source)
    change(book)
    target = folder / "changed.xlsx"
    book.save(target)
    return target


def _rewritten(source: Path, folder: Path, part: str, old: bytes, new: bytes) -> Path:
    """The file with one part changed byte for byte, or added when `old` is empty."""
    target = folder / "rewritten.xlsx"
    with zipfile.ZipFile(source) as before, zipfile.ZipFile(target, "w", zipfile.ZIP_DEFLATED) as after:
        for name in before.namelist():
            data = before.read(name)
            if name == part:
                assert data.count(old) == 1
                data = data.replace(old, new)
            after.writestr(name, data)
        if not old:
            after.writestr(part, new)
    return target


def _rename(book: Workbook) -> None:
    book["Results"].title = "Results (2)"


def _hide_tab(book: Workbook) -> None:
    book["Readings"].sheet_state = "hidden"


def _hide_row(book: Workbook) -> None:
    book["Readings"].row_dimensions[8].hidden = True


def _flatten_row(book: Workbook) -> None:
    book["Readings"].row_dimensions[8].height = 0.5


def _hide_column(book: Workbook) -> None:
    book["Results"].column_dimensions["E"].hidden = True


def _merge(book: Workbook) -> None:
    book["Readings"].merge_cells("E8:F9")


def _unprotect(book: Workbook) -> None:
    book["Results"].protection.sheet = False


def _add_tab(book: Workbook) -> None:
    book.create_sheet("my sums")["A1"] = 12


def _reach(book: Workbook) -> None:
    book["Front"]["Z90"] = '=WEBSERVICE("http://127.0.0.1/x")'


def _outside_name(book: Workbook) -> None:
    book["Front"]["Z91"] = "=[1]Sheet1!A1"
    book.defined_names["elsewhere"] = DefinedName("elsewhere", attr_text="[1]Sheet1!$A$1")


def _by_hand(book: Workbook) -> None:
    book.calculation.calcMode = "manual"


def _as_displayed(book: Workbook) -> None:
    book.calculation.fullPrecision = False


def _in_circles(book: Workbook) -> None:
    book.calculation.iterate = True


CHANGES: list[tuple[Change, str, str | None]] = [
    (_rename, "tab-missing", "Results"),
    (_hide_tab, "cells-hidden", "Readings"),
    (_hide_row, "cells-hidden", "Readings"),
    (_flatten_row, "cells-hidden", "Readings"),
    (_hide_column, "cells-hidden", "Results"),
    (_merge, "cells-merged", "Readings"),
    (_unprotect, "protection-off", "Results"),
    (_add_tab, "tab-added", "my sums"),
    (_reach, "outside-link", "Front"),
    (_outside_name, "outside-link", "Front"),
    (_by_hand, "calculation-by-hand", None),
    (_as_displayed, "calculation-as-displayed", None),
    (_in_circles, "calculation-in-circles", None),
]


def test_all_kinds_have_an_example() -> None:
    """Five kinds are looked at."""
    assert len(FILLED) == 5


@pytest.mark.parametrize("source", FILLED, ids=lambda path: path.stem)
def test_untouched_workbooks_are_silent(source: Path, tmp_path: Path) -> None:
    """Neither the workbook as issued nor a plain save by another program raises a finding on its state."""
    assert _state(source) == []
    assert _state(_saved(source, tmp_path, lambda book: None)) == []


@pytest.mark.parametrize("source", FILLED, ids=lambda path: path.stem)
@pytest.mark.parametrize(("change", "code", "tab"), CHANGES, ids=lambda one: getattr(one, "__name__", str(one)))
def test_a_change_of_the_whole_is_found(
    source: Path, change: Change, code: str, tab: str | None, tmp_path: Path
) -> None:
    """Each change is found under its code on its tab; only a renamed tab is two things, one gone and one added."""
    found = _state(_saved(source, tmp_path, change))
    assert (code, tab) in [(one.code, one.sheet) for one in found]
    assert {one.code for one in found} <= {code, "tab-added"} if change is _rename else {code}
    assert all(one.message and one.likely_cause for one in found)


def test_unlocked_formulas_are_found(tmp_path: Path) -> None:
    """A formula's cell that anyone may type over is named once, however many were unlocked with it."""

    def unlock(book: Workbook) -> None:
        for row in book["Results"].iter_rows():
            for cell in row:
                cell.protection = Protection(locked=False)

    found = _state(_saved(WORKBOOKS / "fuel-filled.xlsx", tmp_path, unlock))
    assert [(one.code, one.sheet) for one in found] == [("cell-unlocked", "Results")]


def test_the_calendar_of_1904_is_found(tmp_path: Path) -> None:
    """A workbook whose days count from 1904 is named, and its dates are read in that calendar."""
    source = WORKBOOKS / "fuel-filled.xlsx"
    with zipfile.ZipFile(source) as package:
        head = package.read("xl/workbook.xml")
    assert b"<workbookPr />" in head or b"<workbookPr/>" in head
    old = b"<workbookPr />" if b"<workbookPr />" in head else b"<workbookPr/>"
    path = _rewritten(source, tmp_path, "xl/workbook.xml", old, b'<workbookPr date1904="1"/>')
    assert [one.code for one in _state(path)] == ["calendar-of-1904"]


def test_macros_and_objects_are_found(tmp_path: Path) -> None:
    """A macro part is an error although nothing runs it; an embedded object is a note."""
    source = WORKBOOKS / "heat-balance-filled.xlsx"
    macro = _rewritten(source, tmp_path, "xl/vbaProject.bin", b"", b"\xd0\xcf\x11\xe0")
    assert [(one.code, one.severity) for one in _state(macro)] == [("macros-present", "error")]
    embedded = _rewritten(source, tmp_path, "xl/embeddings/oleObject1.bin", b"", b"x")
    assert [(one.code, one.severity) for one in _state(embedded)] == [("object-embedded", "note")]


@pytest.mark.office
def test_libreoffice_keeps_what_was_hidden(tmp_path: Path, convert: Callable[[list[Path], str, Path], None]) -> None:
    """Saved by LibreOffice in either format a hidden row, column and tab are still found, and nothing else is."""

    def hide(book: Workbook) -> None:
        _hide_row(book)
        _hide_column(book)
        book["Constants"].sheet_state = "hidden"

    sources = [_saved(WORKBOOKS / "fuel-filled.xlsx", tmp_path, hide)]
    for form in ("xlsx", "ods"):
        convert(sources, form, tmp_path / form)
        found = _state(tmp_path / form / f"changed.{form}")
        assert sorted((one.code, one.sheet) for one in found) == [
            ("cells-hidden", "Constants"),
            ("cells-hidden", "Readings"),
            ("cells-hidden", "Results"),
        ]
