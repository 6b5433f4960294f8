# ruff: noqa: E501 - an element is easier to read on one line
"""The reader returns type, stored value and formula of every filled cell, as the file has them."""

import datetime
import random
import struct
from collections.abc import Callable
from pathlib import Path

import openpyxl
import pytest
from hostile import MAIN, worksheet, xlsx, zipped
from openpyxl.formula.translate import Translator
from openpyxl.packaging.custom import StringProperty
from openpyxl.styles import PatternFill
from openpyxl.styles.numbers import BUILTIN_FORMATS, is_date_format
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.formula import ArrayFormula

from sheetcal.excel import worksheet as roads
from sheetcal.excel.cellvalues import OffRoad
from sheetcal.excel.formula_text import column_letters, shift
from sheetcal.excel.reader import read
from sheetcal.excel.sheetfile import SheetFile

FORMULAS = (
    '=IF(COUNT(A1,A2)=2,IF(AND(A1>0,A2<10),A1*A2+gas_constant/3.5,""),"")',
    "='How computed'!B2+Constants!$C$5",
    "=SUM(A1:A3,'It''s 5%; ok'!A1:B2)",
    "=gas_constant*A1",
    '=IF(A1>0,"a;b [.A1] ""q"" <&>",FALSE())',
    "=SLOPE(INDEX(A1:A3,1):INDEX(A1:A3,3),INDEX(B1:B3,1):INDEX(B1:B3,3))",
    "=SUMPRODUCT({1,2;3,4}*2)",
    "=MATCH(A1,A1:A3,0)",
    "=LOG10(100)+ROUND(2.5,0)+A1%-(-2)^2",
    "=STDEV(A1,A10,A11)",
    "=$A$1+A$1+$A1",
    "=ISNUMBER(MATCH(A1,A1:A3,0))",
    "=IF(A1<>2,0.000000001,15000000000)",
    '=A1&"x"&A2',
    "=1/0",
    "=NA()",
)


def sample(path: Path) -> None:
    """Write a workbook with every sort of cell, by openpyxl."""
    book = openpyxl.Workbook()
    front = book.active
    front.title = "Front"
    for title in ("How computed", "It's 5%; ok", "Constants", "Issue record", "AB12"):
        book.create_sheet(title)
    book["Issue record"].sheet_state = "hidden"
    book["How computed"]["B2"] = 3
    book["How computed"].protection.sheet = True
    book["Constants"]["C5"] = 8.31446261815324
    book.defined_names["gas_constant"] = DefinedName("gas_constant", attr_text="Constants!$C$5")
    book["AB12"].defined_names["mine"] = DefinedName("mine", attr_text="'It''s 5%; ok'!$A$1:$B$2")
    values = [
        1.5,
        'text; with & <b> "q" ;',
        True,
        datetime.datetime(2026, 3, 4, 9, 30),
        datetime.time(9, 30),
        datetime.date(2026, 3, 4),
        "  lead and  double  ",
        "two\nlines",
        1e-9,
        0.1,
        1.5e17,
        "ä 日本 🙂",
        -0.0,
        12,
    ]
    for row, value in enumerate(values, 1):
        front.cell(row, 1, value)
    front["A15"] = "=not a formula"
    front["A15"].data_type = "s"
    front["A16"] = "#N/A"
    front["A16"].data_type = "e"
    front["A17"] = 0.25
    front["A17"].number_format = "0.0%"
    for row, formula in enumerate(FORMULAS, 1):
        front.cell(row, 2, formula)
    front["C1"] = ArrayFormula("C1:C3", "=A1:A3*2")
    front.merge_cells("E1:F2")
    front["E1"] = "merged"
    for row in range(40, 60):
        for column in range(1, 9):
            front.cell(row, column).fill = PatternFill("solid", fgColor="FFEEDD")
    for row in range(5, 9):
        for column in range(1, 6):
            book["AB12"].cell(row, column, "same")
    book.properties.title = "Heat"
    book.properties.identifier = "id-1"
    book.custom_doc_props.append(StringProperty(name="sheetcal_issue", value="b7k2m"))
    book.save(path)


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("made") / "sample.xlsx"
    sample(path)
    return path


@pytest.fixture(scope="module")
def resaved(
    made: Path,
    tmp_path_factory: pytest.TempPathFactory,
    convert: Callable[[list[Path], str, Path], None],
) -> Path:
    """Return a folder with the sample saved again by LibreOffice, as .xlsx and .ods."""
    out = tmp_path_factory.mktemp("resaved")
    for form in ("ods", "xlsx"):
        convert([made], form, out)
    return out


