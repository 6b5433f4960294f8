"""Workbooks for the tests of the verbs: issued by the demonstration laboratory, filled by the bench simulator."""

from __future__ import annotations

import shutil
from collections.abc import Mapping, Sequence
from datetime import datetime
from pathlib import Path
from typing import Any

from sheetcal import bench
from sheetcal.excel.writer import write_workbook
from sheetcal.formulas.compute import compute
from sheetcal.inputs import read_lab, read_worklist
from sheetcal.kinds import load, skeleton
from sheetcal.model import IssueRecord
from sheetcal.verbs.issuing import Order, build

DEMO = Path(__file__).parents[2] / "workbooks" / "demo"
MONDAY = datetime(2025, 3, 3, 6, 30)
COAL = {"sample_id": "S-1", "fuel_class": "coal", "role": "sample"}
CONTROL = {"sample_id": "BA-31", "role": "control"}


def lab_file(folder: Path, more: str = "") -> Path:
    """A copy of the demonstration's lab file, with text appended."""
    path = folder / "lab.toml"
    shutil.copy(DEMO / "lab.toml", path)
    if more:
        path.write_text(path.read_text("utf-8") + more, "utf-8")
    return path


def worklist_file(folder: Path, rows: Sequence[Mapping[str, str]]) -> Path:
    """A worklist with these rows."""
    columns = list(dict.fromkeys(name for row in rows for name in row))
    lines = [",".join(columns), *(",".join(f'"{row.get(name, "")}"' for name in columns) for row in rows)]
    path = folder / "worklist.csv"
    path.write_text("\n".join(lines) + "\n", "utf-8")
    return path


def record_of(kind: str, folder: Path, rows: Sequence[Mapping[str, str]] = (), **order: Any) -> IssueRecord:
    """An issue record as `sheetcal issue` makes it on the Monday of the demonstration's week."""
    lab = order.pop("lab", None) or lab_file(folder)
    if rows:
        order["worklist"] = read_worklist(worklist_file(folder, rows))
    order.setdefault("calorimeter", "CAL-A" if kind in ("fuel", "calibration") else None)
    return build(Order(kind, lab=read_lab(lab), moment=order.pop("moment", MONDAY), **order))


def written(record: IssueRecord, readings: Mapping[str, Any], path: Path) -> Path:
    """The workbook with its readings and results."""
    plan = skeleton(load(record.kind, record.kind_version), record.shape)
    whole = {**record.prefilled, **readings}
    write_workbook(record, {**whole, **compute(plan, record, whole)}, path)
    return path


def filled(record: IssueRecord, path: Path, seed: int = 1, case: str | None = None, **changed: Any) -> Path:
    """The workbook as the bench simulator fills it; `changed` readings by id with `__` for the dot."""
    readings = bench.fill(record, seed, case)
    return written(record, {**readings, **{one.replace("__", "."): value for one, value in changed.items()}}, path)
