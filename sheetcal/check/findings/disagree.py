"""Where the witnesses do not agree: stored against formula, formula against the balance of the physics."""

from __future__ import annotations

from sheetcal.check.balance import Balance
from sheetcal.check.case import Case
from sheetcal.check.causes import of_value
from sheetcal.model import Place, ResultLine, Value


def replay_tolerance(one: Value, other: Value, step: float | None) -> float:
    """How far two evaluations of one formula may lie apart."""
    sizes = [abs(float(x)) for x in (one, other) if isinstance(x, float | int)]
    return 1e-9 * max(sizes, default=0.0) + 1e-6 * (step or 0.0)


def agree(one: Value, other: Value, step: float | None) -> bool:
    """Whether typed and formula are the same within the replay tolerance; blanks equal blanks."""
    if _number(one) and _number(other):
        return abs(one - other) <= replay_tolerance(one, other, step)  # type: ignore[operator]
    return (one in (None, "") and other in (None, "")) or one == other


def look(case: Case, explained: set[str]) -> list[ResultLine]:
    """A line for every result in use, and findings on disagreements that no other finding explains."""
    lines = []
    silent = not case.parts.typed
    for one, formula in case.witnessed.results.items():
        place = case.parts.skeleton.places[one]
        typed = case.parts.typed.get(one)
        balance = case.balances.get(one)
        lines.append(_line(place, typed, formula, balance, silent))
        if one in explained:
            continue
        if not silent and not agree(typed, formula, place.field.resolution):
            _stale(case, place, typed, formula)
        elif balance is not None and not _balanced(formula, balance):
            _disagrees(case, place, formula, balance)
    return lines


def _line(place: Place, typed: Value, formula: Value, balance: Balance | None, silent: bool) -> ResultLine:
    step = place.field.step
    assert step is not None
    agrees: bool | None = None
    spoken = sum(value is not None for value in (typed, formula)) + (balance is not None)
    if spoken >= 2:
        agrees = (silent or typed is None or formula is None or agree(typed, formula, place.field.resolution)) and (
            balance is None or _balanced(formula if formula is not None else typed, balance)
        )
    return ResultLine(
        place.id,
        place.field.label,
        place.field.unit,
        place.where,
        typed,
        formula,
        balance.value if balance else None,
        None,
        agrees,
        step.reported,
        balance.tolerance if balance else None,
    )


def _balanced(value: Value, balance: Balance) -> bool:
    if not _number(value):
        return value is None
    if abs(float(value) - balance.value) > balance.tolerance:  # type: ignore[arg-type]
        return False
    if balance.end_to_end is None or balance.end_to_end_tolerance is None:
        return True
    return abs(float(value) - balance.end_to_end) <= balance.end_to_end_tolerance  # type: ignore[arg-type]


def _stale(case: Case, place: Place, typed: Value, formula: Value) -> None:
    causes: list[str] = []
    if _number(typed) and _number(formula):
        causes = of_value(float(typed), float(formula))  # type: ignore[arg-type]
    shown = "nothing" if typed is None else typed
    case.add(
        "result-stale", place.id,
        f"{place.field.label.lower()}: stored is {shown}, its own formula gives {'nothing' if formula is None else formula}",
        found=typed, expected=formula, causes=tuple(causes),
        likely_cause=causes[0] if causes else "saved without recalculation, or the stored value was forged",
    )  # fmt: skip


def _disagrees(case: Case, place: Place, formula: Value, balance: Balance) -> None:
    end = balance.end_to_end
    stage = _number(formula) and abs(float(formula) - balance.value) > balance.tolerance  # type: ignore[arg-type]
    right = balance.value if stage or end is None else end
    road = "the balance of the step" if stage else "the balance from the readings"
    causes = of_value(float(formula), right) if _number(formula) else []  # type: ignore[arg-type]
    case.add(
        "result-disagrees", place.id, f"{place.field.label.lower()}: {road} gives {right:.8g} {place.field.unit}",
        found=formula, expected=right, causes=tuple(causes), likely_cause=causes[0] if causes else None,
    )  # fmt: skip


def _number(value: Value) -> bool:
    return isinstance(value, float | int) and not isinstance(value, bool)
