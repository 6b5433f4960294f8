"""What is signed is the whole workbook: every visible tab, every reading, nothing cut off, and paper fits the file."""

from __future__ import annotations

import hashlib
import json
import re
import shutil
import subprocess
import sys
import zipfile
from collections import Counter
from dataclasses import dataclass
from decimal import Decimal
from pathlib import Path

import pytest
from output_case import KINDS, clean_case, typed, whole, without_office

from sheetcal.bench import fill
from sheetcal.check.fingerprint import short
from sheetcal.check.submission import Submission
from sheetcal.cli import main
from sheetcal.excel.reader import read
from sheetcal.excel.writer import write_workbook
from sheetcal.kinds.words import printed_label
from sheetcal.model import Place, Value
from sheetcal.verbs import Output, outputs
from sheetcal.verbs.printing import areas, run
from sheetcal.verbs.workbook import open_workbook, shown

sys.path.insert(0, str(Path(__file__).parents[1] / "check"))

import planting

pytestmark = pytest.mark.office
SIGN = ("Measured by", "Checked by", "Released by")
TABS = ("Front", "Readings", "Results", "Constants", "How computed")


@dataclass(frozen=True)
class Printed:
    """A folder of workbooks and what `print` made of it."""

    folder: Path
    into: Path
    output: Output
    before: dict[str, str]

    def pages(self, name: str) -> list[str]:
        """The text of each page, without white space."""
        return [squeezed(one) for one in text_of(self.into / f"{name}.pdf").split("\f")[:-1]]


def text_of(pdf: Path) -> str:
    """All text, in the order it was drawn."""
    return subprocess.run(["pdftotext", "-raw", str(pdf), "-"], check=True, capture_output=True, text=True).stdout


def squeezed(text: str) -> str:
    """Text without white space: how a cell breaks its lines does not matter."""
    return re.sub(r"\s+", "", text)


def hashes(folder: Path) -> dict[str, str]:
    """The hash of every file."""
    return {
        str(one): hashlib.sha256(one.read_bytes()).hexdigest() for one in sorted(folder.rglob("*")) if one.is_file()
    }


@pytest.fixture(scope="module")
def printed(tmp_path_factory: pytest.TempPathFactory) -> Printed:
    """Each kind filled, one blank, one rejected, one .ods, one in a folder below; one that is not ours."""
    folder = tmp_path_factory.mktemp("sheets")
    (folder / "below").mkdir()
    for kind in KINDS:
        record = clean_case.record_of(kind, folder, "coal", "CAL-A")
        clean_case.write(record, 4, None, folder / f"{kind}.xlsx")
    write_workbook(record, whole(record, {}), folder / "below" / "blank.xlsx")
    outputs.write(record, whole(record, fill(record, 4, None)), folder / f"{record.kind}.ods")
    energy = open_workbook(folder / "vaporisation.xlsx").parts.skeleton.places["sheet.energy_reported"].where
    rejected = planting.edited((folder / "vaporisation.xlsx").read_bytes(), {energy: planting.number(24903.0)})
    (folder / "rejected.xlsx").write_bytes(rejected)
    (folder / "strange.xlsx").write_bytes(b"PK\3\4 no workbook")
    (folder / "worklist.csv").unlink()
    before = hashes(folder)
    into = tmp_path_factory.mktemp("paper") / "pdf"
    return Printed(folder, into, run(str(folder), str(into)), before)


