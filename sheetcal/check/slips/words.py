"""What a formula's references stand for, in the words printed beside the cells."""

from __future__ import annotations

import re

from sheetcal.check.case import Case, called, is_number, quoted
from sheetcal.check.formula import address, parse, write
from sheetcal.check.tree import (
    Area,
    Binary,
    Call,
    FormulaError,
    Name,
    Negative,
    Node,
    Number,
    Percent,
    Reference,
    Text,
    children,
)
from sheetcal.kinds.layout import column_letter
from sheetcal.model import Place, Value

LONGEST = 150  # letters of a formula told in words; a longer one is left out
MOST_CELLS = 3000  # cells of a range that are looked at one by one
_SCOPE = re.compile(r"([a-z]+)([0-9]+)")
_SIGNS = {"*": " x ", "/": " / ", "+": " + ", "-": " - ", "^": "^"}


class Words:
    """Names for what one formula of a file refers to."""

    def __init__(self, case: Case, place: Place) -> None:
        self.case, self.place = case, place
        self.tab, self.block = place.tab, place.id.partition(".")[0]
        self._labels = {one.name: one.label for one in case.parts.record.constants}

    def place_at(self, node: Reference) -> Place | None:
        """The place a reference means: its first cell, or within its series."""
        tab = node.tab or self.tab
        cell = f"{column_letter(node.column)}{node.row}"
        return self.case.parts.skeleton.at.get((tab, cell)) or self._in_series(tab, node.column, node.row)

    def _in_series(self, tab: str, column: int, row: int) -> Place | None:
        for place in self.case.parts.skeleton.places.values():
            if not place.field.series or (place.tab, place.column) != (tab, column):
                continue
            if place.row <= row < place.row + self.case.parts.skeleton.shape.record_rows:
                return place
        return None

    def of(self, node: Node) -> str:
        """A part of a formula in words."""
        match node:
            case Reference():
                place = self.place_at(node)
                return self.of_place(place) if place else self.where(node)
            case Name(name):
                return called(self._labels.get(name, f"the column {name}"))
            case Area():
                return self._area(node)
            case Number(value):
                return f"{value:.12g}"
        text = self.computed(node)
        return text if text is not None else "something else"

    def of_place(self, place: Place) -> str:
        """A place's label, with its run or sample where it is another than the formula's own."""
        block = place.id.partition(".")[0]
        label = called(place.field.label)
        return label if block in (self.block, "sheet") else f"{label} of {block_name(block)}"

    def where(self, node: Reference) -> str:
        """`Results!E9`."""
        return f"{node.tab or self.tab}!{address(node.column, node.row)}"

    def _area(self, area: Area) -> str:
        first, last = address(area.left, area.top), address(area.right, area.bottom)
        place = self.place_at(Reference(area.tab, area.left, area.top))
        span = f"{first}:{last}"
        return f"{called(place.field.label)} ({span})" if place else f"{area.tab or self.tab}!{span}"

    def stored(self, node: Reference) -> tuple[str, Value, str | None]:
        """What the file holds at a reference; type `blank` where it holds nothing."""
        cells = self.case.cells.get(node.tab or self.tab, {})
        return cells.get(address(node.column, node.row), ("blank", None, None))

    def content(self, node: Reference) -> str:
        """What a reader sees at a reference that is no place of the sheet."""
        kind, value, formula = self.stored(node)
        if kind == "blank" or value in (None, ""):
            return "an empty cell" if formula is None else "a formula without a value"
        return f"the number {value:.10g}" if is_number(value) else f"the text {quoted(value)}"

    def value(self, node: Node) -> Value:
        """What a part of a formula gives in the workbook as it should be; None where it gives nothing."""
        try:
            found = self.case.right.evaluator().evaluate(f"={write(node)}", self.tab)
        except FormulaError:
            return None
        return found if isinstance(found, float | str) else None

    def resolved(self, node: Node) -> Node:
        """A name as the cells it means."""
        if isinstance(node, Name):
            where = self.case.parts.skeleton.names.get(node.name)
            return parse(where) if where else node
        return node

    def cells(self, node: Node) -> set[tuple[str, int, int]] | None:
        """(tab, column, row) of a reference, range or name; None where it is none, or too large."""
        match self.resolved(node):
            case Reference(tab, column, row):
                return {((tab or self.tab).casefold(), column, row)}
            case Area(tab, left, top, right, bottom) as area if area.size <= MOST_CELLS:
                rows, columns = range(top, bottom + 1), range(left, right + 1)
                return {((tab or self.tab).casefold(), column, row) for row in rows for column in columns}
        return None

    def computed(self, node: Node) -> str | None:
        """A formula in words; None where it would be too long or is no arithmetic."""
        text = self._spoken(node)
        return text if text is not None and len(text) <= LONGEST else None

    def _spoken(self, node: Node) -> str | None:
        match node:
            case Reference() | Name() | Area() | Number():
                return self.of(node)
            case Text(value):
                return quoted(value)
            case Negative(operand):
                return self._joined("-{}", operand)
            case Percent(operand):
                return self._joined("{} %", operand)
            case Binary(sign, left, right):
                return self._joined("{}" + _SIGNS.get(sign, f" {sign} ") + "{}", left, right)
            case Call(function, arguments):
                return self._joined(f"{function}({', '.join(['{}'] * len(arguments))})", *arguments)
        return None

    def _joined(self, pattern: str, *parts: Node) -> str | None:
        told = []
        for part in parts:
            text = self._spoken(part)
            if text is None or len(text) > LONGEST:
                return None
            told.append(f"({text})" if isinstance(part, Binary) and "(" not in pattern else text)
        return pattern.format(*told)


def block_name(block: str) -> str:
    """`run3` -> run 3."""
    match = _SCOPE.fullmatch(block)
    return f"{match[1]} {match[2]}" if match else f"the {block}"


def leaves(node: Node) -> list[Node]:
    """Everything without parts, from the left."""
    below = children(node)
    return [leaf for one in below for leaf in leaves(one)] if below else [node]
