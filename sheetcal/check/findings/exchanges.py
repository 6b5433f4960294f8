"""Exchanges: of two runs' records, or of sample and aid in one run. Proved by putting them back."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from itertools import combinations

from sheetcal.check.case import Case, is_number
from sheetcal.model import Value

MOST = 2000  # pairs of runs looked at; more than that many failing samples have another cause


def look(case: Case) -> None:
    """Samples whose runs do not agree: try exchanges, and see whether that brings them right."""
    failing = [sample for sample in case.samples() if _fails(case, sample, {})]
    explained: set[str] = set()
    tried = 0
    for one, other in combinations(failing, 2):
        for first, second in _pairs(case, one, other):
            tried += 1
            if tried > MOST or {one, other} & explained:
                break
            swap = _rises(case, first, second)
            if _may_cure(case, first, second, one, other) and _cures(case, swap, (one, other)):
                _exchanged_records(case, first, second, swap)
                explained |= {one, other}
    for sample in failing:
        if sample not in explained:
            _sample_and_aid(case, sample)


def _fails(case: Case, sample: str, changed: Mapping[str, Value]) -> bool:
    """Whether the range of the runs that count is above the limit."""
    values = _values(case, changed, [f"{sample}.range", f"{sample}.critical_range"])
    span, limit = values
    return is_number(span) and is_number(limit) and span > limit


def _values(case: Case, changed: Mapping[str, Value], ids: list[str]) -> list[Value]:
    if not changed:
        return [case.value(one) for one in ids]
    return list(case.right.values(ids, {**case.repairs, **changed}).values())


def _pairs(case: Case, one: str, other: str) -> Iterator[tuple[str, str]]:
    """Runs of two samples that count and whose rises come by the same road."""
    for first in case.runs(one):
        for second in case.runs(other):
            same = case.text(f"{first}.rise_source") == case.text(f"{second}.rise_source") != ""
            if same and case.is_counted(first) and case.is_counted(second):
                yield first, second


def _rises(case: Case, first: str, second: str) -> dict[str, Value]:
    return {
        f"{first}.corrected_rise": case.value(f"{second}.corrected_rise"),
        f"{second}.corrected_rise": case.value(f"{first}.corrected_rise"),
    }


def _may_cure(case: Case, first: str, second: str, one: str, other: str) -> bool:
    """A quick estimate: heat is heat capacity times rise, so each gross value moves by C (rise' - rise)/m."""
    return _moved(case, first, second, one) and _moved(case, second, first, other)


def _moved(case: Case, run: str, source: str, sample: str) -> bool:
    names = ("gross_run", "heat_capacity_used", "corrected_rise", "mass")
    gross, capacity, rise, mass = (case.number(f"{run}.{name}") for name in names)
    new, limit = case.number(f"{source}.corrected_rise"), case.number(f"{sample}.critical_range")
    if gross is None or capacity is None or rise is None or not mass or new is None or limit is None:
        return False
    others = [
        case.number(f"{other}.gross_run") for other in case.runs(sample) if other != run and case.is_counted(other)
    ]
    moved = gross + capacity * (new - rise) / mass
    return any(value is not None and abs(value - moved) < 3.0 * limit for value in others)


def _cures(case: Case, changed: Mapping[str, Value], samples: tuple[str, ...]) -> bool:
    spans = _values(case, changed, [f"{sample}.range" for sample in samples])
    return None not in spans and not any(_fails(case, sample, changed) for sample in samples)


def _exchanged_records(case: Case, first: str, second: str, swap: Mapping[str, Value]) -> None:
    cause = (
        f"the records of {first} and {second} were probably exchanged: "
        "exchanged back, both samples agree within their limit"
    )
    for run in (first, second):
        source = "record_time" if case.text(f"{run}.rise_source") == "record" else "instrument_rise"
        case.add(
            "records-exchanged", f"{run}.{source}", f"{run}: {cause}", likely_cause=cause,
            effect=case.effect(f"{run}.", {**case.repairs, **swap}),
        )  # fmt: skip
    case.exchanged |= {first, second}
    case.repairs.update(swap)


def _sample_and_aid(case: Case, sample: str) -> None:
    for run in case.runs(sample):
        mass, aid = case.number(f"{run}.sample_mass"), case.number(f"{run}.aid1_mass")
        if mass is None or aid is None:
            continue
        swap: dict[str, Value] = {f"{run}.sample_mass": aid, f"{run}.aid1_mass": mass}
        if _cures(case, swap, (sample,)):
            cause = "sample and aid were probably typed in each other's cell: exchanged back, the runs agree"
            case.add(
                "masses-exchanged", f"{run}.sample_mass", f"{run}: {cause}", found=mass, expected=aid,
                likely_cause=cause, effect=case.effect(f"{run}.", swap),
            )  # fmt: skip
            case.repairs.update(swap)
            return
