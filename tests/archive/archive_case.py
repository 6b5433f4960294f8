"""Recompute a few workbooks of the week and read what was written."""

from __future__ import annotations

import csv
import json
import shutil
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sheetcal import verbs
from sheetcal.verbs.demo_week import Week


@dataclass(frozen=True)
class Done:
    """A finished recomputation: exit code, rows of changes.csv, summary.json, lines on standard output."""

    out: Path
    code: int
    lines: tuple[str, ...]
    rows: list[dict[str, str]]
    summary: dict[str, Any]

    def of(self, book: str) -> dict[str, dict[str, str]]:
        """Rows of one workbook by field id."""
        return {row["field"]: row for row in self.rows if Path(row["file"]).stem == book}

    @property
    def not_recomputed(self) -> dict[str, str]:
        """Reason by file name."""
        with (self.out / "not_recomputed.csv").open(encoding="utf-8", newline="") as stream:
            return {Path(row["file"]).name: row["reason"] for row in csv.DictReader(stream)}


def gathered(week: Week, folder: Path, books: Iterable[str]) -> Path:
    """A folder with copies of some workbooks of the week."""
    folder.mkdir()
    for name in books:
        shutil.copy(week.filled(name), folder)
    return folder


def recompute(path: Path, out: Path, lab: Path | None, **options: Any) -> Done:
    """`sheetcal recompute PATH --into OUT --lab LAB`."""
    done = verbs.recompute([str(path)], str(out), str(lab) if lab else None, **options)
    with (out / "changes.csv").open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    return Done(out, done.code, done.lines, rows, json.loads((out / "summary.json").read_text("utf-8")))


def relative(row: dict[str, str]) -> float:
    """The relative change of a row, in per cent."""
    return 100.0 * (float(row["new"]) / float(row["old"]) - 1.0)
