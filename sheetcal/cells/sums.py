"""Sums, differences and absent parts: what several kinds of sheet need in a line of its own.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated

from sheetcal.cells.constants import J_PER_KJ
from sheetcal.cells.primitives import is_number, total
from sheetcal.cells.registry import (
    ANY,
    DEGC,
    KJ,
    OPTIONAL,
    SAME,
    SAME_AS_VALUE,
    SAME_AS_VALUES,
    VALUES,
    J,
    K,
    cell,
)

ANY_OR_BLANK = Annotated[float, "any", OPTIONAL]
SAME_AS_FIRST = Annotated[float, SAME + "first"]
SAME_AS_FIRST_OR_BLANK = Annotated[float, SAME + "first", OPTIONAL]


@cell(
    "VALUE_OR_ZERO",
    equation="the value, 0 where it is blank",
    source="what is not there adds nothing",
    standing="derived",
)
def value_or_zero(value: ANY_OR_BLANK) -> SAME_AS_VALUE:
    """A reading, counted as 0 where it is blank."""
    return value if is_number(value) else 0


@cell("SUM_OF_TWO", equation="a + b", source="definition of a sum", standing="derived")
def sum_of_two(first: ANY, second: SAME_AS_FIRST) -> SAME_AS_FIRST:
    """Sum of two values; blank where one is missing."""
    return first + second


@cell("DIFFERENCE_OF", equation="a - b", source="definition of a difference", standing="derived")
def difference_of(first: ANY, second: SAME_AS_FIRST) -> SAME_AS_FIRST:
    """The first value less the second; blank where one is missing."""
    return first - second


@cell(
    "FIRST_OF",
    equation="the first, or the second where the first is blank",
    source="what was measured for the run comes before what holds for all",
    standing="derived",
    needs=("is_number(first) or is_number(second)",),
)
def first_of(first: ANY_OR_BLANK, second: SAME_AS_FIRST_OR_BLANK) -> SAME_AS_FIRST:
    """The first of two readings, or the second where the first is blank."""
    return first if is_number(first) else second


@cell("RISE_OF", equation="dT = T2 - T1", source="definition of a rise", standing="derived")
def rise_of(start: DEGC, end: DEGC) -> K:
    """Rise between two temperatures; negative when it falls."""
    return end - start


@cell("IN_KJ", equation="kJ = J / 1000", source="unit conversion, exact", standing="derived")
def in_kj(value: J) -> KJ:
    """A heat in kJ."""
    return value / J_PER_KJ


@cell("TOTAL_OF", equation="sum of the values", source="definition of a sum", standing="derived")
def total_of(values: VALUES) -> SAME_AS_VALUES:
    """Sum of the numbers of a range; blank where it holds none."""
    return total(values)
