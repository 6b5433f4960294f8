"""A submitted file is judged before anything in it is parsed: the hostile and the broken get one line."""

import hashlib
import os
import random
import subprocess
import sys
import time
import zipfile
from pathlib import Path

import openpyxl
import pytest
from hostile import hostile_files, ods, relations, worksheet, xlsx, zipped

from sheetcal.errors import BadInput, Refused, SheetcalError
from sheetcal.excel import gate
from sheetcal.excel.reader import read

FUZZ_RUNS = 400
MEMORY_MIB = 300
# The process's own highest memory in MiB; ru_maxrss would count the parent's before exec.
PEAK = "int(open('/proc/self/status').read().split('VmHWM:')[1].split()[0]) // 1024"


@pytest.fixture(scope="module")
def hostile(tmp_path_factory: pytest.TempPathFactory) -> list[tuple[Path, str]]:
    return list(hostile_files(tmp_path_factory.mktemp("hostile")))


def test_every_hostile_file_is_refused_by_one_line_that_says_why(hostile: list[tuple[Path, str]]) -> None:
    """Each attack and each damage is refused within two seconds, in one line that begins with its name."""
    assert len(hostile) >= 125
    wrong = []
    for path, words in hostile:
        began = time.perf_counter()
        with pytest.raises((Refused, BadInput)) as caught:
            read(path)
        line = str(caught.value)
        took = time.perf_counter() - began
        if words not in line or not line.startswith(path.name) or not line.isprintable() or took > 2:
            wrong.append((path.name, words, line, took))
    assert wrong == []


def test_refusing_takes_little_memory(hostile: list[tuple[Path, str]]) -> None:
    """One process that meets every hostile file never grows beyond the limit."""
    code = (
        "import sys\nfrom sheetcal.errors import SheetcalError\n"
        "from sheetcal.excel.reader import read\n"
        "for path in sys.argv[1:]:\n    try:\n        read(path)\n    except SheetcalError:\n        pass\n"
        f"print({PEAK})"
    )
    run = [sys.executable, "-c", code, *(str(path) for path, _ in hostile)]
    out = subprocess.run(run, capture_output=True, text=True, check=True, timeout=120)
    print(f"\npeak memory over {len(hostile)} hostile files: {out.stdout.strip()} MiB")
    assert int(out.stdout) < MEMORY_MIB


def test_the_largest_file_that_is_let_in_keeps_the_limits(tmp_path: Path) -> None:
    """A workbook just below the cell limit is read in seconds and below the memory limit."""
    chance = random.Random(3)
    rows = "".join(
        f'<row r="{r}">'
        + "".join(f'<c r="{chr(65 + c)}{r}"><f>A1*{chance.random()}</f><v>{r}.5</v></c>' for c in range(20))
        + "</row>"
        for r in range(1, 9_501)
    )
    path = tmp_path / "large.xlsx"
    path.write_bytes(zipped(xlsx(rows)))
    code = (
        "import sys\nfrom sheetcal.excel.reader import read\nbook = read(sys.argv[1])\n"
        f"print(len(book.cells['Front']), {PEAK})"
    )
    began = time.perf_counter()
    out = subprocess.run([sys.executable, "-c", code, str(path)], capture_output=True, text=True, check=True)
    cells, memory = map(int, out.stdout.split())
    assert cells == 190_000
    assert memory < MEMORY_MIB
    assert time.perf_counter() - began < 10


def test_what_is_no_ordinary_file_is_never_opened(tmp_path: Path) -> None:
    """A folder, a missing file, a pipe and an unreadable name get one line, and nothing waits on a pipe."""
    os.mkfifo(tmp_path / "pipe.xlsx")
    for name, words in (
        ("", "folder"),
        ("none.xlsx", "no such file"),
        ("pipe.xlsx", "ordinary"),
        ("a\0b", "read"),
    ):
        with pytest.raises(BadInput, match=words):
            read(f"{tmp_path}/{name}" if name else tmp_path)


def test_a_file_beyond_the_size_limit_is_not_read_to_its_end(tmp_path: Path) -> None:
    """The size limit holds for the file itself."""
    path = tmp_path / "huge.xlsx"
    with path.open("wb") as stream:
        stream.truncate(gate.MAX_FILE + 1)
    with pytest.raises(Refused, match="too large"):
        read(path)


