"""What recompute writes is what the contract says, the same bytes each time, and the originals stay as they are."""

from __future__ import annotations

import hashlib
import json
import re
import shutil
import zipfile
from pathlib import Path

import pytest
from archive_case import Done, gathered, recompute

from sheetcal import verbs
from sheetcal.archive.rows import COLUMNS, csv_cell
from sheetcal.cli import main
from sheetcal.errors import BadInput, Refused
from sheetcal.verbs.demo_week import Week
from sheetcal.verbs.workbook import open_workbook

HEADER = (
    "file,sha256,issue_id,kind,kind_version,profile,measured_on,calorimeter,sample_id,field,label,unit,stored,old,new,"
    "change,change_relative,reported_old,reported_new,reported_changes,limit,change_of_limit,uncertainty,"
    "change_of_uncertainty,cause,status"
)
FILES = ("changes.csv", "not_recomputed.csv", "summary.json", "summary.txt")
BOOKS = ("C1", "C2", "W1", "W8")


@pytest.fixture(scope="module")
def archive(week: Week, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Sound workbooks, two bad files, one stranger and one altered result."""
    folder = gathered(week, tmp_path_factory.mktemp("outputs") / "archive", BOOKS)
    (folder / "bad").mkdir()
    (folder / "bad" / "cut.xlsx").write_bytes(week.filled("W1").read_bytes()[:3000])
    (folder / "bad" / "page.xlsx").write_bytes(b"%PDF-1.7 invented")
    (folder / "notes.txt").write_text("not a workbook", "utf-8")
    return folder


@pytest.fixture(scope="module")
def done(archive: Path, corrected: Path) -> Done:
    return recompute(archive, archive.parent / "out", corrected)


def test_columns_and_order_are_the_contracts(done: Done) -> None:
    """The header is the contract's; rows stand in file order, then workbook order."""
    first = (done.out / "changes.csv").read_text("utf-8").splitlines()[0]
    assert first == HEADER == ",".join(COLUMNS)
    files = [row["file"] for row in done.rows]
    assert files == sorted(files) and len(set(files)) == 4
    parts = open_workbook(next(file for file in files if file.endswith("W1.xlsx"))).parts
    cells = [(p.tab, p.row, p.column) for row in done.of("W1").values() for p in [parts.skeleton.places[row["field"]]]]
    tabs = ["Front", "Readings", "Records", "Results"]
    assert cells == sorted(cells, key=lambda one: (tabs.index(one[0]), one[1], one[2]))


def test_every_row_is_whole(done: Done) -> None:
    """Old and new differ, the reported columns follow the reported value, and the share of the limit is right."""
    assert len(done.rows) > 200
    for row in done.rows:
        assert row["status"] == "moved" and row["cause"] and len(row["sha256"]) == 64
        assert row["reported_changes"] == ("yes" if row["reported_old"] != row["reported_new"] else "no")
        if row["change_of_limit"]:
            assert float(row["change_of_limit"]) == pytest.approx(float(row["change"]) / float(row["limit"]))
        assert row["uncertainty"] == "" and row["change_of_uncertainty"] == ""
    dry = next(row for row in done.rows if row["field"] == "sample3.gross_dry")
    reported = next(row for row in done.rows if row["field"] == "sample3.gross_dry_reported")
    assert (dry["reported_old"], dry["reported_new"]) == (reported["old"], reported["new"])
    assert dry["sample_id"] == "S-2502" and dry["measured_on"] == "2025-03-03" and dry["limit"] == "120.0"


def test_bad_files_are_named_and_hold_nobody_up(done: Done) -> None:
    """Unreadable files stand in not_recomputed.csv with the reason, the rest is recomputed, the exit code is 2."""
    assert done.code == 2
    assert "damaged or cut short" in done.not_recomputed["cut.xlsx"]
    assert "PDF" in done.not_recomputed["page.xlsx"]
    assert done.summary["files"] == {"read": 6, "recomputed": 4, "incomplete": 0, "unreadable": 2, "skipped": 1}


def test_the_summary_counts_what_the_table_holds(done: Done) -> None:
    """summary.json agrees with changes.csv; the ten largest go by share of the limit."""
    results = done.summary["results"]
    seen = [row for row in done.rows if row["reported_changes"] == "yes" and row["reported_old"] == row["old"]]
    assert results["moved"] == len(done.rows) and results["reported_changed"] == len(seen)
    assert results["beyond_limit"] == sum(abs(float(row["change_of_limit"] or 0)) > 1 for row in done.rows)
    by = done.summary["by_calorimeter"]
    assert set(by) == {"CAL-A", "CAL-B"} and sum(one["moved"] for one in by.values()) == len(done.rows)
    shares = [abs(one["change_of_limit"]) for one in done.summary["largest"]]
    assert len(shares) == 10 and shares == sorted(shares, reverse=True)
    assert shares[0] == max(abs(float(row["change_of_limit"] or 0)) for row in done.rows)
    assert list(done.summary) == ["tool", "lab", "files", "results", "by_calorimeter", "largest"]


def test_ten_lines_for_people_name_each_sample_once(done: Done) -> None:
    """summary.txt is what stands on standard output: ten lines at most, largest visible effect first."""
    text = (done.out / "summary.txt").read_text("utf-8")
    assert text == "\n".join(done.lines) + "\n"
    assert 4 <= len(done.lines) <= 10
    named = [tuple(line.split("  ")[:2]) for line in done.lines[3:]]
    assert len(named) == len(set(named)) and all("reported" in line for line in done.lines[3:])


def test_the_same_archive_gives_the_same_bytes_with_one_or_two_workers(
    archive: Path, done: Done, corrected: Path
) -> None:
    """Byte for byte, serial and parallel."""
    again = recompute(archive, archive.parent / "again", corrected, workers=2)
    for name in FILES:
        assert (again.out / name).read_bytes() == (done.out / name).read_bytes(), name
    assert again.code == done.code and sorted(one.name for one in again.out.iterdir()) == sorted(FILES)


def test_originals_are_never_touched(archive: Path, done: Done, corrected: Path, tmp_path: Path) -> None:
    """Neither bytes nor dates of an input change, with --revise either."""
    before = {one: (one.read_bytes(), one.stat().st_mtime_ns) for one in archive.rglob("*") if one.is_file()}
    recompute(archive, tmp_path / "out", corrected, revise=True)
    assert before == {one: (one.read_bytes(), one.stat().st_mtime_ns) for one in archive.rglob("*") if one.is_file()}


def test_a_result_typed_over_is_a_row_of_its_own(week: Week, corrected: Path, tmp_path: Path) -> None:
    """Stored not equal to old: `stored-differs` where nothing moves (exit 0), `both` where it moves too (exit 1)."""
    folder = gathered(week, tmp_path / "archive", ["W1"])
    place = open_workbook(folder / "W1.xlsx").parts.skeleton.places["sample3.gross_dry"]
    _typed(folder / "W1.xlsx", place.tab, place.cell, "30000")
    quiet = recompute(folder, tmp_path / "quiet", None)
    assert [(row["field"], row["status"], row["stored"], row["cause"]) for row in quiet.rows] == [
        ("sample3.gross_dry", "stored-differs", "30000.0", "")
    ]
    assert quiet.code == 0 and quiet.summary["results"]["moved"] == 0
    loud = recompute(folder, tmp_path / "loud", corrected)
    assert loud.of("W1")["sample3.gross_dry"]["status"] == "both" and loud.code == 1


def _typed(path: Path, tab: str, cell: str, number: str) -> None:
    """Put a number in place of a formula, leaving every stored value as it is."""
    with zipfile.ZipFile(path) as source:
        parts = {one: source.read(one) for one in source.namelist()}
    names = ["Front", "Readings", "Records", "Results"]
    part = f"xl/worksheets/sheet{names.index(tab) + 1}.xml"
    found, count = re.subn(
        rf'(<c r="{cell}"[^>]*?)(?: t="\w+")?>.*?</c>'.encode(),
        rb"\1><v>" + number.encode() + rb"</v></c>",
        parts[part],
    )
    assert count == 1
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as target:
        for one, data in {**parts, part: found}.items():
            target.writestr(one, data)


def test_an_altered_issue_record_is_not_recomputed(week: Week, corrected: Path, tmp_path: Path) -> None:
    """What the record says of constants cannot be trusted any more: named, not recomputed."""
    folder = gathered(week, tmp_path / "archive", ["W1"])
    with zipfile.ZipFile(folder / "W1.xlsx") as source:
        parts = {one: source.read(one) for one in source.namelist()}
    changed = {one: data.replace(b"26436", b"26430") for one, data in parts.items()}
    with zipfile.ZipFile(folder / "W1.xlsx", "w", zipfile.ZIP_DEFLATED) as target:
        for one, data in changed.items():
            target.writestr(one, data)
    done = recompute(folder, tmp_path / "out", corrected)
    assert done.rows == [] and "altered" in done.not_recomputed["W1.xlsx"]
    assert done.summary["files"]["recomputed"] == 0


def test_half_filled_workbooks_are_recomputed_as_far_as_they_go(week: Week, corrected: Path, tmp_path: Path) -> None:
    """An issued workbook gives no rows and is counted as incomplete; the exit code stays 0."""
    folder = tmp_path / "archive"
    folder.mkdir()
    shutil.copy(week.folder / "issued" / "W1.xlsx", folder)
    done = recompute(folder, tmp_path / "out", corrected)
    assert done.summary["files"]["incomplete"] == 1 and done.code in (0, 1)
    assert "readings missing" in done.not_recomputed["W1.xlsx"]
    assert not any(one.startswith("run") for one in done.of("W1"))


# --- refusals ---------------------------------------------------------------------------------------------


def test_an_out_inside_what_is_read_is_refused(archive: Path, corrected: Path) -> None:
    """OUT inside a PATH, OUT as a PATH, and a PATH inside OUT are refused before anything is written."""
    for into in (archive, archive / "out", archive.parent, corrected.parent):
        with pytest.raises(Refused):
            verbs.recompute([str(archive)], str(into), str(corrected), force=True)
    assert not (archive / "out").exists()


def test_an_existing_out_is_refused_unless_it_is_ours_and_forced(
    archive: Path, corrected: Path, tmp_path: Path
) -> None:
    """--force replaces a folder that recompute wrote, never one with anything else in it."""
    out = tmp_path / "out"
    verbs.recompute([str(archive)], str(out), str(corrected))
    with pytest.raises(Refused, match="exists already"):
        verbs.recompute([str(archive)], str(out), str(corrected))
    (out / "summary.txt").write_text("old", "utf-8")
    verbs.recompute([str(archive)], str(out), str(corrected), force=True)
    assert (out / "summary.txt").read_text("utf-8") != "old"
    (out / "diary.txt").write_text("mine", "utf-8")
    with pytest.raises(Refused, match="diary"):
        verbs.recompute([str(archive)], str(out), str(corrected), force=True)
    assert (out / "diary.txt").read_text("utf-8") == "mine"


def test_misuse_writes_nothing(archive: Path, corrected: Path, tmp_path: Path) -> None:
    """A lab file that cannot be read, a path that is not there, a folder that cannot be written: BadInput, no OUT."""
    (tmp_path / "empty").mkdir()
    wrong = tmp_path / "wrong.toml"
    wrong.write_text("[laboratory\n", "utf-8")
    for path, lab, into in (
        (archive, wrong, tmp_path / "out"),
        (tmp_path / "nowhere", corrected, tmp_path / "out"),
        (tmp_path / "empty", corrected, tmp_path / "out"),
        (archive, corrected, tmp_path / "no" / "out"),
    ):
        with pytest.raises(BadInput):
            verbs.recompute([str(path)], str(into), str(lab))
    assert sorted(one.name for one in tmp_path.iterdir()) == ["empty", "wrong.toml"]


def test_json_goes_to_a_file_or_alone_to_standard_output(
    archive: Path, done: Done, corrected: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """`--json -` writes nothing but the document; a file that exists is refused."""
    out = tmp_path / "one"
    code = main(["recompute", str(archive), "--into", str(out), "--lab", str(corrected), "--json", "-"])
    assert code == 2 and json.loads(capsys.readouterr().out) == done.summary
    taken = tmp_path / "summary.json"
    taken.write_text("{}", "utf-8")
    with pytest.raises(Refused, match="exists already"):
        verbs.recompute([str(archive)], str(tmp_path / "two"), str(corrected), json=str(taken))
    assert taken.read_text("utf-8") == "{}" and not (tmp_path / "two").exists()


@pytest.mark.parametrize(
    ("value", "cell"),
    [
        (None, ""), (0.1, "0.1"), (-7.0, "-7.0"), ("=1+1", "'=1+1"), ("+49", "'+49"), ("-5", "'-5"), ("@x", "'@x"),
        ("\tx", "'\\x09x"), ("plain", "plain"), ("a\x07b", "a\\x07b"), (1e-17, "1e-17"),
    ],
)  # fmt: skip
def test_text_that_a_spreadsheet_would_run_is_made_harmless(value: float | str | None, cell: str) -> None:
    """Numbers round-trip; dangerous first signs get an apostrophe; control characters are shown."""
    assert csv_cell(value) == cell


def test_hash_of_each_file_is_its_own(done: Done) -> None:
    """The sha256 column is that of the file named."""
    files = {row["file"]: row["sha256"] for row in done.rows}
    assert files and all(hashlib.sha256(Path(one).read_bytes()).hexdigest() == digest for one, digest in files.items())
