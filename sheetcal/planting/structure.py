"""Slips with the workbook as a whole: tabs, protection, settings, hidden and merged cells, foreign parts."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator

from sheetcal.planting.package import Parts, change_part, sheet_part
from sheetcal.planting.registry import Spot, Structure, slip
from sheetcal.planting.sheet import Sheet

BOOK, TYPES, RELATIONS = "xl/workbook.xml", "[Content_Types].xml", "xl/_rels/workbook.xml.rels"
OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"


def _in(part: str, old: str, new: str) -> Structure:
    """One text in one part replaced, once."""
    return lambda parts: change_part(parts, part, lambda xml: xml.replace(old, new, 1))


def _by(part: str, pattern: str, new: str | Callable[[re.Match[str]], str]) -> Structure:
    """One pattern in one part replaced, once."""
    return lambda parts: change_part(parts, part, lambda xml: re.sub(pattern, new, xml, count=1, flags=re.S))


def _tabs(sheet: Sheet) -> list[str]:
    """Tabs with something on them that the sheet's kind uses."""
    used = {place.tab for place in sheet.plan.places.values()}
    return [
        tab for tab in ("Front", "Readings", "Records", "Results", "Constants") if tab in used or tab == "Constants"
    ]


@slip("tab-missing")
def tab_renamed(sheet: Sheet) -> Iterator[Spot]:
    """`Readings` called `Readings old`."""
    for tab in _tabs(sheet):
        yield Spot(tab, structure=_in(BOOK, f'name="{tab}"', f'name="{tab} old"'))


@slip("tab-added")
def tab_added(sheet: Sheet) -> Iterator[Spot]:
    """Own sums on an own tab."""

    def add(parts: Parts) -> None:
        parts["xl/worksheets/sheet99.xml"] = (
            b'<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><sheetData/></worksheet>'
        )
        kind = "application/vnd.openxmlformats-officedocument.spreadsheetml.worksheet+xml"
        override = f'<Override PartName="/xl/worksheets/sheet99.xml" ContentType="{kind}"/></Types>'
        _in(TYPES, "</Types>", override)(parts)
        link = f'<Relationship Id="rId99" Type="{OFFICE}/worksheet" Target="worksheets/sheet99.xml"/></Relationships>'
        _in(RELATIONS, "</Relationships>", link)(parts)
        _in(BOOK, "</sheets>", '<sheet name="My sums" sheetId="99" r:id="rId99"/></sheets>')(parts)

    yield Spot("My sums", structure=add)


@slip("cells-hidden")
def tab_hidden(sheet: Sheet) -> Iterator[Spot]:
    """A tab that nobody sees."""
    for tab in _tabs(sheet):
        if f'name="{tab}" sheetId="{_number(tab)}" state="visible"' in sheet.parts[BOOK].decode("utf-8"):
            old = f'name="{tab}" sheetId="{_number(tab)}" state="visible"'
            yield Spot(tab, structure=_in(BOOK, old, old.replace("visible", "hidden")))


def _number(tab: str) -> str:
    return re.sub(r"\D", "", sheet_part(tab))


@slip("cells-hidden")
def row_hidden(sheet: Sheet) -> Iterator[Spot]:
    """A row with readings or results out of sight."""
    for tab in ("Front", "Readings", "Results"):
        rows = dict.fromkeys(place.row for place in sheet.plan.places.values() if place.tab == tab)
        for row in rows:
            first = next(place for place in sheet.plan.places.values() if (place.tab, place.row) == (tab, row))
            yield Spot(first.where, structure=_in(sheet_part(tab), f'<row r="{row}"', f'<row r="{row}" hidden="1"'))


@slip("cells-hidden")
def column_hidden(sheet: Sheet) -> Iterator[Spot]:
    """A column of a run out of sight."""
    for tab in ("Readings", "Results"):
        places = [place for place in sheet.plan.places.values() if place.tab == tab]
        for column in dict.fromkeys(place.column for place in places):
            first = next(place for place in places if place.column == column)
            old = f'min="{column}" max="{column}"'
            if old in sheet.parts[sheet_part(tab)].decode("utf-8"):
                yield Spot(first.where, structure=_in(sheet_part(tab), old, f'hidden="1" {old}'))


@slip("cells-merged")
def cells_merged(sheet: Sheet) -> Iterator[Spot]:
    """Two cells of readings or results made one."""
    for place in sheet.plan.places.values():
        beside = (
            sheet.plan.at.get((place.tab, f"{chr(64 + place.column + 1)}{place.row}")) if place.column < 26 else None
        )
        if place.tab in ("Readings", "Results") and beside is not None and beside.field.key == place.field.key:
            merge = f'<mergeCell ref="{place.cell}:{beside.cell}"/></mergeCells>'
            yield Spot(beside.where, structure=_in(sheet_part(place.tab), "</mergeCells>", merge))


@slip("protection-off")
def protection_switched_off(sheet: Sheet) -> Iterator[Spot]:
    """A tab unprotected, and left so."""
    for tab in _tabs(sheet):
        yield Spot(tab, structure=_by(sheet_part(tab), r"<sheetProtection[^>]*/>", ""))


