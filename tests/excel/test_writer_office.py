"""LibreOffice opens the workbook, computes the same numbers, and saves it again without losing anything."""

from __future__ import annotations

import zipfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

import example_record
import openpyxl
import pytest

from sheetcal.excel.writer import write_workbook
from sheetcal.formulas.compute import compute
from sheetcal.model import IssueRecord

Convert = Callable[[list[Path], str, Path], None]
SPOILED: dict[str, dict[str, Any]] = {
    "text among the temperatures": {"run1.record_temperature": [22.31, "24,812", 22.33]},
    "gap in the times": {"run1.record_time": [0.0, None, 1.0]},
    "no firing time": {"run1.firing_time": None},
    "nothing at all": {"run1.record_time": [], "run1.record_temperature": []},
}
BOOKS = ["whole", "void", *SPOILED]


def spoiled(name: str) -> tuple[IssueRecord, dict[str, Any], Any]:
    """The example with one fault in its readings, its results computed again."""
    record, values, layout = example_record.example()
    readings = {one: value for one, value in values.items() if not layout.places[one].field.step}
    if name == "void":
        readings |= {"run2.state": "void", "run2.void_reason": "soot", "run1.oxygen_pressure": 3.5}
    for one, value in SPOILED.get(name, {}).items():
        whole = readings[one]
        readings[one] = [*value, *whole[len(value) :]] if isinstance(value, list) and value else value
    return record, {**readings, **compute(layout, record, readings)}, layout


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory, convert: Convert) -> Path:
    """Each book as written, and as LibreOffice saved it in `again`."""
    path = tmp_path_factory.mktemp("books")
    for name in BOOKS:
        record, values, _ = spoiled(name)
        write_workbook(record, values, path / f"{name}.xlsx")
    convert([path / f"{name}.xlsx" for name in BOOKS], "xlsx", path / "again")
    return path


def same(ours: object, theirs: object) -> bool:
    """Equal, or numbers equal but for what LibreOffice's saving does to the last digits."""
    if isinstance(ours, (int, float)) and isinstance(theirs, (int, float)):
        return abs(ours - theirs) <= 1e-11 * max(abs(ours), abs(theirs)) + 1e-12
    return ours == theirs


@pytest.mark.office
@pytest.mark.parametrize("name", BOOKS)
def test_office_computes_what_is_stored(folder: Path, name: str) -> None:
    """Every formula of every tab, heads and chart lines too, gives the value that was stored; none an error."""
    stored = openpyxl.load_workbook(folder / f"{name}.xlsx", data_only=True)
    formulas = openpyxl.load_workbook(folder / f"{name}.xlsx")
    again = openpyxl.load_workbook(folder / "again" / f"{name}.xlsx", data_only=True)
    again_formulas = openpyxl.load_workbook(folder / "again" / f"{name}.xlsx")
    count = 0
    for sheet in formulas.worksheets:
        for row in sheet.iter_rows():
            for cell in row:
                if cell.data_type != "f":
                    continue
                count += 1
                ours, theirs = (book[sheet.title][cell.coordinate].value for book in (stored, again))
                assert same(ours, theirs), (sheet.title, cell.coordinate, cell.value)
                assert not str(ours).startswith("#")
                assert again_formulas[sheet.title][cell.coordinate].value == cell.value
    assert count > 650


def ruled(sheet: Any) -> set[str]:
    """Every cell with a rule of entry."""
    rules = sheet.data_validations.dataValidation
    return {f"{r},{c}" for rule in rules for area in rule.sqref.ranges for r, c in area.cells}


def marked(sheet: Any) -> set[str]:
    """Every cell a conditional format looks at."""
    formats = sheet.conditional_formatting
    return {f"{r},{c}" for one in formats for area in one.sqref.ranges for r, c in area.cells}


