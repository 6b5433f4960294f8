"""The functions a cell function may call: each means the same in Python and in a spreadsheet.

A series is the list of a range's values; a blank is None, and text or a truth value is not a number.
Positions count from 1 as in a spreadsheet. sheetcal/formulas/spelling.py holds the spreadsheet side.
"""

import math
from decimal import ROUND_HALF_UP, Decimal
from typing import Any, Callable, Dict, List, Sequence, Tuple

BLANK = math.nan  # a blank where a number may stand: reckoning with it gives a blank, as the formula's IF leaves it
Series = Sequence[Any]


class Text(str):
    """A cell's text: compared without regard to case, as a spreadsheet compares."""

    __slots__ = ()

    def __eq__(self, other: object) -> bool:
        return isinstance(other, str) and self.lower() == other.lower()

    def __ne__(self, other: object) -> bool:
        return not self == other

    def __hash__(self) -> int:
        return hash(self.lower())


def is_number(value: object) -> bool:
    """Whether a cell holds a number (a truth value is none)."""
    return isinstance(value, (int, float)) and not isinstance(value, bool) and math.isfinite(value)


def is_text(value: object) -> bool:
    """Whether a cell holds text; an empty text, as a blank result shows, is none."""
    return isinstance(value, str) and value != ""


def same_text(left: object, right: object) -> bool:
    """Whether two cells hold the same text, whatever its case; a blank or a number is no text."""
    return isinstance(left, str) and isinstance(right, str) and bool(left) and left.lower() == right.lower()


def is_blank(value: object) -> bool:
    """Whether a cell is empty or shows an empty text."""
    return value is None or value == "" or value != value


def numbers(series: Series) -> List[float]:
    """The numbers of a series, in order, without blanks and text."""
    return [float(value) for value in series if is_number(value)]


def count(series: Series) -> float:
    """How many cells hold a number."""
    return float(len(numbers(series)))


def filled(series: Series) -> float:
    """How many cells are not empty, whatever they hold."""
    return float(sum(value is not None for value in series))


def part(series: Series, first: float, last: float) -> Series:
    """The cells from position `first` to position `last`, both included."""
    return series[int(first) - 1 : int(last)]


def at(series: Series, position: float) -> float:
    """The cell at a position."""
    value: float = series[int(position) - 1]
    return value


def position(value: float, series: Series) -> float:
    """Position of the last number not above `value` in a rising series; 0 when there is none."""
    last = 0
    for index, number in enumerate(series, start=1):
        if is_number(number) and number > value:
            break
        if is_number(number):
            last = index
    return float(last)


def _same(left: object, right: object) -> bool:
    if isinstance(left, str) and isinstance(right, str):
        return left.lower() == right.lower()
    return is_number(left) and left == right


def look_up(key: object, keys: Series, values: Series) -> Any:
    """The value beside the first key equal to `key`; BLANK when there is none."""
    for known, value in zip(keys, values):
        if _same(key, known):
            return Text(value) if isinstance(value, str) else BLANK if value is None else value
    return BLANK


def found(key: object, keys: Series) -> bool:
    """Whether `key` is among `keys`."""
    return any(_same(key, known) for known in keys)


def total(series: Series) -> float:
    """Sum of the numbers of a series."""
    return math.fsum(numbers(series))


def mean(series: Series) -> float:
    """Arithmetic mean of the numbers of a series."""
    return math.fsum(numbers(series)) / len(numbers(series))


def smallest(series: Series) -> float:
    """Smallest number of a series; 0 when it holds none, as in a spreadsheet."""
    return min(numbers(series), default=0.0)


def largest(series: Series) -> float:
    """Largest number of a series; 0 when it holds none, as in a spreadsheet."""
    return max(numbers(series), default=0.0)


def deviation(series: Series) -> float:
    """Standard deviation of a sample, n - 1 in the denominator."""
    centre = mean(series)
    values = numbers(series)
    return math.sqrt(math.fsum((value - centre) ** 2 for value in values) / (len(values) - 1))


def _pairs(y: Series, x: Series) -> Tuple[List[float], List[float]]:
    both = [(float(b), float(a)) for b, a in zip(y, x) if is_number(b) and is_number(a)]
    return [b for b, _ in both], [a for _, a in both]


def pairs(y: Series, x: Series) -> float:
    """How many rows hold a number in both series."""
    return float(len(_pairs(y, x)[0]))


def slope(y: Series, x: Series) -> float:
    """Slope of the least-squares line of y over x, centred; rows without both numbers are left out."""
    ys, xs = _pairs(y, x)
    x_mean, y_mean = math.fsum(xs) / len(xs), math.fsum(ys) / len(ys)
    cross = math.fsum((a - x_mean) * (b - y_mean) for a, b in zip(xs, ys))
    return cross / math.fsum((a - x_mean) ** 2 for a in xs)


def scatter(y: Series, x: Series) -> float:
    """Residual standard deviation about the least-squares line, n - 2 in the denominator."""
    ys, xs = _pairs(y, x)
    x_mean, y_mean, rate = math.fsum(xs) / len(xs), math.fsum(ys) / len(ys), slope(y, x)
    squares = math.fsum((b - y_mean - rate * (a - x_mean)) ** 2 for a, b in zip(xs, ys))
    return math.sqrt(squares / (len(xs) - 2))


def interpolate(value: float, y: Series, x: Series) -> float:
    """y at x = value on the straight line through the rows (two rows: linear interpolation)."""
    ys, xs = _pairs(y, x)
    x_mean, y_mean = math.fsum(xs) / len(xs), math.fsum(ys) / len(ys)
    return y_mean + slope(y, x) * (value - x_mean)


