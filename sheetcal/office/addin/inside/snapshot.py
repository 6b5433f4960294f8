"""The copy of an open document as a small .xlsx: cells, formulas, names and properties.

Looks are not carried, but for dates, whose format here hides nothing: the checker is told nothing it could accuse.
"""

from __future__ import annotations

import io
import zipfile
from collections.abc import Iterator, Sequence
from xml.sax.saxutils import quoteattr

from sheetcal.office.addin.inside.reading import Copy
from sheetcal.office.addin.inside.sheetxml import MAIN, clean, text_of, worksheet

HEAD = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'
OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006"
PACKAGE = "http://schemas.openxmlformats.org/package/2006"
TYPES = "application/vnd.openxmlformats-officedocument"
STYLES = (
    f'{HEAD}<styleSheet xmlns="{MAIN}">'
    '<numFmts count="1"><numFmt numFmtId="164" formatCode="yyyy-mm-dd hh:mm"/></numFmts>'
    '<cellXfs count="3"><xf numFmtId="0"/><xf numFmtId="164"/>'
    '<xf numFmtId="0" applyProtection="1"><protection locked="0"/></xf></cellXfs></styleSheet>'
)
CORE = ("title", "creator", "subject", "description")
DUBLIN = "http://purl.org/dc/elements/1.1/"
VT = f"{OFFICE}/docPropsVTypes"
FORMAT_ID = "{D5CDD505-2E9C-101B-9397-08002B2CF9AE}"
STATES = {True: "visible", False: "hidden"}


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
    listed.append((f"{OFFICE}/relationships/styles", "styles.xml"))
    yield "xl/_rels/workbook.xml.rels", _relations(listed, copy.outside)
    yield "xl/styles.xml", STYLES
    for name, tab in zip(sheets, copy.tabs):
        yield name, HEAD + worksheet(tab)
    if copy.macros:
        yield "xl/vbaProject.bin", "left where it is"  # the name says that there were macros
    for number in range(1, copy.embedded + 1):
        yield f"xl/embeddings/object{number}.bin", "left where it is"


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


def _relations(listed: list[tuple[str, str]], outside: Sequence[str] = ()) -> str:
    rows = "".join(f'<Relationship Id="r{n}" Type="{sort}" Target="{to}"/>' for n, (sort, to) in enumerate(listed, 1))
    rows += "".join(
        f'<Relationship Id="x{number}" Type="{OFFICE}/relationships/externalLinkPath" Target={quoteattr(clean(to))}'
        ' TargetMode="External"/>'
        for number, to in enumerate(outside, 1)
    )
    return f'{HEAD}<Relationships xmlns="{PACKAGE}/relationships">{rows}</Relationships>'


def _core(properties: dict[str, str]) -> str:
    rows = "".join(f"<dc:{name}>{text_of(properties[name])}</dc:{name}>" for name in CORE if name in properties)
    space = f"{PACKAGE}/metadata/core-properties"
    return f'{HEAD}<cp:coreProperties xmlns:cp="{space}" xmlns:dc="{DUBLIN}">{rows}</cp:coreProperties>'


def _custom(properties: dict[str, str]) -> str:
    rows = "".join(
        f'<property fmtid="{FORMAT_ID}" pid="{number}" name={quoteattr(clean(name))}>'
        f"<vt:lpwstr>{text_of(text)}</vt:lpwstr></property>"
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
        yield f"<definedName name={quoteattr(name)}>{text_of(text)}</definedName>"
    for index, tab in enumerate(copy.tabs):
        for name, text in tab.names.items():
            yield f'<definedName name={quoteattr(name)} localSheetId="{index}">{text_of(text)}</definedName>'


def _settings(copy: Copy) -> str:
    mode = "auto" if copy.automatic else "manual"
    precision = ' fullPrecision="0"' if copy.as_shown else ""
    iterates = ' iterate="1"' if copy.iterates else ""
    return f'<calcPr calcMode="{mode}"{precision}{iterates}/>'
