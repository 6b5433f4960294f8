"""The worklist: samples to be determined, as the office sends them to the bench."""

import os
from dataclasses import dataclass
from datetime import date

from sheetcal.errors import BadInput
from sheetcal.inputs.analysis import BASES, OWN_BASIS, QUANTITIES, SOURCES, AnalysisValue, term
from sheetcal.inputs.table import Row, Table, day, marked_number, number, read_table
from sheetcal.inputs.text import Faults, TextFile

PLAIN = (
    "sample_id", "order", "client", "description", "fuel_class", "received", "condition", "runs", "role",
    "expected_gross", "approval", "customer_limit", "basis", "hydrogen", "remarks",
)  # fmt: skip
VALUES = ("total_moisture", "analysis_moisture", "ash", "C", "H", "N", "S", "Cl", "O")
COLUMNS = (*PLAIN, *VALUES, *(f"{one}_{end}" for one in VALUES for end in ("source", "mark", "basis")))
ROLES = {"sample": "sample", "control": "control", "aid-blank": "aid-blank"}
HYDROGEN = {
    "total": "total",
    "without_moisture": "without moisture",
    "without moisture": "without moisture",
}
MOST_RUNS = 20


@dataclass(frozen=True, slots=True)
class WorklistSample:
    """One line of a worklist; an empty text or None is a reading still open.

    `expected_gross` in J/g as analysed; `values` by quantity, in mass per cent; `basis` is that of the
    customer's limit; `hydrogen` says whether the hydrogen given includes that of the moisture.
    """

    sample_id: str
    line: int
    order: str = ""
    client: str = ""
    description: str = ""
    fuel_class: str = ""
    received: date | None = None
    condition: str = ""
    runs: int | None = None
    role: str = "sample"
    expected_gross: float | None = None
    approval: str = ""
    customer_limit: str = ""
    basis: str = ""
    hydrogen: str = ""
    remarks: str = ""
    values: tuple[AnalysisValue, ...] = ()
    sources: tuple[tuple[str, str], ...] = ()

    def value(self, quantity: str) -> AnalysisValue | None:
        """The value of a quantity, or None where the worklist has none."""
        return next((one for one in self.values if one.quantity == quantity), None)

    def source(self, quantity: str) -> str:
        """Where the quantity's value comes from, also where the value itself is still to come."""
        return dict(self.sources).get(quantity, "")


@dataclass(frozen=True, slots=True)
class Worklist:
    """A worklist as read."""

    source: TextFile
    samples: tuple[WorklistSample, ...]

    @property
    def sha256(self) -> str:
        """Hash of the file as read."""
        return self.source.sha256


def read_worklist(path: str | os.PathLike[str]) -> Worklist:
    """The samples of a worklist, in file order. Raises BadInput or BadInputs with file and line."""
    table = read_table(path, COLUMNS, ["sample_id"])
    faults = Faults(table.source)
    samples = [_sample(row, faults) for row in table.rows]
    _refuse_repeats(table, faults)
    if not table.rows:
        faults.add(None, "has a header and no samples", "a sample a line", "Give the right file.")
    faults.close()
    return Worklist(table.source, tuple(samples))


def _sample(row: Row, faults: Faults) -> WorklistSample:
    """The sample of one row; what cannot be read is noted and left open."""
    if not row["sample_id"]:
        faults.add(row.line, "sample_id is empty", "a sample id", "Fill it in.")
    return WorklistSample(
        sample_id=row["sample_id"],
        line=row.line,
        order=row["order"],
        client=row["client"],
        description=row["description"],
        fuel_class=row["fuel_class"],
        received=_received(row, faults),
        condition=row["condition"],
        runs=_runs(row, faults),
        role=term(row, "role", ROLES, faults) or "sample",
        expected_gross=_expected(row, faults),
        approval=row["approval"],
        customer_limit=row["customer_limit"],
        basis=term(row, "basis", BASES, faults),
        hydrogen=term(row, "hydrogen", HYDROGEN, faults),
        remarks=row["remarks"],
        values=tuple(one for one in (_value(row, name, faults) for name in VALUES) if one),
        sources=tuple((QUANTITIES[name], row[f"{name}_source"]) for name in VALUES if row[f"{name}_source"]),
    )


def _received(row: Row, faults: Faults) -> date | None:
    if not row["received"]:
        return None
    try:
        return day(row["received"])
    except BadInput as error:
        faults.add_error(row.line, "received", error)
        return None


def _runs(row: Row, faults: Faults) -> int | None:
    """Required runs; blank leaves it to the fuel class."""
    text = row["runs"]
    if not text:
        return None
    if text.isascii() and text.isdigit() and 1 <= int(text) <= MOST_RUNS:
        return int(text)
    expected = f"a whole number from 1 to {MOST_RUNS}"
    faults.add(row.line, f"runs '{text}'", expected, "Correct the cell.")
    return None


def _expected(row: Row, faults: Faults) -> float | None:
    """Expected gross value, J/g as analysed. A value below 100 was meant in MJ/kg."""
    text = row["expected_gross"]
    if not text:
        return None
    try:
        value = number(text)
    except BadInput as error:
        faults.add_error(row.line, "expected_gross", error)
        return None
    if 0 < abs(value) < 100:
        do = f"Write {value * 1000:.10g}."
        faults.add(row.line, f"expected_gross {text} looks like MJ/kg", "J/g as analysed", do)
    elif not -3000 <= value <= 60000:
        faults.add(row.line, f"expected_gross {text} J/g", "-3000 to 60000 J/g", "Correct the cell.")
    return value


def _value(row: Row, name: str, faults: Faults) -> AnalysisValue | None:
    """The analysis value in column `name` with its mark, source and basis, or None where it is blank."""
    source = term(row, f"{name}_source", SOURCES, faults)
    basis = term(row, f"{name}_basis", BASES, faults)
    mark = row[f"{name}_mark"]
    if mark not in ("", "<"):
        faults.add(row.line, f"{name}_mark '{mark}' is not known", "< or nothing", "Correct the cell.")
    if not row[name]:
        return None
    try:
        value, own_mark = marked_number(row[name])
    except BadInput as error:
        faults.add_error(row.line, name, error)
        return None
    if not 0 <= value <= 100:
        faults.add(row.line, f"{name} {value:.6g} %", "0 % to 100 %", "Correct the cell.")
    quantity = QUANTITIES[name]
    basis = basis or OWN_BASIS.get(quantity, "")
    return AnalysisValue(row["sample_id"], quantity, value, basis, source=source, mark=own_mark or mark, line=row.line)


def _refuse_repeats(table: Table, faults: Faults) -> None:
    seen: dict[str, int] = {}
    for row in table.rows:
        name = row["sample_id"]
        if name and name in seen:
            what = f"sample_id '{name}' stands already on line {seen[name]}"
            faults.add(row.line, what, "each sample once", "Raise its runs, or remove the line.")
        seen.setdefault(name, row.line)
