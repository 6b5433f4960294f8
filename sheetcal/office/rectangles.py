"""Which cells of a layout are pushed into the bare workbook, and which are read from it: few large rectangles.

A pushed rectangle holds no formula. Every cell of it is written for every file, blank ones included, so that
nothing of the file before remains. Standard library only.
"""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import lru_cache

from sheetcal.kinds.layout import Skeleton, column_letter, skeleton
from sheetcal.model import Shape, SheetKind

Box = tuple[int, int, int, int]  # first row, first column, last row, last column
Cells = set[tuple[int, int]]  # (row, column)
CALL = 150  # cells that may be read or written in the time of one call more
NEAR = 8  # rectangles before that are tried as partners


@dataclass(frozen=True)
class Pushed:
    """A rectangle that is written: tab, first cell, and the address of every cell; None where nothing belongs."""

    tab: str
    cell: str
    rows: tuple[tuple[str | None, ...], ...]


@dataclass(frozen=True)
class Rectangles:
    """What is pushed, the spans that are read, and for each result where it lies: (number of the span, row, column)."""

    pushed: tuple[Pushed, ...]
    read: tuple[tuple[str, str], ...]
    results: dict[str, tuple[int, int, int]]


@lru_cache(maxsize=32)
def rectangles(kind: SheetKind, shape: Shape) -> Rectangles:
    """The rectangles of a kind and shape."""
    plan = skeleton(kind, shape)
    given, computed = _cells(plan)
    pushed = [
        _pushed(tab, box, wanted) for tab, wanted in given.items() for box in covering(wanted, computed.get(tab, set()))
    ]
    read = [(tab, box) for tab, wanted in computed.items() for box in covering(wanted, set())]
    spans = [(tab, f"{_address(top, left)}:{_address(bottom, right)}") for tab, (top, left, bottom, right) in read]
    return Rectangles(tuple(pushed), tuple(spans), _homes(plan, read))


def _cells(plan: Skeleton) -> tuple[dict[str, Cells], dict[str, Cells]]:
    """(row, column) by tab: of what is pushed, and of the formulas."""
    given: dict[str, Cells] = {}
    computed: dict[str, Cells] = {}
    for one in plan.places.values():
        height = plan.shape.record_rows if one.field.series else 1
        cells = given if one.formula is None else computed
        cells.setdefault(one.tab, set()).update((row, one.column) for row in range(one.row, one.row + height))
    given["Constants"] = set(_constants(plan))
    return given, computed


def _constants(plan: Skeleton) -> Iterator[tuple[int, int]]:
    """The cells that the names of the Constants tab point to."""
    for where in plan.names.values():
        first, _, last = where.partition("!")[2].replace("$", "").partition(":")
        (top, column), (bottom, _) = _at(first), _at(last or first)
        yield from ((row, column) for row in range(top, bottom + 1))


def _at(cell: str) -> tuple[int, int]:
    letters = cell.rstrip("0123456789")
    column = 0
    for letter in letters:
        column = column * 26 + ord(letter) - 64
    return int(cell[len(letters) :]), column


def covering(wanted: Cells, barred: Cells) -> list[Box]:
    """Rectangles that together hold every wanted cell and no barred one.

    Cells between are taken in, and rectangles may overlap, where that saves a call.
    """
    walls = _by_column(barred)
    boxes: list[Box] = []
    for one in sorted(_runs(_by_column(wanted), walls)):
        for number in range(len(boxes) - 1, max(-1, len(boxes) - 1 - NEAR), -1):
            both = _around(boxes[number], one)
            if _size(both) - _size(boxes[number]) - _size(one) <= CALL and not _holds(walls, both):
                boxes[number] = both
                break
        else:
            boxes.append(one)
    return boxes


def _by_column(cells: Cells) -> dict[int, list[int]]:
    """Rows by column, rising."""
    columns: dict[int, list[int]] = {}
    for row, column in sorted(cells):
        columns.setdefault(column, []).append(row)
    return columns


def _runs(columns: Mapping[int, list[int]], walls: Mapping[int, list[int]]) -> Iterator[Box]:
    """Column by column the longest stretches without a wall and without a long gap."""
    for column, rows in columns.items():
        top = last = rows[0]
        for row in rows[1:]:
            if row - last > CALL or _holds(walls, (last, column, row, column)):
                yield top, column, last, column
                top = row
            last = row
        yield top, column, last, column


def _holds(walls: Mapping[int, list[int]], box: Box) -> bool:
    """Whether a rectangle holds one of the cells."""
    top, left, bottom, right = box
    for column in range(left, right + 1):
        rows = walls.get(column, ())
        place = bisect_left(rows, top)
        if place < len(rows) and rows[place] <= bottom:
            return True
    return False


def _around(one: Box, other: Box) -> Box:
    """The smallest rectangle that holds both."""
    return min(one[0], other[0]), min(one[1], other[1]), max(one[2], other[2]), max(one[3], other[3])


def _size(box: Box) -> int:
    return (box[2] - box[0] + 1) * (box[3] - box[1] + 1)


def _address(row: int, column: int) -> str:
    return f"{column_letter(column)}{row}"


def _pushed(tab: str, box: Box, wanted: Cells) -> Pushed:
    top, left, bottom, right = box
    letters = {column: column_letter(column) for column in range(left, right + 1)}
    rows = tuple(
        tuple(f"{letter}{row}" if (row, column) in wanted else None for column, letter in letters.items())
        for row in range(top, bottom + 1)
    )
    return Pushed(tab, _address(top, left), rows)


def _homes(plan: Skeleton, read: list[tuple[str, Box]]) -> dict[str, tuple[int, int, int]]:
    """For each result the span it lies in, and where in it."""
    by_tab: dict[str, list[tuple[int, Box]]] = {}
    for number, (tab, box) in enumerate(read):
        by_tab.setdefault(tab, []).append((number, box))
    return {
        one.id: _home(one.row, one.column, by_tab[one.tab]) for one in plan.places.values() if one.formula is not None
    }


def _home(row: int, column: int, boxes: list[tuple[int, Box]]) -> tuple[int, int, int]:
    for number, (top, left, bottom, right) in boxes:
        if top <= row <= bottom and left <= column <= right:
            return number, row - top, column - left
    raise KeyError((row, column))
