"""Whose turn it is: calibrations first, then workbooks that found an aid lot, then all that stand on them."""

from __future__ import annotations

import re
from pathlib import Path

from sheetcal.errors import SheetcalError
from sheetcal.excel.gate import admit

CALIBRATION, AID_LOT, OTHER = 0, 1, 2
# In the issue record the kind stands beside its key; a shared table of texts has lost that neighbourhood.
KIND = re.compile(rb">kind(?:<[^>]*>\s*)+calibration<")
SHARED = "xl/sharedstrings.xml"


def turn(file: str) -> int:
    """The earliest turn a workbook may have, by words in its parts: nothing is parsed yet.

    A workbook that holds such a word by accident is only read twice.
    """
    try:
        package = admit(Path(file))
    except SheetcalError:
        return OTHER  # the reader will say why
    parts = package.kept.values()
    if any(KIND.search(part) for part in parts) or b">calibration<" in package.kept.get(SHARED, b""):
        return CALIBRATION
    return AID_LOT if any(b">aid-blank<" in part for part in parts) else OTHER
