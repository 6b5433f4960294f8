"""The spreadsheet functions a worksheet may use, each as plain Python over values.

Two families: `SINGLE` functions take single values (over ranges they work cell by cell inside SUMPRODUCT),
and `WHOLE` functions take ranges whole. What is not listed is #NAME? to the evaluator. IF, IFERROR, CHOOSE,
INDEX, AND and OR are written in program.py, because they choose what to evaluate or return references.
"""

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import reduce
from typing import Any

import numpy as np

from sheetcal.check import lookup
from sheetcal.check.values import (
    DIV0,
    NA,
    NUM,
    VALUE,
    Arguments,
    Array,
    CellError,
    Fault,
    Scalar,
    number,
    numbers,
    rectangle,
    text,
    truth,
    values,
)


@dataclass(frozen=True, slots=True)
class Single:
    """A function of single values; `open` ones see error values instead of passing them on.

    `vector` is the same on a vector of numbers; a result that is no number falls back to `run`.
    """

    least: int
    most: int
    run: Callable[..., Scalar]
    open: bool = False
    vector: Callable[[Any], Any] | None = None


@dataclass(frozen=True, slots=True)
class Whole:
    """A function of ranges and values, read whole."""

    least: int
    most: int
    run: Callable[[Arguments], Scalar]


def approximate(value: float) -> float:
    """The value at 15 digits: what a spreadsheet means before it rounds down."""
    return float(format(value, ".15g"))


def whole_below(value: float) -> float:
    """Largest whole number not above the value; 2.9999999999999996 is 3 to a spreadsheet."""
    return float(math.floor(approximate(value)))


def round_half_away(value: float, places: float = 0.0) -> float:
    """ROUND: half away from zero, judged on the decimal digits a spreadsheet shows."""
    digits = int(places)
    if value == 0.0 or not -300 < digits < 300:
        return value if digits > 0 else 0.0
    size = abs(value)
    if digits >= 0 and (size >= 2.0**52 or size.is_integer()):
        return value
    if digits == 0:
        return math.copysign(math.floor(size) + (size - math.floor(size) >= 0.5), value)
    return math.copysign(_scaled(size, min(digits, 53 - math.frexp(size)[1])), value)


def _scaled(size: float, digits: int) -> float:
    """A positive number rounded to `digits` places, by way of a whole number."""
    if digits <= 0:
        unit = 10.0**-digits
        return whole_below(size / unit + 0.5) * unit
    unit = 10.0**digits
    return whole_below(size * unit + 0.5) / unit


def _remainder(value: float, divisor: float) -> float:
    """MOD, with the sign of the divisor."""
    if divisor == 0.0:
        raise Fault(DIV0)
    rest = value - divisor * whole_below(value / divisor)
    return rest if rest * divisor > 0.0 else 0.0  # below 0 only by the last digit


def _positive(value: float) -> float:
    """The value, where a logarithm exists. Raises Fault."""
    if value <= 0.0:
        raise Fault(NUM)
    return value


def _numeric(least: int, most: int, run: Callable[..., float], vector: Callable[[Any], Any] | None = None) -> Single:
    """A single function of numbers only."""

    def converted(*arguments: Scalar) -> Scalar:
        return run(*map(number, arguments))

    return Single(least, most, converted, vector=vector)


def _kind(test: Callable[[Scalar], bool]) -> Single:
    """A question about a value's kind."""
    return Single(1, 1, test, open=True)


def is_number(value: Scalar) -> bool:
    """ISNUMBER; a truth value is none, as in COUNT."""
    return type(value) is float


def _log(value: float, base: float = 10.0) -> float:
    return math.log10(_positive(value)) if base == 10.0 else math.log(_positive(value)) / math.log(base)


def _up(value: float, places: float = 0.0) -> float:
    unit = 10.0 ** int(places)
    return math.copysign(-whole_below(-approximate(abs(value) * unit)), value) / unit


def _down(value: float, places: float = 0.0) -> float:
    unit = 10.0 ** int(places)
    return math.copysign(whole_below(abs(value) * unit), value) / unit


def _time_of_day(value: Scalar) -> Scalar:
    """TIMEVALUE: hh:mm as part of a day. Raises Fault for what is no such time."""
    hours, colon, minutes = text(value).partition(":")
    if not (colon and hours.isdecimal() and len(minutes) == 2 and minutes.isdecimal() and int(minutes) < 60):
        raise Fault(VALUE)
    return (60.0 * int(hours) + int(minutes)) / 1440.0 % 1.0


