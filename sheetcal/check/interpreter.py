"""The formula witness: evaluates the formulas found in a file from the readings found in it.

Stored values of formula cells are never read. Cells are settled by an explicit stack, so neither long chains
nor circles can exhaust Python's own; ranges, work and text are limited, so no file can hold the checker up.
"""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any, Final

from sheetcal.check.closures import METER, Meter
from sheetcal.check.formula import abstract, address, reference
from sheetcal.check.program import Program, compile_template
from sheetcal.check.tree import Area, FormulaError, TooComplex
from sheetcal.check.values import CIRCLE, LIMIT, NAME, REF, Array, CellError, Scalar, Value, cut

__all__ = [
    "Array",
    "CellError",
    "Evaluator",
    "Prepared",
    "Program",
    "compile_template",
    "prepare",
    "prepare_template",
]

Stored = tuple[str, float | str | bool | None, str | None]  # (type, value, formula) of one cell
Box = tuple[int, int, int, int]  # left, top, right, bottom
Key = str | Box
Place = tuple[str, Key]

LARGEST_AREA = 20_000  # cells of one range; a record has a few hundred
ALL_AREAS = 2_000_000  # cells of all ranges of a file together
ALL_WORK = 20_000_000  # operations on range cells; a fuel workbook of 20 runs needs about two million
PER_PLACE = 2_500  # the same for each place of a workbook; 148 runs with long records need 1 600
ALL_FORMULAS = 6_000_000  # letters of formulas that are not the kind's own
ALL_TEXT = 20_000_000  # letters of texts that formulas give

_NAMES: Final = "\0names"  # the pseudo-tab of defined names; no tab can be called so
_UNSET: Final[Any] = object()  # compares by identity, so that `in` stays fast


@dataclass(frozen=True, slots=True)
class Prepared:
    """A formula ready to run: its text, its program, and the place of each slot (tab None = its own)."""

    text: str
    program: Program
    inputs: tuple[tuple[str | None, Key], ...]
    ranges: bool


@lru_cache(maxsize=16384)
def _place(text: str) -> tuple[str | None, Key]:
    found = reference(text)
    if isinstance(found, Area):
        return found.tab, (found.left, found.top, found.right, found.bottom)
    return found.tab, address(found.column, found.row)


def _prepared(text: str, program: Program, references: Mapping[str, str]) -> Prepared:
    """Slots tied to places. Raises KeyError for a token without a reference, FormulaError."""
    inputs = tuple((_NAMES, slot[1:]) if slot.startswith("=") else _place(references[slot]) for slot in program.slots)
    return Prepared(text, program, inputs, any(not isinstance(key, str) or tab == _NAMES for tab, key in inputs))


@lru_cache(maxsize=8192)
def prepare(text: str) -> Prepared:
    """A formula of a file, made ready once for all files that hold the same text. Raises FormulaError."""
    template, references = abstract(text)
    named = {str(index): one for index, one in enumerate(references)}
    return _prepared(text, compile_template(template), named)


def prepare_template(template: str, references: Mapping[str, str]) -> Prepared:
    """A template whose tokens stand for `references` ("Tab!D9", "E9:E68"); the text is the filled template.

    Raises KeyError for a token that is not among the references, FormulaError for text that is no formula.
    """
    text = template
    for token, one in references.items():
        text = text.replace(f"{{{token}}}", one)
    return _prepared(f"={text.removeprefix('=')}", compile_template(template), references)


def _size(box: Box) -> int:
    return (box[2] - box[0] + 1) * (box[3] - box[1] + 1)


def _every_address(box: Box) -> tuple[str, ...]:
    """The cells of a rectangle, row by row."""
    left, top, right, bottom = box
    return tuple(address(column, row) for row in range(top, bottom + 1) for column in range(left, right + 1))


_usual_addresses = lru_cache(maxsize=1024)(_every_address)


def _addresses(box: Box) -> tuple[str, ...]:
    """The cells of a rectangle; kept for areas of usual size, so that a hostile file cannot fill memory."""
    return _usual_addresses(box) if _size(box) <= 512 else _every_address(box)


def _stored(cell: Stored) -> Scalar:
    """The value of a cell without formula; numbers and dates as float, error texts as error values."""
    kind, value, _ = cell
    if kind == "e":
        return CellError(str(value))
    if value is None or isinstance(value, bool | str):
        return value
    return float(value)