def put(path: Path, rows: str, tail: str = "", **more: str) -> SheetFile:
    """Write a hand-made workbook and read it."""
    path.write_bytes(zipped(xlsx(rows, tail, **more)))
    return read(path)


def compared(path: Path) -> int:
    """Hold every cell against openpyxl, read once for formulas and once for values; return how many."""
    book = read(path)
    texts, values = openpyxl.load_workbook(path), openpyxl.load_workbook(path, data_only=True)
    count = 0
    for tab in texts.sheetnames:
        mine = dict(book.cells[tab])
        for row in texts[tab].iter_rows():
            for cell in row:
                stored = values[tab][cell.coordinate].value
                formula = getattr(cell.value, "text", cell.value) if cell.data_type == "f" else None
                got = mine.pop(cell.coordinate, ("", None, None))
                if formula in ("=TRUE()", "=#N/A"):  # LibreOffice's way to save a typed TRUE or #N/A
                    formula = None
                assert got[2] == formula, (tab, cell.coordinate)
                assert same_value(got, stored), (tab, cell.coordinate, got, stored)
                count += got != ("", None, None)
        assert mine == {}
    return count


def same_value(got: "tuple[str, object, str | None]", stored: object) -> bool:
    """Tell whether openpyxl's value is ours; it turns date cells into datetimes and "" into None."""
    kind, value, _ = got
    if kind == "d":
        return not isinstance(stored, (int, float, str)) and stored is not None
    if kind == "n":
        return type(stored) in (int, float) and float(stored) == value
    return stored == (None if value == "" else value) and isinstance(stored, bool) == (kind == "b")


def test_cells_equal_those_openpyxl_reads(made: Path) -> None:
    """Types, values and formulas of a workbook by openpyxl are those openpyxl itself reads."""
    assert compared(made) == 57


@pytest.mark.office
def test_cells_of_a_workbook_saved_by_libreoffice_equal_those_openpyxl_reads(resaved: Path) -> None:
    """The same holds after LibreOffice saved the workbook as .xlsx."""
    assert compared(resaved / "sample.xlsx") == 59


@pytest.mark.office
@pytest.mark.parametrize("kind", ["xlsx", "ods"])
def test_saving_by_libreoffice_changes_no_formula_and_no_value(made: Path, resaved: Path, kind: str) -> None:
    """Formulas are the same text, typed values the same to 15 digits, names and tabs the same."""
    before, after = read(made), read(resaved / f"sample.{kind}")
    assert after.format == kind
    count = 0
    for tab, cells in before.cells.items():
        for ref, (sort, value, formula) in cells.items():
            got = after.cells[tab][ref]
            assert got[2] == formula, (tab, ref)
            if formula is None:
                assert got[0] == sort, (tab, ref)
                assert got[1] == (pytest.approx(value, rel=1e-14, abs=0) if sort in "nd" else value), (
                    tab,
                    ref,
                )
            else:
                assert got[1] is not None
            count += 1
    assert count == 57
    assert (after.tabs, after.names) == (before.tabs, before.names)
    assert after.properties["sheetcal_issue"] == "b7k2m"
    assert after.properties["title"] == "Heat"
    assert after.properties["identifier"] == "id-1"
    assert after.properties["Application"].startswith("LibreOffice")
    for fact in ("merges", "arrays"):
        assert after.extras[fact] == before.extras[fact]
    assert sorted(after.extras["unprotected_tabs"]) == sorted(before.extras["unprotected_tabs"])


def test_names_properties_tabs_and_settings_are_read(made: Path) -> None:
    """What stands around the cells is there, by the names the file uses."""
    book = read(made)
    assert book.format == "xlsx"
    assert book.tabs[4] == ("Issue record", "hidden")
    assert book.names == {"gas_constant": "Constants!$C$5", "AB12!mine": "'It''s 5%; ok'!$A$1:$B$2"}
    assert book.properties["title"] == "Heat"
    assert book.properties["sheetcal_issue"] == "b7k2m"
    assert "openpyxl" in book.properties["Application"].lower()
    assert book.extras["merges"] == ["Front!E1:F2"]
    assert book.extras["arrays"] == ["Front!C1:C3"]
    assert "How computed" not in book.extras["unprotected_tabs"]
    assert book.calc == {"mode": "auto", "fullPrecision": True, "iterate": False, "fullCalcOnLoad": True}
    assert not any(ref.endswith("45") for ref in book.cells["Front"])


