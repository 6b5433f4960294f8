"""Closures: the small functions a compiled formula is made of.

Each takes the list of the slots' values and returns a value; error values are values and travel. `lifted...`
ones work cell by cell over ranges, as inside SUMPRODUCT; the others answer #VALUE! to a range.
"""

import math
import operator
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from sheetcal.check import functions, lookup
from sheetcal.check.formula import COMPARISONS
from sheetcal.check.functions import Single, Whole
from sheetcal.check.values import (
    BROAD,
    DIV0,
    LIMIT,
    NUM,
    REF,
    VALUE,
    Argument,
    Array,
    CellError,
    Fault,
    Scalar,
    Value,
    cut,
    equal_arrays,
    finite,
    number,
    order,
    text,
    truth,
)

Closure = Callable[[Sequence[Value]], Value]
LARGEST = 1.7976931348623157e308
LONGEST_TEXT = 32767


@dataclass
class Meter:
    """What may still be computed cell by cell, and joined there as text; a file's evaluator sets it for each run."""

    cells: int = 3_000_000
    letters: int = 20_000_000


METER = Meter()

_ARITHMETIC: dict[str, Callable[[float, float], float]] = {
    "+": operator.add,
    "-": operator.sub,
    "*": operator.mul,
    "/": operator.truediv,
    "^": functions.power,
}
_ORDERS: dict[str, Callable[[Any, Any], Any]] = {
    "=": operator.eq,
    "<>": operator.ne,
    "<": operator.lt,
    "<=": operator.le,
    ">": operator.gt,
    ">=": operator.ge,
}
_VECTORS: dict[str, Callable[[Any, Any], Any]] = {
    "+": np.add,
    "-": np.subtract,
    "*": np.multiply,
    "/": np.divide,
    "^": np.power,
    "=": equal_arrays,
    "<>": lambda a, b: ~equal_arrays(a, b),
    "<": lambda a, b: (a < b) & ~equal_arrays(a, b),
    ">": lambda a, b: (a > b) & ~equal_arrays(a, b),
    "<=": lambda a, b: (a < b) | equal_arrays(a, b),
    ">=": lambda a, b: (a > b) | equal_arrays(a, b),
}


def constant(value: Scalar) -> Closure:
    return lambda cells: value


def _guarded(run: Callable[[], Value]) -> Value:
    """The result, or the error value that stands for what went wrong."""
    try:
        result = run()
        return finite(result) if type(result) is float else result
    except Fault as fault:
        return fault.error
    except ZeroDivisionError:
        return DIV0
    except (OverflowError, ValueError):
        return NUM


def _arithmetic(sign: str, one: Value, other: Value) -> Value:
    """One operation on any two values; ranges are #VALUE!."""
    return _guarded(lambda: _ARITHMETIC[sign](number(one), number(other)))


def reckoned(sign: str, left: Closure, right: Closure) -> Closure:
    apply = _ARITHMETIC[sign]

    def run(cells: Sequence[Value]) -> Value:
        one, other = left(cells), right(cells)
        if type(one) is float and type(other) is float:
            try:
                result = apply(one, other)
            except (ArithmeticError, Fault):
                return _arithmetic(sign, one, other)
            return result if -LARGEST <= result <= LARGEST else NUM
        return _arithmetic(sign, cut(one), cut(other))

    return run


def negated(inner: Closure) -> Closure:
    def run(cells: Sequence[Value]) -> Value:
        value = inner(cells)
        return -value if type(value) is float else _guarded(lambda: -number(cut(value)))

    return run


def joined(left: Closure, right: Closure) -> Closure:
    def run(cells: Sequence[Value]) -> Value:
        one, other = cut(left(cells)), cut(right(cells))
        result = _guarded(lambda: text(one) + text(other))
        return VALUE if isinstance(result, str) and len(result) > LONGEST_TEXT else result

    return run


def _comparison(sign: str, one: Value, other: Value) -> Value:
    """One comparison of any two values; ranges are #VALUE!."""
    result: Value = _guarded(lambda: _ORDERS[sign](order(one, other), 0))
    return result


