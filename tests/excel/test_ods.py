"""An OpenDocument spreadsheet reads as the same workbook saved as xlsx would."""

from pathlib import Path

import pytest
from hostile import ods, ods_cell, zipped

from sheetcal.excel import formula_text
from sheetcal.excel.formula_text import from_open, open_reference
from sheetcal.excel.reader import read
from sheetcal.excel.sheetfile import SheetFile

NUMBER = 'office:value-type="float" office:value="{}"'


def put(path: Path, table: str, **parts: str) -> SheetFile:
    """Write a hand-made OpenDocument workbook and read it."""
    path.write_bytes(zipped(ods(table) | {name.replace("_", "."): text.encode() for name, text in parts.items()}))
    return read(path)


SPELLINGS = [
    ("of:=[.A1]*2", "=A1*2"),
    ("of:=SUM([.A1:.B$3];[.$C$1])", "=SUM(A1:B$3,$C$1)"),
    ("of:=[$Constants.$C$5]+[$'Issue record'.B2]", "=Constants!$C$5+'Issue record'!B2"),
    ("of:=[$'It''s 5%; ok'.A1:.B2]", "='It''s 5%; ok'!A1:B2"),
    ("of:=[$'Front'.A1]", "=Front!A1"),
    ("of:=SUM([Front.A1:Front.B2];[Front.A1:Results.B2])", "=SUM(Front!A1:B2,Front:Results!A1:B2)"),
    ('of:=IF([.A1]>0;"a;b [.A1] ""~""";TRUE())', '=IF(A1>0,"a;b [.A1] ""~""",TRUE())'),
    ("of:=SUMPRODUCT({1;2|3;4}*[.A1:.B2])", "=SUMPRODUCT({1,2;3,4}*A1:B2)"),
    ('of:={"a;|";1|2;3}', '={"a;|",1;2,3}'),
    ("of:=SUM([.A:.B];[.1:.2])", "=SUM(A:B,1:2)"),
    ("of:=SUM([.A1]~[.A2])+[.A1:.A3]![.A2:.B2]", "=SUM(A1,A2)+A1:A3 A2:B2"),
    ("of:=[.#REF!]+[.A1:.#REF!]", "=#REF!+A1:#REF!"),
    ("of:=COM.MICROSOFT.STDEV.S([.A1])", "=_xlfn.STDEV.S(A1)"),
    ("of:=INDEX([.A1:.A9];1):INDEX([.A1:.A9];3)", "=INDEX(A1:A9,1):INDEX(A1:A9,3)"),
    ("of:=['file:///tmp/o.ods'#$Tab.A1]", "='file:///tmp/o.ods'#$Tab!A1"),
    ("msoxl:=A1+1", "=A1+1"),
    ("=gas_constant*2", "=gas_constant*2"),
    ("of:=[$AB12.A1]", "='AB12'!A1"),
]


def test_formulas_come_in_the_xlsx_spelling() -> None:
    """References, separators, arrays, unions and function names are respelled; texts are left alone."""
    assert len(SPELLINGS) == 18
    assert [from_open(text) for text, _ in SPELLINGS] == [wanted for _, wanted in SPELLINGS]
    assert open_reference("$Constants.$C$5") == "Constants!$C$5"


VALUES = [
    (NUMBER.format("1.5E-3"), "", ("n", 0.0015, None)),
    ('office:value-type="percentage" office:value="0.25"', "<text:p>25%</text:p>", ("n", 0.25, None)),
    ('office:value-type="currency" office:value="2"', "", ("n", 2.0, None)),
    ('office:value-type="boolean" office:boolean-value="true"', "", ("b", True, None)),
    ('office:value-type="date" office:date-value="2026-03-04"', "", ("d", 46085.0, None)),
    ('office:value-type="date" office:date-value="2026-03-04T12:00:00.5"', "", ("d", 46085.5 + 0.5 / 86400, None)),
    ('office:value-type="time" office:time-value="PT30H00M36S"', "", ("d", 1.2504166666666667, None)),
    ('office:value-type="string"', "<text:p>a<text:s text:c='2'/>b<text:tab/>c</text:p>", ("s", "a  b\tc", None)),
    ('office:value-type="string"', "<text:p>a</text:p><text:p>b<text:line-break/>c</text:p>", ("s", "a\nb\nc", None)),
    ('office:value-type="string"', "<text:p><text:span>a <text:a>b</text:a></text:span></text:p>", ("s", "a b", None)),
    ('office:value-type="string" office:string-value="kept"', "<text:p>shown</text:p>", ("s", "kept", None)),
    ('office:value-type="string"', "<office:annotation><text:p>note</text:p></office:annotation><text:p>a</text:p>",
     ("s", "a", None)),
    ('office:value-type="string" office:string-value="" calcext:value-type="error" table:formula="of:=1/0"',
     "<text:p>#DIV/0!</text:p>", ("e", "#DIV/0!", "=1/0")),
    ('table:formula="of:=IF([.A1];1;&quot;&quot;)"', "<text:p/>", ("s", "", '=IF(A1,1,"")')),
    ('table:formula="of:=[.B1]"', "", ("", None, "=B1")),
    ('table:formula="of:=TRUE()" ' + NUMBER.format(1), "<text:p>TRUE</text:p>", ("b", True, None)),
    ('table:formula="of:=#N/A" calcext:value-type="error"', "<text:p>#N/A</text:p>", ("e", "#N/A", None)),
]  # fmt: skip


