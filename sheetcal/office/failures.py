"""What can go wrong between sheetcal and LibreOffice, each as one line that says what to do."""

from __future__ import annotations

from sheetcal.errors import SheetcalError


class OfficeMissing(SheetcalError):
    """LibreOffice, or a Python that can speak to it, is not there, or cannot run on this machine as it is."""


class OfficeFailed(SheetcalError):
    """LibreOffice failed on one job, and again on a fresh one."""


class OfficeUnreadable(SheetcalError):
    """LibreOffice is well, but the file is no workbook it can open."""
