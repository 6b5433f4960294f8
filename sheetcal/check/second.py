"""Second sources for one workbook: what an instrument stored, and whether earlier workbooks are at hand."""

from __future__ import annotations

from dataclasses import dataclass

from sheetcal.check.findings.logged import Log

NO_HISTORY = "copies of earlier workbooks, firings and controls in workbooks not checked here (give --history)"
NO_LOG = "weighings and runs against the instrument's own log (give --instrument-log)"


@dataclass(frozen=True)
class Second:
    """`log`: the instrument's, where it was given. `history`: whether earlier workbooks were."""

    log: Log | None = None
    history: bool = False

    @property
    def lacking(self) -> tuple[str, ...]:
        """What cannot be looked for, and what it would need."""
        return (() if self.history else (NO_HISTORY,)) + (() if self.log else (NO_LOG,))


ALONE = Second()
