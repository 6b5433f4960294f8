"""The copy of an open document as a small .xlsx: cells, formulas, names and properties, no looks."""

from __future__ import annotations

import io
import zipfile
from collections.abc import Iterator
from typing import Any
from xml.sax.saxutils import escape, quoteattr

from sheetcal.office.addin.inside.reading import Copy, Tab
from sheetcal.office.addin.inside.spelling import column_letters, xlsx_spelling

HEAD = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'
MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006"
PACKAGE = "http://schemas.openxmlformats.org/package/2006"
TYPES = "application/vnd.openxmlformats-officedocument"
DATE_STYLE = 1
STYLES = (
    f'{HEAD}<styleSheet xmlns="{MAIN}"><cellXfs count="2"><xf numFmtId="0"/><xf numFmtId="14"/></cellXfs></styleSheet>'
)
CORE = ("title", "creator", "subject", "description")
DUBLIN = "http://purl.org/dc/elements/1.1/"
VT = f"{OFFICE}/docPropsVTypes"
FORMAT_ID = "{D5CDD505-2E9C-101B-9397-08002B2CF9AE}"
STATES = {True: "visible", False: "hidden"}
TRUTHS = {"TRUE": "1", "FALSE": "0"}


def workbook(copy: Copy) -> bytes:
    """The bytes of the .xlsx."""
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED, compresslevel=1) as package:
        for name, text in _parts(copy):
            package.writestr(name, text)
    return stream.getvalue()


def _parts(copy: Copy) -> Iterator[tuple[str, str]]:
    sheets = [f"xl/worksheets/sheet{number}.xml" for number in range(1, len(copy.tabs) + 1)]
    yield "[Content_Types].xml", _content_types(sheets)
    yield (
        "_rels/.rels",
        _relations(
            [
                (f"{OFFICE}/relationships/officeDocument", "xl/workbook.xml"),
                (f"{PACKAGE}/relationships/metadata/core-properties", "docProps/core.xml"),
                (f"{OFFICE}/relationships/custom-properties", "docProps/custom.xml"),
            ]
        ),
    )
    yield "docProps/core.xml", _core(copy.properties)
    yield "docProps/custom.xml", _custom(copy.properties)
    yield "xl/workbook.xml", _workbook(copy)
    listed = [(f"{OFFICE}/relationships/worksheet", name[3:]) for name in sheets]
    yield "xl/_rels/workbook.xml.rels", _relations([*listed, (f"{OFFICE}/relationships/styles", "styles.xml")])
    yield "xl/styles.xml", STYLES
    for name, tab in zip(sheets, copy.tabs):
        yield name, _sheet(tab)


def _content_types(sheets: list[str]) -> str:
    kinds = {
        "xl/workbook.xml": f"{TYPES}.spreadsheetml.sheet.main+xml",
        "xl/styles.xml": f"{TYPES}.spreadsheetml.styles+xml",
        "docProps/core.xml": "application/vnd.openxmlformats-package.core-properties+xml",
        "docProps/custom.xml": f"{TYPES}.custom-properties+xml",
        **dict.fromkeys(sheets, f"{TYPES}.spreadsheetml.worksheet+xml"),
    }
    rows = "".join(f'<Override PartName="/{name}" ContentType="{kind}"/>' for name, kind in kinds.items())
    defaults = '<Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/>'
    return f'{HEAD}<Types xmlns="{PACKAGE}/content-types">{defaults}{rows}</Types>'


def _relations(listed: list[tuple[str, str]]) -> str:
    rows = "".join(f'<Relationship Id="r{n}" Type="{sort}" Target="{to}"/>' for n, (sort, to) in enumerate(listed, 1))
    return f'{HEAD}<Relationships xmlns="{PACKAGE}/relationships">{rows}</Relationships>'


def _core(properties: dict[str, str]) -> str:
    rows = "".join(f"<dc:{name}>{_text(properties[name])}</dc:{name}>" for name in CORE if name in properties)
    space = f"{PACKAGE}/metadata/core-properties"
    return f'{HEAD}<cp:coreProperties xmlns:cp="{space}" xmlns:dc="{DUBLIN}">{rows}</cp:coreProperties>'