def test_damage_at_any_place_ends_in_a_reading_or_in_one_line(tmp_path: Path) -> None:
    """Random damage to the zip and to each part never ends in anything but cells or a line of ours."""
    chance = random.Random(11)
    goods = [
        xlsx(
            '<row r="1"><c r="A1" s="1" t="s"><v>1</v></c><c r="B1"><f>A1&amp;"x"</f><v>2.5e3</v></c></row>',
            '<mergeCells count="1"><mergeCell ref="C1:D2"/></mergeCells>',
        ),
        ods(
            '<table:table-row><table:table-cell table:formula="of:=[.A1]*2" office:value-type="float" '
            'office:value="2"/><table:table-cell office:value-type="string"><text:p>a<text:s text:c="2"/>b'
            "</text:p></table:table-cell></table:table-row>"
        ),
    ]
    outcomes = {"read": 0, "refused": 0}
    path = tmp_path / "damaged.xlsx"
    for number in range(FUZZ_RUNS):
        parts = dict(goods[number % 2])
        data = zipped(parts) if number % 4 < 2 else b""
        if not data:
            name = chance.choice(sorted(set(parts) - {"mimetype"}))
            parts[name] = _damaged(parts[name], chance)
            data = zipped(parts)
        else:
            data = _damaged(data, chance)
        path.write_bytes(data)
        try:
            read(path)
            outcomes["read"] += 1
        except SheetcalError as error:
            outcomes["refused"] += 1
            assert "\n" not in str(error)
    assert sum(outcomes.values()) == FUZZ_RUNS
    assert outcomes["refused"] > FUZZ_RUNS // 3


def _damaged(data: bytes, chance: random.Random) -> bytes:
    """Return the bytes with one to three places changed, cut out or doubled."""
    for _ in range(chance.randint(1, 3)):
        at, length = chance.randrange(len(data) + 1), chance.randint(0, 12)
        new = chance.choice(
            [b"", bytes([chance.randrange(256)]), b"<", b'"', b"&", b"9" * 12, data[at : at + length] * 2]
        )
        data = data[:at] + new + data[at + length :]
    return data


def test_the_zip_directory_is_read_as_zipfile_reads_it(tmp_path: Path) -> None:
    """On an ordinary workbook the gate sees the members, sizes and bytes that Python's zipfile sees."""
    book = openpyxl.Workbook()
    book.active["A1"] = "text"
    path = tmp_path / "plain.xlsx"
    book.save(path)
    package = gate.admit(path)
    with zipfile.ZipFile(path) as other:
        names = other.namelist()
        for name in names:
            assert gate.unpack(package.raw, package.members[name.lower()], "x") == other.read(name)
    assert list(package.names()) == names
    assert len(names) >= 8
    assert package.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()


def test_macros_links_and_embedded_objects_are_reported_not_refused(tmp_path: Path) -> None:
    """Macros, links to other files, DDE, embedded objects and formulas that reach outside are facts."""
    parts = xlsx(
        '<row r="1"><c r="A1"><f>[1]Sheet1!A1</f><v>0</v></c><c r="B1"><f>webservice("http://h/")</f></c>'
        '<c r="C1"><f>SUM(A1:B1)</f><v>1</v></c></row>'
    )
    parts |= {
        "xl/vbaProject.bin": b"macro",
        "xl/embeddings/oleObject1.bin": b"object",
        "xl/connections.xml": b"<connections/>",
        "xl/externalLinks/externalLink1.xml": b'<externalLink><ddeLink ddeService="cmd"/></externalLink>',
        "xl/externalLinks/_rels/externalLink1.xml.rels": relations(
            "r1 externalLinkPath file:///tmp/other.xlsx External"
        ).encode(),
        "xl/worksheets/_rels/sheet1.xml.rels": relations("r1 hyperlink http://h/ External").encode(),
    }
    path = tmp_path / "facts.xlsm"
    path.write_bytes(zipped(parts))
    extras = read(path).extras
    assert extras["macros"] == ["xl/vbaProject.bin"]
    assert extras["embedded"] == ["xl/embeddings/oleObject1.bin"]
    assert extras["connections"] == ["xl/connections.xml"]
    assert extras["dde"] == ["xl/externalLinks/externalLink1.xml"]
    assert extras["external_links"] == ["file:///tmp/other.xlsx"]
    assert extras["hyperlinks"] == ["http://h/"]
    assert extras["reaching_formulas"] == ["Front!A1", "Front!B1"]


def test_a_document_type_is_refused_by_the_parser_too() -> None:
    """Were the byte search ever passed by, the parser itself refuses a DOCTYPE."""
    part = worksheet("", head="<!DOCTYPE a>")
    with pytest.raises(Refused, match="DOCTYPE"):
        gate.walk(part, "p", "w", lambda name, attributes: None)


def test_foreign_text_in_a_refusal_is_short_and_printable(tmp_path: Path) -> None:
    """Control characters and long texts of the file reach no terminal."""
    path = tmp_path / "shown.xlsx"
    path.write_bytes(zipped(xlsx(f'<row r="1"><c r="A1"><v>\n\t{"z" * 999}</v></c></row>')))
    with pytest.raises(Refused) as caught:
        read(path)
    assert str(caught.value).isprintable()
    assert "\\x0a" in str(caught.value)
    assert len(str(caught.value)) < 250
