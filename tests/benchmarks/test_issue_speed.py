"""Issuing a fuel workbook of 10 samples costs at most 1.3 x what openpyxl takes to build and save the same cells.

The baseline gets the cells, looks, widths and charts ready made and writes neither stored results nor
validations nor marks: whatever it leaves out counts against us.
"""

from __future__ import annotations

import io
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from openpyxl.styles.cell_style import StyleArray

sys.path.insert(0, str(Path(__file__).parents[1] / "excel"))

import example_record

from sheetcal import kinds
from sheetcal.excel import charts
from sheetcal.excel.writer import workbook_bytes, write_workbook
from sheetcal.formulas.compute import compute
from sheetcal.model import IssueRecord

BAR = 1.3
TOLERATED = 1.3 * BAR  # STYLE: fails only beyond 1.3 x the bar, for the machine may be busy
Cells = dict[str, list[tuple[int, int, Any, StyleArray]]]


def best(work: Callable[[], Any], times: int = 3) -> float:
    """The shortest of some runs, in seconds."""
    took = []
    for _ in range(times):
        start = time.perf_counter()
        work()
        took.append(time.perf_counter() - start)
    return min(took)


def blank_issue(samples: int) -> tuple[IssueRecord, Any]:
    """A record of so many samples and its layout, with nothing filled in."""
    size = example_record.shape(samples)
    return example_record.record(size), kinds.skeleton(kinds.load("fuel"), size)


def same_cells(data: bytes) -> tuple[openpyxl.Workbook, Cells, list[charts.RecordArea]]:
    """What our workbook holds, taken out of it once: template for looks, cells by tab, record areas."""
    book = openpyxl.load_workbook(io.BytesIO(data))
    cells: Cells = {}
    for sheet in book.worksheets:
        cells[sheet.title] = [
            (cell.row, cell.column, cell.value, cell._style)
            for row in sheet.iter_rows()
            for cell in row
            if cell.has_style
        ]
    tops = [row for row, column, value, _ in cells["Records"] if column == 8 and value == "For the chart: x, y"]
    areas = [charts.RecordArea(top, example_record.ROWS, top + 1, top + 47, top + 68) for top in tops]
    return book, cells, areas


def baseline(template: openpyxl.Workbook, cells: Cells, areas: list[charts.RecordArea], path: Path) -> None:
    """openpyxl's own build and save of the same cells with the same charts."""
    book = openpyxl.Workbook()
    book.remove(book.active)
    for name in (
        "_fonts",
        "_fills",
        "_borders",
        "_alignments",
        "_protections",
        "_number_formats",
        "_cell_styles",
    ):
        setattr(book, name, getattr(template, name))
    for title, listed in cells.items():
        sheet = book.create_sheet(title)
        for row, column, value, style in listed:
            cell = sheet.cell(row, column, value)
            cell._style = style
    records = book["Records"]
    for area in areas:
        records.add_chart(charts.build(records, area, ["Fore", "After", "Fired", "End"], "min", "degC"), f"C{area.top}")
        records.add_chart(charts.build_residuals(records, area, "min"), f"C{area.top + 16}")
    book.save(path)


@pytest.mark.benchmark
def test_issue_is_within_the_bar(tmp_path: Path) -> None:
    """Ratio of writing (and of computing and writing) to plain openpyxl, charts included."""
    record, layout = blank_issue(10)
    values = compute(layout, record, {})
    template, cells, areas = same_cells(workbook_bytes(record, values))
    count = sum(len(listed) for listed in cells.values())
    assert count > 20_000
    assert len(areas) == 40  # two charts each
    plain = best(lambda: baseline(template, cells, areas, tmp_path / "plain.xlsx"))
    write = best(lambda: write_workbook(record, values, tmp_path / "ours.xlsx", force=True))
    issue = best(lambda: write_workbook(record, compute(layout, record, {}), tmp_path / "ours.xlsx", force=True))
    print(
        f"\n{count} cells, {2 * len(areas)} charts: openpyxl {plain:.2f} s, "
        f"write {write:.2f} s = {write / plain:.2f} x, "
        f"compute and write {issue:.2f} s = {issue / plain:.2f} x (bar {BAR})"
    )
    assert write / plain <= TOLERATED
    assert issue / plain <= TOLERATED