def compared(sign: str, left: Closure, right: Closure) -> Closure:
    holds = _ORDERS[sign]
    when_equal: bool = holds(0, 0)

    def run(cells: Sequence[Value]) -> Value:
        one, other = left(cells), right(cells)
        if type(one) is float and type(other) is float:
            if one == other:
                return when_equal
            if abs(one - other) > abs(one) * BROAD:
                result: bool = holds(one, other)
                return result
        elif type(one) is str and type(other) is str:
            folded: bool = holds(one.casefold(), other.casefold())
            return folded
        return _comparison(sign, cut(one), cut(other))

    return run


def compared_with_number(sign: str, left: Closure, bound: float) -> Closure:
    """A comparison with a literal number, what every range test is: three outcomes known beforehand."""
    holds = _ORDERS[sign]
    below: bool = holds(-1, 0)
    level: bool = holds(0, 0)
    above: bool = holds(1, 0)
    margin = abs(bound) * BROAD * 2.0
    low, high = bound - margin, bound + margin

    def run(cells: Sequence[Value]) -> Value:
        value = left(cells)
        if type(value) is float:
            if value == bound:
                return level
            if value > high:
                return above
            if value < low:
                return below
        return _comparison(sign, cut(value), bound)

    return run


def compared_with_text(sign: str, left: Closure, literal: str) -> Closure:
    """A comparison with a literal text: states, routes, and the empty text."""
    holds = _ORDERS[sign]
    folded = literal.casefold()

    def run(cells: Sequence[Value]) -> Value:
        value = left(cells)
        if type(value) is str:
            result: bool = holds(value.casefold(), folded)
            return result
        return _comparison(sign, cut(value), literal)

    return run


def if_else(condition: Closure, then: Closure, otherwise: Closure) -> Closure:
    def run(cells: Sequence[Value]) -> Value:
        held = condition(cells)
        if held is not True and held is not False:
            held = _guarded(lambda: truth(cut(held)))
            if isinstance(held, CellError):
                return held
        return then(cells) if held else otherwise(cells)

    return run


def if_error_else(tried: Closure, instead: Closure) -> Closure:
    def run(cells: Sequence[Value]) -> Value:
        value = cut(tried(cells))
        return instead(cells) if isinstance(value, CellError) else value

    return run


def chosen(index: Closure, options: list[Closure]) -> Closure:
    def run(cells: Sequence[Value]) -> Value:
        place = _guarded(lambda: number(cut(index(cells))))
        if not isinstance(place, float):
            return place
        return options[int(place) - 1](cells) if 1.0 <= place < len(options) + 1 else VALUE

    return run


def all_or_any(parts: list[tuple[Closure, bool]], all_of: bool) -> Closure:
    """AND and OR: every argument is looked at, so an error in any of them is the result."""

    closures = [part for part, _ in parts]

    def run(cells: Sequence[Value]) -> Value:
        result = all_of
        for part in closures:
            value = part(cells)
            if value is not all_of:
                result = not all_of
                if value is not True and value is not False:
                    return mixed(cells)
        return result

    def mixed(cells: Sequence[Value]) -> Value:
        found = [part(cells) for part in closures]
        named = [Argument(value, kind) for value, (_, kind) in zip(found, parts, strict=True)]
        held = _guarded(lambda: [*functions.logical(named)])  # type: ignore[arg-type,return-value]
        if not isinstance(held, list):
            return held
        return all(held) if all_of else any(held)

    return run


def indexed(source: Closure, row: Closure, column: Closure | None) -> Closure:
    def run(cells: Sequence[Value]) -> Value:
        array, down = source(cells), row(cells)
        plain = type(down) is float and isinstance(array, Array) and column is None and array.columns == 1
        if plain and 1.0 <= down < array.rows + 1.0:  # type: ignore[operator,union-attr]  # both are in `plain`
            return array.items[int(down) - 1]  # type: ignore[arg-type,union-attr,no-any-return]
        across = None if column is None else cut(column(cells))
        found = _guarded(lambda: lookup.cells_of(array, cut(down), across))
        return found.items[0] if isinstance(found, Array) and len(found) == 1 else found

    return run