def trapezoid(time: Series, y: Series, first: float, last: float) -> float:
    """Integral of y over time from reading `first` to reading `last`, by trapezoids."""
    t, v = part(time, first, last), part(y, first, last)
    return math.fsum((t[i + 1] - t[i]) * (v[i + 1] + v[i]) for i in range(len(t) - 1)) / 2


def _steps(series: Series, last: float) -> List[float]:
    values = part(series, 1, last)
    return [after - before for before, after in zip(values, values[1:]) if is_number(before) and is_number(after)]


def not_rising(series: Series, last: float) -> float:
    """How many of the first `last` numbers are not above the one before."""
    return float(sum(step <= 0 for step in _steps(series, last)))


def jumps(series: Series, last: float, limit: float) -> float:
    """How many of the first `last` numbers differ from the one before by more than `limit`."""
    return float(sum(abs(step) > limit for step in _steps(series, last)))


def not_above_line(y: Series, x: Series, last: float, slope: float, level: float) -> float:
    """How many of the first `last` rows have y - slope x at or below a level."""
    rows = zip(part(y, 1, last), part(x, 1, last))
    return float(sum(b - slope * a <= level for b, a in rows))


def stuck(series: Series, first: float, last: float, margin: float) -> float:
    """How many cells of `first`..`last` equal the three after them and lie more than `margin` off the last."""
    values = part(series, first, last)
    runs = zip(values, values[1:], values[2:], values[3:])
    return float(sum(a == b == c == d and abs(a - values[-1]) > margin for a, b, c, d in runs))


def _alike(value: Any, slope: Any, shift: float, target: float, width: Any, doubt: float) -> bool:
    """Whether a book value, carried on by its slope, lies within the doubts of a target; a blank counts as 0."""
    book, rate, half = (float(one) if is_number(one) else 0.0 for one in (value, slope, width))
    return abs(book + rate * shift - target) <= half + doubt


def count_alike(values: Series, slopes: Series, shift: float, target: float, widths: Series, doubt: float) -> float:
    """How many rows lie, carried on by slope and shift, within width and doubt of a target."""
    rows = zip(values, slopes, widths)
    return float(sum(_alike(value, slope, shift, target, width, doubt) for value, slope, width in rows))


def next_alike(
    places: Series, values: Series, slopes: Series, shift: float, target: float, widths: Series, doubt: float,
    densities: Series, density: float, share: float, below: float,
) -> float:  # fmt: skip
    """Largest key below a bound among the rows alike: 1000 - place, and 1000 more where the density fits; else 0."""
    best = 0.0
    for place, value, slope, width, own in zip(places, values, slopes, widths, densities):
        fits = abs((own if is_number(own) else 0.0) - density) <= share * density
        key = 1000.0 - (place if is_number(place) else 0.0) + 1000.0 * fits
        if _alike(value, slope, shift, target, width, doubt) and best < key < below:
            best = key
    return best


def median(series: Series) -> float:
    """Middle of the numbers of a series, the mean of the two middle ones where their number is even."""
    values = sorted(numbers(series))
    half = len(values) // 2
    return values[half] if len(values) % 2 else (values[half - 1] + values[half]) / 2


def weighted(*series: Series) -> float:
    """Sum over the rows of the product of the numbers in each series."""
    return math.fsum(math.prod(row) for row in zip(*series) if all(is_number(value) for value in row))


def total_size(series: Series) -> float:
    """Sum of the absolute values of the numbers of a series."""
    return math.fsum(abs(value) for value in numbers(series))


def choose(index: float, *values: float) -> float:
    """The value at a position of a printed list."""
    return values[int(index) - 1]


def sqrt(value: float) -> float:
    """Square root."""
    return math.sqrt(value)


def exp(value: float) -> float:
    """Exponential function."""
    return math.exp(value)


def log(value: float) -> float:
    """Natural logarithm."""
    return math.log(value)


def log10(value: float) -> float:
    """Decimal logarithm."""
    return math.log10(value)


def floor(value: float) -> float:
    """Largest whole number not above the value."""
    return float(math.floor(value))


def least(*values: float) -> float:
    """Smallest of several numbers; written `min` in a body."""
    return min(values)


def greatest(*values: float) -> float:
    """Largest of several numbers; written `max` in a body."""
    return max(values)


def size(value: float) -> float:
    """Absolute value; written `abs` in a body."""
    return abs(value)


def round_to_places(value: float, places: float) -> float:
    """Round as a spreadsheet does: half away from zero, judged on the 15 digits it shows."""
    shown = Decimal(format(value, ".15g"))
    return float(shown.quantize(Decimal(1).scaleb(-int(places)), rounding=ROUND_HALF_UP))


def day_part(text: object) -> float:
    """A time of day written hh:mm, as part of a day; 0 for what is no such time."""
    hours, colon, minutes = str(text).partition(":")
    if not (colon and hours.isascii() and hours.isdigit() and minutes.isascii() and minutes.isdigit()):
        return 0.0
    whole = len(hours) <= 2 and len(minutes) == 2 and int(hours) < 24 and int(minutes) < 60
    return (60 * int(hours) + int(minutes)) / 1440 if whole else 0.0


def join(*values: str) -> str:
    """Texts one after the other."""
    return "".join(values)


_OWN_NAMES = (
    is_number, is_text, same_text, is_blank, count, filled, part, at, position, look_up, found, total, mean, smallest,
    largest, deviation, pairs, slope, scatter, interpolate, trapezoid, not_rising, jumps, not_above_line,
    stuck, count_alike, next_alike, median, weighted, total_size, choose, sqrt, exp, log, log10, floor,
    round_to_places, day_part, join,
)  # fmt: skip
PRIMITIVES: Dict[str, Callable[..., Any]] = {function.__name__: function for function in _OWN_NAMES}
PRIMITIVES.update({"min": least, "max": greatest, "abs": size})
