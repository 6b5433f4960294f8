"""Files that try to fetch, to run or to write something when they are opened; all of it towards this machine only."""

from __future__ import annotations

import io
import zipfile
from collections.abc import Iterator
from pathlib import Path

from office_books import rewritten, saved, sums

REL = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
PACKAGE_REL = "http://schemas.openxmlformats.org/package/2006/relationships"
DRAWING = "http://schemas.openxmlformats.org/drawingml/2006"
MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
ODS = "application/vnd.oasis.opendocument.spreadsheet"
ODS_NAMES = " ".join(
    f'xmlns:{short}="{name}"'
    for short, name in {
        "office": "urn:oasis:names:tc:opendocument:xmlns:office:1.0",
        "table": "urn:oasis:names:tc:opendocument:xmlns:table:1.0",
        "text": "urn:oasis:names:tc:opendocument:xmlns:text:1.0",
        "draw": "urn:oasis:names:tc:opendocument:xmlns:drawing:1.0",
        "style": "urn:oasis:names:tc:opendocument:xmlns:style:1.0",
        "svg": "urn:oasis:names:tc:opendocument:xmlns:svg-compatible:1.0",
        "script": "urn:oasis:names:tc:opendocument:xmlns:script:1.0",
        "form": "urn:oasis:names:tc:opendocument:xmlns:form:1.0",
        "of": "urn:oasis:names:tc:opendocument:xmlns:of:1.2",
        "dom": "http://www.w3.org/2001/xml-events",
        "ooo": "http://openoffice.org/2004/office",
        "xlink": "http://www.w3.org/1999/xlink",
    }.items()
)
EVENTS = ("dom:load", "office:load-finished", "office:view-created", "dom:unload", "dom:select")
LINK = 'xlink:type="simple" xlink:show="embed" xlink:actuate="onLoad"'


def hostile_files(folder: Path, url: str, marker: Path) -> Iterator[Path]:
    """Write them all; `url` is the server that must not be asked, `marker` the file that must not appear."""
    for name, content in {**_spreadsheetml(url), **_opendocument(url, marker)}.items():
        (folder / name).write_bytes(content)
        yield folder / name


def _spreadsheetml(url: str) -> dict[str, bytes]:
    return {
        "picture.xlsx": _linked_picture(f"{url}/picture.png"),
        "webservice.xlsx": _formula(f'_xlfn.WEBSERVICE("{url}/service")'),
        "webservice-file.xlsx": _formula('_xlfn.WEBSERVICE("file:///etc/passwd")'),
        "hyperlink.xlsx": _formula(f'HYPERLINK("{url}/link","x")'),
        "workbook.xlsx": _external(f"{url}/other.xlsx"),
        "workbook-file.xlsx": _external("file:///etc/passwd"),
        "dde.xlsx": _formula('DDE("soffice","/etc/passwd","A1")'),
        "indirect.xlsx": _formula(f"INDIRECT(\"'{url}/other.xlsx'#$Sheet1.A1\")"),
    }


def _linked_picture(target: str) -> bytes:
    """A drawing whose picture lies elsewhere."""
    anchor = (
        f'<xdr:wsDr xmlns:xdr="{DRAWING}/spreadsheetDrawing" xmlns:a="{DRAWING}/main" xmlns:r="{REL}">'
        "<xdr:oneCellAnchor><xdr:from><xdr:col>1</xdr:col><xdr:colOff>0</xdr:colOff><xdr:row>1</xdr:row>"
        '<xdr:rowOff>0</xdr:rowOff></xdr:from><xdr:ext cx="900000" cy="900000"/><xdr:pic><xdr:nvPicPr>'
        '<xdr:cNvPr id="2" name="p"/><xdr:cNvPicPr/></xdr:nvPicPr><xdr:blipFill><a:blip r:link="rId1"/></xdr:blipFill>'
        '<xdr:spPr><a:xfrm><a:off x="0" y="0"/><a:ext cx="900000" cy="900000"/></a:xfrm>'
        '<a:prstGeom prst="rect"><a:avLst/></a:prstGeom></xdr:spPr></xdr:pic><xdr:clientData/></xdr:oneCellAnchor>'
        "</xdr:wsDr>"
    )
    parts = {
        "xl/drawings/drawing1.xml": anchor,
        "xl/drawings/_rels/drawing1.xml.rels": _relations(("rId1", "image", target, True)),
        "xl/worksheets/_rels/sheet1.xml.rels": _relations(("rId1", "drawing", "../drawings/drawing1.xml", False)),
    }
    kind = (
        '<Override PartName="/xl/drawings/drawing1.xml" '
        'ContentType="application/vnd.openxmlformats-officedocument.drawing+xml"/>'
    )
    return _extended(parts, kind, ("</worksheet>", f'<drawing xmlns:r="{REL}" r:id="rId1"/></worksheet>'))