def test_a_line_for_each_file_and_a_summary(printed: Printed) -> None:
    """Printed, rejected and not printed are told apart; what is no workbook of ours is not printed: exit 2."""
    lines = printed.output.lines
    assert lines[-1] == "9 workbooks: 8 printed, 1 of them rejected, 1 not printed."
    assert sum(bool(re.fullmatch(r"printed \S+\.pdf  \d+ pages  sound", line)) for line in lines) == 6
    assert [line.rpartition("  ")[2] for line in lines if "rejected.pdf" in line] == ["reject"]
    assert [line.rpartition("  ")[2] for line in lines if "blank.pdf" in line] == ["incomplete"]
    assert next(line for line in lines if line.startswith("not printed")).split()[2].endswith("strange.xlsx")
    assert printed.output.code == 2
    names = sorted(str(one.relative_to(printed.into)) for one in printed.into.rglob("*.*"))
    same = ["heat-balance.ods.pdf", "heat-balance.xlsx.pdf"]
    assert names == sorted(
        ["below/blank.pdf", "rejected.pdf", *same, *(f"{kind}.pdf" for kind in KINDS if kind != "heat-balance")]
    )


def test_originals_are_untouched(printed: Printed) -> None:
    assert hashes(printed.folder) == printed.before


@pytest.mark.parametrize("kind", KINDS)
def test_every_label_and_every_reading_is_on_paper(kind: str, printed: Printed) -> None:
    """All labels and readings of the printed places, all results, as the sheet shows them; no column too narrow."""
    parts = open_workbook(printed.folder / f"{kind}.xlsx").parts
    text = "".join(printed.pages(kind if kind != "heat-balance" else "heat-balance.xlsx"))
    places = [one for one in parts.skeleton.places.values() if is_printed(parts, one)]
    assert [one.field.label for one in places if squeezed(printed_label(one.field)) not in text] == []
    wanted = [word for one in places for word in words_of(parts, one)]
    assert len(wanted) > 40
    assert [word for word in wanted if squeezed(word) not in text] == []
    assert "###" not in text


def is_printed(parts: Submission, place: Place) -> bool:
    """Whether a place lies in what is printed."""
    area = dict(areas(parts)).get(place.tab, "")
    rows = [tuple(int(re.sub("[A-Z]", "", end)) for end in one.split(":")) for one in area.split(",") if one]
    return not rows or any(first <= place.row <= last for first, last in rows)


def words_of(parts: Submission, place: Place) -> list[str]:
    """What a place shows: readings and reported results."""
    step = place.field.step
    if step is not None and not step.reported:
        return []
    value = parts.typed.get(place.id) if step else parts.readings.get(place.id)
    listed = value if isinstance(value, list) else [value]
    return [in_words(place, shown(place, one)) for one in listed if one not in (None, "")]


def in_words(place: Place, value: Value) -> str:
    """A value with the digits of its field."""
    if isinstance(value, float):
        step = Decimal(str(place.field.resolution or 1))
        digits = max(0, -step.normalize().as_tuple().exponent) if place.field.resolution else None
        return f"{value:g}" if digits is None else f"{value:.{digits}f}"
    return str(value).replace("T", " ") if place.field.type == "datetime" else str(value)


@pytest.mark.parametrize("kind", KINDS)
def test_every_page_names_issue_readings_and_its_number(kind: str, printed: Printed) -> None:
    """Head and foot of every page; every visible tab is there; only the first page has room for signatures."""
    name = kind if kind != "heat-balance" else "heat-balance.xlsx"
    pages = printed.pages(name)
    parts = open_workbook(printed.folder / f"{kind}.xlsx").parts
    main(["check", str(printed.folder / f"{kind}.xlsx"), "--json", str(printed.into / f"{kind}.json")])
    told = json.loads((printed.into / f"{kind}.json").read_text("utf-8"))["files"][0]
    assert re.fullmatch("[0-9a-f]{64}", told["readings_sha256"])
    for number, page in enumerate(pages, start=1):
        assert parts.record.issue_id in page
        assert squeezed(f"readings {short(told['readings_sha256'])}") in page
        assert f"page{number}of{len(pages)}" in page
        assert "sound(sheetcal" in page
        assert [squeezed(one) in page for one in ("date, name, signature", SIGN[0])] == [number == 1] * 2
    heads = {tab for tab in (*TABS, "Records") if any(squeezed(f"{parts.kind.title}: {tab}") in one for one in pages)}
    assert heads == {*TABS, *(["Records"] if dict(areas(parts)).get("Records") else [])}


