"""openpyxl's writers, taught three things: our rows with stored values, our name, and the same bytes every time.

They stand on classes of openpyxl that are not public: hence its pinned version, and a test that reads the parts.
"""

from __future__ import annotations

import io
import re
import zipfile
from datetime import datetime
from typing import Any

from openpyxl.drawing.spreadsheet_drawing import SpreadsheetDrawing
from openpyxl.packaging.extended import ExtendedProperties
from openpyxl.workbook import Workbook
from openpyxl.worksheet._writer import WorksheetWriter
from openpyxl.worksheet.dimensions import SheetDimension
from openpyxl.worksheet.worksheet import Worksheet
from openpyxl.writer.excel import ExcelWriter
from openpyxl.xml.constants import ARC_APP
from openpyxl.xml.functions import tostring

from sheetcal.excel.charts import RecordChart
from sheetcal.excel.tabrows import TabRows

APPLICATION = "sheetcal"  # a name of our own: LibreOffice then recalculates texts too when it opens the file
_EMPTY_ROWS = re.compile(rb"<sheetData\s*/>|<sheetData>\s*</sheetData>")


class StampedArchive(zipfile.ZipFile):
    """A zip whose members all carry one date, so that the same workbook is the same bytes."""

    stamp = (1980, 1, 1, 0, 0, 0)

    def writestr(self, name: Any, data: Any, *_: Any, **__: Any) -> None:  # type: ignore[override]
        """Write one member; the program's name takes the place of openpyxl's."""
        entry = zipfile.ZipInfo(str(name), self.stamp)
        entry.compress_type = zipfile.ZIP_DEFLATED
        entry.external_attr = 0o600 << 16
        super().writestr(entry, _application() if name == ARC_APP else data)


class TabWriter(WorksheetWriter):  # type: ignore[misc]  # openpyxl is not typed
    """Writes a worksheet whose rows come ready from a TabRows."""

    def __init__(self, sheet: Worksheet, rows: TabRows) -> None:
        self.table = rows
        super().__init__(sheet, out=io.BytesIO())

    def write_dimensions(self) -> None:
        """The range our rows really use: readers that stream the file trust it."""
        self.xf.send(SheetDimension(self.table.dimension()).to_tree())

    def part(self) -> bytes:
        """The whole worksheet part."""
        self.write()
        head, tail = _EMPTY_ROWS.split(self.out.getvalue(), maxsplit=1)
        return bytes(head + self.table.xml() + tail)


class BookWriter(ExcelWriter):  # type: ignore[misc]  # openpyxl is not typed
    """Writes a workbook whose tabs are TabRows, by tab name."""

    def __init__(self, workbook: Workbook, archive: zipfile.ZipFile, tables: dict[str, TabRows]) -> None:
        super().__init__(workbook, archive)
        self.tables = tables

    def write_worksheet(self, ws: Worksheet) -> None:
        """One tab: what openpyxl knows of it around our own rows."""
        ws._drawing = SpreadsheetDrawing()
        ws._drawing.charts = ws._charts
        writer = TabWriter(ws, self.tables[ws.title])
        self._archive.writestr(ws.path[1:], writer.part())
        ws._rels = writer._rels
        self.manifest.append(ws)

    def _write_charts(self) -> None:
        for chart in self._charts:
            part = chart.part if isinstance(chart, RecordChart) else tostring(chart._write())
            self._archive.writestr(chart.path[1:], part)
            self.manifest.append(chart)


def to_bytes(workbook: Workbook, tables: dict[str, TabRows], moment: datetime) -> bytes:
    """The workbook file. moment: UTC without zone, written as its date of creation and change."""
    workbook.properties.created = workbook.properties.modified = moment
    buffer = io.BytesIO()
    archive = StampedArchive(buffer, "w", zipfile.ZIP_DEFLATED)
    BookWriter(workbook, archive, tables).save()
    return buffer.getvalue()


def _application() -> bytes:
    properties = ExtendedProperties()
    properties.Application, properties.AppVersion = APPLICATION, None
    return bytes(tostring(properties.to_tree()))