def _external(target: str) -> bytes:
    """Formulas over another workbook, with its cells kept in a cache."""
    cache = (
        f'<externalLink xmlns="{MAIN}" xmlns:r="{REL}"><externalBook r:id="rId1"><sheetNames><sheetName val="Sheet1"/>'
        "</sheetNames></externalBook></externalLink>"
    )
    parts = {
        "xl/externalLinks/externalLink1.xml": cache,
        "xl/externalLinks/_rels/externalLink1.xml.rels": _relations(("rId1", "externalLinkPath", target, True)),
    }
    kind = (
        '<Override PartName="/xl/externalLinks/externalLink1.xml" '
        'ContentType="application/vnd.openxmlformats-officedocument.spreadsheetml.externalLink+xml"/>'
    )
    package = _extended(parts, kind, ("<f>SUM(In!A1:B1)</f>", "<f>[1]Sheet1!A1</f>"))

    def link(name: str, content: bytes) -> bytes:
        text = content.decode("utf-8") if name.startswith("xl/") else ""
        if name == "xl/workbook.xml":
            listed = (
                f'</sheets><externalReferences><externalReference xmlns:r="{REL}" r:id="rIdX"/></externalReferences>'
            )
            return text.replace("</sheets>", listed).encode()
        if name == "xl/_rels/workbook.xml.rels":
            one = f'<Relationship Id="rIdX" Type="{REL}/externalLink" Target="externalLinks/externalLink1.xml"/>'
            return text.replace("</Relationships>", one + "</Relationships>").encode()
        return content

    return rewritten(package, link)


def _relations(*rows: tuple[str, str, str, bool]) -> str:
    listed = "".join(
        f'<Relationship Id="{name}" Type="{REL}/{kind}" Target="{target}" '
        f'TargetMode="{"External" if outside else "Internal"}"/>'
        for name, kind, target, outside in rows
    )
    return f'<Relationships xmlns="{PACKAGE_REL}">{listed}</Relationships>'


def _extended(parts: dict[str, str], kind: str, replaced: tuple[str, str]) -> bytes:
    """The sums workbook with more parts, and a text of its tabs replaced."""

    def change(name: str, content: bytes) -> bytes:
        text = content.decode("utf-8")
        if name == "[Content_Types].xml":
            return text.replace("</Types>", kind + "</Types>").encode()
        old, new = replaced
        limited = name == "xl/worksheets/sheet1.xml" or old != "</worksheet>"
        return text.replace(old, new).encode() if name.startswith("xl/worksheets/") and limited else content

    target = io.BytesIO(rewritten(saved(sums(1.0)), change))
    with zipfile.ZipFile(target, "a") as package:
        for name, text in parts.items():
            package.writestr(name, text)
    return target.getvalue()


def _formula(text: str) -> bytes:
    book = sums(1.0)
    book["Out"]["A1"] = "=" + text
    return saved(book)


