"""Cells that were cut and pasted: their value stands elsewhere, and every formula that takes it followed."""

from __future__ import annotations

from collections.abc import Iterable

from sheetcal.check.case import Case, called
from sheetcal.check.formula import address
from sheetcal.check.slips.explain import moved_references
from sheetcal.check.tree import Area, Node, Reference
from sheetcal.model import Place, Value

Box = tuple[str, int, int]  # tab, column, row of a first cell
Move = tuple[Box, Box]
CAUSE = "cut and paste moves the references of all formulas along (copying leaves them): put it back where it was"


def look(case: Case) -> None:
    """One finding for all cells that were moved by the same step, however many formulas followed."""
    groups: dict[tuple[str, str, int, int], list[tuple[str, list[Move]]]] = {}
    for one, text in case.witnessed.altered.items():
        moves = _moves(case.place(one)[0].tab, case.place(one)[0].formula or "", text)
        steps = {_step(move) for move in moves}
        if len(steps) == 1:
            groups.setdefault(steps.pop(), []).append((one, moves))
    for followed in groups.values():
        moves = list(dict.fromkeys(move for _, listed in followed for move in listed))
        if all(_is_filled(case, now) for _, now in moves) and _was_cut(case, moves, {one for one, _ in followed}):
            _say(case, [one for one, _ in followed], moves)


def followers_of(case: Case) -> set[str]:
    """Altered formulas that only followed a cell that was moved."""
    if not case.moved:
        return set()
    places = case.parts.skeleton.places
    return {
        one
        for one, text in case.witnessed.altered.items()
        if follows(case, places[one].tab, places[one].formula or "", text)
    }


def follows(case: Case, tab: str, expected: str, found: str) -> bool:
    """Whether a formula differs only by references to cells that were moved."""
    if not case.moved:
        return False
    moves = _moves(tab, expected, found)
    return bool(moves) and all(
        (place := _at(case, old)) is not None and case.moved.get(place.id) == _where(now) for old, now in moves
    )


def _moves(tab: str, expected: str, found: str) -> list[Move]:
    """(from, to) of each reference that differs; none where anything else differs."""
    moves = [
        (_corner(tab, old), _corner(tab, new))
        for old, new in moved_references(expected, found) or ()
        if _size(old) == _size(new)
    ]
    return moves


def _corner(tab: str, node: Node) -> Box:
    if isinstance(node, Area):
        return node.tab or tab, node.left, node.top
    assert isinstance(node, Reference)  # nothing else is compared
    return node.tab or tab, node.column, node.row


def _size(node: Node) -> tuple[int, int]:
    return (node.right - node.left, node.bottom - node.top) if isinstance(node, Area) else (0, 0)


def _step(move: Move) -> tuple[str, str, int, int]:
    (tab, column, row), (other, new_column, new_row) = move
    return tab, other, new_column - column, new_row - row


def _where(box: Box) -> str:
    return f"{box[0]}!{address(box[1], box[2])}"


def _at(case: Case, box: Box) -> Place | None:
    return case.parts.skeleton.at.get((box[0], address(box[1], box[2])))


def _stored(case: Case, box: Box) -> tuple[str, Value, str | None]:
    return case.cells.get(box[0], {}).get(address(box[1], box[2]), ("", None, None))


def _is_filled(case: Case, box: Box) -> bool:
    _, value, formula = _stored(case, box)
    return formula is not None or value not in (None, "")


def _was_cut(case: Case, moves: list[Move], followed: Iterable[str]) -> bool:
    """Whether a place was emptied, and all that take it followed or its value lies where no place is."""
    emptied = [(old, now) for old, now in moves if not _is_filled(case, old)]
    places = [(_at(case, old), now) for old, now in emptied]
    if not places or any(place is None for place, _ in places):
        return False
    return all(
        _at(case, now) is None or set(case.feeds.get(place.id, ())) <= set(followed) for place, now in places if place
    )


def _say(case: Case, followed: list[str], moves: list[Move]) -> None:
    names = []
    for old, now in moves:
        place = _at(case, old)
        if place is None:
            continue
        case.moved[place.id] = _where(now)
        _, value, formula = _stored(case, now)
        if place.formula is None and formula is None and not _is_filled(case, old):
            case.repairs[place.id] = value
        names.append(f"{called(place.field.label)} ({_where(old)} to {_where(now)})")
    first = followed[0]
    more = f" and {len(names) - 2} more" if len(names) > 2 else ""
    others = f" and {len(followed) - 1} more formulas" if len(followed) > 1 else ""
    place, _ = case.place(first)
    message = f"{', '.join(names[:2])}{more} was cut and pasted: {called(place.field.label)}{others} followed it"
    found = case.witnessed.altered[first]
    case.add(
        "formula-altered", first, message, found=found, expected=place.formula, likely_cause=CAUSE, causes=(CAUSE,)
    )