SINGLE: dict[str, Single] = {
    "ABS": _numeric(1, 1, abs, np.abs),
    "SQRT": _numeric(1, 1, math.sqrt, np.sqrt),
    "EXP": _numeric(1, 1, math.exp, np.exp),
    "LN": _numeric(1, 1, lambda x: math.log(_positive(x))),
    "LOG10": _numeric(1, 1, _log),
    "LOG": _numeric(1, 2, _log),
    "INT": _numeric(1, 1, whole_below),
    "ROUND": _numeric(1, 2, round_half_away),
    "ROUNDUP": _numeric(1, 2, _up),
    "ROUNDDOWN": _numeric(1, 2, _down),
    "TRUNC": _numeric(1, 2, _down),
    "SIGN": _numeric(1, 1, lambda x: float((x > 0.0) - (x < 0.0))),
    "MOD": _numeric(2, 2, _remainder),
    "POWER": _numeric(2, 2, lambda x, y: power(x, y)),
    "PI": _numeric(0, 0, lambda: math.pi),
    "TRUE": Single(0, 0, lambda: True),
    "FALSE": Single(0, 0, lambda: False),
    "NOT": Single(1, 1, lambda x: not truth(x)),
    "LEN": Single(1, 1, lambda x: float(len(text(x)))),
    "TIMEVALUE": Single(1, 1, _time_of_day),
    "TRIM": Single(1, 1, lambda x: " ".join(text(x).split())),
    "UPPER": Single(1, 1, lambda x: text(x).upper()),
    "LOWER": Single(1, 1, lambda x: text(x).lower()),
    "EXACT": Single(2, 2, lambda x, y: text(x) == text(y)),
    "NA": Single(0, 0, lambda: NA),
    "ISNUMBER": _kind(is_number),
    "ISTEXT": _kind(lambda x: isinstance(x, str)),
    "ISNONTEXT": _kind(lambda x: not isinstance(x, str)),
    "ISLOGICAL": _kind(lambda x: isinstance(x, bool)),
    "ISBLANK": _kind(lambda x: x is None),
    "ISERROR": _kind(lambda x: isinstance(x, CellError)),
    "ISERR": _kind(lambda x: isinstance(x, CellError) and x is not NA),
    "ISNA": _kind(lambda x: x == NA),
}


def power(base: float, exponent: float) -> float:
    """base ^ exponent. Raises Fault where there is none."""
    try:
        return math.pow(base, exponent)
    except (ValueError, OverflowError):
        raise Fault(NUM) from None


def _of_numbers(run: Callable[[list[float]], float]) -> Whole:
    """A whole function of all numbers given."""
    return Whole(1, 255, lambda arguments: run(numbers(arguments)))


def _at_least(count: int, found: list[float]) -> list[float]:
    """The numbers, where there are enough of them. Raises Fault."""
    if len(found) < count:
        raise Fault(DIV0)
    return found


def mean(found: list[float]) -> float:
    """AVERAGE."""
    return math.fsum(_at_least(1, found)) / len(found)


def squares_about_mean(found: list[float]) -> float:
    """DEVSQ."""
    if not found:
        return 0.0
    centre = mean(found)
    return math.fsum((one - centre) ** 2 for one in found)


def variance(found: list[float]) -> float:
    """VAR: of a sample, n - 1 below."""
    return squares_about_mean(_at_least(2, found)) / (len(found) - 1)


def _population(found: list[float]) -> float:
    """STDEVP: of a whole population, n below."""
    return math.sqrt(squares_about_mean(_at_least(1, found)) / len(found))


def _median(found: list[float]) -> float:
    if not found:
        raise Fault(NUM)
    ordered = sorted(found)
    half = len(ordered) // 2
    return ordered[half] if len(ordered) % 2 else (ordered[half - 1] + ordered[half]) / 2.0


def _product(found: list[float]) -> float:
    return math.prod(found) if found else 0.0


def _count(arguments: Arguments) -> float:
    """COUNT: numbers only; text, truth values, errors and empty cells are passed over."""
    count = 0
    for argument in arguments:
        value = argument.value
        if isinstance(value, Array):
            count += len(value.floats)
        else:
            count += type(value) is float or (isinstance(value, bool) and not argument.cells)
    return float(count)


def _count_filled(arguments: Arguments) -> float:
    """COUNTA: everything but empty cells; the empty text of a formula counts."""
    count = 0
    for argument in arguments:
        value = argument.value
        count += len(value) - value.empty if isinstance(value, Array) else value is not None
    return float(count)


def _count_blank(arguments: Arguments) -> float:
    """COUNTBLANK: empty cells and empty texts."""
    return float(sum(one is None or one == "" for one in values([argument.value for argument in arguments])))


Pairs = tuple[np.ndarray[Any, Any], np.ndarray[Any, Any]]


def pairs(arguments: Arguments) -> Pairs:
    """The numbers of two ranges, row by row, rows without both left out. Raises Fault."""
    first, second = map(rectangle, arguments)
    if len(first) != len(second):
        raise Fault(NA)
    error = first.error or second.error
    if error is not None:
        raise Fault(error)
    both = zip(first.items, second.items, strict=True)
    kept = [(a, b) for a, b in both if type(a) is float and type(b) is float]
    table = np.array(kept, dtype=np.float64).reshape(-1, 2)
    return table[:, 0], table[:, 1]


@dataclass(frozen=True, slots=True)
class Line:
    """Least-squares line of y over x through n points; centred, so that 22.3 beside 0.001 costs no digits."""

    slope: float
    x_mean: float
    y_mean: float
    residual_square: float
    n: int


