"""Slips of the eye: white text, formats that hide, a filter, a picture laid over readings, names of the constants."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator

from sheetcal.kinds.layout import column_letter
from sheetcal.model import Place
from sheetcal.planting.package import Parts, change_part, sheet_part
from sheetcal.planting.registry import Spot, Structure, slip
from sheetcal.planting.sheet import Sheet

STYLES, BOOK = "xl/styles.xml", "xl/workbook.xml"
DRAWING = "http://schemas.openxmlformats.org/drawingml/2006/spreadsheetDrawing"
CORNER = "<{0}><col>{1}</col><colOff>0</colOff><row>{2}</row><rowOff>0</rowOff></{0}>"
Look = Callable[[str], str]


def _restyled(place: Place, add: Callable[[Parts], Look]) -> Structure:
    """The look of one cell changed: a new cell style beside the others, the cell's own as far as nothing is said."""

    def change(parts: Parts) -> None:
        look = add(parts)
        part, cell = sheet_part(place.tab), place.cell.partition(":")[0]
        own = re.search(rf'<c r="{cell}"[^>]*? s="(\d+)"', parts[part].decode("utf-8"))
        assert own is not None, place.where
        inside = re.search(r"<cellXfs[^>]*>(.*?)</cellXfs>", parts[STYLES].decode("utf-8"), re.S)
        assert inside is not None
        listed = re.findall(r"<xf [^>]*?/>|<xf .*?</xf>", inside[1], re.S)
        new = look(listed[int(own[1])])
        change_part(parts, STYLES, lambda xml: xml.replace("</cellXfs>", f"{new}</cellXfs>"))
        dressed = f'<c r="{cell}" s="{len(listed)}"'
        change_part(parts, part, lambda xml: re.sub(rf'<c r="{cell}"([^>]*?) s="\d+"', rf"{dressed}\1", xml, count=1))

    return change


def _in_white(parts: Parts) -> Look:
    """A font in white; returns what a style becomes with it."""
    count = len(re.findall(r"<font>|<font ?/>", parts[STYLES].decode("utf-8").partition("</fonts>")[0]))
    white = '<font><name val="Arial"/><color rgb="FFFFFFFF"/><sz val="10"/></font></fonts>'
    change_part(parts, STYLES, lambda xml: xml.replace("</fonts>", white, 1))
    return lambda style: re.sub(r'fontId="\d+"', f'fontId="{count}"', style)


def _in_format(code: str) -> Callable[[Parts], Look]:
    def add(parts: Parts) -> Look:
        new = f'<numFmt numFmtId="990" formatCode="{code}"/></numFmts>'
        change_part(parts, STYLES, lambda xml: xml.replace("</numFmts>", new, 1))
        return lambda style: re.sub(r'numFmtId="\d+"', 'numFmtId="990"', style)

    return add


def _numbers(sheet: Sheet) -> Iterator[Place]:
    """Readings and results that are numbers with decimals, one cell each."""
    for role in ("reading", "result"):
        for place in sheet.places(role, "number"):
            if not place.field.series and place.field.resolution is not None and place.field.resolution < 0.1:
                yield place


@slip("cells-hidden")
def text_in_white(sheet: Sheet) -> Iterator[Spot]:
    """A figure in white, so that it does not print."""
    for place in _numbers(sheet):
        yield Spot(place.id, structure=_restyled(place, _in_white), cause=("coloured",))


@slip("format-altered")
def decimals_taken_away(sheet: Sheet) -> Iterator[Spot]:
    """The button that shows fewer decimals, pressed too often."""
    for place in _numbers(sheet):
        yield Spot(place.id, structure=_restyled(place, _in_format("0")), cause=("formatted by hand",))


@slip("format-altered")
def sign_hidden_by_a_format(sheet: Sheet) -> Iterator[Spot]:
    """Negative numbers in red, without their sign."""
    for place in _numbers(sheet):
        decimals = f"{place.field.resolution:.10f}".rstrip("0").partition(".")[2]
        code = f"0.{'0' * len(decimals)};[Red]0.{'0' * len(decimals)}"
        yield Spot(place.id, structure=_restyled(place, _in_format(code)), cause=("formatted by hand",))


@slip("filter-on")
def filter_switched_on(sheet: Sheet) -> Iterator[Spot]:
    """A filter over the table of readings."""

    def add(parts: Parts) -> None:
        part = sheet_part("Readings")
        change_part(parts, part, lambda xml: re.sub(r"(<sheetProtection[^>]*/>)", r'\1<autoFilter ref="A3:H9"/>', xml))

    if any(place.tab == "Readings" for place in sheet.plan.places.values()):
        yield Spot("Readings", structure=add)


@slip("object-over-cells", kinds=("fuel", "calibration"))
def box_laid_over_a_record(sheet: Sheet) -> Iterator[Spot]:
    """A text box among the charts of the records, over the readings beside them."""
    for place in sheet.places("reading"):
        if place.tab == "Records" and place.field.series:
            yield Spot(f"Records!{column_letter(place.column)}{place.row + 2}", structure=_box(place))


def _box(place: Place) -> Structure:
    column, row = place.column - 1, place.row + 1
    corners = CORNER.format("from", column, row) + CORNER.format("to", column, row + 2)
    box = f'<twoCellAnchor xmlns="{DRAWING}">{corners}<sp macro=""/><clientData/></twoCellAnchor></'

    def add(parts: Parts) -> None:
        links = parts["xl/worksheets/_rels/" + sheet_part("Records").rpartition("/")[2] + ".rels"].decode("utf-8")
        name = re.search(r"drawings/(drawing\d+\.xml)", links)
        assert name is not None
        part = f"xl/drawings/{name[1]}"
        change_part(parts, part, lambda xml: box.join(xml.rsplit("</", 1)))

    return add


@slip("constant-altered")
def name_pointed_elsewhere(sheet: Sheet) -> Iterator[Spot]:
    """The name of a constant given to the cell of the next one."""
    for name, where, cell in _names(sheet):
        other = re.sub(r"\d+$", lambda row: str(int(row[0]) + 1), where)
        structure = _name(f">{where}<", f">{other}<", name)
        yield Spot(f"Constants!{cell}", structure=structure, cause=("list of names",))


@slip("constant-altered")
def name_made_again_for_one_tab(sheet: Sheet) -> Iterator[Spot]:
    """The same name a second time, for `Results` alone, with another cell."""
    for name, where, cell in _names(sheet):
        other = re.sub(r"\d+$", lambda row: str(int(row[0]) + 1), where)
        local = f'<definedName name="{name}" localSheetId="3">{other}</definedName></definedNames>'

        def add(parts: Parts, local: str = local) -> None:
            change_part(parts, BOOK, lambda xml: xml.replace("</definedNames>", local))

        yield Spot(f"Constants!{cell}", structure=add, cause=("one tab only",))


def _names(sheet: Sheet) -> Iterator[tuple[str, str, str]]:
    """(name, where it points, cell) of the constants that are one cell each."""
    for name, where in sheet.plan.names.items():
        if ":" not in where:
            yield name, where, where.partition("!")[2].replace("$", "")


def _name(old: str, new: str, name: str) -> Structure:
    """One defined name changed, the others left."""

    def change(parts: Parts) -> None:
        pattern = rf'(<definedName name="{name}"[^>]*){re.escape(old)}'
        change_part(parts, BOOK, lambda xml: re.sub(pattern, lambda found: found[1] + new, xml, count=1))

    return change
