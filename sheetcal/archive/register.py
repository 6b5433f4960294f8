"""The register: one SQLite file that remembers what was issued."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from sheetcal.errors import BadInput
from sheetcal.kinds.record import sha256
from sheetcal.model import IssueRecord

SECONDS = 30.0  # how long a writer waits for another
TABLE = """
CREATE TABLE IF NOT EXISTS issued (
    issue_id TEXT PRIMARY KEY,
    kind TEXT NOT NULL,
    kind_version INTEGER NOT NULL,
    profile TEXT NOT NULL,
    issued_at TEXT NOT NULL,
    lab_sha256 TEXT NOT NULL,
    record_sha256 TEXT NOT NULL,
    skeleton_sha256 TEXT NOT NULL
) STRICT
"""
GUARDS = (
    """CREATE TRIGGER IF NOT EXISTS issued_stays BEFORE UPDATE ON issued
       BEGIN SELECT RAISE(ABORT, 'the register is append-only'); END""",
    """CREATE TRIGGER IF NOT EXISTS issued_kept BEFORE DELETE ON issued
       BEGIN SELECT RAISE(ABORT, 'the register is append-only'); END""",
)


@contextmanager
def _opened(path: Path) -> Iterator[sqlite3.Connection]:
    try:
        connection = sqlite3.connect(path, timeout=SECONDS)
    except sqlite3.Error as fault:
        raise BadInput(str(path), f"cannot be opened ({fault})", "a register file", "Check the path.") from None
    try:
        with connection:
            yield connection
    except sqlite3.IntegrityError:
        raise BadInput(str(path), "knows this issue id already", "a workbook not noted yet") from None
    except sqlite3.DatabaseError as fault:
        raise BadInput(str(path), f"is not a register ({fault})", "a SQLite file of ours", "Name another.") from None
    finally:
        connection.close()


def note_issue(path: Path, record: IssueRecord) -> None:
    """Append one issued workbook; the file is made when it is not there. Raises BadInput."""
    with _opened(path) as connection:
        connection.execute("PRAGMA journal_mode=WAL")
        connection.execute(TABLE)
        for guard in GUARDS:
            connection.execute(guard)
        connection.execute(
            "INSERT INTO issued VALUES (?, ?, ?, ?, ?, ?, ?, ?)",
            (
                record.issue_id,
                record.kind,
                record.kind_version,
                record.profile,
                record.issued_at,
                record.lab_sha256,
                sha256(record),
                record.skeleton_sha256,
            ),
        )


def record_hashes(path: Path) -> dict[str, str]:
    """Record hash by issue id. Raises BadInput for a file that is no register."""
    if not path.is_file():
        raise BadInput(str(path), "does not exist", "a register file", "Check the path.")
    with _opened(path) as connection:
        return dict(connection.execute("SELECT issue_id, record_sha256 FROM issued").fetchall())
