"""One workbook of many cell functions' cases, recalculated by LibreOffice in one call."""

from __future__ import annotations

import subprocess
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import openpyxl
from cell_points import ErrorCell
from openpyxl.utils import get_column_letter
from openpyxl.workbook.defined_name import DefinedName

from sheetcal.cells import registry
from sheetcal.formulas.translate import fill


@dataclass(frozen=True)
class Earlier:
    """The result of a case added before."""

    number: int


class CaseBook:
    """Collects cases, writes them, and gives back what LibreOffice makes of them."""

    def __init__(self) -> None:
        self.book = openpyxl.Workbook()
        self.cases = self.book.active
        self.cases.title = "Cases"
        self.series = self.book.create_sheet("Series")
        self.formulas: list[str] = []
        self.width = 0
        self._constants()

    def _constants(self) -> None:
        tab = self.book.create_sheet("Constants")
        for row, constant in enumerate(registry.constants().values(), start=1):
            tab.cell(row, 1, float(constant))
            place = DefinedName(constant.name, attr_text=f"Constants!$A${row}")
            self.book.defined_names[constant.name] = place

    def add(self, template: str, values: dict[str, Any]) -> int:
        """Adds a case; its number is returned."""
        row = len(self.formulas) + 1
        columns = enumerate(values.items(), start=2)
        references = {name: self._place(row, column, value) for column, (name, value) in columns}
        self.formulas.append("=" + fill(template, references))
        self.cases.cell(row, 1, self.formulas[-1])
        return row - 1

    def _place(self, row: int, column: int, value: Any) -> str:
        if isinstance(value, Earlier):
            return f"A{value.number + 1}"
        if not isinstance(value, list):
            _put(self.cases, row, column, value)
            return f"{get_column_letter(column)}{row}"
        self.width += 1
        for index, one in enumerate(value, start=1):
            _put(self.series, index, self.width, one)
        letter = get_column_letter(self.width)
        return f"Series!${letter}$1:${letter}${len(value)}"

    def recalculated(self, folder: Path) -> tuple[list[Any], list[str]]:
        """Values and formula texts after LibreOffice has calculated and saved the workbook."""
        path = folder / "cases.xlsx"
        self.book.save(path)
        profile = (folder / "profile").as_uri()
        out = folder / "out"
        subprocess.run(
            ["soffice", f"-env:UserInstallation={profile}", "--headless", "--convert-to", "xlsx",
             "--outdir", str(out), str(path)],
            check=True, capture_output=True, timeout=300,
        )  # fmt: skip
        return _column(out / "cases.xlsx", True), _column(out / "cases.xlsx", False)


def _put(tab: Any, row: int, column: int, value: Any) -> None:
    """None leaves the cell empty, "" is a formula that shows an empty text, as a blank result does."""
    content = "=NA()" if isinstance(value, ErrorCell) else '=""' if value == "" else value
    if content is not None:
        tab.cell(row, column, content)


def _column(path: Path, values: bool) -> list[Any]:
    tab = openpyxl.load_workbook(path, data_only=values)["Cases"]
    return [row[0] for row in tab.iter_rows(max_col=1, values_only=True)]
