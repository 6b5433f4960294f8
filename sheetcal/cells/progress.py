"""Where a sheet stands: what has been begun, what the bench has finished, what is still to come.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated, Any, Sequence

from sheetcal.cells.primitives import count, is_number, is_text, largest, smallest
from sheetcal.cells.registry import (
    COLUMN,
    J_PER_G,
    J_PER_G_OR_BLANK,
    ONE,
    ONE_OR_BLANK,
    SAME_AS_VALUES,
    TEXT,
    TEXT_OR_BLANK,
    VALUES,
    cell,
)

ANY_OR_NONE = Annotated[Sequence[Any], "any", COLUMN]
ENERGIES = Annotated[Sequence[Any], "J/g", COLUMN]

_BOOKKEEPING = "bookkeeping of this workbook"


@cell(
    "SMALLEST_OF",
    equation="smallest of the values",
    source=_BOOKKEEPING,
    standing="derived",
)
def smallest_of(values: VALUES) -> SAME_AS_VALUES:
    """Smallest of the numbers of a range."""
    return smallest(values)


@cell(
    "LARGEST_OF",
    equation="largest of the values",
    source=_BOOKKEEPING,
    standing="derived",
)
def largest_of(values: VALUES) -> SAME_AS_VALUES:
    """Largest of the numbers of a range."""
    return largest(values)


@cell(
    "BEGUN",
    equation="1 once any mass or rise is there, else 0",
    source=_BOOKKEEPING,
    standing="derived",
)
def begun(masses: ANY_OR_NONE, rises: ANY_OR_NONE) -> ONE:
    """Whether bench work has begun: 1 yes, 0 no."""
    return 1 if count(masses) + count(rises) > 0 else 0


@cell(
    "BENCHED",
    equation="1 once as many runs are done as required, else 0",
    source=_BOOKKEEPING,
    standing="derived",
)
def benched(counted: ONE_OR_BLANK, required: ONE, rises: ANY_OR_NONE) -> ONE:
    """Whether the bench has done the runs required: 1 yes, 0 no; analysis may be to come."""
    results = counted if is_number(counted) else 0
    return 1 if max(results, count(rises)) >= required else 0


@cell(
    "SAMPLE_COMPLETE",
    equation="1 once every result asked for is there, else 0",
    source=_BOOKKEEPING,
    standing="derived",
)
def sample_complete(benched: ONE, role: TEXT, gross: J_PER_G_OR_BLANK, net: J_PER_G_OR_BLANK) -> ONE:
    """Whether a sample has its results, a control or an aid its gross value: 1 yes, 0 no."""
    needed = is_number(gross) and is_number(net) if role == "sample" else is_number(gross)
    return 1 if benched == 1 and needed else 0


@cell(
    "SHEET_STAGE",
    equation="issued, bench, waiting or complete",
    source=_BOOKKEEPING,
    standing="derived",
)
def sheet_stage(samples: ONE, begun: ONE, benched: ONE, complete: ONE) -> TEXT:
    """Stage of a workbook from how many samples it has, begun, finished on the bench and complete."""
    working = "waiting" if benched >= samples else "bench"
    started = "complete" if complete >= samples else working
    return "issued" if begun == 0 else started


@cell(
    "SHEET_NEXT_STEP",
    equation="the next step in words",
    source=_BOOKKEEPING,
    standing="derived",
)
def sheet_next_step(samples: ONE, begun: ONE, benched: ONE, complete: ONE) -> TEXT:
    """What is to be done next, from how many samples are begun, finished on the bench and complete."""
    working = "enter the analysis values" if benched >= samples else "weigh and fire the open runs"
    started = "have it checked" if complete >= samples else working
    return "weigh the first charge" if begun == 0 else started


@cell(
    "RANGE_ON_BASIS",
    equation="w = largest - smallest, on the basis of the repeatability limit",
    source="ISO 5725-6; the profile names the basis",
    standing="memory",
    choices={"basis": ("dry", "as analysed")},
    needs=("count(dry) >= 2 if basis == 'dry' else count(analysed) >= 2",),
)
def range_on_basis(basis: TEXT, analysed: ENERGIES, dry: ENERGIES) -> J_PER_G:
    """Range of the runs that count, as analysed or dry."""
    spread = largest(analysed) - smallest(analysed)
    return largest(dry) - smallest(dry) if basis == "dry" else spread


@cell(
    "WHAT_NEXT",
    equation="enough runs and range <= critical range: the mean; else one more run, from four on the median",
    source="ISO 5725-6, acceptance of results",
    standing="memory",
)
def what_next(counted: ONE_OR_BLANK, required: ONE, range: J_PER_G_OR_BLANK, critical_range: J_PER_G_OR_BLANK) -> TEXT:
    """What the runs so far ask for."""
    done = counted if is_number(counted) else 0
    within = range <= critical_range if is_number(range) and is_number(critical_range) else required <= 1
    apart = "range stays above the limit: report the median" if done >= 4 else "one more run: range above the limit"
    judged = "enough runs: report the mean" if within else apart
    fewer = "one more run" if required - done == 1 else "runs still to be done"
    return judged if done >= required else fewer


@cell(
    "RUNS_STAGE",
    equation="issued, bench, waiting or complete",
    source=_BOOKKEEPING,
    standing="derived",
)
def runs_stage(masses: ANY_OR_NONE, rises: ANY_OR_NONE, results: ANY_OR_NONE, required: ONE) -> TEXT:
    """Stage of a workbook that holds runs only: what was weighed, measured and has its result."""
    working = "waiting" if count(rises) >= required else "bench"
    started = "complete" if count(results) >= required else working
    return "issued" if count(masses) + count(rises) == 0 else started


@cell(
    "RUNS_NEXT_STEP",
    equation="the next step in words",
    source=_BOOKKEEPING,
    standing="derived",
)
def runs_next_step(masses: ANY_OR_NONE, rises: ANY_OR_NONE, results: ANY_OR_NONE, required: ONE) -> TEXT:
    """What is to be done next in a workbook that holds runs only."""
    working = "enter the late values" if count(rises) >= required else "do the runs that are open"
    started = "have it checked" if count(results) >= required else working
    return "begin with the first run" if count(masses) + count(rises) == 0 else started


@cell(
    "SHEET_STAGE_OF_VALUE",
    equation="issued, bench or complete",
    source=_BOOKKEEPING,
    standing="derived",
)
def sheet_stage_of_value(begun: ANY_OR_NONE, value: J_PER_G_OR_BLANK, source: TEXT_OR_BLANK) -> TEXT:
    """Stage of a workbook that ends in one value: from its runs, or from a table alone."""
    started = "bench" if count(begun) > 0 or is_text(source) else "issued"
    return "complete" if is_number(value) else started


@cell(
    "SHEET_STEP_OF_VALUE",
    equation="the next step in words",
    source=_BOOKKEEPING,
    standing="derived",
)
def sheet_step_of_value(begun: ANY_OR_NONE, value: J_PER_G_OR_BLANK, source: TEXT_OR_BLANK) -> TEXT:
    """What is to be done next in a workbook that ends in one value."""
    started = "fill the open readings" if count(begun) > 0 or is_text(source) else "choose the source"
    return "have it checked" if is_number(value) else started
