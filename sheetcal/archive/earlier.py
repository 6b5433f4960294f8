"""What the constants of a workbook were before, by a lab file in which old blocks stay: for naming what was used."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from sheetcal.archive.changed import heat
from sheetcal.inputs.lab import Lab
from sheetcal.model import IssueRecord, Value

Old = tuple[float, str]
Row = Mapping[str, Value]
BACK = {1: "before last", 2: "before the one before last"}


def earlier(record: IssueRecord, lab: Lab) -> dict[str, tuple[Old, ...]]:
    """For each constant by id, other values its identity had or has in the lab file, each with words for it."""
    found: dict[str, list[Old]] = {}
    for table, column in (("vessel", "heat_capacity"), ("certified", "value"), ("titrant", "strength"),
                          ("cup", "heat_capacity"), ("wire", "heat"), ("aid", "heat")):  # fmt: skip
        for number, row in enumerate(record.tables.get(table, ()), start=1):
            for value, words in _stated(lab, table, row):
                if value != row.get(column):
                    found.setdefault(f"table.{table}.{column}[{number}]", []).append((value, words))
    return {one: tuple(values) for one, values in found.items()}


def _stated(lab: Lab, table: str, row: Row) -> Iterator[Old]:
    """Every value the lab file states for what a row names, the newest first."""
    if table == "vessel":
        yield from _calibrations(lab, row)
    elif table == "certified":
        for certified in reversed([one for one in lab.certified if one.lot == row["lot"]]):
            yield certified.value, f"another value of the certificate of {row['lot']} was probably used"
    elif table == "titrant":
        for titrant in reversed([one for one in lab.all_titrants if one.lot == row["lot"]]):
            day = titrant.standardised
            yield titrant.strength, f"the strength of titrant {row['lot']} found on {day} was probably used"
    elif table == "cup":
        for cup in reversed([one for one in lab.cups if one.id == row["id"]]):
            if cup.heat_capacity is not None:
                yield cup.heat_capacity, f"another heat capacity of cup {row['id']} was probably used"
    else:
        for lot in reversed([one for one in lab.all_lots if one.id == row["lot"]]):
            value = heat(lot, "J/cm" if table == "wire" else "J/g")
            if value is not None:
                yield value, f"another heat of lot {row['lot']} was probably used"


def _calibrations(lab: Lab, row: Row) -> Iterator[Old]:
    """Calibrations of the vessel before and after the one in the workbook."""
    listed = sorted((one for one in lab.calibrations if one.vessel == row["id"]), key=lambda one: one.valid_from)
    at = next((place for place, one in enumerate(listed) if one.issue == row["calibration"]), len(listed))
    for place in (*range(at - 1, -1, -1), *range(at + 1, len(listed))):
        one = listed[place]
        back = BACK.get(at - place, "of another day") if place < at else "after the one printed here"
        yield (
            one.value,
            (
                f"the heat capacity of the calibration {back} was probably used: "
                f"{one.value:g} J/K of {row['id']}, {one.issue}, {one.valid_from:%Y-%m-%d}"
            ),
        )