def between(source: Closure, first: list[Closure], last: list[Closure]) -> Closure:
    """The cells from one position of a range to another."""
    plain = len(first) == len(last) == 1

    def run(cells: Sequence[Value]) -> Value:
        array = source(cells)
        if not isinstance(array, Array):
            return array if isinstance(array, CellError) else REF
        if array.columns == 1 and plain:
            top, bottom = first[0](cells), last[0](cells)
            size = array.rows + 1.0
            if type(top) is float and type(bottom) is float and 1.0 <= top < size and 1.0 <= bottom < size:
                return array.part((int(top) - 1, 0), (int(bottom) - 1, 0))
        held: Array = array
        return _guarded(lambda: held.part(_corner(held, first, cells), _corner(held, last, cells)))

    return run


def _corner(array: Array, place: list[Closure], cells: Sequence[Value]) -> tuple[int, int]:
    """(row, column) from 0 that INDEX's numbers point at. Raises Fault outside the range."""
    down, *across = (int(number(cut(one(cells)))) for one in place)
    row, column = (down, *across) if across else ((down, 1) if array.rows > 1 else (1, down))
    if not (1 <= row <= array.rows and 1 <= column <= array.columns):
        raise Fault(REF)
    return row - 1, column - 1


def counted(places: list[int]) -> Closure:
    """COUNT over slots, the test that opens almost every formula of a worksheet."""

    def run(cells: Sequence[Value]) -> Value:
        count = 0
        for place in places:
            value = cells[place]
            if type(value) is float:
                count += 1
            elif isinstance(value, Array):
                count += len(value.floats)
        return float(count)

    return run


def blank(place: int) -> Closure:
    """COUNTBLANK of one slot: whether an optional reading is absent."""

    def run(cells: Sequence[Value]) -> Value:
        value = cells[place]
        if isinstance(value, Array):
            return float(sum(one is None or one == "" for one in value.items))
        return 1.0 if value is None or value == "" else 0.0

    return run


def gathered(whole: Whole, parts: list[tuple[Closure, bool]]) -> Closure:
    apply = whole.run

    def run(cells: Sequence[Value]) -> Value:
        arguments = [Argument(part(cells), kind) for part, kind in parts]
        return _guarded(lambda: apply(arguments))

    return run


def _apply(single: Single, values: Sequence[Value]) -> Scalar:
    """A function of single values; error values pass through it unless it asks for them."""
    plain = [cut(value) for value in values]
    if not single.open:
        error = next((one for one in plain if isinstance(one, CellError)), None)
        if error is not None:
            return error
    return cut(_guarded(lambda: single.run(*plain)))


def applied(single: Single, parts: list[Closure]) -> Closure:
    if single.open and len(parts) == 1:
        return _asked(single.run, parts[0])

    def run(cells: Sequence[Value]) -> Value:
        return _apply(single, [part(cells) for part in parts])

    return run


def holds_kind(place: int, kind: type) -> Closure:
    """ISNUMBER and ISTEXT of a slot."""

    def run(cells: Sequence[Value]) -> Value:
        value = cells[place]
        return type(cut(value) if isinstance(value, Array) else value) is kind

    return run


def _asked(test: Callable[[Scalar], Scalar], part: Closure) -> Closure:
    """ISNUMBER and its like: they take every value and never fail."""

    def run(cells: Sequence[Value]) -> Value:
        return test(cut(part(cells)))

    return run


def collected(items: list[Any], rows: int, columns: int) -> Array:
    """An Array of computed values; truth values alone become one vector."""
    if items and all(isinstance(one, bool) for one in items):
        return Array(None, rows, columns, np.array(items, dtype=np.bool_))
    return Array(items, rows, columns)