@pytest.mark.parametrize(("attributes", "inside", "wanted"), VALUES)
def test_every_value_type_is_read(tmp_path: Path, attributes: str, inside: str, wanted: object) -> None:
    """Numbers, dates, times, truth values, texts and errors come as their type says."""
    assert put(tmp_path / "a.ods", ods_cell(attributes, inside)).cells["Front"] == {"A1": wanted}


def test_repeated_cells_and_rows_are_written_out(tmp_path: Path) -> None:
    """Repetition fills cells; empty cells to the end of the sheet cost nothing and fill none."""
    empty = ods_cell('table:style-name="x"')
    table = (
        '<table:table-row table:number-rows-repeated="2"><table:table-cell table:number-columns-repeated="2"/>'
        f'<table:table-cell table:number-columns-repeated="2" {NUMBER.format(7)}/>'
        '<table:table-cell table:number-columns-repeated="16380"/></table:table-row>'
        '<table:table-row table:number-rows-repeated="1048573"><table:table-cell/></table:table-row>'
        f"<table:table-header-rows>{empty}</table:table-header-rows>"
    )
    cells = put(tmp_path / "a.ods", table).cells["Front"]
    assert cells == dict.fromkeys(("C1", "D1", "C2", "D2"), ("n", 7.0, None))


def test_tracked_changes_and_drawings_are_no_cells(tmp_path: Path) -> None:
    """Old values kept by change tracking and texts in shapes are not taken for cells."""
    shape = '<table:shapes><draw xmlns="urn:d"><text:p>in a shape</text:p></draw></table:shapes>'
    old = ods_cell(NUMBER.format(5))
    parts = ods(shape + ods_cell(NUMBER.format(1)))
    changes = f"<table:tracked-changes>{old}</table:tracked-changes><table:table ".encode()
    path = tmp_path / "a.ods"
    content = parts["content.xml"].replace(b"<table:table ", changes, 1)
    path.write_bytes(zipped({**parts, "content.xml": content}))
    assert read(path).cells == {"Front": {"A1": ("n", 1.0, None)}}


def test_settings_names_and_facts_are_read(tmp_path: Path) -> None:
    """Calculation settings, names, hidden tabs, protection, links, DDE and macros are told."""
    parts = ods(ods_cell(NUMBER.format(1)))
    content = parts["content.xml"].decode().replace(
        "<office:body>",
        '<office:automatic-styles><style:style style:name="t1" style:family="table"><style:table-properties '
        'table:display="false"/></style:style></office:automatic-styles><office:body>',
    ).replace(
        "<office:spreadsheet>",
        '<office:spreadsheet><table:calculation-settings table:precision-as-shown="true"><table:null-date '
        'table:date-value="1904-01-01"/><table:iteration table:status="enable"/></table:calculation-settings>',
    ).replace(
        '<table:table table:name="Front">',
        '<table:table table:name="Front" table:style-name="t1" table:protected="true"><table:table-source '
        'xmlns:xlink="http://www.w3.org/1999/xlink" xlink:href="http://h/a.ods"/>',
    ).replace(
        "</office:spreadsheet>",
        '<table:named-expressions><table:named-range table:name="n" table:cell-range-address="$Front.$A$1"/>'
        '<table:named-expression table:name="e" table:expression="[.A1]*2;3"/></table:named-expressions>'
        "<table:dde-links><table:dde-link/></table:dde-links></office:spreadsheet>",
    )  # fmt: skip
    settings = (
        '<s xmlns:config="urn:oasis:names:tc:opendocument:xmlns:config:1.0">'
        '<config:config-item config:name="AutoCalculate">false</config:config-item></s>'
    )
    path = tmp_path / "a.ods"
    more = {"settings.xml": settings.encode(), "Basic/Standard/Module1.xml": b"<m/>"}
    path.write_bytes(zipped({**parts, "content.xml": content.encode(), **more}))
    book = read(path)
    assert book.calc == {"mode": "manual", "fullPrecision": False, "iterate": True, "fullCalcOnLoad": False}
    assert book.date1904
    assert book.tabs == [("Front", "hidden")]
    assert book.names == {"n": "Front!$A$1", "e": "A1*2,3"}
    assert book.extras == {"dde": ["content.xml"], "external_links": ["http://h/a.ods"],
                           "macros": ["Basic/Standard/Module1.xml"]}  # fmt: skip


def test_the_quick_respelling_is_the_full_one_or_none() -> None:
    """Plain replacement, where it is taken, gives what the token by token respelling gives."""
    bodies = [text.partition("=")[2] for text, _ in SPELLINGS]
    bodies += [
        'IF(COUNT([.A1];[.$B$2:.C$3])=2;[$Readings.E9]&"]; [.x] ";"")',
        "SUM([$Readings.A1:.B2])",
        "[Results.A1]-1.5;2",
    ]
    quick = [formula_text._plainly_respelled(body) for body in bodies]
    taken = [(body, text) for body, text in zip(bodies, quick, strict=True) if text is not None]
    assert len(taken) >= 8
    for body, text in taken:
        assert text == formula_text._OPEN.sub(formula_text._respelled, body)
