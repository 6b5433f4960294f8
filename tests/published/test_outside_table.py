"""All outside checks of this folder in one table: source, rows, largest deviation, tolerance (show it with -s)."""

from __future__ import annotations

import test_combustion_table
import test_constants
import test_heat_capacities
import test_quality_factors
import test_synthetic_records
import test_vaporisation_table
import test_worked_examples
from outside import CHECKS, Check, of

MODULES = (
    test_worked_examples, test_combustion_table, test_vaporisation_table, test_heat_capacities, test_constants,
    test_synthetic_records, test_quality_factors,
)  # fmt: skip


def line(check: Check) -> str:
    """One row of the table, as Markdown."""
    unit = f" {check.unit}" if check.unit else ""
    shown = f"{check.largest:.2g}{unit}" if check.largest else "0"
    allowed = f"{check.tolerance:.3g}{unit}" if check.tolerance else "exact"
    return f"| {check.what} | {check.source} | {len(check.measured)} | {shown} | {allowed} |"


def test_print_the_table() -> None:
    """Every check is in the table once, and none is beyond its tolerance."""
    listed = [check for module in MODULES for check in of(module.__name__)]
    assert len(listed) == len(CHECKS) >= 30
    print("\n| what is compared | source | rows | largest deviation | tolerance |\n|---|---|---|---|---|")
    for check in listed:
        print(line(check))
    assert all(check.largest <= check.tolerance for check in listed)
    assert sum(len(check.measured) for check in listed) >= 2000
