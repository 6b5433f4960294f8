"""Whose turn it is: calibrations first, then workbooks that found an aid lot, then all that stand on them."""

from __future__ import annotations

import re
from pathlib import Path

from sheetcal.errors import SheetcalError
from sheetcal.excel.gate import admit

CALIBRATION, AID_LOT, OTHER = 0, 1, 2
# The front page prints kind and version; the role of a sample stands in a cell of its own.
MARKS = ((re.compile(rb">calibration \d+<"), CALIBRATION), (re.compile(rb">aid-blank<"), AID_LOT))


def turn(file: str) -> int:
    """The earliest turn a workbook may have, by words in its parts: nothing is parsed yet.

    A workbook that holds such a word by accident is only read twice.
    """
    try:
        package = admit(Path(file))
    except SheetcalError:
        return OTHER  # the reader will say why
    parts = package.kept.values()
    return next((place for mark, place in MARKS if any(mark.search(part) for part in parts)), OTHER)
