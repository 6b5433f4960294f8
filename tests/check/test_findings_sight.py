"""What hides a cell from the eye is found, in .xlsx and .ods; other looks and rewritten formats are not."""

from __future__ import annotations

import subprocess
from collections.abc import Callable
from pathlib import Path

import pytest
from openpyxl import Workbook, load_workbook
from openpyxl.styles import Font, PatternFill, Protection
from openpyxl.styles.colors import Color
from planting import packed, parts_of, write

from sheetcal.check.shown import hidden
from sheetcal.model import Finding
from sheetcal.verbs.checking import Against, check_path

WORKBOOKS = Path(__file__).parents[2] / "workbooks"
FILLED = sorted(WORKBOOKS.glob("*-filled.xlsx"))
FUEL, SMALL = WORKBOOKS / "fuel-filled.xlsx", WORKBOOKS / "vaporisation-filled.xlsx"
SIGHT = ("cells-hidden", "format-altered", "filter-on", "object-over-cells", "cell-unlocked")
Change = Callable[[Workbook], None]


def _found(path: Path) -> list[Finding]:
    return [one for one in check_path(str(path), Against()).findings if one.code in SIGHT]


def _saved(folder: Path, change: Change, source: Path = SMALL) -> Path:
    """A workbook changed by openpyxl; it drops stored values, which is no matter here."""
    book = load_workbook(source)
    change(book)
    target = folder / "changed.xlsx"
    book.save(target)
    return target


def _coloured(tab: str, cell: str, font: Font | None = None, ground: str | None = None) -> Change:
    def change(book: Workbook) -> None:
        if font is not None:
            book[tab][cell].font = font
        if ground is not None:
            book[tab][cell].fill = PatternFill("solid", fgColor=ground)

    return change


def _formatted(tab: str, code: str, *cells: str) -> Change:
    def change(book: Workbook) -> None:
        for cell in cells:
            book[tab][cell].number_format = code

    return change


WHITE = Font(color="FFFFFFFF")
HIDING: dict[str, tuple[Change, str, str]] = {
    "white on nothing": (_coloured("Readings", "E8", WHITE), "Readings", "E8"),
    "white of the theme": (_coloured("Readings", "E8", Font(color=Color(theme=0))), "Readings", "E8"),
    "white of the old palette": (_coloured("Readings", "E8", Font(color=Color(indexed=9))), "Readings", "E8"),
    "white on a result": (_coloured("Results", "E10", WHITE), "Results", "E10"),
    "the colour of the cell": (_coloured("Results", "E10", Font(color="FF336699"), "FF336699"), "Results", "E10"),
    "pale on pale": (_coloured("Readings", "E9", Font(color="FFFAFAFA")), "Readings", "E9"),
    "letters of one point": (_coloured("Readings", "E9", Font(size=1, color="FF000000")), "Readings", "E9"),
    "a constant": (_coloured("Constants", "C6", WHITE), "Constants", "C6"),
    "a record": (_coloured("Records", "B9", WHITE), "Records", "B9"),
}


@pytest.mark.parametrize("name", HIDING)
def test_text_in_the_colour_of_its_cell_is_found(name: str, tmp_path: Path) -> None:
    """Once, with its cell."""
    change, tab, cell = HIDING[name]
    found = _found(_saved(tmp_path, change, FUEL if tab == "Records" else SMALL))
    assert [(one.code, one.severity, one.sheet, one.cell) for one in found] == [("cells-hidden", "warning", tab, cell)]
    assert "colour of its cell" in found[0].message


def test_many_cells_of_one_tab_are_one_finding(tmp_path: Path) -> None:
    def change(book: Workbook) -> None:
        for row in range(6, 12):
            book["Records"][f"A{row}"].font = WHITE

    found = _found(_saved(tmp_path, change, FUEL))
    assert [(one.code, one.cell) for one in found] == [("cells-hidden", "A6")]
    assert "and 3 more cells" in found[0].message


