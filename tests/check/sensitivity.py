"""How small a planted slip the balances of a filled, clean workbook still find.

A slip is planted in what the sheet's formulas see, while the balance sees the workbook as it was issued and
filled: a reading taken from a wrong cell, a constant altered, a formula that gives too much or too little. What
a person types wrong and everybody reads alike is beyond any balance, and is left to ranges and limits.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

from balance_case import Case

from sheetcal.check.balance import Balance, balances
from sheetcal.formulas.compute import Engine
from sheetcal.model import Value

LADDER = (0.005, 0.01, 0.02, 0.05, 0.1, 0.15, 0.3, 1.0, 3.0)  # % of the largest term of the result most moved
PROBE = 1e-4
NOTHING = 1e-9  # % of the largest term: a slip that moves the result by less is none


@dataclass(frozen=True)
class Slip:
    """A planted change: what it is in, how much of it (relative), and the results it leads to."""

    term: str
    results: dict[str, Value]


@dataclass(frozen=True)
class Line:
    """A result of the table: the width of its own balance and the worst slip behind it, % of its largest term."""

    result: str
    own: float
    worst: float
    term: str


def plant(case: Case, term: str, share: float) -> Slip:
    """The sheet's results with one reading, constant or result off by a share of itself."""
    record, readings = case.record, dict(case.readings)
    if term.startswith("const."):
        constants = tuple(
            replace(one, value=one.value * (1 + share)) if one.name == term[6:] else one for one in record.constants
        )
        record = replace(record, constants=constants)
    elif term in readings:
        readings[term] = _scaled(readings[term], share)
    engine = Engine(case.skeleton, record, readings)
    if term in case.results:
        engine.known[term] = _scaled(case.results[term], share)
    return Slip(term, {one: engine.value(one) for one in case.results})


def _scaled(value: Value | list[Value], share: float) -> Value:
    assert isinstance(value, int | float)
    return value * (1 + share)


def terms(case: Case) -> Iterator[str]:
    """Every number the results stand on: readings, constants, and every numeric result before another."""
    yield from (one for one, value in case.readings.items() if _is_number(value))
    yield from (f"const.{one.name}" for one in case.record.constants)
    yield from (one for one, value in case.results.items() if _is_number(value))


def _is_number(value: object) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool) and value != 0


def found_in(case: Case, slip: Slip) -> bool:
    """Whether any balance of the workbook disagrees with the slip's results."""
    seen = balances(case.kind, case.record, case.readings, slip.results)
    return any(disagrees(slip.results[one], balance) for one, balance in seen.items())


def disagrees(result: Value, balance: Balance) -> bool:
    if not isinstance(result, int | float):
        return False
    if abs(result - balance.value) > balance.tolerance:
        return True
    if balance.end_to_end is None or balance.end_to_end_tolerance is None:
        return False
    return abs(result - balance.end_to_end) > balance.end_to_end_tolerance


def effects(case: Case, slip: Slip, behind: dict[str, float]) -> dict[str, float]:
    """% of its largest term by which each result is moved by a slip."""
    found = {}
    for one, largest in behind.items():
        after, before = slip.results[one], case.results[one]
        if isinstance(after, int | float) and isinstance(before, int | float):
            found[one] = abs(100 * (after - before) / largest)
    return found


def first_found(case: Case, term: str, sign: int, behind: dict[str, float]) -> dict[str, float]:
    """What the smallest slip found in a term did to each result; of a slip never found, what the largest did.

    The rungs are those of the result moved most, taken as linear; the effects are the true ones.
    """
    probe = effects(case, plant(case, term, sign * PROBE), behind)
    most = max(probe.values(), default=0.0)
    if most < NOTHING:
        return {}
    moved = probe
    for rung in LADDER:
        slip = plant(case, term, sign * min(rung * PROBE / most, 1.0))
        moved = effects(case, slip, behind)
        if found_in(case, slip):
            break
    return moved


def table(case: Case, largest: dict[str, tuple[str, float]]) -> list[Line]:
    """A line for each reported result; `largest` names the unrounded result behind it and its largest term."""
    behind = dict(largest.values())
    worst = dict.fromkeys(behind, (0.0, "-"))
    for term in terms(case):
        for sign in (1, -1):
            for one, effect in first_found(case, term, sign, behind).items():
                worst[one] = max(worst[one], (effect, term))
    widths = case.balances()
    return [
        Line(reported, 100 * widths[one].tolerance / size, *worst[one]) for reported, (one, size) in largest.items()
    ]


def printed(lines: list[Line]) -> str:
    """The table as text."""
    head = f"{'result':42}{'own tolerance %':>16}{'smallest found %':>18}  worst term"
    rows = [f"{one.result:42}{one.own:16.5f}{one.worst:18.3f}  {one.term}" for one in lines]
    return "\n".join([head, *rows])
