"""The looks of cells: our own palette, chosen so that every difference also prints in grey."""

from __future__ import annotations

from dataclasses import dataclass, replace

from openpyxl.styles import Alignment, Border, Font, PatternFill, Protection, Side
from openpyxl.styles.differential import DifferentialStyle
from openpyxl.styles.styleable import StyleableObject
from openpyxl.workbook import Workbook

INK = "1C2B33"
DEEP = "234E52"
SOFT = "5A6B6E"
PALE = "E9F1EF"
SAND = "F3F0E8"
LINE = "8FA3A0"
FONT = "Arial"  # its metric twins are installed everywhere, so widths hold on every machine
SIZE = 10


@dataclass(frozen=True)
class Look:
    """How one sort of cell looks; `frame` is none, hair, box, bold or head."""

    size: float = SIZE
    bold: bool = False
    italic: bool = False
    ink: str = INK
    ground: str = ""
    frame: str = "none"
    align: str = "left"
    middle: bool = True
    wrap: bool = False
    open: bool = False
    inset: bool = False
    shrink: bool = False


LOOKS: dict[str, Look] = {
    "title": Look(16, bold=True, ink=DEEP, wrap=True),
    "under": Look(ink=SOFT, wrap=True),
    "note": Look(8.5, italic=True, ink=SOFT, wrap=True),
    "block": Look(11, bold=True, ink=DEEP, frame="head"),
    "block_inset": Look(11, bold=True, ink=DEEP, frame="head", inset=True),
    "block_right": Look(10, bold=True, ink=DEEP, frame="head", align="right"),
    "block_head": Look(8.5, italic=True, ink=SOFT, frame="head", wrap=True),
    "head": Look(9, bold=True, ink=DEEP, align="center", frame="hair", wrap=True),
    "number": Look(8.5, ink=SOFT, align="right"),
    "label": Look(wrap=True, frame="hair"),
    "label_bold": Look(bold=True, wrap=True, frame="hair"),
    "unit": Look(9, ink=SOFT, frame="hair", shrink=True),
    "allowed": Look(8.5, ink=SOFT, wrap=True, frame="hair"),
    "function": Look(8, ink=SOFT, frame="hair", shrink=True),
    "input": Look(frame="box", align="right", open=True),
    "input_moment": Look(8, frame="box", align="right", open=True),
    "input_text": Look(frame="box", wrap=True, open=True),
    "given": Look(ground=SAND, frame="hair", align="right"),
    "given_moment": Look(8, ground=SAND, frame="hair", align="right"),
    "given_text": Look(ground=SAND, frame="hair", wrap=True),
    "result": Look(ground=PALE, frame="hair", align="right"),
    "result_text": Look(9, ground=PALE, frame="hair", wrap=True),
    "reported": Look(11, bold=True, ground=PALE, frame="bold", align="right"),
    "glance_warning": Look(9, bold=True, ground=PALE, frame="hair", align="center"),
    "look": Look(8, bold=True, frame="bold", wrap=True),
    "warn": Look(9.5, wrap=True, middle=False, inset=True),
    "legend": Look(9, wrap=True, inset=True),
    "legend_box": Look(9, frame="box"),
    "legend_hatch": Look(9, frame="hair", ground="lightUp"),
    "legend_idle": Look(9, frame="hair", ground="EDEFEE"),
    "legend_warn": Look(9, bold=True, frame="box", ground="gray125"),
    "legend_stop": Look(9, bold=True, ink="FFFFFF", ground="000000", frame="box"),
    "cell_text": Look(9, frame="hair", wrap=True, middle=False),
    "cell_bold": Look(9, bold=True, frame="hair", wrap=True, middle=False),
    "cell_value": Look(9, frame="hair", ground=SAND, align="right", middle=False),
    "cell_given": Look(9, frame="hair", ground=SAND, wrap=True, middle=False),
    "cell_head": Look(9, bold=True, ink=DEEP, ground=PALE, frame="hair", wrap=True),
    "helper": Look(7.5, ink=LINE),
    "raw": Look(9),
}


