"""The register only grows, and a walk takes each workbook once, in order."""

from __future__ import annotations

import os
import sqlite3
from pathlib import Path

import pytest

from sheetcal.archive.register import note_issue, record_hashes
from sheetcal.archive.walk import walk
from sheetcal.errors import BadInput
from sheetcal.kinds.record import sha256
from sheetcal.verbs.demo_week import Week
from sheetcal.verbs.workbook import open_workbook


def test_the_register_holds_the_hash_of_each_record(week: Week) -> None:
    """Every workbook issued with --register is found with its record's hash."""
    hashes = record_hashes(week.register)
    records = [open_workbook(week.filled(name)).parts.record for name in ("C1", "W1", "W11", "SH1")]
    assert len(hashes) == len(week.rows)
    assert [hashes[one.issue_id] for one in records] == [sha256(one) for one in records]


@pytest.mark.parametrize("order", ["UPDATE issued SET kind = 'fuel'", "DELETE FROM issued"])
def test_rows_of_the_register_cannot_be_changed(week: Week, tmp_path: Path, order: str) -> None:
    """The file itself refuses to change or forget a row."""
    path = tmp_path / "register.sqlite"
    note_issue(path, open_workbook(week.filled("W1")).parts.record)
    with pytest.raises(sqlite3.DatabaseError, match="append-only"):
        sqlite3.connect(path).execute(order)
    assert len(record_hashes(path)) == 1


def test_a_second_workbook_of_one_id_is_refused(week: Week, tmp_path: Path) -> None:
    """An issue id is given once."""
    record = open_workbook(week.filled("W1")).parts.record
    note_issue(tmp_path / "register.sqlite", record)
    with pytest.raises(BadInput):
        note_issue(tmp_path / "register.sqlite", record)


def test_what_is_no_register_is_said_in_one_line(tmp_path: Path) -> None:
    """A missing file and a file of another kind are BadInput."""
    other = tmp_path / "other.sqlite"
    other.write_bytes(b"not a database, but long enough to be taken for one" * 100)
    for path in (tmp_path / "none.sqlite", other):
        with pytest.raises(BadInput):
            record_hashes(path)


def test_a_walk_takes_workbooks_sorted_and_counts_the_rest(tmp_path: Path) -> None:
    """Hidden and lock files are passed over, links to directories not followed, other files counted."""
    for name in ("b.xlsx", "a.ods", "sub/c.XLSM", ".hidden.xlsx", "~$b.xlsx", "notes.txt", ".git/d.xlsx", "sub/e.xls"):
        (tmp_path / name).parent.mkdir(exist_ok=True)
        (tmp_path / name).touch()
    os.symlink(tmp_path / "sub", tmp_path / "link")
    found = walk([str(tmp_path)])
    assert [os.path.relpath(one, tmp_path) for one in found.files] == ["a.ods", "b.xlsx", "sub/c.XLSM", "sub/e.xls"]
    assert found.skipped == 1


def test_a_file_named_is_always_tried_and_each_file_once(tmp_path: Path) -> None:
    """A name with any ending is taken; a file named beside its folder counts once."""
    for name in ("a.xlsx", "odd.bin"):
        (tmp_path / name).touch()
    found = walk([str(tmp_path), str(tmp_path / "a.xlsx"), str(tmp_path / "odd.bin")])
    assert [Path(one).name for one in found.files] == ["a.xlsx", "odd.bin"]


def test_a_path_that_is_not_there_is_refused(tmp_path: Path) -> None:
    """A missing path, and a folder without any workbook, are BadInput."""
    (tmp_path / "empty").mkdir()
    for path in (tmp_path / "none", tmp_path / "empty"):
        with pytest.raises(BadInput):
            walk([str(path)])
