"""An archive of filled workbooks round real measured values: readings are made backwards by the bench simulator."""

from __future__ import annotations

import csv
from collections.abc import Iterator
from concurrent.futures import ProcessPoolExecutor
from datetime import datetime, timedelta
from itertools import repeat
from pathlib import Path

from sheetcal.bench import Lot, archive, fill
from sheetcal.excel.writer import write_workbook
from sheetcal.formulas.compute import compute
from sheetcal.inputs import read_lab, read_worklist
from sheetcal.kinds import load, skeleton
from sheetcal.verbs.demo_week import Week, table
from sheetcal.verbs.issuing import Order, build

SEED = 20250307
FIRST = datetime(2025, 2, 4, 7, 0)  # a titrant is in force from here on
CALORIMETERS = ("CAL-A", "CAL-B")


def build_archive(week: Week, sheets: int) -> None:
    """Write the archive's workbooks and sources.csv, which carries the source of every measured figure."""
    lots = archive(table(week.folder / "fuels.csv"), SEED, sheets)
    (week.folder / ".worklists").mkdir()
    with ProcessPoolExecutor(2) as pool:
        for _ in pool.map(_one, range(len(lots)), lots, repeat(week.folder), chunksize=8):
            pass
    for path in sorted((week.folder / ".worklists").iterdir()):
        path.unlink()
    (week.folder / ".worklists").rmdir()
    with (week.folder / "sources.csv").open("w", encoding="utf-8", newline="") as stream:
        writer = csv.writer(stream, lineterminator="\n")
        writer.writerow(["file", "sample", "gross_dry_J_g", "source"])
        writer.writerows(_sources(lots))


def _sources(lots: list[Lot]) -> Iterator[tuple[str, str, float, str]]:
    for number, lot in enumerate(lots):
        for truth in lot.truths:
            yield f"archive/{_name(number)}", truth.name, truth.gross_dry, truth.source


def _name(number: int) -> str:
    return f"A{number + 1:03d}.xlsx"


def _one(number: int, lot: Lot, folder: Path) -> None:
    """Issue and fill one workbook of the archive in one step, on a day of its own."""
    worklist = folder / ".worklists" / f"{number}.csv"
    rows = lot.worklist()
    with worklist.open("w", encoding="utf-8", newline="") as stream:
        writer = csv.DictWriter(stream, list(rows[0]), lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)
    moment = FIRST + timedelta(days=number % 28)
    order = Order(
        "fuel",
        read_lab(folder / "lab.toml"),
        read_worklist(worklist),
        spare=0,
        calorimeter=CALORIMETERS[number % 2],
        job="archive of the demonstration (readings invented round measured values)",
        moment=moment,
        values={"sheet.control_ref": "control of the day, kept elsewhere (invented)"},
    )
    record = build(order)
    plan = skeleton(load(record.kind, record.kind_version), record.shape)
    readings = {**record.prefilled, **fill(record, lot.seed, truths=lot.truths)}
    write_workbook(record, {**readings, **compute(plan, record, readings)}, folder / "archive" / _name(number))
