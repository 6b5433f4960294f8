"""Attacks by number and by nesting on a real workbook: more of something than any worksheet has.

Each is (name, what makes the file, words): the words must stand in what `check` says of the file.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

from spoiling import (
    BOOK,
    RELATIONS,
    STYLES,
    base,
    later,
    ods_parts,
    ods_tables,
    part_of,
    replaced,
    with_cell,
    with_rows,
    with_tail,
)

Attack = tuple[str, Callable[[], bytes], str]
LONG = "a" * 900_000
ALL = 'sqref="A1:XFD1048576"'
SHARED = "xl/sharedStrings.xml"


def _distinct(count: int, form: str) -> str:
    return "".join([form % number for number in range(count)])


def names_of_xml() -> Iterator[Attack]:
    """What makes a parser itself grow: long namespaces, names that are all different, attributes without end."""
    flood = f'<extLst xmlns:z="{LONG}">{"<z:a/>" * 200_000}</extLst>'
    yield "long-namespace.xlsx", later(with_tail("Results", flood)), "namespace"
    attributes = _distinct(60_000, " z:a%d=``").replace("`", '"')
    wide = f'<extLst xmlns:z="{LONG}"><x{attributes}/></extLst>'
    yield "long-namespace-attributes.xlsx", later(with_tail("Results", wide)), "namespace"
    yield "different-elements.xlsx", later(with_tail("Results", _distinct(900_000, "<e%d/>"))), "names"
    rows = "".join(f"<x {_distinct(35_000, f'a{part}x%d=`` ')}/>".replace("`", '"') for part in range(24))
    yield "different-attributes.xlsx", later(with_tail("Results", rows)), "names"
    yield "huge-attribute.xlsx", later(with_tail("Results", f'<x a="{LONG}{LONG}"/>')), "too long"
    yield "deep-tail.xlsx", later(with_tail("Results", "<x>" * 5000 + "</x>" * 5000)), "nested deeper"
    yield "deep-record.xlsx", later(with_tail("Issue record", "<x>" * 200 + "</x>" * 200)), "nested deeper"
    comments = "<!-- " + "x" * 400_000 + " -->"
    yield "comments.xlsx", later(with_tail("Results", comments * 20)), "sound"
    instructions = '<?xml-stylesheet type="text/xsl" href="http://127.0.0.1/x.xsl"?>'
    yield "instruction.xlsx", later(replaced(BOOK, "<workbook ", instructions + "<workbook ")), "sound"
    late = "<?x <!DOCTYPE a>?>"
    yield "doctype-in-instruction.xlsx", later(replaced(BOOK, "<workbook ", late + "<workbook ")), "DOCTYPE"
    yield "entities.xlsx", later(with_tail("Results", "<x>" + "&#65;" * 100_000 + "</x>")), "sound"
    data = "<![CDATA[" + "<" * 900_000 + "]]>"
    yield "cdata.xlsx", later(with_tail("Results", f"<x>{data}</x>")), "sound"
    ods = f'<office:x xmlns:z="{LONG}">{"<z:a/>" * 200_000}</office:x>'
    yield "long-namespace.ods", later(ods_parts(ods_tables() + ods)), "namespace"
    yield "different-elements.ods", later(ods_parts(ods_tables() + _distinct(900_000, "<e%d/>"))), "names"


def styles_and_names() -> Iterator[Attack]:
    """Millions of styles, names, texts, relations."""
    styles = base()[STYLES].decode()
    many = styles.replace("</cellXfs>", '<xf numFmtId="0"/>' * 500_000 + "</cellXfs>")
    yield "styles.xlsx", later({**base(), STYLES: many.encode()}), "styles"
    formats = '<numFmts count="1">' + "".join(
        [f'<numFmt numFmtId="{n}" formatCode="[{"[" * 50}{n}"/>' for n in range(200, 100_000)]
    )
    yield "number-formats.xlsx", later(replaced(STYLES, "<cellXfs", formats + "</numFmts><cellXfs")), "number formats"
    names = _distinct(300_000, '<definedName name="n%d">Constants!$C$5</definedName>')
    yield "names.xlsx", later(replaced(BOOK, "</definedNames>", f"{names}</definedNames>")), "names"
    local = _distinct(15_000, '<definedName name="n%d" localSheetId="3">Constants!$C$5</definedName>')
    yield "names-of-a-tab.xlsx", later(replaced(BOOK, "</definedNames>", f"{local}</definedNames>")), "sound"
    long = f'<definedName name="{"n" * 200_000}">{"A1+" * 200_000}1</definedName>'
    yield "name-long.xlsx", later(replaced(BOOK, "</definedNames>", f"{long}</definedNames>")), "sound"
    texts = f'<sst xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main">{"<si/>" * 1_500_000}</sst>'
    relation = (
        '<Relationship Id="rS" Type="http://schemas.openxmlformats.org/officeDocument/2006/relationships/'
        'sharedStrings" Target="sharedStrings.xml"/>'
    )
    linked = replaced(RELATIONS, "</Relationships>", f"{relation}</Relationships>")
    yield "shared-texts.xlsx", later({**linked, SHARED: texts.encode()}), "texts"
    one = texts.replace("<si/>" * 1_500_000, f"<si><t>{'x' * 700_000}</t></si>")
    cells = "".join(
        f'<row r="{r}">{"".join(f"<c r=`{chr(65 + c)}{r}` t=`s`><v>0</v></c>" for c in range(26))}</row>'
        for r in range(5000, 9000)
    ).replace("`", '"')
    held = with_rows("Results", cells, {**linked, SHARED: one.encode()})
    yield "one-text-everywhere.xlsx", later(held), "text"
    relations = _distinct(200_000, '<Relationship Id="x%d" Type="a" Target="b"/>')
    yield "relations.xlsx", later(replaced(RELATIONS, "</Relationships>", f"{relations}</Relationships>")), "relations"
    properties = _distinct(100_000, '<property name="p%d"><v>1</v></property>')
    custom = base()["docProps/custom.xml"].decode().replace("</Properties>", f"{properties}</Properties>")
    yield "properties.xlsx", later({**base(), "docProps/custom.xml": custom.encode()}), "sound"


def tabs() -> Iterator[Attack]:
    """One part under a thousand tabs; tabs without number."""
    more = _distinct(1500, '<sheet name="t%d" sheetId="9" r:id="rId1"/>')
    big = with_tail("Front", "<x/>" * 500_000, replaced(BOOK, "</sheets>", f"{more}</sheets>"))
    yield "one-part-many-tabs.xlsx", later(big), "tabs"
    twice = '<sheet name="again" sheetId="9" r:id="rId2"/>'
    yield "one-part-two-tabs.xlsx", later(replaced(BOOK, "</sheets>", f"{twice}</sheets>")), "one part"
    many = ods_tables() + _distinct(20_000, '<table:table table:name="t%d"/>')
    yield "many-tabs.ods", later(ods_parts(many)), "tabs"


def around_cells() -> Iterator[Attack]:
    """Merges, hidden rows and columns, links, validations, formats and comments without number."""
    merges = _distinct(150_000, '<mergeCell ref="AA%d"/>').replace('AA0"', 'AA150000"')
    yield "merges.xlsx", later(with_tail("Results", f"<mergeCells>{merges}</mergeCells>")), "merges"
    over = "".join([f'<mergeCell ref="A{n % 900 + 1}:C{n % 900 + 60}"/>' for n in range(1100)])
    yield "merges-over-all.xlsx", later(with_tail("Results", f"<mergeCells>{over}</mergeCells>")), "merge"
    hidden = _distinct(300_000, '<row r="%d" hidden="1"/>')
    yield "hidden-rows.xlsx", later(with_rows("Results", hidden)), "hidden"
    columns = _distinct(300_000, '<col min="1" max="%d" hidden="1"/>')
    yield "columns.xlsx", later(with_tail("Constants", f"<cols>{columns}</cols>")), "hidden"
    far = '<cols><col min="1" max="99999999999999" hidden="1"/><col min="-5" max="0" hidden="1"/></cols>'
    yield "columns-far.xlsx", later(with_tail("Constants", far)), ""
    links = _distinct(190_000, '<hyperlink ref="A1" location="x%d"/>')
    yield "links.xlsx", later(with_tail("Front", f"<hyperlinks>{links}</hyperlinks>")), "links"
    for name, one in (
        ("validations", f'<dataValidation type="list" {ALL}><formula1>"a,b"</formula1></dataValidation>'),
        ("formats", f"<conditionalFormatting {ALL}><cfRule><formula>1</formula></cfRule></conditionalFormatting>"),
    ):
        yield f"{name}.xlsx", later(with_tail("Results", one * 120_000)), "sound"
    comments = "<comments><commentList>" + '<comment ref="A1"><text><t>x</t></text></comment>' * 150_000
    written = {**base(), "xl/comments1.xml": (comments + "</commentList></comments>").encode()}
    yield "comments-part.xlsx", later(written), "sound"
    rows = _distinct(400_000, '<row r="%d"/>')
    yield "rows.xlsx", later(with_rows("Results", rows)), ""
    shrunk = replaced(part_of("Readings"), '<dimension ref="A1:H40" />', '<dimension ref="A1:XFD1048576"/>')
    yield "dimension.xlsx", later(shrunk), "sound"
    small = replaced(part_of("Readings"), '<dimension ref="A1:H40" />', '<dimension ref="A1"/>')
    yield "dimension-small.xlsx", later(small), "sound"
    repeated = '<table:table-row table:visibility="collapse"/>' * 200_000
    extra = f'<table:table table:name="more">{repeated}</table:table>'
    yield "hidden-rows.ods", later(ods_parts(ods_tables() + extra)), "hidden"


def cells() -> Iterator[Attack]:
    """Cells, texts and formulas in numbers."""
    grid = "".join(
        f'<row r="{r}">{"".join(f"<c r=`{chr(65 + c)}{r}`><v>{r}.{c}</v></c>" for c in range(20))}</row>'
        for r in range(5000, 14_400)
    ).replace("`", '"')
    yield "cells-below-the-limit.xlsx", later(with_rows("Results", grid)), ""
    formulas = "".join(
        f'<row r="{r}">{"".join(f"<c r=`{chr(65 + c)}{r}`><f>A1*{r}.{c}</f><v>1</v></c>" for c in range(20))}</row>'
        for r in range(5000, 14_000)
    ).replace("`", '"')
    long = "".join(
        f'<row r="{r}">{"".join(f"<c r=`{chr(65 + c)}{r}`><f>{filling}{c}</f></c>" for c in range(20))}</row>'
        for r in range(5000, 5090)
        for filling in ["http:" + "A1+" * 2600]
    ).replace("`", '"')
    yield "long-formulas.xlsx", later(with_rows("Results", long)), "outside"
    outside = "".join(
        f'<row r="{r}">{"".join(f"<c r=`{chr(65 + c)}{r}`><f>[1]A!B{r}</f></c>" for c in range(20))}</row>'
        for r in range(5000, 14_000)
    ).replace("`", '"')
    yield "outside-everywhere.xlsx", later(with_rows("Results", outside)), "outside"
    yield "formulas-below-the-limit.xlsx", later(with_rows("Results", formulas)), ""
    shared = '<row r="5000"><c r="A5000"><f t="shared" si="0" ref="A5000:T14000">' + "A1+" * 2000 + "1</f></c></row>"
    copies = "".join(f'<row r="{r}"><c r="A{r}"><f t="shared" si="0"/></c></row>' for r in range(5001, 9000))
    yield "shared-formulas.xlsx", later(with_rows("Results", shared + copies)), "shared formulas"
    long = f"of:={'[.A1]+' * 100_000}1"
    cell = f'<table:table-cell table:formula="{long}" office:value-type="float" office:value="1"'
    many = f'<table:table-row table:number-rows-repeated="290">{cell} table:number-columns-repeated="680"/>'
    table = f'<table:table table:name="more">{many}</table:table-row></table:table>'
    yield "one-formula-everywhere.ods", later(ods_parts(ods_tables() + table)), "formulas"
    text = '<table:table-cell office:value-type="string" table:number-columns-repeated="680">'
    body = f"{text}<text:p>{'x' * 700_000}</text:p></table:table-cell>"
    wide = f'<table:table-row table:number-rows-repeated="290">{body}</table:table-row>'
    table = f'<table:table table:name="more">{wide}</table:table>'
    yield "one-text-everywhere.ods", later(ods_parts(ods_tables() + table)), "text"
    spaces = '<text:s text:c="10000"/>' * 40_000
    one = f'<table:table-row><table:table-cell office:value-type="string"><text:p>{spaces}</text:p></table:table-cell>'
    table = f'<table:table table:name="more">{one}</table:table-row></table:table>'
    yield "spaces.ods", later(ods_parts(ods_tables() + table)), "text"
    quotes = "='" * 400_000
    cell = f'<table:table-cell table:formula="of:{quotes}" office:value-type="float" office:value="1"/>'
    table = f'<table:table table:name="more"><table:table-row>{cell}</table:table-row></table:table>'
    yield "quotes-in-formula.ods", later(ods_parts(ods_tables() + table)), ""
    yield "long-number.xlsx", later(with_cell("Readings", "E17", f"<v>0.{'1' * 500_000}</v>")), ""
    yield "digits-400.xlsx", later(with_cell("Readings", "E17", f"<v>{'9' * 400}</v>")), "not a number"


def floods() -> Iterator[Attack]:
    """All of them."""
    for group in (names_of_xml, styles_and_names, tabs, around_cells, cells):
        yield from group()