def test_calculation_settings_and_the_1904_calendar_are_read(tmp_path: Path) -> None:
    """Manual calculation, precision as displayed, iteration and the other calendar are told."""
    book = xlsx()["xl/workbook.xml"].decode().replace("<sheets>", '<workbookPr date1904="1"/><sheets>')
    book = book.replace("</sheets>", '</sheets><calcPr calcMode="manual" fullPrecision="0" iterate="true"/>')
    cell = '<row r="1"><c r="A1" t="d"><v>1904-01-03T12:00:00</v></c></row>'
    read_back = put(tmp_path / "a.xlsx", cell, workbook=book)
    assert read_back.calc == {
        "mode": "manual",
        "fullPrecision": False,
        "iterate": True,
        "fullCalcOnLoad": False,
    }
    assert read_back.date1904
    assert read_back.cells["Front"]["A1"] == ("d", 2.5, None)


def test_doubles_come_back_to_the_last_bit(tmp_path: Path) -> None:
    """2000 doubles of any bit pattern, written by repr, are read back exactly."""
    chance = random.Random(5)
    wanted = []
    while len(wanted) < 2000:
        (number,) = struct.unpack("<d", chance.getrandbits(64).to_bytes(8, "little"))
        if number - number == 0.0:
            wanted.append(number)
    rows = "".join(f'<row r="{r}"><c r="A{r}"><v>{v!r}</v></c></row>' for r, v in enumerate(wanted, 1))
    cells = put(tmp_path / "a.xlsx", rows).cells["Front"]
    assert [cells[f"A{r}"][1] for r in range(1, 2001)] == wanted


ODD = (
    '<row r="1"><c r="A1" s="1"><v>45000</v></c><c r="B1" t="s"><v>1</v></c><c r="C1" t="b"><v>1</v></c></row>'
    '<row r="2"><c r="A2" t="e"><v>#DIV/0!</v></c><c r="B2" t="str"><f>A1&amp;"&lt;"</f><v>a&#x20AC;&#228;</v></c>'
    '<c r="C2" t="inlineStr"><is><t xml:space="preserve"> x </t></is></c></row>'
    '<row r="3"><c r="A3"><f>B3*2</f></c><c r="B3" s="1"/><c r="C3" t="str"><f>IF(A1&gt;1,"","")</f><v></v></c></row>'
    '<row r="4"><c r="A4"><f t="shared" ref="A4:A5" si="0">$B4+C$1+A3</f><v>1</v></c></row>'
    '<row r="5"><c r="A5"><f t="shared" si="0"/><v>2</v></c><c r="B5" t="inlineStr"><is><t>_x000D_y_x005F_</t></is></c></row>'
)
EXPECTED = {
    "A1": ("d", 45000.0, None), "B1": ("s", "two", None), "C1": ("b", True, None), "A2": ("e", "#DIV/0!", None),
    "B2": ("s", "a€ä", '=A1&"<"'), "C2": ("s", " x ", None), "A3": ("", None, "=B3*2"),
    "C3": ("s", "", '=IF(A1>1,"","")'), "A4": ("n", 1.0, "=$B4+C$1+A3"), "A5": ("n", 2.0, "=$B5+C$1+A4"),
    "B5": ("s", "\ry_", None),
}  # fmt: skip


def prefixed(rows: str) -> str:
    """Return the rows with a namespace prefix on every element, in the strict namespace."""
    rows = rows.replace("</", "\0").replace("<", "<x:").replace("\0", "</x:")
    space = "http://purl.oclc.org/ooxml/spreadsheetml/main"
    return f'<x:worksheet xmlns:x="{space}"><x:sheetData>{rows}</x:sheetData></x:worksheet>'


def without_places(rows: str) -> str:
    """Return the rows with no address on rows and cells; position alone tells."""
    for name in ("row", "c"):
        for place in [f"{c}{r}" for c in "ABC" for r in range(1, 6)] + list("12345"):
            rows = rows.replace(f'<{name} r="{place}"', f"<{name}")
    return rows


@pytest.mark.parametrize(
    "spelling",
    [
        worksheet(ODD),
        worksheet(ODD).replace("><", ">\n<").replace("<v>\n</v>", "<v></v>"),
        worksheet(ODD).replace("<v>1</v>", "<v>1<!-- a comment --></v>"),
        worksheet(ODD).replace("<v>45000</v>", "<v><![CDATA[45000]]></v>"),
        worksheet(ODD).replace("<v>45000</v>", "<v> 45000 </v>"),
        worksheet(ODD).replace("<row ", "<?pi?><row "),
        worksheet(ODD).replace(
            '<t xml:space="preserve"> x </t>', '<r><rPr/><t xml:space="preserve"> x</t></r><r><t> </t></r>'
        ),
        worksheet(ODD).replace("<v>45000</v>", "<v>45000</v><extLst><ext><c r='Z9'><v>7</v></c></ext></extLst>"),
        worksheet(ODD).replace('r="A1" s="1"', 's="1" r="A1"'),
        worksheet(ODD.replace('r="A1" s="1"', 'r="A1" s="1" cm="1"')),
        prefixed(ODD),
        worksheet(without_places(ODD)),
        "\ufeff" + worksheet(ODD),
    ],
    ids=range(13),
)
def test_every_legal_spelling_of_a_part_reads_the_same(tmp_path: Path, spelling: str) -> None:
    """Comments, CDATA, prefixes, white space, attribute order, rich text and missing addresses change nothing."""
    assert put(tmp_path / "a.xlsx", "", sheet=spelling).cells["Front"] == EXPECTED