def test_a_rejected_sheet_is_not_for_signature(printed: Printed, tmp_path: Path) -> None:
    """Every page says so, and there is no line to sign on; exit code 1."""
    pages = printed.pages("rejected")
    assert pages and all("REJECTED,1error:NOTFORSIGNATURE" in one for one in pages)
    assert all("REJECTED,NOTFORSIGNATURE·Energyofvaporisation:" in one for one in pages)
    assert not any("date,name,signature" in one for one in pages)
    assert run(str(printed.folder / "rejected.xlsx"), str(tmp_path)).code == 1


def test_a_blank_form_says_what_is_missing_and_can_be_signed(printed: Printed) -> None:
    pages = printed.pages("below/blank")
    assert all("readingsmissing" in one for one in pages)
    assert "date,name,signature" in pages[0]


def test_the_ods_prints_as_the_xlsx(printed: Printed) -> None:
    """The same readings, the same pages, the same words; the page number stands where it stood."""
    assert printed.pages("heat-balance.ods") == printed.pages("heat-balance.xlsx")


def test_no_ink_touches_the_edges(printed: Printed) -> None:
    """On every page 5 mm stay free on all sides."""
    count = 0
    for path in sorted(printed.into.rglob("*.pdf")):
        for page in greys(path):
            assert min(margins(page)) > 5.0, path
            count += 1
    assert count > 60


Page = tuple[int, int, bytes]  # width, height, grey values


def greys(pdf: Path) -> list[Page]:
    """The pages as grey pictures of 30 dots an inch."""
    raw = subprocess.run(["pdftoppm", "-r", "30", "-gray", str(pdf)], check=True, capture_output=True).stdout
    pages, at = [], 0
    while at < len(raw):
        match = re.compile(rb"P5\s+(\d+)\s+(\d+)\s+255\s").match(raw, at)
        assert match is not None
        width, height = int(match[1]), int(match[2])
        pages.append((width, height, raw[match.end() : match.end() + width * height]))
        at = match.end() + width * height
    return pages


def margins(page: Page) -> list[float]:
    """Millimetres without ink on each side."""
    width, height, dots = page
    rows = [number for number in range(height) if min(dots[number * width : (number + 1) * width]) < 200]
    columns = [number for number in range(width) if min(dots[number::width]) < 200]
    free = (rows[0], height - 1 - rows[-1], columns[0], width - 1 - columns[-1])
    return [one * 25.4 / 30 for one in free]


def test_what_a_file_hides_is_printed(printed: Printed, tmp_path: Path) -> None:
    """A hidden tab, hidden rows, too narrow a column, a remark longer than its row, a spare record begun late."""
    data = (printed.folder / "fuel.xlsx").read_bytes()
    plan = open_workbook(printed.folder / "fuel.xlsx").parts.skeleton
    row = plan.places["run1.crucible_gross"].row
    last = max(int(one.partition(".")[0][3:]) for one in plan.places if one.startswith("run"))
    start, end = plan.places[f"run{last}.record_temperature"].cell.split(":")
    remark = " ".join(f"word{number:02d}" for number in range(36))
    data = planting.edited(
        data, {f"Records!{start}": planting.number(23.4567), plan.places["sheet.remarks"].where: planting.text(remark)}
    )
    hidden = re.compile(r'(name="Results"[^>]*state=)"visible"')
    data = planting.on_part(data, "xl/workbook.xml", lambda xml: hidden.sub(r'\1"hidden"', xml))
    data = planting.on_part(
        data, planting.sheet_part("Readings"),
        lambda xml: re.sub(rf'<row r="{row}"', f'<row r="{row}" hidden="1"', xml).replace(
            '<col width="14" customWidth="1" min="5" max="5"', '<col width="2" customWidth="1" min="5" max="5"'),
    )  # fmt: skip
    assert start != end
    (tmp_path / "hides.xlsx").write_bytes(data)
    assert run(str(tmp_path / "hides.xlsx"), str(tmp_path)).lines[0].startswith("printed")
    text = squeezed(text_of(tmp_path / "hides.pdf"))
    assert squeezed(remark) in squeezed(text_of(tmp_path / "hides.pdf").split("\f")[0])
    assert "Cruciblewithsample" in text and "23.4567" in text and "###" not in text
    assert squeezed("Calorific value of fuels: Results") in text
    assert "NOTEVERYTHINGISPRINTED" not in text


