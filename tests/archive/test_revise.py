"""A revised copy holds the new constants, gives what the table says, and cites what it replaces."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from archive_case import Done, gathered, recompute

from sheetcal.verbs.checking import Against, check_path
from sheetcal.verbs.demo_week import Week
from sheetcal.verbs.workbook import open_workbook

Convert = Callable[[list[Path], str, Path], None]


@pytest.fixture(scope="module")
def archive(week: Week, tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = gathered(week, tmp_path_factory.mktemp("revise") / "archive", ["C1", "C2", "SH1"])
    gathered(week, folder / "monday", ["W1"])
    return folder


@pytest.fixture(scope="module")
def done(archive: Path, corrected: Path) -> Done:
    return recompute(archive, archive.parent / "out", corrected, revise=True)


def test_only_what_moved_is_revised_under_its_own_relative_path(done: Done) -> None:
    """revised/ mirrors the archive; a workbook in which nothing moved has no copy."""
    found = sorted(str(one.relative_to(done.out / "revised")) for one in (done.out / "revised").rglob("*.xlsx"))
    assert found == ["C1.xlsx", "C2.xlsx", "monday/W1.xlsx"]


def test_a_revised_copy_cites_its_original_and_the_cause(done: Done, archive: Path, week: Week) -> None:
    """New issue id; the issue record names the original's id, its SHA-256 and the cause."""
    original = open_workbook(archive / "monday" / "W1.xlsx")
    revised = open_workbook(done.out / "revised" / "monday" / "W1.xlsx")
    record = revised.parts.record
    assert record.issue_id != original.parts.record.issue_id == record.cites["issue_id"]
    assert record.cites["sha256"] == original.file.sha256
    assert "certificate BA-31 26436 -> 26429 J/g" in record.cites["cause"] and week.ids["C1"] in record.cites["cause"]
    assert revised.parts.record_whole and record.lab_sha256 != original.parts.record.lab_sha256
    assert {row["lot"]: row["value"] for row in record.tables["certified"]}["BA-31"] == 26429.0
    assert record.prefilled["sheet.constants_id"] != original.parts.record.prefilled["sheet.constants_id"]


def test_a_revised_copy_shows_the_new_values_and_the_old_readings(done: Done, archive: Path) -> None:
    """Every row's `new` is what the copy stores; readings are those of the original."""
    original = open_workbook(archive / "monday" / "W1.xlsx").parts
    revised = open_workbook(done.out / "revised" / "monday" / "W1.xlsx").parts
    rows = done.of("W1")
    assert len(rows) > 50
    for one, row in rows.items():
        stored = revised.typed[one]
        assert (
            stored == pytest.approx(float(row["new"]), rel=1e-12) if isinstance(stored, float) else stored == row["new"]
        )
    own = {"sheet.issue_id", "sheet.issued_at", "sheet.constants_id"}
    assert {one: value for one, value in revised.readings.items() if one not in own} == {
        one: value for one, value in original.readings.items() if one not in own
    }


def test_a_revised_copy_gets_the_verdict_of_its_original(done: Done, archive: Path) -> None:
    """Checking the copy finds what was found in the original, no more: its constants belong together."""
    for name in ("C1.xlsx", "monday/W1.xlsx"):
        before = check_path(str(archive / name), Against())
        after = check_path(str(done.out / "revised" / name), Against())
        assert after.verdict == before.verdict
        assert [one.code for one in after.findings] == [one.code for one in before.findings]


def test_an_ods_workbook_gets_an_xlsx_copy_beside_its_name(
    week: Week, corrected: Path, tmp_path: Path, convert: Convert
) -> None:
    """What LibreOffice saved as .ods moves alike; its copy keeps the old name and adds .xlsx."""
    folder = tmp_path / "archive"
    folder.mkdir()
    convert([week.filled("C1")], "ods", folder)
    ours = recompute(gathered(week, tmp_path / "ours", ["C1"]), tmp_path / "one", corrected)
    theirs = recompute(folder, tmp_path / "two", corrected, revise=True)
    assert (theirs.out / "revised" / "C1.ods.xlsx").is_file()
    assert [row["new"] for row in ours.rows] == [row["new"] for row in theirs.rows]
    assert {row["status"] for row in theirs.rows} == {"moved"}
