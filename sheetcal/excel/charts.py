"""The charts of a temperature record: readings with periods and drifts drawn on, and below what is left over from them.

Each record needs the same charts over other rows, so they are written once and their row numbers are moved.
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
RESIDUAL_COLUMN = 11  # K: x, L: y of the residuals
RESIDUAL_SHARE = 0.36  # of the rows of both charts
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
    """Puts the charts of each record on the Records tab."""

    def __init__(self, sheet: Worksheet, time_unit: str, temperature_unit: str) -> None:
        self.sheet = sheet
        self.units = (time_unit, temperature_unit)
        self._origin: RecordArea | None = None
        self._patterns: tuple[str, str] = ("", "")

    def add(self, area: RecordArea, titles: Sequence[str]) -> None:
        """Draw the record of one block and its residuals; titles: of its four lines."""
        if self._origin is None:
            drawn = build(self.sheet, area, titles, *self.units), build_residuals(self.sheet, area, self.units[0])
            self._origin, self._patterns = area, (_text(drawn[0]), _text(drawn[1]))
        split = area.bottom - round(RESIDUAL_SHARE * (area.bottom - area.top))
        for pattern, top, bottom in zip(self._patterns, (area.top, split + 1), (split, area.bottom), strict=True):
            self._place(pattern, area.first - self._origin.first, top, bottom)

    def _place(self, pattern: str, offset: int, top: int, bottom: int) -> None:
        chart = RecordChart()
        chart.part = _ROW.sub(lambda match: str(int(match[1]) + offset), pattern).encode()
        chart.anchor = TwoCellAnchor(
            editAs="oneCell", _from=AnchorMarker(col=2, row=top - 1), to=AnchorMarker(col=6, row=bottom)
        )
        self.sheet._charts.append(chart)


def _text(chart: ScatterChart) -> str:
    return str(tostring(chart._write()).decode())


def build(
    sheet: Worksheet, area: RecordArea, titles: Sequence[str], time_unit: str, temperature_unit: str
) -> ScatterChart:
    """The chart of one record as openpyxl builds it."""
    chart = _plain(("", f"Temperature, {temperature_unit}"), ("0", "0.0"))  # the chart below names the time
    last = area.first + area.rows - 1
    chart.series = [_dots(sheet, (1, 2), area.first, last, "Readings", "circle")]
    for number, (title, stroke) in enumerate(zip(titles, STROKES, strict=True)):
        chart.series.append(_line(sheet, area.helper + 2 * number, title, *stroke))
    chart.legend.position = "b"
    chart.legend.txPr = _small()
    chart.layout = Layout(manualLayout=ManualLayout(xMode="edge", yMode="edge", x=0.09, y=0.04, w=0.88, h=0.74))
    return chart


def build_residuals(sheet: Worksheet, area: RecordArea, time_unit: str) -> ScatterChart:
    """What fore- and after-period leave over from their drift lines, in mK: a thousand times enlarged."""
    chart = _plain((f"Time, {time_unit}", "Residual, mK"), ("0", "0.0"))
    last = area.first + area.rows - 1
    columns = (RESIDUAL_COLUMN, RESIDUAL_COLUMN + 1)
    chart.series = [_dots(sheet, columns, area.first, last, "Residuals of both drift lines", "diamond")]
    chart.x_axis.tickLblPos = "low"
    chart.legend = None
    chart.layout = Layout(manualLayout=ManualLayout(xMode="edge", yMode="edge", x=0.09, y=0.06, w=0.88, h=0.66))
    return chart


def _plain(titles: tuple[str, str], formats: tuple[str, str]) -> ScatterChart:
    """A chart with our axes; titles and number formats: of x and y."""
    chart = ScatterChart(style=None)
    chart.scatterStyle = "lineMarker"
    for axis, title, shown in zip((chart.x_axis, chart.y_axis), titles, formats, strict=True):
        axis.title = title or None
        axis.delete = False
        axis.number_format = shown
        axis.majorTickMark = "out"
        axis.txPr = _small()
        if title:
            axis.title.tx.rich.p[0].pPr = ParagraphProperties(defRPr=CharacterProperties(sz=800, b=False))
        axis.graphicalProperties = GraphicalProperties(ln=LineProperties(solidFill=INK, w=9525))
    chart.x_axis.majorGridlines = None
    chart.y_axis.majorGridlines.spPr = GraphicalProperties(ln=LineProperties(solidFill="D5DCDA", w=6350))
    chart.graphical_properties = GraphicalProperties(ln=LineProperties(solidFill=SOFT, w=6350))
    chart.visible_cells_only = False
    return chart


def _dots(sheet: Worksheet, columns: tuple[int, int], first: int, last: int, title: str, symbol: str) -> Series:
    """Markers without a line; columns: of x and y."""
    series = Series(
        Reference(sheet, min_col=columns[1], min_row=first, max_row=last),
        Reference(sheet, min_col=columns[0], min_row=first, max_row=last),
        title=title,
    )
    series.marker.symbol, series.marker.size = symbol, 4
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
