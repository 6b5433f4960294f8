"""No balance disagrees with, or passes over, any result of clean workbooks from the bench, honest cases included."""

from __future__ import annotations

from datetime import datetime
from pathlib import Path

import pytest
from balance_case import Case, disagreeing, shown, spoken

from sheetcal import bench
from sheetcal.inputs.lab import Lab
from sheetcal.inputs.lab_reader import read_lab
from sheetcal.inputs.worklist import read_worklist
from sheetcal.kinds import load
from sheetcal.model import IssueRecord
from sheetcal.verbs.issuing import Order, build

DEMO = Path(__file__).parents[2] / "workbooks" / "demo"
MONDAY = datetime(2025, 3, 3, 6, 30)
CLASSES = ("coal", "coke", "biomass", "recovered", "sludge", "liquid", "waste")
NO_VESSEL = {("fuel", "weekend", "CAL-B")}  # the demo laboratory's calibration of CAL-B runs out that Thursday
CASES = [
    (kind, case, calorimeter)
    for kind in ("fuel", "calibration", "specific-heat", "vaporisation", "heat-balance")
    for case in [None, *bench.cases_of(kind)]
    for calorimeter in (("CAL-A", "CAL-B") if kind in ("fuel", "calibration") else ("CAL-A",))
    if (kind, case, calorimeter) not in NO_VESSEL
]


@pytest.fixture(scope="module")
def lab() -> Lab:
    """The demonstration laboratory."""
    return read_lab(DEMO / "lab.toml")


def issued(kind: str, lab: Lab, calorimeter: str, folder: Path, fuel_class: str) -> IssueRecord:
    """An empty workbook; for fuel a control and two samples of one class."""
    if kind != "fuel":
        return build(Order(kind, lab=lab, calorimeter=calorimeter, moment=MONDAY))
    rows = [f"S{number},{fuel_class},sample,,HT 2025-03-01" for number in (1, 2)]
    path = folder / "worklist.csv"
    head = "sample_id,fuel_class,role,expected_gross,approval"
    path.write_text("\n".join([head, "BA-31,,control,26456,", *rows]) + "\n", "utf-8")
    return build(Order(kind, lab=lab, calorimeter=calorimeter, moment=MONDAY, worklist=read_worklist(path)))


@pytest.mark.parametrize(("kind", "case", "calorimeter"), CASES)
def test_clean_workbooks(kind: str, case: str | None, calorimeter: str, lab: Lab, tmp_path: Path) -> None:
    """Three seeds of each: both roads agree with the cell functions, and nothing shown in a begun block is left."""
    for seed in range(3):
        fuel_class = (bench.class_of(case) if case else "") or CLASSES[seed]
        record = issued(kind, lab, calorimeter, tmp_path, fuel_class)
        readings = bench.fill(record, seed, case)
        filled = Case(load(kind), record, {**record.prefilled, **readings}).computed()
        assert disagreeing(filled) == [], seed
        begun = {one.partition(".")[0] for one, value in readings.items() if value is not None}
        assert shown(filled, ("sheet", *begun)) <= spoken(filled), seed


def test_how_many() -> None:
    """The bench's cases are all there: 60 and more combinations, three workbooks each."""
    assert len(CASES) >= 60