def line(arguments: Arguments, least: int = 2) -> Line:
    """The line through two ranges, y first. Raises Fault for too few points or a single x."""
    y, x = pairs(arguments)
    if len(x) < least:
        raise Fault(DIV0)
    x_mean, y_mean = math.fsum(x) / len(x), math.fsum(y) / len(y)
    dx, dy = x - x_mean, y - y_mean
    spread = float(dx @ dx)
    if spread == 0.0:
        raise Fault(DIV0)
    slope = float(dx @ dy) / spread
    residual = dy - slope * dx
    return Line(slope, x_mean, y_mean, float(residual @ residual), len(x))


def _intercept(arguments: Arguments) -> float:
    found = line(arguments)
    return found.y_mean - found.slope * found.x_mean


def _residual_deviation(arguments: Arguments) -> float:
    """STEYX: n - 2 below."""
    found = line(arguments, least=3)
    return math.sqrt(found.residual_square / (found.n - 2))


def _forecast(arguments: Arguments) -> float:
    """FORECAST: the line of y (second argument) over x (third) at a value."""
    found = line(arguments[1:])
    return found.y_mean + found.slope * (number(arguments[0].value) - found.x_mean)


def _correlation(arguments: Arguments) -> float:
    y, x = pairs(arguments)
    if len(x) < 2:
        raise Fault(DIV0)
    dx, dy = x - x.mean(), y - y.mean()
    spread = float(dx @ dx) * float(dy @ dy)
    if spread == 0.0:
        raise Fault(DIV0)
    return float(dx @ dy) / math.sqrt(spread)


def factors(array: Array) -> Any:
    """The vector SUMPRODUCT sees: text and empty cells are 0. Raises Fault for error values."""
    if array.data is not None:
        return array.data.astype(np.float64)
    if array.error is not None:
        raise Fault(array.error)
    return np.array([number(one) if isinstance(one, float | bool) else 0.0 for one in array.items])


def _sum_of_products(arguments: Arguments) -> float:
    """SUMPRODUCT: the ranges must have one shape."""
    arrays = [rectangle(argument) for argument in arguments]
    if len({(one.rows, one.columns) for one in arrays}) > 1:
        raise Fault(VALUE)
    with np.errstate(all="ignore"):
        return float(np.add.reduce(reduce(np.multiply, map(factors, arrays))))


def logical(arguments: Arguments) -> Iterator[bool]:
    """The truth values of AND and OR; text and empty cells of ranges are passed over. Raises Fault."""
    found = False
    for argument in arguments:
        for one in values([argument.value]):
            if argument.cells and (one is None or isinstance(one, str)):
                continue
            found = True
            yield truth(one)
    if not found:
        raise Fault(VALUE)


WHOLE: dict[str, Whole] = {
    "COUNT": Whole(1, 255, _count),
    "COUNTA": Whole(1, 255, _count_filled),
    "COUNTBLANK": Whole(1, 1, _count_blank),
    "COUNTIF": Whole(2, 2, lookup.count_if),
    "SUMIF": Whole(2, 3, lambda arguments: math.fsum(lookup.chosen(arguments))),
    "AVERAGEIF": Whole(2, 3, lambda arguments: mean(lookup.chosen(arguments))),
    "SUM": _of_numbers(math.fsum),
    "PRODUCT": _of_numbers(_product),
    "AVERAGE": _of_numbers(mean),
    "MEDIAN": _of_numbers(_median),
    "MIN": _of_numbers(lambda found: min(found, default=0.0)),
    "MAX": _of_numbers(lambda found: max(found, default=0.0)),
    "STDEV": _of_numbers(lambda found: math.sqrt(variance(found))),
    "STDEV.S": _of_numbers(lambda found: math.sqrt(variance(found))),
    "STDEVP": _of_numbers(_population),
    "STDEV.P": _of_numbers(_population),
    "VAR": _of_numbers(variance),
    "VAR.S": _of_numbers(variance),
    "SUMSQ": _of_numbers(lambda found: math.fsum(one * one for one in found)),
    "DEVSQ": _of_numbers(squares_about_mean),
    "SLOPE": Whole(2, 2, lambda arguments: line(arguments).slope),
    "INTERCEPT": Whole(2, 2, _intercept),
    "STEYX": Whole(2, 2, _residual_deviation),
    "FORECAST": Whole(3, 3, _forecast),
    "CORREL": Whole(2, 2, _correlation),
    "RSQ": Whole(2, 2, lambda arguments: _correlation(arguments) ** 2),
    "SUMPRODUCT": Whole(1, 255, _sum_of_products),
    "MATCH": Whole(2, 3, lookup.match),
    "ROWS": Whole(1, 1, lambda arguments: float(rectangle(arguments[0]).rows)),
    "COLUMNS": Whole(1, 1, lambda arguments: float(rectangle(arguments[0]).columns)),
}

AGGREGATES = frozenset(WHOLE)  # their result is one value whatever the size of their ranges
