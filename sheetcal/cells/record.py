"""The record's length, once its state is known to be sound.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from sheetcal.cells.primitives import count
from sheetcal.cells.registry import ONE, TEXT, TIMES, cell


@cell(
    "RECORD_COUNT",
    equation="n = number of readings, only where the record is sound",
    source="the line that judges the record",
    standing="derived",
    choices={"state": ("sound",)},
)
def record_count(state: TEXT, time: TIMES) -> ONE:
    """Number of readings of a record that was found sound."""
    return count(time)
