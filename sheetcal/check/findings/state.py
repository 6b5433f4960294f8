"""The state of the workbook as a whole: its tabs, its protection, how it calculates, what in it is no worksheet."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator, Mapping, Sequence
from typing import Any, Protocol

from sheetcal.check.case import Case
from sheetcal.kinds.layout import column_letter
from sheetcal.model import TABS, Finding

RECORD_TAB = "Issue record"
OUR_LISTS = ("Findings", "Befunde")
NAMED = 50  # formulas that reach outside, as many by their cell
SHOWN = 3  # as many examples in one message
OUTSIDE = re.compile(r"\[\d+\]|WEBSERVICE\(|\bDDE\(|\bRTD\(|FILE:|HTTPS?:|\\\\|\|'", re.IGNORECASE)


class File(Protocol):
    """What a reader says of a workbook beside its cells."""

    @property
    def tabs(self) -> Sequence[tuple[str, str]]: ...
    @property
    def calc(self) -> Mapping[str, Any]: ...
    @property
    def date1904(self) -> bool: ...
    @property
    def extras(self) -> Mapping[str, Sequence[str]]: ...


def look(case: Case, file: File) -> None:
    """Findings on tabs, outside reach, calculation settings, protection, merges, and what is hidden."""
    _tabs(case, file)
    _reach(case, file)
    _calculation(case, file)
    if not case.shifted:
        _protection(case, file)
        _merges(case, file)
        _hidden(case, file)


def say(case: Case, code: str, severity: str, message: str, cause: str, action: str, tab: str | None = None,
         cell: str | None = None) -> None:  # fmt: skip
    sort = "note" if severity == "note" else "fault"
    case.found.append(Finding(code, sort, severity, message, tab, cell, likely_cause=cause, action=action))


def _tabs(case: Case, file: File) -> None:
    """Tabs that are gone, tabs that were added, tabs that were hidden."""
    present = dict(file.tabs)
    used = {place.tab for place in case.parts.skeleton.places.values()} | {"Constants", RECORD_TAB}
    for tab in TABS:
        if tab in used and tab not in present:
            case.shifted.add(tab)
            cause = "the tab was renamed or deleted"
            say(case, "tab-missing", "error", f"the tab {tab} is not there: fill a fresh copy", cause, "reject", tab)
        elif tab in used and tab != RECORD_TAB and present[tab] != "visible" and _has_cells(case, tab):
            say(case, "cells-hidden", "warning", f"the tab {tab} is hidden: show it", "somebody hid it", "hold", tab)
    for tab, state in file.tabs:
        if tab not in TABS and not _is_our_list(case, tab):
            hidden = "" if state == "visible" else " (hidden)"
            message = f"a tab was added{hidden}: nothing on it is checked; send the workbook without it"
            say(case, "tab-added", "warning", message, "own notes or sums beside the sheet", "correct", tab)


def _is_our_list(case: Case, tab: str) -> bool:
    """Whether a tab is the list that a check from inside LibreOffice left in the workbook."""
    first = case.cells.get(tab, {}).get("A1")
    return tab.startswith(OUR_LISTS) and first is not None and str(first[1]).startswith("sheetcal: ")


def _has_cells(case: Case, tab: str) -> bool:
    return tab == "Constants" or any(place.tab == tab for place in case.parts.skeleton.places.values())


def _reach(case: Case, file: File) -> None:
    """Macros, links to other files, and objects that are no part of a worksheet."""
    facts = file.extras
    if facts.get("macros"):
        message = f"the workbook holds macros ({_some(facts['macros'])}): nothing was run; fill a fresh copy"
        say(case, "macros-present", "error", message, "saved with macros, or made from another file", "reject")
    links = [*facts.get("external_links", ()), *facts.get("connections", ()), *facts.get("dde", ())]
    if links:
        message = f"the workbook reaches outside itself ({_some(links)}): nothing was fetched; fill a fresh copy"
        say(case, "outside-link", "error", message, "cells or pictures were pasted from another file", "reject")
    reaching = list(_reaching(case))
    for number, (tab, cell, formula) in enumerate(reaching[:NAMED], start=1):
        more = len(reaching) - NAMED if number == NAMED else 0
        others = f" (and {more} more do)" if more > 0 else ""
        message = f"a formula reaches outside the workbook{others}: {formula[:60]}; delete it"
        say(case, "outside-link", "error", message, "pasted from another file", "reject", tab, cell)
    if facts.get("embedded"):
        message = f"{len(facts['embedded'])} objects were embedded; nothing in them is checked"
        say(case, "object-embedded", "note", message, "an object was pasted in", "note")


def _reaching(case: Case) -> Iterator[tuple[str, str, str]]:
    """Cells outside every place whose formula reaches outside; those of places are altered formulas anyhow."""
    for tab, cells in case.parts.strangers.items():
        for cell, (_, _, formula) in cells.items():
            if formula and OUTSIDE.search(formula):
                yield tab, cell, formula


def _some(facts: Sequence[str]) -> str:
    more = f" and {len(facts) - SHOWN} more" if len(facts) > SHOWN else ""
    return ", ".join(fact[:60] for fact in facts[:SHOWN]) + more


def _calculation(case: Case, file: File) -> None:
    """How the workbook calculates: as displayed, by hand, in circles, from another first day."""
    settings = file.calc
    if not settings.get("fullPrecision", True):
        message = "the workbook calculates with the figures as displayed, not as measured: switch that off"
        say(case, "calculation-as-displayed", "error", message, "`precision as shown` was switched on", "reject")
    if settings.get("mode", "auto") == "manual":
        message = "calculation by hand: results may be older than the readings; switch to automatic"
        say(case, "calculation-by-hand", "warning", message, "a setting taken over from another workbook", "hold")
    if settings.get("iterate"):
        message = "the workbook may calculate in circles; switch iteration off"
        say(case, "calculation-in-circles", "warning", message, "a setting of the program", "hold")
    if file.date1904:
        message = "dates are counted from 1904: they move by four years when copied; fill a fresh copy"
        say(case, "calendar-of-1904", "warning", message, "saved by a program with another calendar", "hold")


def _protection(case: Case, file: File) -> None:
    """Tabs of ours without protection; the lock of the workbook's structure is not asked for."""
    off = [tab for tab in file.extras.get("unprotected_tabs", ()) if tab in TABS]
    if off:
        message = f"protection is off ({', '.join(off)}): switch it on again"
        say(case, "protection-off", "warning", message, "switched off to change something", "correct", off[0])
    unlocked = set(file.extras.get("unlocked", ()))
    for place in case.parts.skeleton.places.values() if unlocked else ():
        if place.formula is not None and place.where in unlocked:
            message = f"{place.field.label}: the cell of a formula was unlocked"
            case.add("cell-unlocked", place.id, message, "warning", action="correct")
            break  # cells are unlocked by the range; one finding says it


