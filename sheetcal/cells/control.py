"""Control runs, and small steps of the fuel sheet that belong to nobody else.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from sheetcal.cells.primitives import is_number
from sheetcal.cells.registry import (
    J_PER_G,
    J_PER_G_OR_BLANK,
    ONE,
    PERCENT,
    PERCENT_OR_BLANK,
    TEXT,
    TEXT_OR_BLANK,
    cell,
)


@cell(
    "CONTROL_DEVIATION",
    equation="d = 100 (found/target - 1)",
    source="definition; found and target on one basis and in one mass convention",
    standing="derived",
    choices={"role": ("control",)},
    valid={"target": (100.0, 100000.0)},
    needs=("is_number(dry) if basis == 'dry' else is_number(analysed)",),
)
def control_deviation(
    role: TEXT, basis: TEXT_OR_BLANK, analysed: J_PER_G_OR_BLANK, dry: J_PER_G_OR_BLANK, target: J_PER_G
) -> PERCENT:
    """Control run found against its target, on the basis of the book value; blank for any other run."""
    found = dry if basis == "dry" else analysed
    return 100 * (found / target - 1)


@cell(
    "SULFUR_FOR_WASH",
    equation="sulfur as analysed; 0 for a certified pure substance",
    source="benzoic acid holds no sulfur",
    standing="derived",
    valid={"sulfur": (0.0, 100.0)},
    needs=("is_number(sulfur) or (role == 'control' and basis != 'dry')",),
)
def sulfur_for_wash(sulfur: PERCENT_OR_BLANK, role: TEXT, basis: TEXT_OR_BLANK) -> PERCENT:
    """Sulfur of the charge; a control whose book value is dry is a fuel and waits for its sulfur."""
    return sulfur if is_number(sulfur) else 0


@cell(
    "IN_OTHER_UNIT",
    equation="value / unit",
    source="definition of the unit, on the Constants tab",
    standing="derived",
    valid={"divisor": (1e-9, 1e9)},
)
def in_other_unit(value: J_PER_G, divisor: J_PER_G) -> ONE:
    """A value in the unit chosen at issue; divisor: that unit in J/g."""
    return value / divisor
