"""What a cell can hold while formulas are evaluated, and how a spreadsheet compares and converts it.

A value is a float, a text, a truth value, an error value, None (an empty cell) or an Array. Text is never
turned into a number: whether a program does so depends on a setting of its user.
"""

import math
import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any, Union

import numpy as np
from numpy.typing import NDArray

# Numbers closer than this share of their size are equal to a spreadsheet (2^-48: about 15 digits).
CLOSE = 2.0**-48
BROAD = 2.0**-44

Numbers = NDArray[np.float64]
Data = NDArray[Any]  # float64 or bool


@dataclass(frozen=True, slots=True)
class CellError:
    """An error value; it travels through arithmetic and stops at ISNUMBER, COUNT and their like."""

    code: str

    def __str__(self) -> str:
        return self.code


DIV0 = CellError("#DIV/0!")
VALUE = CellError("#VALUE!")
REF = CellError("#REF!")
NAME = CellError("#NAME?")
NUM = CellError("#NUM!")
NA = CellError("#N/A")
CIRCLE = CellError("#CIRCLE!")  # the formula needs its own result
LIMIT = CellError("#LIMIT!")  # larger or deeper than anything a worksheet needs

Value = Union[float, str, bool, CellError, "Array", None]
Scalar = float | str | bool | CellError | None


class Fault(Exception):
    """An error value on its way out of a function."""

    def __init__(self, error: CellError) -> None:
        super().__init__(error)
        self.error = error


class Array:
    """A rectangle of values, row by row: the content of a range, or the result of array arithmetic.

    Numbers are kept as one numpy vector wherever all cells are numbers or empty; text, truth values read from
    cells, and error values force the slower list.
    """

    __slots__ = ("_floats", "_items", "_numbers", "_plain", "columns", "rows")

    def __init__(self, items: list[Any] | None, rows: int, columns: int, data: Data | None = None) -> None:
        self._items = items
        self._floats: list[float] | None = None
        self._numbers: Data | None = data
        self._plain: bool | None = None if data is None else True
        self.rows = rows
        self.columns = columns

    def __len__(self) -> int:
        return self.rows * self.columns

    @property
    def shape(self) -> tuple[int, int]:
        """(rows, columns)."""
        return self.rows, self.columns

    @property
    def items(self) -> list[Any]:
        """The values, row by row; None for an empty cell."""
        if self._items is None:
            assert self._numbers is not None  # one of the two is always there
            self._items = self._numbers.tolist()
        return self._items

    @property
    def data(self) -> Data | None:
        """The values as one vector (float64, or bool for comparisons); None where one is no number."""
        if self._plain is None:
            self._plain = all(type(one) is float or one is None for one in self.items)
            if self._plain:
                plain = [0.0 if one is None else one for one in self.items]
                self._numbers = np.array(plain, dtype=np.float64)
        return self._numbers

    @property
    def floats(self) -> list[float]:
        """The numbers alone, as COUNT and AVERAGE see them: no empty cells, text or truth values."""
        if self._floats is None:
            self._floats = [one for one in self.items if type(one) is float]
        return self._floats

    @property
    def empty(self) -> int:
        """How many cells are empty."""
        return self.items.count(None)

    @property
    def error(self) -> CellError | None:
        """The first error value; None where there is none."""
        if self._plain:
            return None
        return next((one for one in self.items if isinstance(one, CellError)), None)

    def part(self, first: tuple[int, int], last: tuple[int, int]) -> "Array":
        """The rectangle between two (row, column) positions, counted from 0, both included."""
        top, bottom = sorted((first[0], last[0]))
        left, right = sorted((first[1], last[1]))
        width = right - left + 1
        if width == self.columns:
            start, stop = top * width, (bottom + 1) * width
            part = Array(self.items[start:stop], bottom - top + 1, width)
            data = self.data  # made once for the whole range; its parts are views of it
            if data is not None:
                part._numbers, part._plain = data[start:stop], True
            return part
        rows = range(top, bottom + 1)
        items = [one for row in rows for one in self.row(row)[left : right + 1]]
        return Array(items, bottom - top + 1, width)

    def row(self, index: int) -> list[Any]:
        """The values of one row, counted from 0."""
        return self.items[index * self.columns : (index + 1) * self.columns]


def number(value: Value) -> float:
    """The value in arithmetic: an empty cell counts 0. Raises Fault for text, errors and ranges."""
    if type(value) is float:
        return value
    if value is None:
        return 0.0
    if isinstance(value, bool):
        return 1.0 if value else 0.0
    raise Fault(value if isinstance(value, CellError) else VALUE)


def truth(value: Value) -> bool:
    """The value as a condition. Raises Fault for text, errors and ranges."""
    return value if isinstance(value, bool) else number(value) != 0.0


def text(value: Value) -> str:
    """The value beside `&`. Raises Fault for errors and ranges."""
    if isinstance(value, str):
        return value
    if value is None:
        return ""
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    return shown(number(value))