def _opendocument(url: str, marker: Path) -> dict[str, bytes]:
    basic = _basic(marker)
    cell = _cell
    picture = f'<draw:image xlink:href="{url}/picture.png" {LINK}/>'
    frame = f'<table:shapes><draw:frame svg:width="2cm" svg:height="2cm">{picture}</draw:frame></table:shapes>'
    embedded = f'<draw:object xlink:href="{url}/object.ods" {LINK}/>'
    other = f'<table:shapes><draw:frame svg:width="2cm" svg:height="2cm">{embedded}</draw:frame></table:shapes>'
    source = f'<table:table-source xlink:href="{url}/sheet.ods" table:table-name="Sheet1" {LINK}/>'
    area = (
        f'<table:cell-range-source table:name="A1" xlink:href="{url}/area.html" table:last-column-spanned="1" '
        f'table:last-row-spanned="1" table:refresh-delay="PT1S" {LINK}/>'
    )
    dde = (
        '<table:dde-links><table:dde-link><office:dde-source office:dde-application="soffice" '
        'office:dde-topic="/etc/passwd" office:dde-item="A1" office:automatic-update="true"/>'
        '<table:table><table:table-row><table:table-cell office:value-type="float" office:value="5"/>'
        "</table:table-row></table:table></table:dde-link></table:dde-links>"
    )
    python = f"def run(*_):\n    open({str(marker)!r}, 'w').write('ran')\n"
    started, started_python = (
        "".join(
            f'<script:event-listener script:language="ooo:script" script:event-name="{event}" '
            f'xlink:href="vnd.sun.star.script:{script}&amp;location=document" xlink:type="simple"/>'
            for event in EVENTS
        )
        for script in ("Standard.Module1.Run?language=Basic", "m.py$run?language=Python")
    )
    face = (
        '<style:font-face style:name="Far" svg:font-family="Far"><svg:font-face-src>'
        f'<svg:font-face-uri xlink:href="{url}/font.ttf" xlink:type="simple"/></svg:font-face-src></style:font-face>'
    )
    return {
        "picture.ods": _ods(cell("1"), shapes=frame),
        "object.ods": _ods(cell("1"), shapes=other),
        "sheet.ods": _ods(cell("1"), shapes=source),
        "area.ods": _ods(f'<table:table-cell office:value-type="float" office:value="1">{area}</table:table-cell>'),
        "font.ods": _ods(cell("1"), faces=face),
        "webservice.ods": _ods(cell(f"COM.MICROSOFT.WEBSERVICE(&quot;{url}/service&quot;)")),
        "dde.ods": _ods(cell("DDE(&quot;soffice&quot;;&quot;/etc/passwd&quot;;&quot;A1&quot;)")),
        "workbook.ods": _ods(cell(f"[&apos;{url}/other.ods&apos;#$Sheet1.A1]")),
        "workbook-file.ods": _ods(cell("[&apos;file:///etc/passwd&apos;#$Sheet1.A1]")),
        "macro-cell.ods": _ods(cell("RUN()"), parts=_library(basic)),
        "macro-open.ods": _ods(cell("1"), events=started, parts=_library(basic)),
        "macro-python.ods": _ods(cell("1"), events=started_python, parts={"Scripts/python/m.py": python}),
        "dde-link.ods": _ods(cell("1"), after=dde),
    }


def _cell(formula: str) -> str:
    return (
        f'<table:table-cell table:formula="of:={formula}" office:value-type="float" office:value="0">'
        "<text:p>0</text:p></table:table-cell>"
    )


def _basic(marker: Path) -> str:
    return (
        'Function Run(Optional a)\nn = FreeFile\nOpen "' + str(marker) + '" For Output As #n\nPrint #n, "ran"\n'
        "Close #n\nRun = 42\nEnd Function\n"
    )


def _ods(
    cell: str, shapes: str = "", faces: str = "", events: str = "", after: str = "", parts: dict[str, str] | None = None
) -> bytes:
    """A small .ods with one cell and whatever comes with it."""
    listeners = f"<office:event-listeners>{events}</office:event-listeners>" if events else ""
    content = (
        f'<?xml version="1.0" encoding="UTF-8"?><office:document-content {ODS_NAMES} office:version="1.2">'
        f"<office:scripts>{listeners}</office:scripts>"
        f"<office:font-face-decls>{faces}</office:font-face-decls><office:body><office:spreadsheet>"
        f'<table:table table:name="Out">{shapes}<table:table-row>{cell}</table:table-row></table:table>{after}'
        "</office:spreadsheet></office:body></office:document-content>"
    )
    parts = {"content.xml": content, **(parts or {})}
    listed = "".join(
        f'<manifest:file-entry manifest:full-path="{name}" manifest:media-type="text/xml"/>' for name in parts
    )
    parts["META-INF/manifest.xml"] = (
        '<manifest:manifest xmlns:manifest="urn:oasis:names:tc:opendocument:xmlns:manifest:1.0" manifest:version="1.2">'
        f'<manifest:file-entry manifest:full-path="/" manifest:media-type="{ODS}"/>{listed}</manifest:manifest>'
    )
    target = io.BytesIO()
    with zipfile.ZipFile(target, "w") as package:
        package.writestr("mimetype", ODS)
        for name, text in parts.items():
            package.writestr(name, text)
    return target.getvalue()


def _library(basic: str) -> dict[str, str]:
    """A Basic library of one module."""
    names = 'xmlns:library="http://openoffice.org/2000/library" xmlns:script="http://openoffice.org/2000/script"'
    escaped = basic.replace("&", "&amp;").replace('"', "&quot;").replace("<", "&lt;")
    return {
        "Basic/script-lc.xml": (
            f'<library:libraries {names}><library:library library:name="Standard" library:link="false"/>'
            "</library:libraries>"
        ),
        "Basic/Standard/script-lb.xml": (
            f'<library:library {names} library:name="Standard" library:readonly="false" '
            'library:passwordprotected="false"><library:element library:name="Module1"/></library:library>'
        ),
        "Basic/Standard/Module1.xml": (
            f'<script:module {names} script:name="Module1" script:language="StarBasic">{escaped}</script:module>'
        ),
    }
