"""The verdict is the first that applies; notes and statistical findings never change it; files in any state get one."""

import hashlib
from dataclasses import replace
from pathlib import Path

import pytest
from planting import CONTROL, Book, check, coal, filled, issue, only, packed, parts_of, rewritten, write

from sheetcal.check.verdict import decide
from sheetcal.errors import BadInput, Refused
from sheetcal.kinds.record import constant_cells
from sheetcal.model import Finding
from sheetcal.verbs import check as check_verb

FIRST_CODES = [
    "file-unreadable",
    "file-refused",
    "record-missing",
    "record-altered",
    "kind-unknown",
    "version-unknown",
    "result-typed-over",
    "result-stale",
    "result-disagrees",
    "formula-altered",
    "formula-dimension",
    "constant-altered",
    "label-altered",
    "reading-missing",
    "reading-not-number",
    "reading-decimal-comma",
    "reading-date",
    "reading-error-value",
    "reading-formula",
    "reading-impossible",
    "reading-out-of-range",
    "cross-foot",
    "limit-exceeded",
    "charge-energy",
    "oxygen-pressure",
    "vessel-out-of-service",
    "chlorine-limit",
    "calibration-expired",
    "composition-unlikely",
    "run-void",
    "one-more-run",
    "value-awaited",
    "control-missing",
]
NOTE = Finding("rise-range", "note", "note", "m", action="note")
WARNING = Finding("wire-left", "fault", "warning", "m")
DUTY = Finding("one-more-run", "duty", "warning", "m")
ERROR = Finding("cross-foot", "fault", "error", "m", action="reject")
MISSING = Finding("reading-missing", "fault", "error", "m")
CHANCE = replace(ERROR, certain=False, false_alarm=0.001)


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A control and one coal, two runs each."""
    return filled(issue("fuel", tmp_path_factory.mktemp("issue"), [CONTROL, coal("S-1")], spare=0))


@pytest.mark.parametrize(
    ("found", "complete", "verdict"),
    [
        ((), True, "sound"),
        ((NOTE, CHANCE), True, "sound"),
        ((WARNING,), True, "hold"),
        ((DUTY,), True, "hold"),
        ((MISSING,), True, "hold"),
        ((), False, "incomplete"),
        ((WARNING, DUTY, MISSING, NOTE), False, "incomplete"),
        ((ERROR,), True, "reject"),
        ((MISSING, ERROR, WARNING), False, "reject"),
        ((NOTE, CHANCE), False, "incomplete"),
    ],
)
def test_the_first_verdict_that_applies(found: tuple[Finding, ...], complete: bool, verdict: str) -> None:
    assert decide(found, complete) == verdict


def test_findings_come_errors_first_then_by_tab_row_and_column(book: Book, tmp_path: Path) -> None:
    verdict = rewritten(
        book,
        tmp_path,
        {
            "run4.wire_left": 6.8,
            "run3.wire_left": 6.9,
            "run3.oxygen_pressure": 3.4,
            "sheet.room_temperature": 29.0,
            "run3.residue_mass": 0.4,
        },
    )
    order = [(one.severity, one.sheet, one.cell) for one in verdict.findings]
    assert [one[0] for one in order] == ["error", *["warning"] * (len(order) - 1)]
    assert order[1][1] == "Front"
    left = [one.field for one in verdict.findings if one.code == "wire-left"]
    assert left == ["run3.wire_left", "run4.wire_left"]


def test_a_sound_file_says_everything_the_contract_asks_for(book: Book, tmp_path: Path) -> None:
    path = write(tmp_path, book.data())
    verdict = check(path)
    assert (verdict.file, verdict.sha256) == (str(path), hashlib.sha256(path.read_bytes()).hexdigest())
    assert (verdict.kind, verdict.kind_version, verdict.issue_id) == ("fuel", 1, book.record.issue_id)
    assert (verdict.profile, verdict.profile_version) == (book.record.profile, book.record.profile_version)
    assert (verdict.sound, verdict.complete, verdict.stage, verdict.missing) == (True, True, "complete", ())
    assert verdict.constants_checked_against == ("record",)
    assert verdict.witnesses == ("typed", "formula", "balance")
    assert verdict.witness_notes == {"office": "silent: LibreOffice not asked"}
    assert len(verdict.not_checked) >= 4
    assert len(verdict.results) > 250
    assert {line.office for line in verdict.results} == {None}
    assert any(line.reported for line in verdict.results)
    assert path.read_bytes() == book.data()  # checked, not touched


def test_a_result_that_is_blank_is_blank_for_all(book: Book, tmp_path: Path) -> None:
    verdict = rewritten(book, tmp_path, {"sample2.analysis_moisture": None})
    line = next(one for one in verdict.results if one.id == "sample2.gross_dry")
    assert (line.typed, line.formula, line.balance, line.agrees) == (None, None, None, None)


@pytest.mark.parametrize(
    ("name", "content", "code"),
    [
        ("empty.xlsx", b"", "file-unreadable"),
        ("really.xlsx", b"%PDF-1.7 and so on", "file-unreadable"),
        ("old.xls", b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + b"\0" * 600, "file-unreadable"),
        ("vast.xlsx", b"PK\3\4PK\5\6" + b"\0" * 4 + b"\xff" * 4 + b"\0" * 10, "file-refused"),
        ("cut.xlsx", None, "file-unreadable"),
        ("text.ods", b"PK\x03\x04 but no more", "file-unreadable"),
    ],
)
def test_what_is_no_workbook_is_unreadable(
    name: str, content: bytes | None, code: str, book: Book, tmp_path: Path
) -> None:
    verdict = check(write(tmp_path, book.data()[:4000] if content is None else content, name))
    found = only(verdict)
    assert (verdict.verdict, verdict.kind, verdict.complete, verdict.results) == ("unreadable", None, None, ())
    assert (found.code, found.severity, found.sheet, found.cell, found.field) == (code, "error", None, None, None)
    assert not verdict.sound
    assert found.likely_cause


def test_a_file_that_is_not_there_or_not_ours(book: Book, tmp_path: Path) -> None:
    missing = check(tmp_path / "gone.xlsx")
    assert (missing.verdict, only(missing).code) == ("unreadable", "file-unreadable")
    parts = parts_of(book.data())
    stranger = {one: data for one, data in parts.items() if not one.endswith("sheet7.xml")}
    stranger["xl/workbook.xml"] = parts["xl/workbook.xml"].replace(b'name="Issue record"', b'name="Something"')
    stranger["xl/worksheets/sheet7.xml"] = parts["xl/worksheets/sheet7.xml"]
    verdict = check(write(tmp_path, packed(stranger)))
    assert (verdict.verdict, only(verdict).code) == ("unreadable", "record-missing")


def test_a_constant_the_lab_file_states_otherwise_is_a_warning(book: Book, tmp_path: Path) -> None:
    """Only with --lab, and only for the same identity; the verdict says what was compared."""
    from planting import lab

    from sheetcal.inputs.lab_reader import parse_lab
    from sheetcal.inputs.text import TextFile

    path = write(tmp_path, book.data())
    same = check(path, lab=lab())
    assert (same.verdict, same.constants_checked_against) == ("sound", ("record", "lab"))
    text = lab().source.text
    assert "26436 J/g" in text
    later = parse_lab(TextFile(lab().source.path, lab().sha256, text.replace("26436 J/g", "26429 J/g")))
    verdict = check(path, lab=later)
    hits = [one for one in verdict.findings if one.code == "constant-superseded"]
    assert hits
    assert verdict.verdict == "hold"
    cells = {cell for _, cell, _, _ in constant_cells(book.plan.kind, book.record)}
    assert {one.sheet for one in hits} == {"Constants"}
    assert {one.cell for one in hits} <= cells


def test_every_first_code_of_the_contract_is_planted_somewhere_here() -> None:
    texts = "".join(path.read_text("utf-8") for path in Path(__file__).parent.glob("test_*.py"))
    unplanted = [code for code in FIRST_CODES if texts.count(f'"{code}"') < 2]  # once in the list itself
    assert len(FIRST_CODES) == 33
    assert unplanted == []


# --- the verb ---------------------------------------------------------------------------------------------


def test_exit_codes(book: Book, tmp_path: Path) -> None:
    """0 all sound, 1 something is not, 2 something is unreadable, whatever else there is."""
    sound, held, broken = tmp_path / "a", tmp_path / "b", tmp_path / "c"
    for folder in (sound, held, broken):
        folder.mkdir()
    write(sound, book.data())
    write(held, book.data({"run3.wire_left": 6.8}))
    write(broken, b"nothing", "x.xlsx")
    assert check_verb([str(sound)]).code == 0
    assert check_verb([str(sound), str(held)]).code == 1
    assert check_verb([str(sound), str(held), str(broken)]).code == 2
    assert check_verb([str(sound)], workers=2).code == 0


def test_the_last_line_counts_and_json_alone_goes_to_standard_output(book: Book, tmp_path: Path) -> None:
    write(tmp_path, book.data())
    write(tmp_path, b"nothing", "x.xlsx")
    (tmp_path / "notes.txt").write_text("not a workbook")
    output = check_verb([str(tmp_path)])
    assert output.lines[-1] == (
        "2 workbooks: 1 sound, 1 unreadable. Witnesses: typed, formula, balance; LibreOffice not asked. "
        "1 other file passed over."
    )
    assert output.lines[0].startswith("unreadable  ")
    only_json = check_verb([str(tmp_path)], json="-")
    assert len(only_json.lines) == 1
    assert only_json.lines[0].startswith("{") and only_json.lines[0].endswith("}")
    out = tmp_path / "out.json"
    text = check_verb([str(tmp_path)], json=str(out))
    assert text.lines == output.lines
    assert out.read_text("utf-8") == only_json.lines[0] + "\n"
    with pytest.raises((BadInput, Refused)):
        check_verb([str(tmp_path)], json=str(out))


def test_misuse_reads_no_file(book: Book, tmp_path: Path) -> None:
    empty = tmp_path / "empty"
    empty.mkdir()
    for paths in ([str(empty)], [str(tmp_path / "nowhere")]):
        with pytest.raises(BadInput):
            check_verb(paths)