VISIBLE: dict[str, Change] = {
    "red": _coloured("Readings", "E8", Font(color="FFC00000", bold=True)),
    "grey": _coloured("Readings", "E8", Font(color="FF808080")),
    "white on black": _coloured("Results", "E10", WHITE, "FF000000"),
    "a yellow ground": _coloured("Readings", "E8", None, "FFFFFF00"),
    "white beside the places": _coloured("Readings", "K2", WHITE),
    "no colour said": _coloured("Readings", "E8", Font(name="Calibri")),
    "unlocked readings": lambda book: setattr(book["Readings"]["E8"], "protection", Protection(locked=False)),
    "more decimals": _formatted("Results", "0.00000000", "E10", "E11"),
    "another spelling": _formatted("Results", "#,##0.000000;-#,##0.000000", "E10"),
}


@pytest.mark.parametrize("name", VISIBLE)
def test_other_looks_are_nobodys_business(name: str, tmp_path: Path) -> None:
    assert _found(_saved(tmp_path, VISIBLE[name])) == []


def _mass(source: Path = SMALL) -> str:
    """A weighing with four decimals."""
    sheet = load_workbook(source)["Readings"]
    return next(
        cell.coordinate for row in sheet.iter_rows(min_col=5, max_col=5) for cell in row
        if cell.number_format.startswith("0.0000_") and isinstance(cell.value, float)
    )  # fmt: skip


FORMATS = {
    "0.00": "hides decimals", "0": "hides decimals", "0.0000;0.0000": "hides the minus sign",
    "0.0000;[Red]0.0000": "hides the minus sign", ";;;": "shows nothing", '"ok"': "shows 'ok' instead",
    '0.0000" mg"': "shows 'mg' beside", "0.0000%": "per cent", "0.0000,": "in thousands",
    "[White]0.0000": "shows nothing", "0.0E+00": "hides decimals",
}  # fmt: skip


@pytest.mark.parametrize("code", FORMATS)
def test_a_format_that_hides_is_found(code: str, tmp_path: Path) -> None:
    """Sign, unit and decimals; the finding shows the format found and the one issued."""
    cell = _mass()
    found = _found(_saved(tmp_path, _formatted("Readings", code, cell)))
    assert [(one.code, one.severity, one.action, one.cell) for one in found] == [
        ("format-altered", "warning", "correct", cell)
    ]
    assert FORMATS[code] in found[0].message
    assert (found[0].found, found[0].expected) == (code, "0.0000_ ")


def test_a_format_of_many_cells_is_one_finding(tmp_path: Path) -> None:
    def change(book: Workbook) -> None:
        for row in range(6, 40):
            book["Records"][f"B{row}"].number_format = "0.0"

    found = _found(_saved(tmp_path, change, FUEL))
    assert [(one.code, one.sheet, one.cell) for one in found] == [("format-altered", "Records", "B6")]
    assert "and 33 more cells" in found[0].message


EQUIVALENT = [
    ("0.0000_ ", "0.0000"), ("0.0000_ ", "0.0000\\ "), ("0.0000_ ", "0.0000_)"), ("0.0000_ ", "#,##0.0000"),
    ("0.0000_ ", "0.0000;[RED]-0.0000"), ("0.0000_ ", "0.0000;(0.0000)"), ("0.0000_ ", "General"), ("0.0000_ ", "@"),
    ("0.0000_ ", "[$-407]0.0000"), ("0.0000_ ", "0.000000"), ("0_ ", "0"), ("General", "Standard"),
    ("yyyy-mm-dd_ ", "yyyy\\-mm\\-dd\\ "), ("yyyy-mm-dd_ ", "mm-dd-yy"), ("yyyy-mm-dd_ ", "[$-407]dd.mm.yyyy"),
    ("yyyy-mm-dd hh:mm_ ", "m/d/yy h:mm"), ("yyyy-mm-dd hh:mm_ ", "dd.mm.yyyy hh:mm:ss"),
]  # fmt: skip


