"""What a sheet says in words: what it waits for, why a value is not there, how a limit counts, how old a moisture is.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated

from sheetcal.cells.primitives import day_part, is_number, join
from sheetcal.cells.registry import (
    J_PER_G_OR_BLANK,
    ONE,
    OPTIONAL,
    PERCENT,
    PERCENT_OR_BLANK,
    TEXT,
    TEXT_OR_BLANK,
    cell,
)

DATE = Annotated[float, "date"]
DATE_OR_BLANK = Annotated[float, "date", OPTIONAL]

_BOOKKEEPING = "bookkeeping of this workbook"


@cell(
    "WAITING_FOR",
    equation="analysis values that are not there yet",
    source=_BOOKKEEPING,
    standing="derived",
    choices={"role": ("sample",)},
)
def waiting_for(
    role: TEXT,
    total_moisture: PERCENT_OR_BLANK,
    analysis_moisture: PERCENT_OR_BLANK,
    ash: PERCENT_OR_BLANK,
    carbon: PERCENT_OR_BLANK,
    hydrogen: PERCENT_OR_BLANK,
    nitrogen: PERCENT_OR_BLANK,
    sulfur: PERCENT_OR_BLANK,
    chlorine: PERCENT_OR_BLANK,
    oxygen: PERCENT_OR_BLANK,
) -> TEXT:
    """Which analysis values of a sample are still to come; blank when all are there."""
    moist = join(
        "" if is_number(total_moisture) else "total moisture; ", "" if is_number(analysis_moisture) else "moisture; "
    )
    solid = join("" if is_number(ash) else "ash; ", "" if is_number(carbon) else "C; ")
    more = join("" if is_number(hydrogen) else "H; ", "" if is_number(nitrogen) else "N; ")
    rest = join("" if is_number(sulfur) else "S; ", "" if is_number(chlorine) else "Cl; ")
    return join(moist, solid, more, rest, "" if is_number(oxygen) else "O; ")


@cell(
    "NET_WORDS",
    equation="why the net value is not there",
    source="without hydrogen nobody knows the water that is formed",
    standing="derived",
    choices={"role": ("sample",)},
)
def net_words(role: TEXT, gross: J_PER_G_OR_BLANK, hydrogen: PERCENT_OR_BLANK, net: J_PER_G_OR_BLANK) -> TEXT:
    """Says that and why the net value of a sample is not determined; blank when it is, or nothing was fired."""
    why = "not determined: values are missing" if is_number(hydrogen) else "not determined: no hydrogen"
    return why if is_number(gross) and not is_number(net) else ""


@cell(
    "BELOW_LIMIT_WORDS",
    equation="the share of its limit that a value marked < counts for, in words",
    source="the profile",
    standing="derived",
    valid={"share": (0.0, 1.0)},
)
def below_limit_words(share: ONE) -> TEXT:
    """How a value below its limit counts."""
    part = "counts as nothing" if share == 0 else "counts as a part of its limit"
    return "counts as its limit" if share == 1 else "counts as half its limit" if share == 0.5 else part


@cell(
    "MARKED_VALUE",
    equation="the value; marked <: share x value",
    source="the profile's share of a limit",
    standing="derived",
    valid={"share": (0.0, 1.0)},
)
def marked_value(value: PERCENT, mark: TEXT_OR_BLANK, share: ONE) -> PERCENT:
    """A per cent; marked "<" it counts with a share of its limit."""
    return value * (share if mark == "<" else 1)


@cell(
    "MOISTURE_AGE",
    equation="day + hh:mm as part of a day - moment of the moisture: the run's own, or the sample's",
    source="calendar",
    standing="derived",
    needs=("is_number(own_moment) if is_number(own_moisture) else is_number(sample_moment)",),
)
def moisture_age(
    day: DATE,
    start: TEXT,
    own_moisture: PERCENT_OR_BLANK,
    own_moment: DATE_OR_BLANK,
    sample_moment: DATE_OR_BLANK,
) -> ONE:
    """Days from the moisture's determination to the start of a run; a start that is no time is midnight."""
    return day + day_part(start) - (own_moment if is_number(own_moisture) else sample_moment)