class Looks:
    """Style numbers of one workbook: each pair of look and number format is registered once."""

    def __init__(self, workbook: Workbook) -> None:
        self._sheet = workbook.worksheets[0]
        self._numbers: dict[tuple[str, str, float], int] = {}
        normal = workbook._named_styles["Normal"]
        normal.font = Font(name=FONT, size=SIZE, color=INK)
        normal.bind(workbook)
        workbook._fonts[0] = normal.font

    def __call__(self, look: str, number_format: str = "General", largest: float = 16) -> int:
        """The style number of a look with a number format, its letters no larger than `largest` points."""
        key = (look, number_format, largest)
        if key not in self._numbers:
            found = LOOKS[look]
            self._numbers[key] = self._register(replace(found, size=min(found.size, largest)), number_format)
        return self._numbers[key]

    def _register(self, look: Look, number_format: str) -> int:
        cell = StyleableObject(self._sheet)
        cell.font = Font(name=FONT, size=look.size, bold=look.bold, italic=look.italic, color=look.ink)
        if look.ground in ("lightUp", "gray125"):
            cell.fill = PatternFill(look.ground, fgColor=SOFT, bgColor="FFFFFF")
        elif look.ground:
            cell.fill = PatternFill("solid", fgColor=look.ground)
        cell.border = _border(look.frame)
        vertical = "center" if look.middle else "top"
        framed = look.frame in _INSET and look.align == "left"
        indent = 1 if framed or look.inset else 0  # text does not touch its frame
        cell.alignment = Alignment(
            look.align, vertical, wrap_text=look.wrap or None, shrink_to_fit=look.shrink or None, indent=indent
        )
        cell.protection = Protection(locked=not look.open)
        cell.number_format = number_format
        return int(cell.style_id)


_INSET = ("hair", "box", "bold")


def _border(frame: str) -> Border:
    if frame == "head":
        return Border(bottom=Side("medium", color=DEEP))
    if frame == "none":
        return Border()
    side = {
        "hair": Side("hair", color=LINE),
        "box": Side("thin", color=INK),
        "bold": Side("medium", color=INK),
    }[frame]
    return Border(left=side, right=side, top=side, bottom=side)


def missing_mark() -> DifferentialStyle:
    """A required reading that is still empty although its block was begun: shaded."""
    return DifferentialStyle(fill=PatternFill("lightUp", fgColor=SOFT, bgColor="FFFFFF"))


def outside_mark() -> DifferentialStyle:
    """A value outside its usual range: bold on dots in a frame."""
    side = Side("thin", color="000000")
    return DifferentialStyle(
        font=Font(bold=True),
        fill=PatternFill("gray125", fgColor=INK, bgColor="FFFFFF"),
        border=Border(left=side, right=side, top=side, bottom=side),
    )


def stop_mark() -> DifferentialStyle:
    """A line that begins with STOP: white on black."""
    return DifferentialStyle(font=Font(bold=True, color="FFFFFF"), fill=PatternFill("solid", bgColor="FF000000"))


def look_mark() -> DifferentialStyle:
    """Any other line that asks for attention: bold on dots."""
    return DifferentialStyle(font=Font(bold=True), fill=PatternFill("gray125", fgColor=INK, bgColor="FFFFFF"))


def idle_mark() -> DifferentialStyle:
    """A line that does not apply under the choice made, or a run still planned: grey on grey."""
    side = Side("hair", color=LINE)  # no frame: nothing is asked for here
    return DifferentialStyle(
        font=Font(color="8A9694"),
        fill=PatternFill("solid", bgColor="FFEDEFEE"),
        border=Border(left=side, right=side, top=side, bottom=side),
    )


def void_mark() -> DifferentialStyle:
    """A run that is void: struck through."""
    return DifferentialStyle(font=Font(strike=True, color=SOFT))