@pytest.mark.parametrize(("issued", "found"), EQUIVALENT)
def test_formats_that_show_the_same_are_the_same(issued: str, found: str) -> None:
    assert hidden(issued, found) is None


@pytest.mark.parametrize(
    ("issued", "found", "told"),
    [
        ("yyyy-mm-dd_ ", "hh:mm", "hides the year"),
        ("yyyy-mm-dd_ ", "dd.mm.", "hides the year"),
        ("yyyy-mm-dd_ ", "0", "shows a date as a number"),
        ("yyyy-mm-dd hh:mm_ ", "yyyy-mm-dd", "hides the hour"),
        ("0.0000_ ", "dd.mm.yyyy", "as a date"),
        ("General", "0.0", "hides decimals"),
    ],
)
def test_formats_that_hide_say_what(issued: str, found: str, told: str) -> None:
    assert told in (hidden(issued, found) or "")


def test_a_filter_without_hidden_rows_is_a_note(tmp_path: Path) -> None:
    """Nothing is out of sight yet; the verdict does not change."""

    def change(book: Workbook) -> None:
        book["Readings"].auto_filter.ref = "A3:H40"

    found = _found(_saved(tmp_path, change))
    assert [(one.code, one.severity, one.sort, one.sheet) for one in found] == [
        ("filter-on", "note", "note", "Readings")
    ]


ANCHOR = """<xdr:twoCellAnchor xmlns:xdr="http://schemas.openxmlformats.org/drawingml/2006/spreadsheetDrawing">
<xdr:from><xdr:col>{0}</xdr:col><xdr:colOff>0</xdr:colOff><xdr:row>{1}</xdr:row><xdr:rowOff>0</xdr:rowOff></xdr:from>
<xdr:to><xdr:col>{2}</xdr:col><xdr:colOff>0</xdr:colOff><xdr:row>{3}</xdr:row><xdr:rowOff>0</xdr:rowOff></xdr:to>
<xdr:{4}/><xdr:clientData/></xdr:twoCellAnchor>"""


@pytest.mark.parametrize(
    ("sort", "box", "count"), [("pic", (0, 6, 2, 9), 1), ("sp", (0, 6, 2, 9), 1), ("pic", (20, 6, 22, 9), 0)]
)
def test_a_picture_over_readings_is_a_note(sort: str, box: tuple[int, ...], count: int, tmp_path: Path) -> None:
    """Added to the drawing that holds the charts of the records; beside the places it is nobody's business."""
    parts = parts_of(FUEL.read_bytes())
    name = next(one for one in parts if one.startswith("xl/drawings/drawing"))
    end = parts[name].rindex(b"</")
    parts[name] = parts[name][:end] + ANCHOR.format(*box, sort).encode() + parts[name][end:]
    found = _found(write(tmp_path, packed(parts)))
    assert [(one.code, one.severity, one.sheet) for one in found] == [("object-over-cells", "note", "Records")] * count


@pytest.mark.parametrize("source", FILLED, ids=lambda path: path.stem)
def test_untouched_workbooks_are_silent(source: Path, tmp_path: Path) -> None:
    """As issued, and after a plain save by another program."""
    assert _found(source) == []
    assert _found(_saved(tmp_path, lambda book: None, source)) == []


def _spoiled_all_over(book: Workbook) -> None:
    for change in (
        _coloured("Readings", "E8", WHITE), _coloured("Results", "E10", Font(color="FF336699"), "FF336699"),
        _formatted("Readings", "0.0", "E47"), _formatted("Results", ";;;", "E11"),
        _formatted("Records", '0.000" K"', "B8"),
    ):  # fmt: skip
        change(book)
    for cell in ("E12", "E13"):
        book["Results"][cell].protection = Protection(locked=False)
    book["Readings"].auto_filter.ref = "A3:H40"


