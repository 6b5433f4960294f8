"""A reference, range or name that takes something else than the issued formula did."""

from __future__ import annotations

from sheetcal.check.case import called
from sheetcal.check.slips.words import Words, block_name
from sheetcal.check.tree import Area, ErrorLiteral, Name, Node, Reference
from sheetcal.model import Place

Told = tuple[str, str | None]  # what the formula does now; how that came about
SHOWN = 3


def reference_slip(expected: Node, found: Node, words: Words) -> Told | None:
    """What the found reference does in place of the expected one; None where one of them is none."""
    if isinstance(found, ErrorLiteral):
        return f"lost its reference to {words.of(expected)} ({found.code})", "cells it needs were deleted"
    if not isinstance(expected, Reference | Area | Name):
        return None
    if isinstance(found, Reference) and isinstance(expected, Reference):
        return _one_for_another(expected, found, words)
    wanted, taken = words.cells(expected), words.cells(found)
    if wanted is not None and taken is not None:
        return _range_for_another(expected, found, wanted, taken, words)
    if isinstance(found, Name):
        return f"takes {words.of(found)} instead of {words.of(expected)}", "another name was put in"
    return None


def _one_for_another(expected: Reference, found: Reference, words: Words) -> Told:
    right, now = words.place_at(expected), words.place_at(found)
    name = words.of(expected)
    if now is None:
        return f"takes {words.content(found)} ({words.where(found)}) instead of {name}", _strange_cause(found, words)
    told = f"takes {_apart(now, right, words)} instead of {name}{_emptiness(found, now, words)}"
    return told, _cause(right, now)


def _apart(now: Place, right: Place | None, words: Words) -> str:
    """The place taken, named so that it differs from the right one."""
    block = now.id.partition(".")[0]
    if right is not None and now.field.key == right.field.key:
        return f"that of {block_name(block)}"
    return words.of_place(now)


def _emptiness(found: Reference, now: Place, words: Words) -> str:
    """What is odd about the cell taken."""
    kind, value, formula = words.stored(found)
    if kind == "blank" or (formula is None and value in (None, "")):
        return "; that cell is empty and counts as 0"
    if isinstance(value, str) and value and now.field.type in ("number", "integer"):
        return "; that cell holds text"
    return "; that is text" if now.field.type in ("text", "choice") else ""


def _cause(right: Place | None, now: Place) -> str | None:
    if right is None:
        return None
    if now.field.key == right.field.key:
        return "copied from another column with a reference that did not move, or moved too far ($)"
    if now.field.name == f"{right.field.name}_reported":
        return "the rounded figure was taken on into the reckoning"
    return "another cell was clicked"


def _strange_cause(found: Reference, words: Words) -> str | None:
    kind, _, _ = words.stored(found)
    return "the reference slipped in copying the formula" if kind == "blank" else "a cell beside the sheet was clicked"


Cells = set[tuple[str, int, int]]


def _range_for_another(expected: Node, found: Node, wanted: Cells, taken: Cells, words: Words) -> Told:
    missing, more = wanted - taken, taken - wanted
    what = words.of(expected)
    if not wanted & taken:
        return f"takes {words.of(found)} instead of {what}", "the range slipped when the formula was copied"
    told = []
    if missing:
        told.append(f"leaves out {_listed(missing, words, len(wanted))} of {what}")
    if more:
        told.append(f"also takes {_listed(more, words, len(more))}{_doubled(more, words)}")
    cause = "the range is too short" if not more else "the range is too long" if not missing else "the range slipped"
    return " and ".join(told), cause


def _listed(cells: Cells, words: Words, whole: int) -> str:
    """Cells as runs, samples or readings of a record."""
    ordered = sorted(cells, key=lambda cell: (cell[0], cell[2], cell[1]))
    places = [words.place_at(Reference(tab_of(tab, words), column, row)) for tab, column, row in ordered]
    known = [place for place in places if place is not None]
    if known and all(place.field.series for place in known) and len(known) == len(places):
        return f"{len(cells)} of {whole} readings" if len(cells) > 1 else "one reading"
    names = list(dict.fromkeys(_named(place, words) if place else "cells beside the table" for place in places))
    shown = ", ".join(names[:SHOWN])
    return shown if len(names) <= SHOWN else f"{shown} and {len(names) - SHOWN} more"


def _named(place: Place, words: Words) -> str:
    block = place.id.partition(".")[0]
    return called(place.field.label) if block in (words.block, "sheet") else block_name(block)


def _doubled(more: Cells, words: Words) -> str:
    """Says where a range runs over a total, so that its parts count twice."""
    for tab, column, row in more:
        place = words.place_at(Reference(tab_of(tab, words), column, row))
        if place is not None and place.id == words.place.id:
            return ": its own result"
        if place is not None and place.field.step is not None and place.id.partition(".")[0] == words.block:
            return f": {called(place.field.label)} is a result itself, and counts twice"
    return ""


def tab_of(folded: str, words: Words) -> str:
    """The tab as the sheet spells it."""
    return next((tab for tab in words.case.cells if tab.casefold() == folded), folded)
