"""The balance witness: every result again from the physics, by a road that shares no formula with the sheet.

Two roads are drawn up. Stage by stage, each result is balanced against the value before as the sheet holds it:
only rounded coefficients may differ. End to end, everything comes from the readings, and the tolerance of the
rise is carried through. One module a kind, found by its name.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cache
from importlib import import_module, util

from sheetcal.check.balance.book import Book, Readings, Road, exact, key_of, speaking
from sheetcal.check.balance.measure import LARGEST_SHARE, Measure
from sheetcal.model import IssueRecord, SheetKind, Value

__all__ = ["Balance", "balances"]

BLANK = (None, "")
SILENT_ABOVE = 2.0  # caps
Walk = Callable[[Book, tuple[Road, ...]], None]


@dataclass(slots=True)
class Balance:
    """What the balance says of one result, in the result's unit.

    `value` stands on the value before, `end_to_end` on the readings alone; None where that road is silent.
    """

    value: float
    tolerance: float
    end_to_end: float | None = None
    end_to_end_tolerance: float | None = None


def balances(
    kind: SheetKind,
    record: IssueRecord,
    readings: Readings,
    results: Mapping[str, Value],
) -> dict[str, Balance]:
    """The balance of every result that the kind lets it speak on and whose inputs are complete.

    readings: by field id, dates as ISO text or serial numbers, series as lists. results: the values the sheet
    holds, by id; they serve as the value before, and where one is blank the balance has nothing to say.
    """
    walk = _walk_of(kind.name)
    if walk is None:
        return {}
    stages, whole = Road(results), Road()
    walk(Book(kind, record, readings), (stages, whole))
    steps = speaking(kind)
    found: dict[str, Balance] = {}
    for one, stage in stages.own.items():
        step = steps.get(key_of(one))
        if step is not None and results.get(one, 0.0) not in BLANK:
            found[one] = _balance(stage, whole.own.get(one), step)
    return found


def _balance(stage: Measure, whole: Measure | None, step: float) -> Balance:
    """A long road that would need far more than the cap, as after a misfire, has nothing to say."""
    if whole is None or whole.tolerance > SILENT_ABOVE * _cap(whole):
        return Balance(stage.value, _width(stage, step))
    return Balance(stage.value, _width(stage, step), whole.value, _width(whole, step))


def _cap(measure: Measure) -> float:
    return max(LARGEST_SHARE * max(measure.largest, abs(measure.value)), measure.absolute)


def _width(measure: Measure, step: float) -> float:
    """The tolerance, never wider than its cap, plus what any two sums of doubles may differ in."""
    return min(measure.tolerance, _cap(measure)) + exact(measure.value, step)


@cache
def _walk_of(kind: str) -> Walk | None:
    """The walk of a kind's module, None where the kind has no balance."""
    name = f"{__name__}.{kind.replace('-', '_')}"
    if util.find_spec(name) is None:
        return None
    walk: Walk = import_module(name).walk
    return walk