@slip("cell-unlocked")
def result_unlocked(sheet: Sheet) -> Iterator[Spot]:
    """A result given the look, and with it the lock, of a reading."""
    for place in sheet.places("result", "number"):
        open_cell = next(one for one in sheet.places("reading", "number") if one.tab == "Readings")
        style = re.search(rf'<c r="{open_cell.cell}" s="(\d+)"', sheet.parts[sheet_part("Readings")].decode("utf-8"))
        assert style is not None
        pattern = rf'<c r="{place.cell}" s="\d+"'
        yield Spot(place.id, structure=_by(sheet_part(place.tab), pattern, f'<c r="{place.cell}" s="{style[1]}"'))


@slip("calculation-as-displayed")
def figures_as_displayed(sheet: Sheet) -> Iterator[Spot]:
    """`Precision as shown` switched on."""
    yield Spot("", structure=_in(BOOK, "<calcPr ", '<calcPr fullPrecision="0" '))


@slip("calculation-by-hand")
def calculation_by_hand(sheet: Sheet) -> Iterator[Spot]:
    """Calculation by hand, a setting taken over from another workbook."""
    yield Spot("", structure=_in(BOOK, "<calcPr ", '<calcPr calcMode="manual" '))


@slip("calculation-in-circles")
def iteration_on(sheet: Sheet) -> Iterator[Spot]:
    """Iteration switched on."""
    yield Spot("", structure=_in(BOOK, "<calcPr ", '<calcPr iterate="1" '))


@slip("calendar-of-1904")
def days_from_1904(sheet: Sheet) -> Iterator[Spot]:
    """The other calendar."""
    yield Spot("", structure=_by(BOOK, r"<workbookPr ?/>", '<workbookPr date1904="1"/>'))


@slip("macros-present")
def macros_added(sheet: Sheet) -> Iterator[Spot]:
    """Saved with macros."""

    def add(parts: Parts) -> None:
        parts["xl/vbaProject.bin"] = b"\xd0\xcf\x11\xe0 no program"
        kind = '<Default Extension="bin" ContentType="application/vnd.ms-office.vbaProject"/></Types>'
        _in(TYPES, "</Types>", kind)(parts)

    yield Spot("", structure=add)


@slip("outside-link")
def link_to_another_file(sheet: Sheet) -> Iterator[Spot]:
    """Cells pasted from another workbook, with a link to it."""

    def add(parts: Parts) -> None:
        parts["xl/externalLinks/externalLink1.xml"] = (
            b'<externalLink xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"/>'
        )
        kind = "application/vnd.openxmlformats-officedocument.spreadsheetml.externalLink+xml"
        override = f'<Override PartName="/xl/externalLinks/externalLink1.xml" ContentType="{kind}"/></Types>'
        _in(TYPES, "</Types>", override)(parts)
        outside = f'<Relationship Id="rId1" Type="{OFFICE}/externalLinkPath" Target="old.xlsx" TargetMode="External"/>'
        package = "http://schemas.openxmlformats.org/package/2006/relationships"
        links = f'<Relationships xmlns="{package}">{outside}</Relationships>'
        parts["xl/externalLinks/_rels/externalLink1.xml.rels"] = links.encode()
        target = f'Type="{OFFICE}/externalLink" Target="externalLinks/externalLink1.xml"'
        _in(RELATIONS, "</Relationships>", f'<Relationship Id="rId98" {target}/></Relationships>')(parts)
        _in(BOOK, "</sheets>", '</sheets><externalReferences><externalReference r:id="rId98"/></externalReferences>')(
            parts
        )

    yield Spot("", structure=add)


@slip("object-embedded")
def object_pasted(sheet: Sheet) -> Iterator[Spot]:
    """A document pasted in as an object."""

    def add(parts: Parts) -> None:
        parts["xl/embeddings/oleObject1.bin"] = b"nothing"
        kind = (
            '<Default Extension="bin" ContentType="application/vnd.openxmlformats-officedocument.oleObject"/></Types>'
        )
        _in(TYPES, "</Types>", kind)(parts)

    yield Spot("", structure=add)


@slip("record-missing")
def hidden_tab_deleted(sheet: Sheet) -> Iterator[Spot]:
    """The hidden tab deleted: not ours any more."""

    def drop(parts: Parts) -> None:
        _by(BOOK, r'<sheet name="Issue record"[^>]*/>', "")(parts)

    yield Spot("", structure=drop)


@slip("file-unreadable")
def file_cut_off(sheet: Sheet) -> Iterator[Spot]:
    """A copy that broke off half way."""

    yield Spot("", whole=lambda data: data[: len(data) // 2])


@slip("file-refused")
def part_with_entities(sheet: Sheet) -> Iterator[Spot]:
    """A part that declares entities, as files do that are built to do harm."""
    yield Spot("", structure=_by(BOOK, "<workbook ", '<!DOCTYPE w [<!ENTITY a "aa">]><workbook '))


@slip("file-before-issue")
def clock_of_another_year(sheet: Sheet) -> Iterator[Spot]:
    """Saved by a computer whose clock was a year behind."""
    core, when = "docProps/core.xml", r"(<dcterms:modified[^>]*>)[^<]*"
    yield Spot("", structure=_by(core, when, r"\g<1>2024-03-03T12:00:00Z"))


@slip("kind-unknown")
def kind_unknown(sheet: Sheet) -> Iterator[Spot]:
    """A kind that this installation does not have: the record says another name."""

    def rename(parts: Parts) -> None:
        name = sheet_part("Issue record")
        change_part(parts, name, lambda xml: xml.replace(f">{sheet.kind}<", ">soap-kettle<"))

    yield Spot("", structure=rename)
