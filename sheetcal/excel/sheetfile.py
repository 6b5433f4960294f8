"""What the readers hand out: a workbook as cells and facts, whatever its format."""

from dataclasses import dataclass, field
from typing import Any

from sheetcal.excel.cellvalues import Cell


@dataclass
class SheetFile:
    """One workbook as read.

    cells: by tab and address, (type, value, formula); type "n" number, "d" number shown as date or time, "s"
    text, "b" truth value, "e" error text, "" formula without stored value. A cell without value (or with an
    empty text) and without formula is left out; a typed TRUE or #N/A that LibreOffice saved as the formula
    =TRUE() or =#N/A is a plain value again.
    names: defined names; one local to a tab is "Tab!name". properties: core, application and custom ones.
    calc: mode ("auto", "manual", ...), fullPrecision, iterate, fullCalcOnLoad. tabs: (name, state) in order.
    extras: facts that are no reason to refuse, by sort: macros, external_links, hyperlinks, dde, embedded,
    connections, reaching_formulas, arrays, merges, links, unprotected_tabs, hidden (rows `Tab!7:7`, columns
    `Tab!C:D`), unlocked (cells with a formula), unseen (cells whose text has the colour of the cell), filters (tabs),
    objects (cells under a picture or text box, `Tab!C3:F9`).
    styled: by tab and address, the style of each cell that holds a number; codes: the number format of each style.
    """

    format: str
    sha256: str
    cells: dict[str, dict[str, Cell]] = field(default_factory=dict)
    names: dict[str, str] = field(default_factory=dict)
    properties: dict[str, str] = field(default_factory=dict)
    calc: dict[str, Any] = field(default_factory=dict)
    date1904: bool = False
    tabs: list[tuple[str, str]] = field(default_factory=list)
    extras: dict[str, list[str]] = field(default_factory=dict)
    styled: dict[str, dict[str, str]] = field(default_factory=dict)
    codes: dict[str, str] = field(default_factory=dict)

    def note(self, sort: str, fact: str) -> None:
        """Add one fact to the extras."""
        self.extras.setdefault(sort, []).append(fact)
