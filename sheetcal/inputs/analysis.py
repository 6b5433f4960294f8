"""Values of the analysis bench: moistures, ash and elements, often later than the firing."""

import os
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import datetime

from sheetcal import units
from sheetcal.errors import BadInput
from sheetcal.inputs.table import Row, Table, marked_number, moment, parse_table
from sheetcal.inputs.text import Faults, TextFile, nearest, read_text

COLUMNS = ("sample", "quantity", "value", "unit", "basis", "determined", "by", "source", "mark")
REQUIRED = ("sample", "quantity", "value")

# What a bench may write, and the name used everywhere else.
QUANTITIES = {
    "total_moisture": "total_moisture",
    "analysis_moisture": "analysis_moisture",
    "ash": "ash",
    "C": "carbon",
    "H": "hydrogen",
    "N": "nitrogen",
    "S": "sulfur",
    "Cl": "chlorine",
    "O": "oxygen",
    "carbon": "carbon",
    "hydrogen": "hydrogen",
    "nitrogen": "nitrogen",
    "sulfur": "sulfur",
    "chlorine": "chlorine",
    "oxygen": "oxygen",
}
BASES = {
    "ad": "as analysed",
    "d": "dry",
    "daf": "dry ash-free",
    "ar": "as received",
    "as analysed": "as analysed",
    "dry": "dry",
    "dry ash-free": "dry ash-free",
    "as received": "as received",
}
SOURCES = {
    "measured": "measured",
    "difference": "difference",
    "by difference": "difference",
    "typical": "typical",
    "typical for class": "typical",
    "client": "client",
}
OWN_BASIS = {"total_moisture": "as received", "analysis_moisture": "as analysed"}


@dataclass(frozen=True, slots=True)
class AnalysisValue:
    """One value in mass per cent; `mark` is `<` where it is a limit, `basis` empty where nobody said it."""

    sample: str
    quantity: str
    value: float
    basis: str = ""
    determined: datetime | None = None
    by: str = ""
    source: str = ""
    mark: str = ""
    line: int = 0


def read_analysis(path: str | os.PathLike[str]) -> tuple[AnalysisValue, ...]:
    """The values of an analysis file, in file order. Raises BadInput or BadInputs with file and line.

    A row without a value says nothing yet and is passed over.
    """
    return parse_analysis(read_text(path))


def parse_analysis(source: TextFile) -> tuple[AnalysisValue, ...]:
    """As `read_analysis`, of text already read."""
    table = parse_table(source, COLUMNS, REQUIRED)
    faults = Faults(source)
    values = [_value(row, faults) for row in table.rows if row["value"]]
    _refuse_repeats((one for one in values if one), faults)
    _require_rows(table, faults)
    faults.close()
    return tuple(one for one in values if one)


def _require_rows(table: Table, faults: Faults) -> None:
    if not table.rows:
        faults.add(None, "has a header and no rows", "a value a line", "Give the right file.")


def _value(row: Row, faults: Faults) -> AnalysisValue | None:
    """The value of one row, or None with its faults noted."""
    before = len(faults.found)
    quantity = term(row, "quantity", QUANTITIES, faults)
    basis = term(row, "basis", BASES, faults)
    source = term(row, "source", SOURCES, faults)
    if not row["sample"]:
        faults.add(row.line, "sample is empty", "a sample id", "Fill it in.")
    determined = _determined(row, faults)
    value, mark = _number(row, faults)
    if len(faults.found) > before:
        return None
    basis = basis or OWN_BASIS.get(quantity, "")
    return AnalysisValue(row["sample"], quantity, value, basis, determined, row["by"], source, mark, row.line)


def term(row: Row, column: str, known: dict[str, str], faults: Faults) -> str:
    """The tool's word for what a cell says; an unknown word is a fault; an empty cell is empty."""
    text = row[column]
    found = known.get(text, known.get(text.lower()))
    if text and found is None:
        faults.add(row.line, f"{column} '{text}' is not known", nearest(text, known), "Correct the cell.")
    return found or ""


def _determined(row: Row, faults: Faults) -> datetime | None:
    if not row["determined"]:
        return None
    try:
        return moment(row["determined"])
    except BadInput as error:
        faults.add_error(row.line, "determined", error)
        return None


def _number(row: Row, faults: Faults) -> tuple[float, str]:
    """(value in per cent, mark)."""
    try:
        value, mark = marked_number(row["value"])
        value = units.convert(value, row["unit"] or "%", "%")
    except BadInput as error:
        faults.add_error(row.line, "value", error)
        return 0.0, ""
    if row["mark"] not in ("", "<"):
        faults.add(row.line, f"mark '{row['mark']}' is not known", "< or nothing", "Correct the cell.")
    if not 0 <= value <= 100:
        faults.add(row.line, f"value {value:.6g} %", "0 % to 100 %", "Correct the cell.")
    return value, mark or row["mark"]


def _refuse_repeats(values: Iterable[AnalysisValue], faults: Faults) -> None:
    """Two different values of one quantity at one time: only one can be right."""
    seen: dict[tuple[str, str, datetime | None], AnalysisValue] = {}
    for one in values:
        key = (one.sample, one.quantity, one.determined)
        first = seen.setdefault(key, one)
        if (first.value, first.mark) != (one.value, one.mark):
            what = f"{one.quantity} of {one.sample} stands already on line {first.line} with {first.value:.6g}"
            faults.add(one.line, what, "one value at one time", "Remove one.")
