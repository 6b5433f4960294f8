"""What one workbook tells of the work behind it: the order of the runs, what they have in common, lone slips."""

from __future__ import annotations

from sheetcal.check.case import Case
from sheetcal.check.findings import alike, sequence, suspects


def look(case: Case) -> None:
    """Findings that compare the runs of the workbook with each other; the faintest last."""
    alike.look(case)
    sequence.look(case)
    suspects.look(case)