def test_a_tab_hidden_in_an_ods_is_printed(printed: Printed, tmp_path: Path) -> None:
    """Also where the tabs are locked."""
    with (
        zipfile.ZipFile(printed.folder / "heat-balance.ods") as before,
        zipfile.ZipFile(tmp_path / "a.ods", "w") as after,
    ):
        for entry in before.infolist():
            content = before.read(entry)
            if entry.filename == "content.xml":
                style = re.search(rb'table:name="Results" table:style-name="(\w+)"', content)
                assert style is not None and b'table:structure-protected="true"' in content
                shown = re.compile(rb'(style:name="' + style[1] + rb'".{0,300}?table:display=)"true"', re.S)
                assert shown.search(content)
                content = shown.sub(rb'\1"false"', content, count=1)
            after.writestr(entry, content, entry.compress_type)
    assert ("Results", "hidden") in read(tmp_path / "a.ods").tabs
    assert run(str(tmp_path / "a.ods"), str(tmp_path)).lines[0].startswith("printed")
    assert squeezed("Heat balance of bodies: Results") in squeezed(text_of(tmp_path / "a.pdf"))


def test_an_xls_is_printed_as_it_stands(printed: Printed, tmp_path: Path) -> None:
    order = {
        "file": str(printed.folder / "vaporisation.xlsx"),
        "out": str(tmp_path / "old.xls"),
        "filter": "MS Excel 97",
    }
    typed([order], tmp_path / "user")
    output = run(str(tmp_path / "old.xls"), str(tmp_path))
    assert output.code == 0 and output.lines[0].endswith("sound")
    ours, theirs = text_of(printed.into / "vaporisation.pdf"), text_of(tmp_path / "old.pdf")
    assert Counter(squeezed(ours)) == Counter(squeezed(theirs))  # it is drawn in another order
    assert ours.count("\f") == theirs.count("\f")


def test_misuse_is_refused_before_anything_is_written(
    printed: Printed, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """A PDF that exists, a folder that is none, a missing parent; --force replaces."""
    book = tmp_path / "a.xlsx"
    shutil.copy(printed.folder / "vaporisation.xlsx", book)
    (tmp_path / "a.pdf").write_text("kept", "utf-8")
    for into, said in ((tmp_path, "exists already"), (book, "is a file"), (tmp_path / "no" / "no", "does not exist")):
        assert main(["print", str(book), "--into", str(into)]) == 2
        assert said in capsys.readouterr().err
    assert (tmp_path / "a.pdf").read_text("utf-8") == "kept"
    assert main(["print", str(book), "--into", str(tmp_path), "--force"]) == 0
    assert capsys.readouterr().out.endswith("1 workbook: 1 printed, 0 of them rejected, 0 not printed.\n")
    assert (tmp_path / "a.pdf").read_bytes().startswith(b"%PDF-")
    assert sorted(one.name for one in tmp_path.iterdir()) == ["a.pdf", "a.xlsx"]


def test_without_libreoffice(
    printed: Printed, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    without_office(monkeypatch)
    assert main(["print", str(printed.folder), "--into", str(tmp_path / "pdf")]) == 2
    said = capsys.readouterr().err
    assert said.count("\n") == 1 and "LibreOffice: not found" in said and "install" in said
    assert not (tmp_path / "pdf").exists()
