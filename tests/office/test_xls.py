"""A workbook saved in the old binary format gets the verdict of the .xlsx it was: no false alarm, no fault lost."""

from __future__ import annotations

import hashlib
import random
import shutil
import struct
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from output_case import clean_case, typed, whole, without_office

from sheetcal.archive.opening import read_workbook, sources
from sheetcal.bench import fill
from sheetcal.cli import main
from sheetcal.errors import SheetcalError
from sheetcal.excel import oldlimits, ole
from sheetcal.excel.writer import write_workbook
from sheetcal.model import Value, Verdict
from sheetcal.office import jobs, shared
from sheetcal.verbs.checking import Against, check_all, check_path
from sheetcal.verbs.workbook import open_workbook

sys.path.insert(0, str(Path(__file__).parents[1] / "check"))

import planting
from test_findings_office import slips, told

pytestmark = pytest.mark.office
Convert = Callable[[list[Path], str, Path], None]
FOLLOWS = {"result-stale", "formula-lost"}  # what is not kept in an .xls, and what is said of it
KINDS = ("heat-balance", "fuel", "vaporisation", "specific-heat", "calibration")
FIRST = ("reading-error-value", "reading-formula", "formula-altered", "constant-altered", "reading-date", "sound")


@pytest.fixture(scope="module")
def books(
    tmp_path_factory: pytest.TempPathFactory, convert: Convert, sizes: dict[str, Any]
) -> dict[str, tuple[Path, Path]]:
    """(.xlsx, .xls) of a blank and of a filled workbook of each kind, and of one spoiled in each way there is."""
    folder = tmp_path_factory.mktemp("books")
    for kind in KINDS:
        record = clean_case.record_of(kind, folder, "coal", "CAL-A")
        if kind in KINDS[: sizes["old_blanks"]]:
            write_workbook(record, whole(record, {}), folder / f"{kind}-blank.xlsx")
        write_workbook(record, whole(record, fill(record, 2, None)), folder / f"{kind}.xlsx")
    record = planting.issue("fuel", folder, [planting.CONTROL, planting.coal("S-1")], spare=1)
    book = planting.filled(record)
    spoiled = slips(book)
    for name in [*FIRST, *(one for one in spoiled if one not in FIRST)][: sizes["old_slips"]]:
        planting.write(folder, spoiled[name], f"slip-{name}.xlsx")
    gross = {book.cell("sample2.gross_dry"): planting.error("#N/A")}
    planting.write(folder, planting.edited(book.data(), gross), "over.xlsx")
    files = sorted(folder.glob("*.xlsx"))
    convert(files, "xls", folder)
    return {one.stem: (one, one.with_suffix(".xls")) for one in files}


@pytest.fixture(scope="module")
def verdicts(books: dict[str, tuple[Path, Path]]) -> dict[str, tuple[Verdict, Verdict]]:
    """Both verdicts on each, all files in one go."""
    files = [str(path) for pair in books.values() for path in pair]
    found = {one.file: one for one in check_all(files, Against())}
    return {name: (found[str(before)], found[str(after)]) for name, (before, after) in books.items()}


@pytest.mark.parametrize("kind", KINDS)
def test_honest_workbooks_keep_their_verdict(kind: str, verdicts: dict[str, tuple[Verdict, Verdict]]) -> None:
    """Blank and filled: the same verdict, missing readings, results and hash; the file's own name and hash."""
    for name, wanted in ((kind, "sound"), (f"{kind}-blank", "incomplete")):
        if name not in verdicts:
            assert kind not in KINDS[:2]
            continue
        before, after = verdicts[name]
        assert (before.verdict, after.verdict) == (wanted, wanted)
        assert (after.missing, after.stage) == (before.missing, before.stage)
        assert after.readings_sha256 == before.readings_sha256
        assert after.sha256 == hashlib.sha256(Path(after.file).read_bytes()).hexdigest()
        assert [(one.id, told_to_twelve(one.formula)) for one in after.results] == [
            (one.id, told_to_twelve(one.formula)) for one in before.results
        ]
        assert after.witnesses == tuple(one for one in before.witnesses if one != "typed")
        assert "anew" in after.witness_notes["typed"]
        new = [one for one in after.findings if one.code not in {found.code for found in before.findings}]
        assert {one.code for one in new} <= {"formula-lost"} and {one.sort for one in new} <= {"note"}


def told_to_twelve(value: Value) -> Value:
    """A number to twelve digits."""
    return f"{value:.12g}" if isinstance(value, float) else value


