"""Runs against each other and against the logger: exchanges, another run's file, titrants, controls."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace
from datetime import datetime
from itertools import combinations
from statistics import median

from sheetcal.check.case import Case
from sheetcal.check.replay import replay
from sheetcal.kinds.dates import iso
from sheetcal.model import Value

CLOCK_MINUTES = 10.0  # a logger started by hand is within this of the start typed


def look(case: Case) -> None:
    """Findings that need more than one run, or the run and its logger file."""
    if "sample" not in case.parts.kind.scopes:
        return
    _logger_start(case)
    _titrants(case)
    _controls(case)
    _exchanges(case)


def _moment(case: Case, run: str) -> datetime | None:
    day, start = case.number(f"{run}.date"), case.text(f"{run}.start")
    if day is None or len(start) != 5:
        return None
    try:
        return datetime.fromisoformat(f"{iso(day, False)}T{start}")
    except ValueError:
        return None


def _logger_start(case: Case) -> None:
    """A record that started at another time than the run; one common offset is the logger's clock."""
    offsets: dict[str, float] = {}
    for run in case.runs():
        moment, text = _moment(case, run), case.text(f"{run}.record_start")
        try:
            started = datetime.fromisoformat(text)
        except ValueError:
            continue
        if moment is not None:
            offsets[run] = (started - moment).total_seconds() / 60.0
    if not offsets:
        return
    usual = median(offsets.values()) if len(offsets) > 2 else 0.0
    for run, offset in offsets.items():
        if abs(offset - usual) > CLOCK_MINUTES:
            case.add(
                "record-of-another-run", f"{run}.record_start",
                f"{run}: the logger file {case.text(f'{run}.record_file')} started {abs(offset):.0f} min "
                f"{'after' if offset > 0 else 'before'} the run",
                found=case.text(f"{run}.record_start"), expected=f"within {CLOCK_MINUTES:g} min of the start",
                likely_cause="the record of another run was loaded",
            )  # fmt: skip


def _titrants(case: Case) -> None:
    """Two titrants in one sample on one day: right when a bottle ran out, worth a look."""
    for sample in _samples(case):
        lots: dict[float, dict[str, str]] = {}
        for run in case.runs(sample):
            day, lot = case.number(f"{run}.date"), case.text(f"{run}.titrant_lot")
            if day is not None and lot:
                lots.setdefault(day, {}).setdefault(lot, run)
        for of_day in lots.values():
            if len(of_day) > 1:
                lot, run = min(of_day.items(), key=lambda pair: pair[0])
                others = ", ".join(sorted(set(of_day) - {lot}))
                case.add(
                    "titrant-of-the-day", f"{run}.titrant_lot",
                    f"{run}: titrant {lot}, but {others} in another run of the sample that day", "note",
                    found=lot, expected=others, effect=case.effect(f"{run}.", {f"{run}.titrant_lot": sorted(set(of_day) - {lot})[0]}),
                )  # fmt: skip


def _samples(case: Case) -> list[str]:
    return [f"sample{number}" for number in range(1, case.parts.skeleton.shape.samples + 1)]


def _controls(case: Case) -> None:
    """Every vessel needs a sound control on the day, on this sheet or cited."""
    covered: set[tuple[str, float]] = set()
    needing: dict[tuple[str, float], str] = {}
    for run in case.runs():
        if case.text(f"{run}.state") != "valid":
            continue
        day, vessel = case.number(f"{run}.date"), case.text(f"{run}.vessel")
        if day is None or not vessel:
            continue
        if case.text(f"{case.sample_of(run)}.role") == "control":
            covered.add((vessel, day))
        elif not case.text(f"{run}.control_ref") and not case.text("sheet.control_ref"):
            needing.setdefault((vessel, day), run)
    for (vessel, day), run in needing.items():
        if (vessel, day) not in covered:
            case.add(
                "control-missing", f"{run}.vessel",
                f"{run}: no control of vessel {vessel} on {iso(day, False)}, and none cited", "warning",
                likely_cause="the control stands in another workbook and was not cited",
            )  # fmt: skip


def _exchanges(case: Case) -> None:
    """Samples whose runs do not agree: try exchanging records, or sample and aid, and see whether both come right."""
    results = replay(case.parts, case.repairs) if case.repairs else case.witnessed.results
    failing = [sample for sample in _samples(case) if _fails(case, sample, results)]
    explained: set[str] = set()
    for one, other in combinations(failing, 2):
        for first, second in _pairs(case, one, other):
            swap = {
                f"{first}.corrected_rise": case.value(f"{second}.corrected_rise"),
                f"{second}.corrected_rise": case.value(f"{first}.corrected_rise"),
            }
            if _cures(case, swap, (one, other)):
                _exchanged_records(case, first, second, swap)
                explained |= {one, other}
    for sample in failing:
        if sample not in explained:
            _sample_and_aid(case, sample)


def _fails(case: Case, sample: str, results: Mapping[str, Value]) -> bool:
    span, limit = results.get(f"{sample}.range"), results.get(f"{sample}.critical_range")
    return isinstance(span, float | int) and isinstance(limit, float | int) and span > limit


def _pairs(case: Case, one: str, other: str) -> Iterator[tuple[str, str]]:
    for first in case.runs(one):
        for second in case.runs(other):
            if case.text(f"{first}.rise_source") == case.text(f"{second}.rise_source") != "":
                yield first, second


def _cures(case: Case, changed: Mapping[str, Value], samples: tuple[str, ...]) -> bool:
    results = replay(case.parts, {**case.repairs, **changed})
    return all(results.get(f"{sample}.range") is not None and not _fails(case, sample, results) for sample in samples)


def _exchanged_records(case: Case, first: str, second: str, swap: Mapping[str, Value]) -> None:
    cause = f"the records of {first} and {second} were probably exchanged: exchanged back, both samples agree within their limit"
    for run in (first, second):
        one = f"{run}.record_time" if case.text(f"{run}.rise_source") == "record" else f"{run}.instrument_rise"
        place, cell = case.place(one)
        anchor = cell.partition(":")[0]
        case.add(
            "records-exchanged",
            one,
            f"{run}: {cause}",
            likely_cause=cause,
            effect=case.effect(f"{run}.", swap),
        )
        case.found[-1] = replace(case.found[-1], cell=anchor)


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
