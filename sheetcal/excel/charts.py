"""The chart of a temperature record: readings, the ends of the periods and both drifts drawn on.

Each record needs the same chart over other rows, so it is written once and its row numbers are moved.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from openpyxl.chart import Reference, ScatterChart, Series
from openpyxl.chart.layout import Layout, ManualLayout
from openpyxl.chart.shapes import GraphicalProperties
from openpyxl.chart.text import RichText
from openpyxl.drawing.line import LineProperties
from openpyxl.drawing.spreadsheet_drawing import AnchorMarker, TwoCellAnchor
from openpyxl.drawing.text import CharacterProperties, Paragraph, ParagraphProperties
from openpyxl.worksheet.worksheet import Worksheet
from openpyxl.xml.functions import tostring

from sheetcal.excel.styles import DEEP, INK, SOFT

_ROW = re.compile(r"(?<=\$)(\d+)\b")
HELPER_COLUMN = 9  # I: x, J: y of the drawn lines
STROKES = (("dash", INK), ("sysDot", INK), ("solid", SOFT), ("lgDashDot", SOFT))


class RecordChart(ScatterChart):  # type: ignore[misc]  # openpyxl is not typed
    """A chart that knows its finished part."""

    part: bytes = b""


@dataclass(frozen=True)
class RecordArea:
    """Where one record stands: first row, number of rows, first helper row, the chart's first and last row."""

    first: int
    rows: int
    helper: int
    top: int
    bottom: int


class ChartPrinter:
    """Puts the chart of each record on the Records tab."""

    def __init__(self, sheet: Worksheet, time_unit: str, temperature_unit: str) -> None:
        self.sheet = sheet
        self.units = (time_unit, temperature_unit)
        self._pattern: tuple[RecordArea, str] | None = None

    def add(self, area: RecordArea, titles: Sequence[str]) -> None:
        """Draw the record of one block; titles: of its four lines."""
        if self._pattern is None:
            text = tostring(build(self.sheet, area, titles, *self.units)._write()).decode()
            self._pattern = (area, text)
        origin, text = self._pattern
        offset = area.first - origin.first
        chart = RecordChart()
        chart.part = _ROW.sub(lambda match: str(int(match[1]) + offset), text).encode()
        chart.anchor = TwoCellAnchor(
            editAs="oneCell",
            _from=AnchorMarker(col=2, row=area.top - 1),
            to=AnchorMarker(col=6, row=area.bottom),
        )
        self.sheet._charts.append(chart)


def build(
    sheet: Worksheet, area: RecordArea, titles: Sequence[str], time_unit: str, temperature_unit: str
) -> ScatterChart:
    """The chart of one record as openpyxl builds it."""
    chart = ScatterChart(style=None)
    chart.scatterStyle = "lineMarker"
    last = area.first + area.rows - 1
    chart.series = [_readings(sheet, area.first, last)]
    for number, (title, stroke) in enumerate(zip(titles, STROKES, strict=True)):
        chart.series.append(_line(sheet, area.helper + 2 * number, title, *stroke))
    chart.x_axis.title, chart.y_axis.title = f"Time, {time_unit}", f"Temperature, {temperature_unit}"
    for axis, shown in ((chart.x_axis, "0"), (chart.y_axis, "0.0")):
        axis.delete = False
        axis.number_format = shown
        axis.majorTickMark = "out"
        axis.txPr = _small()
        axis.title.tx.rich.p[0].pPr = ParagraphProperties(defRPr=CharacterProperties(sz=800, b=False))
        axis.graphicalProperties = GraphicalProperties(ln=LineProperties(solidFill=INK, w=9525))
    chart.x_axis.majorGridlines = None
    chart.y_axis.majorGridlines.spPr = GraphicalProperties(ln=LineProperties(solidFill="D5DCDA", w=6350))
    chart.legend.position = "b"
    chart.legend.txPr = _small()
    chart.layout = Layout(manualLayout=ManualLayout(xMode="edge", yMode="edge", x=0.09, y=0.03, w=0.88, h=0.74))
    chart.graphical_properties = GraphicalProperties(ln=LineProperties(solidFill=SOFT, w=6350))
    chart.visible_cells_only = False
    return chart


def _readings(sheet: Worksheet, first: int, last: int) -> Series:
    series = Series(
        Reference(sheet, min_col=2, min_row=first, max_row=last),
        Reference(sheet, min_col=1, min_row=first, max_row=last),
        title="Readings",
    )
    series.marker.symbol, series.marker.size = "circle", 4
    series.marker.graphicalProperties = GraphicalProperties(solidFill=DEEP, ln=LineProperties(solidFill=DEEP))
    series.graphicalProperties = GraphicalProperties(ln=LineProperties(noFill=True))
    return series


def _line(sheet: Worksheet, row: int, title: str, dash: str, ink: str) -> Series:
    series = Series(
        Reference(sheet, min_col=HELPER_COLUMN + 1, min_row=row, max_row=row + 1),
        Reference(sheet, min_col=HELPER_COLUMN, min_row=row, max_row=row + 1),
        title=title,
    )
    series.marker.symbol = "none"
    series.smooth = False
    line = LineProperties(solidFill=ink, w=12700, prstDash=dash)
    series.graphicalProperties = GraphicalProperties(ln=line)
    return series


def _small() -> RichText:
    plain = CharacterProperties(sz=800)
    return RichText(p=[Paragraph(pPr=ParagraphProperties(defRPr=plain), endParaRPr=plain)])