def _custom(properties: dict[str, str]) -> str:
    rows = "".join(
        f'<property fmtid="{FORMAT_ID}" pid="{number}" name={quoteattr(_clean(name))}>'
        f"<vt:lpwstr>{_text(text)}</vt:lpwstr></property>"
        for number, (name, text) in enumerate(properties.items(), 2)
        if name not in CORE
    )
    return f'{HEAD}<Properties xmlns="{OFFICE}/custom-properties" xmlns:vt="{VT}">{rows}</Properties>'


def _workbook(copy: Copy) -> str:
    sheets = "".join(
        f'<sheet name={quoteattr(tab.name)} sheetId="{number}" state="{STATES[tab.visible]}" r:id="r{number}"/>'
        for number, tab in enumerate(copy.tabs, 1)
    )
    names = "".join(_defined(copy))
    start = ' date1904="1"' if copy.date1904 else ""
    return (
        f'{HEAD}<workbook xmlns="{MAIN}" xmlns:r="{OFFICE}/relationships"><workbookPr{start}/>'
        f"<sheets>{sheets}</sheets><definedNames>{names}</definedNames>{_settings(copy)}</workbook>"
    )


def _defined(copy: Copy) -> Iterator[str]:
    for name, text in copy.names.items():
        yield f"<definedName name={quoteattr(name)}>{_text(text)}</definedName>"
    for index, tab in enumerate(copy.tabs):
        for name, text in tab.names.items():
            yield f'<definedName name={quoteattr(name)} localSheetId="{index}">{_text(text)}</definedName>'


def _settings(copy: Copy) -> str:
    mode = "auto" if copy.automatic else "manual"
    precision = ' fullPrecision="0"' if copy.as_shown else ""
    iterates = ' iterate="1"' if copy.iterates else ""
    return f'<calcPr calcMode="{mode}"{precision}{iterates}/>'


def _sheet(tab: Tab) -> str:
    dates = {
        (column, row)
        for first, top, last, bottom in tab.dates
        for column in range(first, last + 1)
        for row in range(top, bottom + 1)
    }
    rows = "".join(_rows(tab, dates))
    protection = '<sheetProtection sheet="1" objects="1" scenarios="1"/>' if tab.protected else ""
    return f'{HEAD}<worksheet xmlns="{MAIN}"><sheetData>{rows}</sheetData>{protection}</worksheet>'


def _rows(tab: Tab, dates: set[tuple[int, int]]) -> Iterator[str]:
    letters = [column_letters(index) for index in range(len(tab.values[0]) if tab.values else 0)]
    for row, (values, formulas) in enumerate(zip(tab.values, tab.formulas)):
        cells = "".join(
            _cell(f"{letters[column]}{row + 1}", value, formula, (column, row) in dates, tab.errors.get((column, row)))
            for column, (value, formula) in enumerate(zip(values, formulas))
            if formula
        )
        if cells:
            yield f'<row r="{row + 1}">{cells}</row>'


def _cell(ref: str, value: Any, text: str, is_date: bool, error: str | None) -> str:
    if text.startswith(("=", "{=")):
        return _computed(ref, value, text, error)
    if isinstance(value, str):
        return f'<c r="{ref}" t="inlineStr"><is><t xml:space="preserve">{_text(value)}</t></is></c>'
    if text in TRUTHS:
        return f'<c r="{ref}" t="b"><v>{TRUTHS[text]}</v></c>'
    style = f' s="{DATE_STYLE}"' if is_date else ""
    return f'<c r="{ref}"{style}><v>{value!r}</v></c>'


def _computed(ref: str, value: Any, text: str, error: str | None) -> str:
    array = f' t="array" ref="{ref}"' if text.startswith("{") else ""
    inner = text[2:-1] if array else text[1:]
    formula = f"<f{array}>{_text(xlsx_spelling(inner))}</f>"
    if error is not None:
        return f'<c r="{ref}" t="e">{formula}<v>{error}</v></c>'
    if isinstance(value, str):
        return f'<c r="{ref}" t="str">{formula}<v>{_text(value)}</v></c>'
    return f'<c r="{ref}">{formula}<v>{value!r}</v></c>'


def _text(text: str) -> str:
    return escape(_clean(text))


def _clean(text: str) -> str:
    """Without the characters XML cannot hold."""
    return "".join(one for one in text if one >= " " or one in "\t\n\r") if not text.isprintable() else text
