"""Quality: what counts, mean and scatter, limits for duplicates and outliers, rounding to a step.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated

from sheetcal.cells.constants import J_PER_G_PER_MJ_PER_KG
from sheetcal.cells.primitives import (
    choose,
    count,
    deviation,
    floor,
    is_number,
    largest,
    mean,
    median,
    round_to_places,
    scatter,
    slope,
    smallest,
    sqrt,
)
from sheetcal.cells.registry import (
    ANY,
    J_PER_G,
    MJ_PER_KG,
    ONE,
    OPTIONAL,
    PERCENT,
    SAME,
    SAME_AS_VALUE,
    SAME_AS_VALUES,
    TEXT,
    VALUES,
    cell,
)

SAME_AS_LIMIT = Annotated[float, SAME + "limit"]
SAME_AS_A = Annotated[float, SAME + "a"]
SAME_AS_REFERENCE = Annotated[float, SAME + "reference"]
Y_PER_X = Annotated[float, "y / x"]

_STATISTICS = "statistics of a sample"


@cell(
    "COUNTED",
    equation="the value, where the run is valid",
    source="a void run stays in the sheet and does not count",
    standing="derived",
    needs=('state == "valid"',),
)
def counted(value: ANY, state: TEXT) -> SAME_AS_VALUE:
    """A run's value where the run counts."""
    return value


@cell("NUMBER_OF", equation="n", source=_STATISTICS, standing="derived")
def number_of(values: VALUES) -> ONE:
    """How many values count."""
    return count(values)


@cell("MEAN_OF", equation="sum x / n", source=_STATISTICS, standing="derived")
def mean_of(values: VALUES) -> SAME_AS_VALUES:
    """Arithmetic mean of the values that count."""
    return mean(values)


@cell(
    "MEAN_OR_MEDIAN",
    equation="sum x / n; the median of four or more whose range is above the critical range",
    source="ISO 5725-6, acceptance of results",
    standing="memory",
)
def mean_or_median(
    values: VALUES, range: Annotated[float, "any", OPTIONAL], limit: Annotated[float, SAME + "range", OPTIONAL]
) -> SAME_AS_VALUES:
    """Final result of the values that count: their mean, or their median where they do not agree."""
    apart = range > limit if is_number(range) and is_number(limit) else False
    return median(values) if apart and count(values) >= 4 else mean(values)


@cell(
    "DEVIATION_OF",
    equation="s = sqrt(sum (x - mean)^2/(n - 1))",
    source=_STATISTICS,
    standing="derived",
    needs=("count(values) >= 2",),
)
def deviation_of(values: VALUES) -> SAME_AS_VALUES:
    """Standard deviation of the values that count."""
    return deviation(values)


@cell(
    "RELATIVE_DEVIATION_OF",
    equation="100 s / mean",
    source=_STATISTICS,
    standing="derived",
    needs=("count(values) >= 2", "mean(values) != 0"),
)
def relative_deviation_of(values: VALUES) -> PERCENT:
    """Relative standard deviation of the values that count."""
    return 100 * deviation(values) / mean(values)


@cell(
    "RANGE_OF",
    equation="largest - smallest",
    source=_STATISTICS,
    standing="derived",
    needs=("count(values) >= 2",),
)
def range_of(values: VALUES) -> SAME_AS_VALUES:
    """Difference of the largest and the smallest value that count."""
    return largest(values) - smallest(values)


@cell(
    "CRITICAL_RANGE",
    equation="CR(n) = r f(n)/2.8; f(2) = 2.8",
    source="ISO 5725-6, f(n) as printed, equal to the studentized range to its one decimal",
    standing="memory",
    valid={"limit": (0.0, None), "n": (2.0, 20.0)},
)
def critical_range(limit: ANY, n: ONE) -> SAME_AS_LIMIT:
    """Largest range of n results that the repeatability limit of two allows."""
    f = choose(n - 1, 2.8, 3.3, 3.6, 3.9, 4, 4.2, 4.3, 4.4, 4.5, 4.6, 4.6, 4.7, 4.7, 4.8, 4.8, 4.9, 4.9, 5, 5)
    return limit * f / 2.8


