"""Where the witnesses do not agree: stored against formula, formula against the balance of the physics."""

from __future__ import annotations

from sheetcal.check.balance import Balance, balances
from sheetcal.check.case import Case, called, is_number
from sheetcal.check.reasons import of_place
from sheetcal.model import Place, ResultLine, Value

MOST = 5  # more results than this with an old stored value are one save without recalculation


def replay_tolerance(one: Value, other: Value, step: float | None) -> float:
    """How far two evaluations of one formula may lie apart."""
    sizes = [abs(x) for x in (one, other) if is_number(x)]
    return 1e-9 * max(sizes, default=0.0) + 1e-6 * (step or 0.0)


def agree(one: Value, other: Value, step: float | None) -> bool:
    """Whether typed and formula are the same within the replay tolerance; blanks equal blanks."""
    if is_number(one) and is_number(other):
        return abs(one - other) <= replay_tolerance(one, other, step)
    return (one in (None, "") and other in (None, "")) or (type(one) is type(other) and one == other)


def look(case: Case) -> list[ResultLine]:
    """A line for every result in use, and findings on disagreements that no other finding explains."""
    stale: list[str] = []
    unbalanced: list[str] = []
    lines = []
    silent = not case.parts.stores_results
    for one, formula in case.witnessed.results.items():
        place = case.parts.skeleton.places[one]
        typed, balance = case.parts.typed.get(one), case.balances.get(one)
        lines.append(_line(place, typed, formula, balance))
        if not silent and not agree(typed, formula, place.field.resolution):
            stale.append(one)
        elif balance is not None and not _balanced(formula, balance):
            unbalanced.append(one)
    if (stale or unbalanced) and not case.shifted:
        _findings(case, stale, unbalanced)
    return lines


def _findings(case: Case, stale: list[str], unbalanced: list[str]) -> None:
    """Findings on those that nothing before them explains: neither an altered cell nor a result further up.

    What a run without a value gives need not balance: of a void one nothing counts.
    """
    altered = case.stands_on(case.altered | case.mistyped)
    stale = _first(case, [one for one in stale if one not in altered or _is_neither(case, one)])
    explained = altered | case.stands_on({*case.spoiled, *case.repairs})
    for one in stale[:1] if len(stale) > MOST else stale:
        _stale(case, one, len(stale))
    unbalanced = _still_unbalanced(case, unbalanced) if case.altered else unbalanced
    counted = [one for one in unbalanced if one not in explained and case.is_counted(one.partition(".")[0])]
    for one in _first(case, counted):
        _disagrees(case, one, case.balances[one])


def _is_neither(case: Case, one: str) -> bool:
    """Whether what is stored below an altered formula is neither what it gives now nor what the issued one gave."""
    typed = case.parts.typed.get(one)
    if one in case.altered or not is_number(typed) or one in case.stands_on(case.mistyped | case.spoiled):
        return False
    return not agree(typed, case.expected.get(one), case.parts.skeleton.places[one].field.resolution)


def _still_unbalanced(case: Case, ids: list[str]) -> list[str]:
    """Those that do not balance where what was altered is put right, either: a balance may start from such a cell."""
    held = case.witnessed.held(case.parts.typed)
    right = {one: case.expected[one] for one in case.altered if one in case.expected}
    spoken = balances(case.parts.kind, case.parts.record, case.parts.readings, {**held, **right})
    return [one for one in ids if one in spoken and not _balanced(case.witnessed.results[one], spoken[one])]


def _first(case: Case, ids: list[str]) -> list[str]:
    """Those that do not stand on another of them."""
    later = case.stands_on(follower for one in ids for follower in case.feeds.get(one, ()))
    return [one for one in ids if one not in later]


def _line(place: Place, typed: Value, formula: Value, balance: Balance | None) -> ResultLine:
    step = place.field.step
    assert step is not None
    return ResultLine(
        place.id, place.field.label, place.field.unit, place.where, typed, formula, balance.value if balance else None,
        None, _agrees(place, typed, formula, balance), step.reported, balance.tolerance if balance else None,
    )  # fmt: skip


def _agrees(place: Place, typed: Value, formula: Value, balance: Balance | None) -> bool | None:
    """Over the witnesses that spoke; None when fewer than two did."""
    spoken = [value for value in (typed, formula) if value is not None]
    if len(spoken) + (balance is not None) < 2:
        return None
    same = len(spoken) < 2 or agree(typed, formula, place.field.resolution)
    return same and (balance is None or all(_balanced(value, balance) for value in spoken))


def _balanced(value: Value, balance: Balance) -> bool:
    if not is_number(value):
        return value is None
    if abs(float(value) - balance.value) > balance.tolerance:
        return False
    if balance.end_to_end is None or balance.end_to_end_tolerance is None:
        return True
    return abs(float(value) - balance.end_to_end) <= balance.end_to_end_tolerance


def _stale(case: Case, one: str, count: int) -> None:
    place = case.parts.skeleton.places[one]
    typed, formula = case.parts.typed.get(one), case.witnessed.results[one]
    causes = of_place(case, one, typed, formula)
    others = f" (and {count - 1} more results that stand on no other of them)" if count > MOST else ""
    said = f"stored is {_word(typed)}, its own formula gives {_word(formula)}"
    case.add(
        "result-stale", one, f"{called(place.field.label)}: {said}{others}", found=typed, expected=formula,
        causes=tuple(causes), effect=case.effect(one, wrong={one: typed}) if is_number(typed) else None,
        likely_cause=causes[0] if causes else "saved without recalculation, or the stored value was forged",
    )  # fmt: skip


def _word(value: Value) -> str:
    if value is None:
        return "nothing"
    return f"{value:.10g}" if is_number(value) else str(value)


def _disagrees(case: Case, one: str, balance: Balance) -> None:
    place, formula = case.parts.skeleton.places[one], case.witnessed.results[one]
    end = balance.end_to_end
    stage = is_number(formula) and abs(float(formula) - balance.value) > balance.tolerance
    right = balance.value if stage or end is None else end
    road = "the balance of the step" if stage else "the balance from the readings"
    causes = of_place(case, one, formula, right)
    case.add(
        "result-disagrees", one, f"{called(place.field.label)}: {road} gives {right:.8g} {place.field.unit}",
        found=formula, expected=right, causes=tuple(causes), likely_cause=causes[0] if causes else None,
        effect=case.effect(one, right={one: right}),
    )  # fmt: skip
