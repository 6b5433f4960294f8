"""Workbooks to spoil: issued from the demonstration laboratory, filled by the bench, then changed as people do.

Two ways of changing: `rewritten` types other readings and lets everything be computed again, as a spreadsheet
does; `edited` changes single cells of the file and leaves every other byte as it is.
"""

from __future__ import annotations

import csv
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from functools import cache
from pathlib import Path
from typing import Any

from sheetcal import bench
from sheetcal.excel.writer import workbook_bytes
from sheetcal.formulas.compute import compute
from sheetcal.inputs.lab import Lab
from sheetcal.inputs.lab_reader import parse_lab, read_lab
from sheetcal.inputs.text import TextFile
from sheetcal.inputs.worklist import read_worklist
from sheetcal.kinds import load, skeleton
from sheetcal.kinds.layout import Skeleton
from sheetcal.model import Finding, IssueRecord, Verdict
from sheetcal.planting.package import (
    edited,
    error,
    formula,
    number,
    on_part,
    packed,
    parts_of,
    sheet_part,
    stored,
    text,
    truth,
)
from sheetcal.verbs.checking import Against, check_path
from sheetcal.verbs.issuing import Order, build

__all__ = [
    "CONTROL", "DEMO", "MONDAY", "Book", "check", "coal", "edited", "error", "faults", "filled", "formula", "issue",
    "lab", "lab_of_one", "number", "on_part", "only", "packed", "parts_of", "rewritten", "sheet_part", "stored", "text",
    "truth", "write",
]  # fmt: skip
DEMO = Path(__file__).parents[2] / "workbooks" / "demo"
MONDAY = datetime(2025, 3, 3, 6, 30)
CONTROL = {"sample_id": "BA-31", "role": "control", "expected_gross": "26456"}


@dataclass(frozen=True)
class Book:
    """A workbook as issued and what the bench read."""

    plan: Skeleton
    record: IssueRecord
    readings: Mapping[str, Any]

    def cell(self, one: str) -> str:
        """`Tab!A1` of a place."""
        return self.plan.places[one].where

    def data(self, changes: Mapping[str, Any] | None = None, record: IssueRecord | None = None) -> bytes:
        """The file with some readings changed (None: emptied) and every result computed from them."""
        record = record or self.record
        whole = {**record.prefilled, **self.readings, **(changes or {})}
        whole = {one: value for one, value in whole.items() if value is not None}
        return workbook_bytes(record, {**whole, **compute(self.plan, record, whole)})


@cache
def lab() -> Lab:
    """The demonstration laboratory."""
    return read_lab(DEMO / "lab.toml")


@cache
def lab_of_one() -> Lab:
    """The same laboratory where whoever works there may also release."""
    text = lab().source.text.replace('may = ["', 'may = ["release", "')
    assert text.count('"release", "') == 4
    return parse_lab(TextFile(lab().source.path, lab().sha256, text.replace('"release", "release"', '"release"')))


def coal(name: str, **columns: str) -> dict[str, str]:
    """One sample of a worklist."""
    return {"sample_id": name, "fuel_class": "coal", "role": "sample", **columns}


def issue(kind: str, folder: Path, rows: list[dict[str, str]] | None = None, **order: Any) -> IssueRecord:
    """An issue record as `sheetcal issue` makes it on the Monday of the demonstration week."""
    if rows:
        path = folder / "worklist.csv"
        columns = list(dict.fromkeys(name for row in rows for name in row))
        with path.open("w", encoding="utf-8", newline="") as stream:
            writer = csv.DictWriter(stream, columns, restval="")
            writer.writeheader()
            writer.writerows(rows)
        order["worklist"] = read_worklist(path)
    if kind in ("fuel", "calibration"):
        order.setdefault("calorimeter", "CAL-A")
    order.setdefault("lab", lab())
    return build(Order(kind, moment=MONDAY, **order))


def filled(record: IssueRecord, seed: int = 1, case: str | None = None) -> Book:
    """The workbook with a full set of readings from the bench."""
    return Book(skeleton(load(record.kind), record.shape), record, bench.fill(record, seed, case))


def write(folder: Path, data: bytes, name: str = "book.xlsx") -> Path:
    """A file of one test."""
    path = folder / name
    path.write_bytes(data)
    return path


def check(path: Path, **against: Any) -> Verdict:
    """What the checker says of a file."""
    return check_path(str(path), Against(**against))


def rewritten(book: Book, folder: Path, changes: Mapping[str, Any]) -> Verdict:
    """The verdict on a workbook with other readings, computed anew."""
    return check(write(folder, book.data(changes)))


def faults(verdict: Verdict) -> list[tuple[str, str | None]]:
    """(code, field) of every finding, in the order of the verdict."""
    return [(one.code, one.field) for one in verdict.findings]


def only(verdict: Verdict) -> Finding:
    """The one finding there must be."""
    assert len(verdict.findings) == 1, [(one.code, one.sheet, one.cell, one.message) for one in verdict.findings]
    return verdict.findings[0]