def _merges(case: Case, file: File) -> None:
    """Merges that swallow a place: all but the first cell of a merge are out of sight."""
    for merge in file.extras.get("merges", ()):
        tab, _, ref = merge.rpartition("!")
        swallowed = [place for place in _places_in(case, tab, ref) if place.cell != ref.partition(":")[0]]
        if swallowed:
            message = f"cells {ref} were merged over {swallowed[0].field.label}: separate them"
            say(case, "cells-merged", "warning", message, "formatted by hand", "correct", tab, swallowed[0].cell)


def _hidden(case: Case, file: File) -> None:
    """Rows and columns with readings, results or constants on them that cannot be seen."""
    for area in file.extras.get("hidden", ()):
        tab, _, ref = area.rpartition("!")
        covered = next(iter(_places_in(case, tab, ref)), None)
        if covered is not None or (tab == "Constants" and _holds(case, tab, ref)):
            what = f" with {covered.field.label}" if covered else ""
            message = f"{_named(ref)}{what} cannot be seen: show it"
            cell = covered.cell if covered else None
            say(case, "cells-hidden", "warning", message, "hidden by hand, or left so by a filter", "hold", tab, cell)


def _named(ref: str) -> str:
    """`7:9` -> rows 7 to 9; `C:C` -> column C."""
    first, _, last = ref.partition(":")
    kind = "row" if first.isdigit() else "column"
    return f"{kind} {first}" if first == last else f"{kind}s {first} to {last}"


def _places_in(case: Case, tab: str, ref: str) -> Iterable[Any]:
    """Places whose first cell lies in an area such as `C3:F9`, `7:9` or `C:D`."""
    area = box(ref)
    for place in case.parts.skeleton.places.values():
        if place.tab == tab and area[0] <= place.row <= area[2] and area[1] <= place.column <= area[3]:
            yield place


def _holds(case: Case, tab: str, ref: str) -> bool:
    top, left, bottom, right = box(ref)
    cells = case.cells.get(tab, {})
    return any(
        f"{column_letter(column)}{row}" in cells
        for row in range(top, min(bottom, 2000) + 1)
        for column in range(left, min(right, 40) + 1)
    )


def box(ref: str) -> tuple[int, int, int, int]:
    """First row, first column, last row, last column of an area; whole rows and columns have no end."""
    first, _, last = ref.replace("$", "").partition(":")
    row, column = _corner(first)
    row_end, column_end = _corner(last or first)
    return row or 1, column or 1, row_end or 1 << 20, column_end or 1 << 14


def _corner(ref: str) -> tuple[int, int]:
    letters = "".join(c for c in ref if c.isalpha())
    number = 0
    for letter in letters:
        number = number * 26 + ord(letter) - 64
    digits = "".join(c for c in ref if c.isdigit())
    return int(digits or 0), number
