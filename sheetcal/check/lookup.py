"""Functions that look something up: MATCH, INDEX, COUNTIF, SUMIF."""

import re
from collections.abc import Callable

from sheetcal.check.values import (
    NA,
    REF,
    VALUE,
    Argument,
    Arguments,
    Array,
    CellError,
    Fault,
    Scalar,
    Value,
    cut,
    equal,
    number,
    numbers,
    order,
    rectangle,
    same,
)


def match(arguments: Arguments) -> float:
    """MATCH: position of the last value not above (1), of the equal one (0), of the last not below (-1)."""
    sought, array = cut(arguments[0].value), rectangle(arguments[1])
    kind = number(arguments[2].value) if len(arguments) > 2 else 1.0
    if isinstance(sought, CellError):
        raise Fault(sought)
    if min(array.rows, array.columns) > 1:
        raise Fault(NA)
    found = _equal_position(sought, array) if kind == 0.0 else _sorted_position(sought, array, kind > 0.0)
    if not found:
        raise Fault(NA)
    return float(found)


def _equal_position(sought: Scalar, array: Array) -> int:
    """Position, from 1, of the first equal value; 0 without one."""
    wanted = 0.0 if sought is None else sought
    return next((at for at, one in enumerate(array.items, 1) if same(wanted, one)), 0)


def _sorted_position(sought: Scalar, array: Array, rising: bool) -> int:
    """Position, from 1, of the last value of the same kind not past the sought one; 0 without one."""
    wanted = 0.0 if sought is None else sought
    last = 0
    for at, one in enumerate(array.items, 1):
        if one is None or isinstance(one, CellError) or isinstance(one, str) != isinstance(wanted, str):
            continue
        beyond = order(one, wanted)
        if beyond > 0 if rising else beyond < 0:
            break
        last = at
    return last


_CRITERION = re.compile(r"(<=|>=|<>|<|>|=)?(.*)", re.DOTALL)
_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?")
_FITS: dict[str, Callable[[int], bool]] = {
    "<": lambda o: o < 0,
    ">": lambda o: o > 0,
    "<=": lambda o: o <= 0,
    ">=": lambda o: o >= 0,
}


def criterion(wanted: Scalar) -> Callable[[Scalar], bool]:
    """The test that COUNTIF's second argument names: a value, or text such as ">0". Raises Fault."""
    if isinstance(wanted, CellError):
        return lambda one: one == wanted
    if not isinstance(wanted, str):
        sought = number(wanted)
        return lambda one: isinstance(one, float | bool) and equal(number(one), sought)
    match = _CRITERION.fullmatch(wanted)
    assert match is not None  # the pattern takes any text
    operator, operand = match.group(1) or "=", match.group(2)
    value: float | str = float(operand) if _NUMBER.fullmatch(operand) else operand
    if isinstance(value, float) and operator in ("=", "<>"):
        return lambda one: (same(value, one) or one == operand) == (operator == "=")
    if operator in _FITS:
        fits = _FITS[operator]
        return lambda one: _comparable(value, one) and fits(order(one, value))
    if operand == "":
        return lambda one: (one is None or (one == "" and not match.group(1))) == (operator == "=")
    return lambda one: same(value, one) == (operator == "=")


def _comparable(value: float | str, one: Scalar) -> bool:
    """Whether both are numbers or both are text."""
    return isinstance(one, str) if isinstance(value, str) else isinstance(one, float | bool)


def count_if(arguments: Arguments) -> float:
    fits = criterion(cut(arguments[1].value))
    return float(sum(map(fits, rectangle(arguments[0]).items)))


def chosen(arguments: Arguments) -> list[float]:
    """SUMIF's and AVERAGEIF's numbers: those of the third range (or the first) beside a fitting value."""
    tested = rectangle(arguments[0])
    taken = rectangle(arguments[2]) if len(arguments) > 2 else tested
    if len(tested) != len(taken):
        raise Fault(VALUE)
    fits = criterion(cut(arguments[1].value))
    beside = [one for one, key in zip(taken.items, tested.items, strict=True) if fits(key)]
    return numbers([Argument(Array(beside, len(beside), 1), True)])


def cells_of(source: Value, row: Value, column: Value = None) -> Array:
    """INDEX: a cell, or a whole row or column where the number is 0 or left out. Raises Fault."""
    array = rectangle(Argument(source, True))
    down, across = int(number(row)), int(number(column))
    if column is None and array.rows == 1:  # one number along a single row counts columns
        down, across = 1, down
    if not (0 <= down <= array.rows and 0 <= across <= array.columns):
        raise Fault(REF)
    top, bottom = (down - 1, down - 1) if down else (0, array.rows - 1)
    left, right = (across - 1, across - 1) if across else (0, array.columns - 1)
    return array.part((top, left), (bottom, right))
