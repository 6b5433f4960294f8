"""The bare workbook of a layout: formulas and names of the frozen kind, no value, no look.

LibreOffice keeps it open and gets the readings of one file after the other pushed into it, so nothing of a
submitted file may stand in it: of the shape only numbers enter, and names that the kind itself knows.
"""

from __future__ import annotations

import hashlib
import io
import zipfile
from collections.abc import Iterator
from xml.sax.saxutils import escape, quoteattr

from sheetcal.kinds.layout import Skeleton, column_letter
from sheetcal.model import TABS, Place

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
RELATIONS = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
PACKAGE = "http://schemas.openxmlformats.org/package/2006"
TYPES = "application/vnd.openxmlformats-officedocument.spreadsheetml"
HEAD = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'


def bare_key(plan: Skeleton) -> str:
    """What tells one bare workbook from another: kind, version, layout and where its names point."""
    names = "\n".join(f"{name} {where}" for name, where in _names(plan))
    digest = hashlib.sha256(f"{plan.sha256}\n{names}".encode()).hexdigest()
    return f"{plan.kind.name} {plan.kind.version} {digest}"


def bare_workbook(plan: Skeleton) -> bytes:
    """The workbook as .xlsx: every tab, every formula in its place, every name; all other cells empty."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED, compresslevel=1) as package:
        for name, text in _parts(plan):
            package.writestr(zipfile.ZipInfo(name), HEAD + text, zipfile.ZIP_DEFLATED)
    return buffer.getvalue()


def _parts(plan: Skeleton) -> Iterator[tuple[str, str]]:
    yield "[Content_Types].xml", _content_types()
    yield "_rels/.rels", _relations([("officeDocument", "xl/workbook.xml")])
    yield "xl/_rels/workbook.xml.rels", _relations([("worksheet", f"worksheets/{_file(tab)}") for tab in TABS])
    yield "xl/workbook.xml", _workbook(plan)
    for tab in TABS:
        yield f"xl/worksheets/{_file(tab)}", _worksheet(plan, tab)


def _file(tab: str) -> str:
    return f"sheet{TABS.index(tab) + 1}.xml"


def _content_types() -> str:
    parts = [("/xl/workbook.xml", "sheet.main")]
    parts += [(f"/xl/worksheets/{_file(tab)}", "worksheet") for tab in TABS]
    listed = "".join(f'<Override PartName="{name}" ContentType="{TYPES}.{sort}+xml"/>' for name, sort in parts)
    plain = "application/vnd.openxmlformats-package.relationships+xml"
    default = f'<Default Extension="rels" ContentType="{plain}"/><Default Extension="xml" ContentType="text/xml"/>'
    return f'<Types xmlns="{PACKAGE}/content-types">{default}{listed}</Types>'


def _relations(listed: list[tuple[str, str]]) -> str:
    links = "".join(
        f'<Relationship Id="rId{number}" Type="{RELATIONS}/{sort}" Target="{target}"/>'
        for number, (sort, target) in enumerate(listed, start=1)
    )
    return f'<Relationships xmlns="{PACKAGE}/relationships">{links}</Relationships>'


def _workbook(plan: Skeleton) -> str:
    sheets = "".join(
        f'<sheet name="{tab}" sheetId="{number}" r:id="rId{number}"/>' for number, tab in enumerate(TABS, start=1)
    )
    names = "".join(
        f"<definedName name={quoteattr(name)}>{escape(where)}</definedName>" for name, where in _names(plan)
    )
    return (
        f'<workbook xmlns="{MAIN}" xmlns:r="{RELATIONS}"><sheets>{sheets}</sheets>'
        f"<definedNames>{names}</definedNames></workbook>"
    )


def _names(plan: Skeleton) -> list[tuple[str, str]]:
    """Names the kind knows: a record may list others, and no formula of the kind can mean those."""
    known = set(plan.kind.constants)
    for table, columns in plan.kind.tables.items():
        known.update(f"{table}_{column.partition(':')[0]}" for column in columns)
    return [(name, where) for name, where in plan.names.items() if name in known]


def _worksheet(plan: Skeleton, tab: str) -> str:
    rows: dict[int, list[Place]] = {}
    for one in plan.places.values():
        if one.tab == tab and one.formula is not None:
            rows.setdefault(one.row, []).append(one)
    written = "".join(f'<row r="{row}">{_cells(rows[row])}</row>' for row in sorted(rows))
    return f'<worksheet xmlns="{MAIN}"><sheetData>{written}</sheetData></worksheet>'


def _cells(places: list[Place]) -> str:
    return "".join(
        f'<c r="{column_letter(one.column)}{one.row}"><f>{escape((one.formula or "")[1:])}</f></c>'
        for one in sorted(places, key=lambda one: one.column)
    )