@pytest.mark.office
def test_saving_keeps_rules_marks_names_charts_and_locks(folder: Path) -> None:
    """What LibreOffice saves is still the same form."""
    before = openpyxl.load_workbook(folder / "whole.xlsx")
    after = openpyxl.load_workbook(folder / "again" / "whole.xlsx")
    assert after.sheetnames == before.sheetnames
    assert set(before.defined_names) <= set(after.defined_names)
    assert after["Issue record"].sheet_state == "hidden"
    for sheet in before.worksheets:
        other = after[sheet.title]
        assert other.protection.sheet
        assert ruled(other) == ruled(sheet)
        assert marked(sheet) <= marked(other)
        assert len(other._charts) == len(sheet._charts)
    assert len(before["Records"]._charts) == 16
    assert len(ruled(after["Records"])) > 900


@pytest.mark.office
def test_lines_on_the_chart(folder: Path) -> None:
    """Fore and after drift pass through the readings they were fitted to; without a record all points coincide."""
    book = openpyxl.load_workbook(folder / "whole.xlsx", data_only=True)
    sheet = book["Records"]
    points = [(sheet.cell(row, 9).value, sheet.cell(row, 10).value) for row in range(7, 15)]
    assert sheet["I6"].value == 1
    fore, after = points[0], points[3]
    assert fore == (0.0, pytest.approx(22.3126, abs=5e-4))
    assert after == (24.0, pytest.approx(sheet["B54"].value, abs=5e-4))
    assert [x for x, _ in points[4:]] == [5.0, 5.0, 14.0, 14.0]
    empty = openpyxl.load_workbook(folder / "nothing at all.xlsx", data_only=True)["Records"]
    assert {(empty.cell(row, 9).value, empty.cell(row, 10).value) for row in range(7, 15)} == {(0, 0)}


def test_each_chart_draws_its_own_rows(tmp_path: Path) -> None:
    """The two charts of each block refer to that block's series, lines and residuals."""
    record, values, layout = example_record.example()
    write_workbook(record, values, tmp_path / "book.xlsx")
    archive = zipfile.ZipFile(tmp_path / "book.xlsx")
    blocks = [one for one in layout.blocks if one.tab == "Records"]
    assert len(blocks) == 8
    for number, block in enumerate(blocks):
        drawn, left = (archive.read(f"xl/charts/chart{2 * number + one}.xml").decode() for one in (1, 2))
        first, last = block.first_row, block.first_row + layout.shape.record_rows - 1
        assert f"'Records'!$A${first}:$A${last}" in drawn
        assert f"'Records'!$B${first}:$B${last}" in drawn
        assert f"'Records'!$I${first + 1}:$I${first + 2}" in drawn
        assert f"'Records'!$J${first + 7}:$J${first + 8}" in drawn
        assert f"'Records'!$K${first}:$K${last}" in left
        assert f"'Records'!$L${first}:$L${last}" in left


def test_residuals_are_what_the_drift_lines_leave_over(tmp_path: Path) -> None:
    """In mK against each period's own line: they add up to nothing, and the main period shows none."""
    record, values, layout = example_record.example()
    write_workbook(record, values, tmp_path / "book.xlsx")
    sheet = openpyxl.load_workbook(tmp_path / "book.xlsx", data_only=True)["Records"]
    size = layout.shape.record_rows
    points = [(sheet.cell(row, 11).value, sheet.cell(row, 12).value) for row in range(6, 6 + size)]
    fore_end, main_end, length = (int(values[f"run1.{name}"]) for name in ("fore_end", "main_end", "record_length"))
    times = values["run1.record_time"]
    for part in (slice(0, fore_end), slice(main_end - 1, length)):
        assert [x for x, _ in points[part]] == times[part]
        assert abs(sum(y for _, y in points[part])) < 1e-4
        assert 0 < max(abs(y) for _, y in points[part]) < 1.0
    assert set(points[fore_end : main_end - 1]) == {points[0]}
    assert set(points[length:]) == {points[0]}