def test_both_roads_read_the_same(made: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The pattern and the event road give the same cells, names and facts."""
    odd = tmp_path / "odd.xlsx"
    fast = [read(made), put(odd, ODD)]
    calls = []

    def off(*_: object) -> None:
        calls.append(1)
        raise OffRoad

    monkeypatch.setattr(roads, "_fast", off)
    assert [read(made), read(odd)] == fast
    assert len(calls) == 7


def test_the_pattern_road_is_the_one_taken(made: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """An ordinary workbook never needs the slow road, or the speed claimed would not be met."""
    monkeypatch.setattr(roads, "_slow", None)
    assert len(read(made).cells["Front"]) > 30


@pytest.mark.parametrize("text", [
    '<sst xmlns="M"><si><t>one</t></si><si><r><t>tw</t></r><r><t>o</t></r><rPh><t>no</t></rPh></si></sst>',
    '<?xml version="1.0"?><s:sst xmlns:s="M"><s:si><s:t>one</s:t></s:si><s:si><s:t>two</s:t></s:si></s:sst>',
    '<sst xmlns="M">\n<si><t xml:space="preserve">one</t></si>\n<si><t>t&#119;o</t></si></sst>',
    '<sst xmlns="M"><si><t/></si><si><t>two</t></si></sst>',
])  # fmt: skip
def test_shared_texts_are_read_in_every_spelling(tmp_path: Path, text: str) -> None:
    """Rich text is flattened, phonetic guides are left out, prefixes and spaces do not matter."""
    book = put(tmp_path / "a.xlsx", ODD, strings=text.replace("M", MAIN))
    assert book.cells["Front"]["B1"] == ("s", "two", None)


def test_date_formats_are_told_from_numbers(tmp_path: Path) -> None:
    """A style is a date or time exactly where openpyxl's own rule says so, and for elapsed hours."""
    codes = [code for _, code in sorted(BUILTIN_FORMATS.items())]
    codes += [
        "[h]:mm",
        "yyyy-mm-dd",
        "0.00E+00",
        '0.0 "days"',
        "[Red]0.0",
        "#,##0\\ h",
        "dd/mm/yy;@",
        "0.00_d",
        "[$-409]d",
    ]
    sheet = openpyxl.Workbook()
    for row, code in enumerate(codes, 1):
        sheet.active.cell(row, 1, 1.5).number_format = code
    sheet.save(tmp_path / "a.xlsx")
    cells = read(tmp_path / "a.xlsx").cells["Sheet"]
    wrong = [code for row, code in enumerate(codes, 1) if (cells[f"A{row}"][0] == "d") != bool(is_date_format(code))]
    assert len(codes) > 40
    assert wrong == []


def test_shared_formulas_are_written_out_as_openpyxl_translates_them() -> None:
    """Moving a formula shifts what openpyxl's translator shifts, and nothing in texts or names."""
    formulas = [
        *FORMULAS,
        "=SUM(A:B,$C:D,3:$4)",
        "=LOG10(B2)+XAB12_C+a1b+1E5+B$2",
        "='A1'!A1+Tab1!B2",
        '="A1"&A1',
    ]
    count = 0
    for formula in formulas:
        for rows, columns in ((0, 0), (1, 0), (7, 3), (-1, 0), (0, 25)):
            target = f"{column_letters(5 + columns)}{10 + rows}"
            if rows == -1 and "A1" in formula:  # beyond the edge openpyxl raises, a program shows #REF!
                continue
            wanted = Translator(formula, origin="E10").translate_formula(target)
            assert shift(formula, rows, columns) == wanted
            count += 1
    assert count > 75
    assert shift("=A1+$A$1", -1, 0) == "=#REF!+$A$1"


def test_nothing_is_written_beside_the_file(made: Path) -> None:
    """Reading leaves the folder and the file as they were."""
    before = (made.read_bytes(), made.stat().st_mtime_ns, sorted(made.parent.iterdir()))
    read(made)
    assert (made.read_bytes(), made.stat().st_mtime_ns, sorted(made.parent.iterdir())) == before
