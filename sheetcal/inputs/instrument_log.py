"""What a balance or another instrument stored by itself: time, instrument, run, quantity, value, unit."""

import os
from dataclasses import dataclass
from datetime import datetime

from sheetcal import units
from sheetcal.errors import BadInput
from sheetcal.inputs.table import Row, moment, number, read_table
from sheetcal.inputs.text import Faults

COLUMNS = ("time", "instrument", "run", "quantity", "value", "unit")


@dataclass(frozen=True, slots=True)
class InstrumentReading:
    """One value an instrument stored, in its own unit; `run` as the bench calls it, or empty."""

    time: datetime
    instrument: str
    run: str
    quantity: str
    value: float
    unit: str
    line: int


def read_instrument_log(path: str | os.PathLike[str]) -> tuple[InstrumentReading, ...]:
    """The readings of an instrument log, in file order. Raises BadInput or BadInputs with file and line."""
    table = read_table(path, COLUMNS, COLUMNS)
    faults = Faults(table.source)
    found = [_reading(row, faults) for row in table.rows]
    faults.close()
    return tuple(one for one in found if one)


def _reading(row: Row, faults: Faults) -> InstrumentReading | None:
    try:
        units.parse(row["unit"])
        value, time = number(row["value"]), moment(row["time"])
    except BadInput as error:
        faults.add_error(row.line, "reading", error)
        return None
    return InstrumentReading(time, row["instrument"], row["run"], row["quantity"], value, row["unit"], row.line)