class Evaluator:
    """The values of one file's cells, each computed once, from readings and formulas alone.

    cells: tab -> address -> (type, value, formula). names: defined name -> "Constants!$E$5" or other
    formula text. prepared: (tab, address) -> a formula the kind expects there, used where the file's text
    is the same.
    work: operations on range cells that may be needed, where that is more than usual.
    booleans_are_numbers: count truth values in cells as LibreOffice does; other programs pass them over.
    """

    def __init__(
        self,
        cells: Mapping[str, Mapping[str, Stored]],
        names: Mapping[str, str] | None = None,
        *,
        prepared: Mapping[tuple[str, str], Prepared] | None = None,
        booleans_are_numbers: bool = False,
        work: int = 0,
    ) -> None:
        self._cells = cells
        self._names = {name.casefold(): text for name, text in (names or {}).items()}
        self._expected = prepared or {}
        self._booleans = booleans_are_numbers
        # Typed numbers are most of a file: taken over at once, everything else when it is needed.
        self._values: dict[str, dict[Key, Value]] = {
            tab: {key: one[1] for key, one in table.items() if one[2] is None and type(one[1]) is float}
            for tab, table in cells.items()
        }
        self._values[_NAMES] = {}
        self._tabs = {tab.casefold(): tab for tab in cells}
        self._left = ALL_AREAS
        self._work = max(ALL_WORK, work)
        self._letters = ALL_TEXT
        self._unread = max(ALL_FORMULAS, work // 5)
        self._meter = Meter()

    def value(self, tab: str, cell: str) -> Scalar:
        """The value of a cell: computed where it holds a formula, stored where it does not. None if empty.

        A tab that the file does not have is #REF!; a formula that cannot be read is #NAME?.
        """
        return cut(self._settled((tab, cell)))

    def values(self, places: Iterable[tuple[str, str]]) -> list[Scalar]:
        """The values of several cells, in order."""
        return [self.value(tab, cell) for tab, cell in places]

    def array(self, tab: str, area: str) -> Array | CellError:
        """The values of a range such as "E9:E68"; one too large is an error value. Raises FormulaError."""
        where, key = _place(area)
        found = self._settled((where or tab, key))
        return found if isinstance(found, Array | CellError) else Array([found], 1, 1)

    def evaluate(self, text: str, tab: str) -> Scalar:
        """What a formula would show if it stood on a tab of this file. Raises FormulaError."""
        ready = prepare(text)
        values = [self._settled((where or tab, key)) for where, key in ready.inputs]
        return cut(self._run(ready, values))

    def run(self, program: Program, places: Sequence[tuple[str, str]]) -> Scalar:
        """A program over cells and ranges of this file, (tab, address) per slot. Raises FormulaError."""
        found = [self._settled((tab, _place(text)[1])) for tab, text in places]
        return cut(program.run(found))

    def _settled(self, place: Place) -> Value:
        """The value of a cell, range or name, with everything it needs settled before it."""
        tab, key = self._real_tab(place[0]), place[1]
        table = self._values.get(tab)
        if table is None:
            return REF
        found = table.get(key, _UNSET)
        if found is _UNSET:
            self._settle((tab, key))
            found = table[key]
        settled: Value = found
        return settled

    def _settle(self, place: Place) -> None:
        stack = [place]
        opened: set[Place] = set()
        while stack:
            top = stack[-1]
            table = self._values[top[0]]
            if top[1] in table:
                stack.pop()
                opened.discard(top)
                continue
            needed = self._step(top, table)
            if not needed:
                continue
            opened.add(top)
            closing = [one for one in needed if one in opened]
            if closing:
                self._close(stack, opened, closing)
            else:
                stack.extend(needed)

    def _close(self, stack: list[Place], opened: set[Place], closing: list[Place]) -> None:
        """Mark every cell and name of a circle; ranges on the way are built with the marks in them."""
        start = min(stack.index(one) for one in closing)
        for tab, key in stack[start:]:
            if (tab, key) in opened and isinstance(key, str):
                self._values[tab][key] = CIRCLE

    def _step(self, place: Place, table: dict[Key, Value]) -> list[Place]:
        """Settle a place whose needs are settled; otherwise what is missing."""
        tab, key = place
        if not isinstance(key, str):
            return self._area(tab, key, table)
        if tab == _NAMES:
            return self._name(key, table)
        cell = self._cells[tab].get(key)
        if cell is None:
            table[key] = None
            return []
        if cell[2] is None:
            table[key] = self._seen(_stored(cell))
            return []
        return self._formula(tab, key, cell[2], table)

    def _seen(self, value: Value) -> Value:
        """The value as other cells see it."""
        return float(value) if self._booleans and isinstance(value, bool) else value

    def _formula(self, tab: str, key: str, text: str, table: dict[Key, Value]) -> list[Place]:
        expected = self._expected.get((tab, key)) if self._expected else None
        try:
            ready = expected if expected is not None and expected.text == text else self._prepared(text)
        except FormulaError as fault:
            table[key] = LIMIT if isinstance(fault, TooComplex) else NAME
            return []
        values, needed = self._inputs(tab, ready)
        if not needed:
            result = cut(self._run(ready, values))
            if type(result) is str:
                self._letters -= len(result)
                result = result if self._letters >= 0 else LIMIT
            table[key] = 0.0 if result is None else self._seen(result)
        return needed

    def _prepared(self, text: str) -> Prepared:
        """A formula of the file. Raises FormulaError, also where all of them are too long together."""
        self._unread -= len(text)
        if self._unread < 0:
            raise TooComplex("formula", "is one of too many", "a worksheet")
        return prepare(text)

    def _name(self, key: str, table: dict[Key, Value]) -> list[Place]:
        """A defined name: a range stays one, a cell's emptiness stays visible."""
        text = self._names.get(key)
        if text is None:
            table[key] = NAME
            return []
        try:
            ready = prepare(text)
        except FormulaError:
            table[key] = NAME
            return []
        if any(tab is None for tab, _ in ready.inputs):  # without a tab it would move with the asking cell
            table[key] = REF
            return []
        values, needed = self._inputs("", ready)
        if not needed:
            table[key] = self._run(ready, values)
        return needed

    def _inputs(self, own: str, ready: Prepared) -> tuple[list[Value], list[Place]]:
        """The values of the slots, and the places still to be settled."""
        tables = self._values
        try:
            values = [tables[own if tab is None else tab].get(key, _UNSET) for tab, key in ready.inputs]
        except KeyError:
            values = [self._looked_up(own if tab is None else tab, key) for tab, key in ready.inputs]
        if _UNSET not in values:
            return values, []
        needed = []
        for index, (tab, key) in enumerate(ready.inputs):
            if values[index] is _UNSET:
                place = (self._real_tab(own if tab is None else tab), key)
                if self._waits(place):
                    needed.append(place)
                else:
                    values[index] = tables[place[0]][key]
        return values, needed

    def _real_tab(self, tab: str) -> str:
        """The tab as the file spells it."""
        return tab if tab in self._values else self._tabs.get(tab.casefold(), tab)

    def _looked_up(self, tab: str, key: Key) -> Value:
        table = self._values.get(self._real_tab(tab))
        return REF if table is None else table.get(key, _UNSET)

    def _waits(self, place: Place) -> bool:
        """Whether a place needs a step of its own; a plain cell is settled here."""
        tab, key = place
        if tab == _NAMES or not isinstance(key, str):
            return True
        return self._is_formula(tab, key, self._values[tab])

    def _run(self, ready: Prepared, values: Sequence[Value]) -> Value:
        """The program's result, as long as the work on ranges stays within the limit."""
        if ready.ranges:
            self._work -= ready.program.weight * sum(len(one) for one in values if isinstance(one, Array))
            if self._work < 0:
                return LIMIT
            METER.cells, METER.letters = self._meter.cells, self._meter.letters
            result = ready.program.run(values)
            self._meter = Meter(METER.cells, METER.letters)
            return result
        return ready.program.run(values)

    def _area(self, tab: str, box: Box, table: dict[Key, Value]) -> list[Place]:
        """Build a range once all its cells are settled; cells without formula are settled on the way."""
        size = _size(box)
        if size > LARGEST_AREA or size > self._left:
            table[box] = LIMIT
            return []
        addresses = _addresses(box)
        unset = [one for one in addresses if one not in table]
        needed: list[Place] = [(tab, one) for one in unset if self._is_formula(tab, one, table)]
        if not needed:
            self._left -= size
            rows = box[3] - box[1] + 1
            table[box] = Array([table[one] for one in addresses], rows, size // rows)
        return needed

    def _is_formula(self, tab: str, key: str, table: dict[Key, Value]) -> bool:
        """Whether the cell holds a formula; any other is settled here."""
        cell = self._cells[tab].get(key)
        if cell is not None and cell[2] is not None:
            return True
        table[key] = None if cell is None else self._seen(_stored(cell))
        return False