TEXT_BOX = """<xdr:twoCellAnchor xmlns:xdr="http://schemas.openxmlformats.org/drawingml/2006/spreadsheetDrawing"
 xmlns:a="http://schemas.openxmlformats.org/drawingml/2006/main"><xdr:from><xdr:col>0</xdr:col><xdr:colOff>0</xdr:colOff>
<xdr:row>8</xdr:row><xdr:rowOff>0</xdr:rowOff></xdr:from><xdr:to><xdr:col>2</xdr:col><xdr:colOff>0</xdr:colOff><xdr:row>11
</xdr:row><xdr:rowOff>0</xdr:rowOff></xdr:to><xdr:sp macro="" textlink=""><xdr:nvSpPr><xdr:cNvPr id="99" name="Box"/>
<xdr:cNvSpPr txBox="1"/></xdr:nvSpPr><xdr:spPr><a:xfrm><a:off x="100000" y="1000000"/><a:ext cx="900000" cy="500000"/>
</a:xfrm><a:prstGeom prst="rect"><a:avLst/></a:prstGeom></xdr:spPr><xdr:txBody><a:bodyPr/><a:p><a:r><a:t>ok</a:t></a:r>
</a:p></xdr:txBody></xdr:sp><xdr:clientData/></xdr:twoCellAnchor>"""
SPOILED = [
    ("cells-hidden", "Readings", "E8"), ("cells-hidden", "Results", "E10"), ("cell-unlocked", "Results", "E12"),
    ("filter-on", "Readings", None), ("format-altered", "Readings", "E47"), ("format-altered", "Records", "B8"),
    ("format-altered", "Results", "E11"), ("object-over-cells", "Records", "A9"),
]  # fmt: skip


@pytest.mark.office
def test_saved_by_libreoffice_all_of_it_is_still_found(
    tmp_path: Path, convert: Callable[[list[Path], str, Path], None]
) -> None:
    """In both formats: colours, formats, locks, a filter and a text box, and nothing else."""
    parts = parts_of(_saved(tmp_path, _spoiled_all_over, FUEL).read_bytes())
    name = next(one for one in parts if one.startswith("xl/drawings/drawing"))
    end = parts[name].rindex(b"</")
    parts[name] = parts[name][:end] + TEXT_BOX.encode() + parts[name][end:]
    source = write(tmp_path, packed(parts), "changed.xlsx")
    assert sorted(((one.code, one.sheet, one.cell) for one in _found(source)), key=str) == sorted(SPOILED, key=str)
    for form in ("xlsx", "ods"):
        convert([source], form, tmp_path / form)
        found = _found(tmp_path / form / f"changed.{form}")
        assert sorted(((one.code, one.sheet, one.cell) for one in found), key=str) == sorted(SPOILED, key=str)


@pytest.mark.office
@pytest.mark.parametrize("language", ["en-US", "de-DE", "fr-FR"])
def test_saved_by_libreoffice_in_any_language_clean_sheets_stay_silent(language: str, tmp_path: Path) -> None:
    """Formats are rewritten, decimal signs of the language set: neither a note nor a change of any formula."""
    home = tmp_path / "home"
    settings = home / "user" / "registrymodifications.xcu"
    settings.parent.mkdir(parents=True)
    settings.write_text(REGISTRY.format(language), "utf-8")
    for form in ("xlsx", "ods", "xls"):
        command = ["soffice", f"-env:UserInstallation={home.as_uri()}", "--headless", "--convert-to", form]
        subprocess.run(
            [*command, "--outdir", str(tmp_path), *map(str, FILLED)], check=True, capture_output=True, timeout=600
        )
        saved = sorted(tmp_path.glob(f"*.{form}"))
        assert len(saved) == len(FILLED)
        for path in saved:
            verdict = check_path(str(path), Against())
            assert [one for one in verdict.findings if one.code != "formula-lost"] == []
            assert verdict.verdict == "sound"


REGISTRY = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema"
 xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance"><item oor:path="/org.openoffice.Setup/L10N">
<prop oor:name="ooSetupSystemLocale" oor:op="fuse"><value>{0}</value></prop></item></oor:items>
"""
