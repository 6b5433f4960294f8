"""How much of each thing one workbook may hold: well beyond any worksheet, and little enough to be gone through.

The gate bounds bytes and marks; what is counted here costs more than its bytes once it is read. Standard library.
"""

from sheetcal.errors import Refused

LIMITS = {
    "tabs": 100,
    "relations": 10_000,
    "names": 20_000,
    "cell styles": 65_536,
    "number formats": 20_000,
    "shared texts": 250_000,
    "merges": 2_000,
    "links": 20_000,
    "hidden rows or columns": 2_000,  # rows side by side count as one
    "array formulas": 2_000,
    "letters of text": 16_000_000,
    "letters of formulas": 16_000_000,
}


class Allowance:
    """What is left of each for one workbook."""

    def __init__(self, where: str) -> None:
        self._where = where
        self._left = dict(LIMITS)

    def take(self, sort: str, number: int = 1) -> None:
        """Count so many of a sort. Raises Refused where there are too many."""
        self._left[sort] -= number
        if self._left[sort] < 0:
            what = f"holds more than {LIMITS[sort]} {sort}"
            raise Refused(self._where, what, "a worksheet", "Send the sheet alone.")