@cell(
    "GRUBBS_LARGEST",
    equation="G = max |x - mean| / s",
    source="ISO 5725-2",
    standing="memory",
    needs=("count(values) >= 3", "deviation(values) > 0"),
)
def grubbs_largest(values: VALUES) -> ONE:
    """Grubbs' statistic of the value farthest from the mean."""
    return max(largest(values) - mean(values), mean(values) - smallest(values)) / deviation(values)


@cell(
    "GRUBBS_LIMIT",
    equation="G = (n-1)/sqrt n sqrt(t^2/(n-2+t^2)), t two-sided at 5 %/n with n - 2 degrees of freedom",
    source="ISO 5725-2 form, computed; at n = 3 the test can find nothing and is left out",
    standing="derived",
    valid={"n": (4.0, 20.0)},
)
def grubbs_limit(n: ONE) -> ONE:
    """Grubbs' limit at 5 %, two-sided: a value beyond it is a straggler."""
    return choose(
        n - 3, 1.481, 1.715, 1.887, 2.02, 2.127, 2.215, 2.29, 2.355, 2.412, 2.462, 2.507, 2.548, 2.586, 2.62,
        2.652, 2.681, 2.708
    )  # fmt: skip


@cell(
    "SLOPE_OF",
    equation="slope of y over x, least squares",
    source=_STATISTICS,
    standing="derived",
    needs=(
        "pairs(y, x) >= 2",
        "count(y) == pairs(y, x) and count(x) == pairs(y, x)",
        "largest(x) > smallest(x)",
    ),
)
def slope_of(y: VALUES, x: VALUES) -> Y_PER_X:
    """Slope of the values over another quantity; every row has both or neither."""
    return slope(y, x)


@cell(
    "SLOPE_T",
    equation="t = slope / its standard deviation, n - 2 degrees of freedom",
    source=_STATISTICS,
    standing="derived",
    needs=(
        "pairs(y, x) >= 3",
        "count(y) == pairs(y, x) and count(x) == pairs(y, x)",
        "largest(x) > smallest(x)",
        "scatter(y, x) > 0",
    ),
)
def slope_t(y: VALUES, x: VALUES) -> ONE:
    """How many of its standard deviations a slope is away from none."""
    return slope(y, x) * deviation(x) * sqrt(count(x) - 1) / scatter(y, x)


@cell(
    "ROUNDED_TO_STEP",
    equation="nearest multiple of the step; a tie, judged on x/step at 9 decimals, goes to the even multiple",
    source="ISO 80000-1, rule A",
    standing="derived",
    needs=("step > 0",),
)
def rounded_to_step(value: ANY, step: SAME_AS_VALUE) -> SAME_AS_VALUE:
    """A value rounded for the report."""
    q = round_to_places(value / step, 9)
    even = 2 * floor((floor(q) + 1) / 2)
    return (even if q - floor(q) == 0.5 else round_to_places(q, 0)) * step


@cell("IN_MJ", equation="MJ/kg = J/g / 1000", source="unit conversion, exact", standing="derived")
def in_mj(value: J_PER_G) -> MJ_PER_KG:
    """A value in MJ/kg."""
    return value / J_PER_G_PER_MJ_PER_KG


@cell("MEAN_OF_TWO", equation="(a + b)/2", source=_STATISTICS, standing="derived")
def mean_of_two(a: ANY, b: SAME_AS_A) -> SAME_AS_A:
    """Mean of two values."""
    return (a + b) / 2


@cell(
    "DIFFERENCE_PERCENT",
    equation="100 |a - b| / |mean|",
    source=_STATISTICS,
    standing="derived",
    needs=("a + b != 0",),
)
def difference_percent(a: ANY, b: SAME_AS_A) -> PERCENT:
    """Difference of two values as a share of their mean."""
    return 100 * abs(a - b) / abs((a + b) / 2)


@cell(
    "DEVIATION_PERCENT",
    equation="100 (found - reference)/reference",
    source="change against a reference",
    standing="derived",
    needs=("reference != 0",),
)
def deviation_percent(found: SAME_AS_REFERENCE, reference: ANY) -> PERCENT:
    """Deviation of a value from its reference, with its sign."""
    return 100 * (found - reference) / reference