def lifted(single: Single, parts: list[Closure]) -> Closure:
    """A function of single values, cell by cell."""

    vector = single.vector

    def run(cells: Sequence[Value]) -> Value:
        operands = [part(cells) for part in parts]
        if vector is not None and isinstance(operands[0], Array):
            found = _computed(operands[0], lambda: vector(_vector(operands[0])))
            if found is not None:
                return found
        return cell_by_cell(lambda *row: _apply(single, row), operands)

    return run


def cell_by_cell(apply: Callable[..., Scalar], operands: list[Value]) -> Value:
    """`apply` over ranges of one shape, single values repeated; other shapes are #VALUE!."""
    arrays = [one for one in operands if isinstance(one, Array)]
    if not arrays:
        return apply(*operands)
    rows, columns = arrays[0].shape
    if any(one.shape != (rows, columns) for one in arrays):
        return VALUE
    size = rows * columns
    METER.cells -= size
    if METER.cells < 0:
        return LIMIT
    lists = [one.items if isinstance(one, Array) else [one] * size for one in operands]
    return collected([apply(*row) for row in zip(*lists, strict=True)], rows, columns)


def lifted_binary(sign: str, left: Closure, right: Closure) -> Closure:
    """An operator cell by cell: on vectors where both sides are numbers, else value by value."""
    if sign == "&":
        return lifted(Single(2, 2, _joined_cells), [left, right])
    vector = _VECTORS[sign]
    scalar = _comparison if sign in COMPARISONS else _arithmetic

    def run(cells: Sequence[Value]) -> Value:
        one, other = left(cells), right(cells)
        if not (isinstance(one, Array) or isinstance(other, Array)):
            return scalar(sign, one, other)
        found = _vector_result(vector, one, other)
        return found or cell_by_cell(lambda a, b: cut(scalar(sign, a, b)), [one, other])

    return run


def _joined_cells(one: Scalar, other: Scalar) -> Scalar:
    """`&` on two cells of ranges."""
    result = text(one) + text(other)
    METER.letters -= len(result)
    if METER.letters < 0:
        return LIMIT
    return result if len(result) <= LONGEST_TEXT else VALUE


def _vector_result(vector: Callable[[Any, Any], Any], one: Value, other: Value) -> Array | None:
    """The operator on vectors; None where a side is no plain number, or a result is none."""
    shape = one if isinstance(one, Array) else other
    assert isinstance(shape, Array)
    if isinstance(one, Array) and isinstance(other, Array) and one.shape != other.shape:
        return None
    first, second = _vector(one), _vector(other)
    if first is None or second is None:
        return None
    return _computed(shape, lambda: vector(first, second))


def _computed(shape: Array, compute: Callable[[], Any]) -> Array | None:
    """A vector result in the shape of an operand; None where any of it is no number."""
    if shape.data is None:
        return None
    with np.errstate(all="ignore"):
        data = compute()
        if data.dtype != np.bool_ and not math.isfinite(float(np.add.reduce(data))):
            return None
    return Array(None, shape.rows, shape.columns, data)


def _vector(value: Value) -> Any:
    """The value as a vector of numbers, or one number; None where it is neither."""
    if isinstance(value, Array):
        data = value.data
        return data.astype(np.float64) if data is not None and data.dtype == np.bool_ else data
    if isinstance(value, bool):
        return float(value)
    return value if type(value) is float else None


def lifted_if_else(condition: Closure, then: Closure, otherwise: Closure) -> Closure:
    """IF cell by cell; with a single condition only its branch is evaluated."""
    single = if_else(condition, then, otherwise)

    def choose(held: Value, first: Value, second: Value) -> Scalar:
        known = _guarded(lambda: truth(held))
        return cut(known if isinstance(known, CellError) else first if known else second)

    def run(cells: Sequence[Value]) -> Value:
        held = condition(cells)
        if isinstance(held, Array):
            return cell_by_cell(choose, [held, then(cells), otherwise(cells)])
        return single(cells)

    return run