def test_planted_faults_are_still_found(verdicts: dict[str, tuple[Verdict, Verdict]], sizes: dict[str, Any]) -> None:
    """Every slip is found in the .xls as in the .xlsx: same code, cell and values, same verdict."""
    compared = 0
    for name, (before, after) in verdicts.items():
        if name.startswith("slip-"):
            left = [one for one in told(after) if one[0] not in FOLLOWS]
            assert left == [one for one in told(before) if one[0] not in FOLLOWS], name
            assert after.verdict == before.verdict, name
            compared += 1
    assert compared == sizes["old_slips"]


def test_formulas_the_format_cannot_hold_are_told(
    books: dict[str, tuple[Path, Path]], verdicts: dict[str, tuple[Verdict, Verdict]]
) -> None:
    """They are lines of warning only, computed as issued; a note says how many and where the first stands."""
    file = read_workbook(books["fuel"][1])
    lost = file.extras["lost_formulas"]
    assert lost and all(one.startswith("Records!F") for one in lost)
    note = next(one for one in verdicts["fuel"][1].findings if one.code == "formula-lost")
    assert (note.severity, note.action, note.sheet) == ("note", "note", "Records")
    assert str(len(lost)) in note.message


def test_limits_of_the_old_format() -> None:
    """Length, nesting and number of arguments; quotes and plain brackets do not count."""
    assert oldlimits.fits('=IF(A1="((((((((((((",((((((((((1)))))))))),2)')
    assert oldlimits.fits("=" + "ABS(" * 8 + "1" + ")" * 8)
    assert not oldlimits.fits("=" + "ABS(" * 9 + "1" + ")" * 9)
    assert oldlimits.fits(f"=SUM({','.join('1' * 30)})")
    assert not oldlimits.fits(f"=SUM({','.join('1' * 31)})")
    assert not oldlimits.fits("=" + "+1" * 600)
    assert oldlimits.is_lost("e", "#VALUE!", None) and not oldlimits.is_lost("n", 1.0, None)


def test_a_formula_that_fits_and_is_gone_was_deleted(verdicts: dict[str, tuple[Verdict, Verdict]]) -> None:
    """#N/A typed over a result that the format can hold stays a fault."""
    codes = {(one.code, one.field) for one in verdicts["over"][1].findings if one.severity == "error"}
    assert codes & {("result-typed-over", "sample2.gross_dry"), ("formula-altered", "sample2.gross_dry")}
    assert verdicts["over"][1].verdict == "reject"


def test_what_other_programs_leave_of_long_formulas(
    books: dict[str, tuple[Path, Path]], tmp_path: Path, convert: Convert
) -> None:
    """Every formula beyond the old limits replaced by #VALUE!, as the old programs save it: sound, with the note."""
    parts = open_workbook(books["specific-heat"][0]).parts
    long = [one.where for one in parts.skeleton.places.values() if one.formula and not oldlimits.fits(one.formula)]
    data = planting.edited(books["specific-heat"][0].read_bytes(), {one: planting.error("#VALUE!") for one in long})
    convert([planting.write(tmp_path, data)], "xls", tmp_path)
    verdict = check_path(str(tmp_path / "book.xls"), Against())
    assert verdict.verdict == "sound" and len(long) > 5
    assert [one.message for one in verdict.findings if one.code == "formula-lost"] == [
        f"the old format .xls cannot hold {len(long)} of its formulas: computed as issued"
    ]


