"""Gate and reader together cost a small part of what a bare load by openpyxl of the same file costs.

Prints milliseconds and ratios; the baseline is measured beside it in the same run.
"""

import random
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from openpyxl.chart import Reference, ScatterChart, Series
from openpyxl.styles import Border, PatternFill, Protection, Side
from openpyxl.worksheet.datavalidation import DataValidation

from sheetcal.excel import gate
from sheetcal.excel.reader import read

BAR = 0.2  # of a bare openpyxl load; the whole check may take 0.5
SLACK = 1.3  # fails only beyond this multiple of the bar
TABS = ("Front", "Readings", "Records", "Results", "Constants", "How computed", "Issue record", "More")
FORMULA = '=IF(COUNT(A{0},B{0})=2,IF(AND(A{0}>0,B{0}<10),A{0}*B{0}+gas_constant/3.5,""),"")'


def workbook(path: Path) -> None:
    """Write 8 tabs, 10 000 cells (half of them empty and framed for input) and 20 charts."""
    chance = random.Random(3)
    book = openpyxl.Workbook()
    book.remove(book.active)
    line, fill = Side(style="thin"), PatternFill("solid", fgColor="FFFFEE")
    frame, free = Border(line, line, line, line), Protection(locked=False)
    for title in TABS:
        sheet = book.create_sheet(title)
        for row in range(1, 251):
            for column in range(1, 6):
                cell = sheet.cell(row, column)
                kind = chance.random()
                if kind < 0.5:
                    cell.fill, cell.border, cell.protection = fill, frame, free
                elif kind < 0.65:
                    cell.value = f"Label of row {row}"
                elif kind < 0.85:
                    cell.value = chance.random() * 100
                else:
                    cell.value = FORMULA.format(row)
        rule = DataValidation(type="decimal", operator="between", formula1="0", formula2="10")
        rule.add("A1:A250")
        sheet.add_data_validation(rule)
    records = book["Records"]
    for number in range(20):
        chart = ScatterChart()
        for first in range(1, 5):
            x, y = (Reference(records, min_col=c, min_row=first, max_row=first + 49) for c in (1, 2))
            chart.series.append(Series(y, x, title=f"period {first}"))
        records.add_chart(chart, f"H{1 + 15 * number}")
    book.save(path)


def milliseconds(works: list[Callable[[], object]], repeats: int) -> list[float]:
    """Return the best time of each call; they take turns, so that a busy moment hits all alike."""
    best = [float("inf")] * len(works)
    for _ in range(repeats + 1):
        for number, work in enumerate(works):
            began = time.perf_counter()
            work()
            best[number] = min(best[number], (time.perf_counter() - began) * 1000)
    return best


def measured(path: Path, repeats: int) -> float:
    """Print and return the ratio of gate and reader to a bare load."""
    works = [lambda: openpyxl.load_workbook(path), lambda: gate.admit(path), lambda: read(path)]
    bare, door, whole = milliseconds(works, repeats)
    print(f"\n{path.parent.name}/{path.name}: openpyxl {bare:.1f} ms, gate {door:.1f} ms, ", end="")
    print(f"gate and read {whole:.1f} ms = {whole / bare:.3f}")
    return whole / bare


@pytest.mark.benchmark
def test_gate_and_reader_take_a_fifth_of_a_bare_load(
    tmp_path: Path, sizes: dict[str, Any], convert: Callable[[list[Path], str, Path], None]
) -> None:
    """Reading through the gate stays within a fifth of openpyxl's load, also after a save by LibreOffice."""
    made, saved = tmp_path / "made.xlsx", tmp_path / "saved"
    workbook(made)
    saved.mkdir()
    convert([made], "xlsx", saved)
    convert([made], "ods", saved)
    repeats = max(5, int(sizes["read_benchmark"]))
    ratios = [measured(path, repeats) for path in (made, saved / "made.xlsx")]
    (as_ods,) = milliseconds([lambda: read(saved / "made.ods")], repeats)
    print(f"the same as .ods: gate and read {as_ods:.1f} ms")
    counts = {sum(map(len, read(p).cells.values())) for p in (made, saved / "made.xlsx", saved / "made.ods")}
    assert len(counts) == 1
    assert max(ratios) < BAR * SLACK
