"""The bench: from how things really are to what was read of them, for demonstration and for tests.

It works backwards from the physics (heat set free, true rise, temperature record, scatter, last digit) and
shares nothing with the cell functions or the balances. One seed gives one set of readings on every machine.
"""

from __future__ import annotations

from collections.abc import Sequence

from sheetcal.bench import calibration, equilibrium, fuel, mixing, vaporisation
from sheetcal.bench.curve import VARIANTS, Bath, Record, Thermometer, Timing, record, temperature
from sheetcal.bench.draw import Dice, stepped
from sheetcal.bench.facts import Facts, Readings
from sheetcal.bench.honest import HONEST_CASES, Habits, cases_of, class_of, habits_of
from sheetcal.bench.materials import MATERIALS, Composition, Truth
from sheetcal.bench.measured import Lot, archive
from sheetcal.errors import BadInput
from sheetcal.model import IssueRecord

__all__ = [
    "HONEST_CASES",
    "MATERIALS",
    "VARIANTS",
    "Bath",
    "Composition",
    "Dice",
    "Habits",
    "Lot",
    "Readings",
    "Record",
    "Thermometer",
    "Timing",
    "Truth",
    "archive",
    "cases_of",
    "class_of",
    "fill",
    "record",
    "stepped",
    "temperature",
]


def fill(issued: IssueRecord, seed: int, case: str | None = None, truths: Sequence[Truth] | None = None) -> Readings:
    """A full set of readings for an issued workbook, by field id; dates as ISO text, series as lists.

    `case` is one of HONEST_CASES; `truths` are what the samples of a fuel workbook really are, else they are
    invented by fuel class. What is locked or already printed does not come again. Raises BadInput for a kind
    or case the bench does not know and for a workbook that lacks what the work needs.
    """
    habits = habits_of(case, issued.kind)
    facts, dice = Facts(issued), Dice("fill", seed)
    makers = {
        "fuel": lambda: fuel.readings(facts, habits, dice, truths),
        "calibration": lambda: calibration.readings(facts, habits, dice),
        "specific-heat": lambda: mixing.readings(facts, habits, dice),
        "vaporisation": lambda: vaporisation.readings(facts, habits, dice),
        "heat-balance": lambda: equilibrium.readings(facts, habits, dice),
    }
    if issued.kind not in makers:
        raise BadInput(f"kind '{issued.kind}'", "has no bench", ", ".join(makers), "Choose one of these.")
    return facts.open(makers[issued.kind]())