def test_other_commands_take_an_xls(
    books: dict[str, tuple[Path, Path]], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """`fields`, `explain`, `fill`, `recompute` give what they give of the .xlsx."""
    said: list[list[str]] = []
    for path in books["heat-balance"]:
        assert main(["fields", str(path)]) == 0
        assert main(["explain", str(path), "sheet.closure"]) == 0
        said.append(capsys.readouterr().out.splitlines())
    assert said[0] == said[1] and len(said[0]) > 50
    blank, data = books["heat-balance-blank"][1], tmp_path / "late.csv"
    data.write_text("field,value,unit\nsheet.room_temperature,21.5,degC\n", "utf-8")
    assert main(["fill", str(blank), "--from", str(data), "-o", str(tmp_path / "late.xlsx")]) == 0
    archive = tmp_path / "archive"
    archive.mkdir()
    for name in ("calibration", "fuel"):
        shutil.copy(books[name][1], archive)
    assert main(["recompute", str(archive), "--into", str(tmp_path / "out")]) == 0
    assert "2 recomputed" in capsys.readouterr().out
    assert (tmp_path / "out" / "changes.csv").read_text("utf-8").count("\n") == 1


def test_many_files_share_one_libreoffice(books: dict[str, tuple[Path, Path]], monkeypatch: pytest.MonkeyPatch) -> None:
    """All .xls of a command go through one pool, each once; other files do not go through it."""
    asked: list[jobs.Convert] = []
    pool = shared.shared_pool()
    submit = pool.submit
    monkeypatch.setattr(pool, "submit", lambda job: asked.append(job) or submit(job))
    files = [str(path) for pair in list(books.values())[:4] for path in pair]
    with sources(files) as found:
        assert [one.file for one in found] == files
        assert [bool(one.copy) for one in found] == [one.endswith(".xls") for one in files]
        copies = [Path(one.copy) for one in found if one.copy]
        assert {one.read().format for one in found if one.copy} == {"xls"}
        assert len(pool.engine_pids()) <= pool.size
    assert [one.path for one in asked] == [one for one in files if one.endswith(".xls")]
    assert not any(one.exists() for one in copies)


def test_without_libreoffice(
    books: dict[str, tuple[Path, Path]],
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    """One .xls among others: its verdict is unreadable and says what is needed; the others get theirs; exit 2."""
    without_office(monkeypatch)
    for path in books["heat-balance"]:
        shutil.copy(path, tmp_path)
    assert main(["check", str(tmp_path), "--all"]) == 2
    lines = capsys.readouterr().out.splitlines()
    assert [line.split()[0] for line in lines if line.split()[0] in ("sound", "unreadable")] == ["unreadable", "sound"]
    assert sum("is read through LibreOffice: not found" in line for line in lines) == 1
    assert main(["fields", str(tmp_path / "heat-balance.xls")]) == 2
    said = capsys.readouterr().err
    assert said.count("\n") == 1 and "install" in said


def test_dangerous_and_damaged_files_are_refused(books: dict[str, tuple[Path, Path]], tmp_path: Path) -> None:
    """Encrypted, cut short, no workbook, in circles: one line each, and LibreOffice is not asked."""
    good = books["heat-balance"][1].read_bytes()
    typed(
        [{"file": str(books["heat-balance"][0]), "out": str(tmp_path / "secret.xls"), "filter": "MS Excel 97",
          "password": "a"}],
        tmp_path / "user",
    )  # fmt: skip
    name = "Workbook".encode("utf-16-le")
    first = struct.unpack_from("<I", good, 76)[0]
    circle = bytearray(good)
    circle[512 * (first + 1) : 512 * (first + 2)] = struct.pack("<128I", *range(128))
    written = {
        "cut.xls": (good[: len(good) // 2], "damaged or cut short"),
        "short.xls": (good[:700], "damaged or cut short"),
        "letter.xls": (good.replace(name, "WordDocu".encode("utf-16-le")), "not a workbook"),
        "circle.xls": (bytes(circle), "damaged or cut short"),
        "secret.xls": ((tmp_path / "secret.xls").read_bytes(), "encrypted"),
        "page.xls": (b"<html><table></table></html>", "markup text"),
        "empty.xls": (b"", "empty"),
    }
    for name, (data, reason) in written.items():
        (tmp_path / name).write_bytes(data)
        verdict = check_path(str(tmp_path / name), Against())
        assert verdict.verdict == "unreadable", name
        assert reason in verdict.findings[0].message, (name, verdict.findings[0].message)


def test_macros_and_links_of_an_xls_are_noted(books: dict[str, tuple[Path, Path]], tmp_path: Path) -> None:
    """A storage of macros and a sheet of macros are told, as they are of an .xlsm."""
    good = books["heat-balance"][1].read_bytes()
    assert ole.look(books["heat-balance"][1]).extras == {}
    sheet = good.index(struct.pack("<H", 0x0085), good.index(b"\x09\x08"))
    changed = bytearray(good)
    changed[sheet + 9] = 1  # the type of the first sheet
    (tmp_path / "macro.xls").write_bytes(changed)
    assert ole.look(tmp_path / "macro.xls").extras == {"macros": ["a sheet of macros"]}


def test_spoiled_bytes_cost_neither_time_nor_a_traceback(
    books: dict[str, tuple[Path, Path]], tmp_path: Path, sizes: dict[str, Any]
) -> None:
    """Whatever is changed in header, tables and directory, the look ends at once, in an answer or in one line."""
    good = books["vaporisation"][1].read_bytes()
    chance = random.Random(7)
    began, refused = time.perf_counter(), 0
    for _ in range(sizes["spoiled_xls"]):
        data = bytearray(good)
        for _ in range(chance.randint(1, 40)):
            data[chance.randrange(4096) if chance.random() < 0.7 else chance.randrange(len(data))] = chance.randrange(
                256
            )
        data[:8] = good[:8]
        (tmp_path / "a.xls").write_bytes(data)
        try:
            ole.look(tmp_path / "a.xls")
        except SheetcalError as fault:
            refused += "\n" not in str(fault)
    assert refused > sizes["spoiled_xls"] // 4
    assert time.perf_counter() - began < 0.05 * sizes["spoiled_xls"]
