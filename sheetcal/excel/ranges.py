"""Cells gathered into few ranges, so that one rule over many cells is written once."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from sheetcal.kinds.layout import column_letter
from sheetcal.model import Place


@dataclass(frozen=True, order=True)
class Area:
    """A rectangle of cells."""

    row: int
    column: int
    last_row: int
    last_column: int

    @property
    def first(self) -> str:
        """Its upper left cell, which relative references start from."""
        return f"{column_letter(self.column)}{self.row}"

    def __str__(self) -> str:
        last = f"{column_letter(self.last_column)}{self.last_row}"
        return self.first if self.first == last else f"{self.first}:{last}"


def areas(places: Iterable[Place]) -> list[Area]:
    """The places as rectangles, top first; neighbours in a row become one."""
    found: list[Area] = []
    for place in sorted(places, key=lambda one: (one.row, one.column)):
        last_row = place.row + _height(place) - 1
        before = found[-1] if found else None
        if before and (before.row, before.last_row, before.last_column + 1) == (
            place.row,
            last_row,
            place.column,
        ):
            found[-1] = Area(before.row, before.column, before.last_row, place.column)
        else:
            found.append(Area(place.row, place.column, last_row, place.column))
    return found


def sqref(found: Sequence[Area]) -> str:
    """The list of ranges as a rule spells it."""
    return " ".join(str(one) for one in found)


def by_column(found: Iterable[Area]) -> list[list[Area]]:
    """Areas parted by their first column: relative references count from the uppermost and leftmost cell of a rule."""
    groups: dict[int, list[Area]] = {}
    for one in found:
        groups.setdefault(one.column, []).append(one)
    return [groups[column] for column in sorted(groups)]


def _height(place: Place) -> int:
    if not place.field.series:
        return 1
    first, _, last = place.cell.partition(":")
    return _row(last or first) - _row(first) + 1


def _row(cell: str) -> int:
    return int(cell.lstrip("ABCDEFGHIJKLMNOPQRSTUVWXYZ"))