def shown(value: float) -> str:
    """A number as a cell without a format shows it: 15 digits, exponents only for very large and small."""
    plain = format(value, ".15g")
    if "e" not in plain:
        return plain
    mantissa, _, power = plain.partition("e")
    exponent = int(power)
    digits = len(mantissa.lstrip("-").replace(".", ""))
    if exponent < 0 and digits - exponent <= 20:
        return format(value, f".{digits - 1 - exponent}f")
    return f"{mantissa}E{'-' if exponent < 0 else '+'}{abs(exponent):02d}"


def finite(value: float) -> float | CellError:
    """The value, or #NUM! where it is too large for a number."""
    return value if math.isfinite(value) else NUM


def equal(one: float, other: float) -> bool:
    """Equality of two numbers as spreadsheets judge it: to about 15 digits, whole numbers exactly."""
    if one == other:
        return True
    gap = abs(one - other)
    if gap > abs(one) * BROAD or gap > abs(other) * BROAD or not math.isfinite(gap):
        return False
    if one.is_integer() and other.is_integer() and abs(one) < 2.0**53:
        return False
    return gap < abs(one) * CLOSE and gap < abs(other) * CLOSE


def equal_arrays(one: Any, other: Any) -> Any:
    """`equal` for vectors; either side may be a single number."""
    size = np.abs(one)
    gap = np.abs(one - other)
    near = gap <= size * BROAD
    if not near.any():
        return near
    least = np.minimum(size, np.abs(other))
    whole = (np.floor(one) == one) & (np.floor(other) == other) & (size < 2.0**53)
    return (gap == 0.0) | ((gap < least * CLOSE) & ~whole)


def order(one: Value, other: Value) -> int:
    """-1, 0 or 1: numbers (truth values among them) before text, text without regard to case.

    An empty cell is 0 beside a number and "" beside text. Raises Fault for errors and ranges.
    """
    if isinstance(one, str) or isinstance(other, str):
        return _text_order(one, other)
    left, right = number(one), number(other)
    if equal(left, right):
        return 0
    return -1 if left < right else 1


def _text_order(one: Value, other: Value) -> int:
    """The order where at least one side is text."""
    sides = ["" if side is None else side for side in (one, other)]
    keys = [side.casefold() if isinstance(side, str) else number(side) for side in sides]
    first, second = keys
    if isinstance(first, str) and isinstance(second, str):
        return (first > second) - (first < second)
    return 1 if isinstance(first, str) else -1


def cut(value: Value) -> Scalar:
    """The single value of an Array of one; a larger one is #VALUE!, for no cell says which is meant."""
    if isinstance(value, Array):
        single: Scalar = value.items[0] if len(value) == 1 else VALUE
        return single
    return value


@lru_cache(maxsize=256)
def pattern(criterion: str) -> re.Pattern[str]:
    """A text criterion with its wildcards `*` and `?`; `~` takes the next sign literally."""
    *pieces, last = (_literal(piece) for piece in re.split(r"(?<!~)\*", criterion))
    # Each star takes the first fit and never gives it back: the search cannot run away.
    first, *middle = [*pieces, last]
    if not middle:
        return re.compile(first, _FLAGS)
    stars = "".join(f"(?>.*?{piece})" for piece in middle[:-1])
    return re.compile(f"{first}{stars}.*{last}", _FLAGS)


_FLAGS = re.IGNORECASE | re.DOTALL


def _literal(piece: str) -> str:
    """The pattern of a piece without stars: `?` is any sign, `~` takes the next literally."""
    parts = re.findall(r"~[*?~]|.", piece, re.DOTALL)
    return "".join("." if part == "?" else re.escape(part[-1]) for part in parts)


def same(sought: Value, found: Value) -> bool:
    """Whether a look-up for `sought` stops at `found`: kinds must agree, text may hold wildcards."""
    if isinstance(sought, str):
        return isinstance(found, str) and matches(sought, found)
    if isinstance(found, float | bool):
        return equal(number(sought), number(found))
    return False


def matches(criterion: str, found: str) -> bool:
    """Whether the whole of a text fits the criterion, without regard to case."""
    if not any(sign in criterion for sign in "*?~"):
        return criterion.casefold() == found.casefold()
    return pattern(criterion).fullmatch(found) is not None


def values(arguments: list[Value]) -> Iterator[Scalar]:
    """All values of arguments, ranges unrolled."""
    for argument in arguments:
        if isinstance(argument, Array):
            yield from argument.items
        else:
            yield argument


@dataclass(frozen=True, slots=True)
class Argument:
    """What a whole function gets: a value, and whether it came from cells.

    In cells, text and truth values are passed over by SUM and its like; written into the formula they count.
    """

    value: Value
    cells: bool


Arguments = Sequence[Argument]


def rectangle(argument: Argument) -> Array:
    """The argument as a rectangle. Raises Fault for an error value."""
    value = argument.value
    if isinstance(value, Array):
        return value
    if isinstance(value, CellError):
        raise Fault(value)
    return Array([value], 1, 1)


def numbers(arguments: Arguments) -> list[float]:
    """The numbers of all arguments, in order. Raises Fault for error values and for text in the formula."""
    found: list[float] = []
    for argument in arguments:
        value = argument.value
        if isinstance(value, Array):
            if value.error is not None:
                raise Fault(value.error)
            found += value.floats
        elif type(value) is float:
            found.append(value)
        elif isinstance(value, CellError) or not argument.cells:
            found.append(number(value))
    return found
