"""What hides a cell without changing it: colours, number formats, filters, pictures laid over readings."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Protocol

from sheetcal.check.case import Case, called
from sheetcal.check.findings.state import box, say
from sheetcal.check.shown import hidden
from sheetcal.kinds.display import number_format
from sheetcal.kinds.layout import column_letter
from sheetcal.kinds.record import constant_cells
from sheetcal.model import Place

SHOWN = 3  # as many cells are named in one message


class File(Protocol):
    """What a reader says of the looks of cells."""

    @property
    def extras(self) -> Mapping[str, Sequence[str]]: ...
    @property
    def styled(self) -> Mapping[str, Mapping[str, str]]: ...
    @property
    def codes(self) -> Mapping[str, str]: ...


def look(case: Case, file: File) -> None:
    """Findings on cells whose content a reader cannot see, or sees without its sign, unit or decimals."""
    if file.extras.get("unseen"):
        _unseen(case, file.extras["unseen"])
    _formats(case, file)
    for tab in file.extras.get("filters", ()):
        if any(place.tab == tab for place in case.parts.skeleton.places.values()):
            message = "a filter is switched on: it may hide rows"
            say(case, "filter-on", "note", message, "switched on by hand", "note", tab)
    for area in file.extras.get("objects", ()):
        _object(case, area)


def _unseen(case: Case, cells: Sequence[str]) -> None:
    """Places whose text has the colour of its cell: one finding for each tab."""
    listed = set(cells)
    by_tab: dict[str, list[tuple[str, str]]] = {}
    for place, cell in _cells_of(case):
        if f"{place.tab}!{cell}" in listed:
            by_tab.setdefault(place.tab, []).append((cell, called(place.field.label)))
    for one, cell, _, _ in constant_cells(case.parts.kind, case.parts.record):
        if f"Constants!{cell}" in listed:
            by_tab.setdefault("Constants", []).append((cell, f"constant {one.partition('.')[2]}"))
    for tab, found in by_tab.items():
        names = ", ".join(f"{name} ({cell})" for cell, name in found[:SHOWN])
        more = f" and {len(found) - SHOWN} more cells" if len(found) > SHOWN else ""
        message = f"{names}{more} cannot be seen: the text has the colour of its cell; give it another"
        cause = "coloured by hand, so that it does not show or does not print"
        say(case, "cells-hidden", "warning", message, cause, "hold", tab, found[0][0])


def _cells_of(case: Case) -> Iterator[tuple[Place, str]]:
    """Every cell of every place, those of series one by one."""
    rows = case.parts.skeleton.shape.record_rows
    for place in case.parts.skeleton.places.values():
        if not place.field.series:
            yield place, place.cell
            continue
        letter = column_letter(place.column)
        for row in range(place.row, place.row + rows):
            yield place, f"{letter}{row}"


def _formats(case: Case, file: File) -> None:
    """Numbers whose format hides something the issued one shows; one finding for each tab and format."""
    found: dict[tuple[str, str, str], list[tuple[Place, str]]] = {}
    known: dict[tuple[str, float | None, str], str | None] = {}
    for place, cell in _cells_of(case):
        style = file.styled.get(place.tab, {}).get(cell)
        if style is None:
            continue
        key = (style, place.field.resolution, place.field.type)
        if key not in known:
            known[key] = _judged(file.codes.get(style), place)
        if known[key] is not None and not _is_said(case, place, cell):
            told = (place.tab, str(known[key]), file.codes[style])
            found.setdefault(told, []).append((place, cell))
    for (tab, what, code), listed in found.items():
        _say_format(case, tab, what, code, listed)


def _judged(code: str | None, place: Place) -> str | None:
    """What a format hides at a place."""
    if code is None or place.field.type not in ("number", "integer", "date", "datetime"):
        return None
    return hidden(number_format(place.field.resolution, place.field.type), code)


def _is_said(case: Case, place: Place, cell: str) -> bool:
    """Whether the cell holds a date where a number belongs: that is a reading turned into a date."""
    kind = case.cells.get(place.tab, {}).get(cell, ("", None, None))[0]
    return kind == "d" and place.formula is None and place.field.type in ("number", "integer")


def _say_format(case: Case, tab: str, what: str, code: str, listed: list[tuple[Place, str]]) -> None:
    place, cell = listed[0]
    more = f" (and {len(listed) - 1} more cells)" if len(listed) > 1 else ""
    row = int("".join(letter for letter in cell if letter.isdigit()))
    one = f"{place.id}[{row - place.row + 1}]" if place.field.series else place.id
    message = f"{called(place.field.label)}{more}: its number format {what}; give it back the issued one"
    expected = number_format(place.field.resolution, place.field.type)
    case.add(
        "format-altered", one, message, "warning", found=code, expected=expected, action="correct",
        likely_cause="formatted by hand, or pasted from a cell of another format",
    )  # fmt: skip


def _object(case: Case, area: str) -> None:
    """A picture or text box over readings or results; beside them it is nobody's business."""
    tab, _, span = area.rpartition("!")
    top, left, bottom, right = box(span)
    for place in case.parts.skeleton.places.values():
        last = place.row + (case.parts.skeleton.shape.record_rows - 1 if place.field.series else 0)
        if place.tab == tab and left <= place.column <= right and place.row <= bottom and last >= top:
            cell = f"{column_letter(place.column)}{max(place.row, top)}"
            message = f"a picture or text box lies over {span}, {called(place.field.label)} among it: lay it elsewhere"
            say(case, "object-over-cells", "note", message, "pasted over the sheet", "note", tab, cell)
            return
