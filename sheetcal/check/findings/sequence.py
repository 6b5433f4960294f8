"""The order of the work: runs that overlap, runs dropped without a word, moments between two readings, odd titres."""

from __future__ import annotations

from datetime import datetime, timedelta
from itertools import pairwise
from statistics import median

from sheetcal.check.case import Case, called, is_number
from sheetcal.check.completeness import UNCOUNTED
from sheetcal.check.rule_causes import as_minutes, of_titre, titre
from sheetcal.kinds.dates import moment_of

FIRED = ("calibration", "fuel")
OF_RECORD = 0.8  # of a record's length: starts are typed to the minute, and one may mean the filling
SHORTEST = 5.0  # min between two firings where no record tells
OPEN = "planned"
NEARLY_ALL = 0.8  # of the readings of a run that counts
TITRE_APART, TITRE_RATIO = 4.0, 2.0  # mL; measured on the simulated bench: none of 3000 pairs of duplicates
TITRE_ALARM = 1e-3
OFF_GRID = 0.01  # one of the hundred decimals a moment may have
MOMENT = 1e-6
NEVER_ZERO = ("sulfur", "nitrogen", "hydrogen", "carbon", "ash")
MAY_BE_ZERO = ("liquid", "waste", "unknown")  # classes of fuel
ZERO_ALARM = 0.01


def look(case: Case) -> None:
    """Findings on how the runs of the workbook followed each other."""
    _dropped(case)
    _gaps(case)
    if case.parts.kind.name in FIRED:
        _overlapping(case)
        _off_record(case)
        _titres(case)
    if "sample" in case.parts.kind.scopes:
        _zeros(case)
        _reference_as_sample(case)


# --- runs -------------------------------------------------------------------------------------------------


def _moment(case: Case, run: str) -> datetime | None:
    day = None if f"{run}.date" in case.spoiled else case.number(f"{run}.date")
    return None if f"{run}.start" in case.spoiled else moment_of(day, case.value(f"{run}.start"))


def _overlapping(case: Case) -> None:
    """Two firings in one calorimeter, the second before the first can have ended."""
    twice = {(one.field or "").partition(".")[0] for one in case.found if one.code == "runs-equal"}
    once = [run for run in case.runs() if run not in twice]
    timed = sorted((moment, run) for run in once if (moment := _moment(case, run)) is not None)
    for (start, first), (after, second) in pairwise(timed):
        if not case.is_counted(first):
            continue
        least = timedelta(minutes=_length(case, first))
        if after - start < least:
            minutes = (after - start).total_seconds() / 60.0
            case.add(
                "runs-overlap", f"{second}.start",
                f"{second} starts {minutes:.0f} min after {first}, which takes longer in the same calorimeter",
                "warning",
                found=case.text(f"{second}.start"), expected=f"{start + least:%H:%M} or later",
                likely_cause="the start was typed wrongly, or the run was not made",
            )  # fmt: skip


def _length(case: Case, run: str) -> float:
    times = case.parts.readings.get(f"{run}.record_time")
    listed = [float(one) for one in times if is_number(one)] if isinstance(times, list) else []
    usable = len(listed) > 1 and f"{run}.record_time" not in case.spoiled
    return max(OF_RECORD * (listed[-1] - listed[0]), 0.0) if usable and listed[-1] < 120.0 else SHORTEST


def _dropped(case: Case) -> None:
    """A run that was made and is neither valid nor void, beside runs enough that count."""
    states = {run: case.text(f"{run}.state") for run in case.runs()}
    for run, state in states.items():
        if state not in (OPEN, "not needed"):
            continue
        sample = case.sample_of(run)
        valid = [one for one, other in states.items() if other == "valid" and case.sample_of(one) == sample]
        needed = case.number(f"{sample}.runs_required" if sample else "sheet.runs_required")
        full = min((_typed(case, one) for one in valid), default=0)
        if needed is not None and len(valid) >= needed and full and _typed(case, run) >= NEARLY_ALL * full:
            case.add(
                "run-dropped", f"{run}.state", f"{run} was made, but counts neither as valid nor as void", "warning",
                found=state, expected="valid, or void with its reason",
                likely_cause="the run was left out, or its state was not chosen",
            )  # fmt: skip


def _typed(case: Case, run: str) -> int:
    return sum(is_number(value) for one, value in case.parts.readings.items() if one.startswith(f"{run}."))


def _gaps(case: Case) -> None:
    """A reserve place passed over: what stood there may have been deleted."""
    begun = {run for run in case.runs() if case.parts.readings.get(f"{run}.date") is not None}
    required = {one.partition(".")[0] for one in case.missing}
    places = [block for block in case.anchors if block.startswith("run")]
    for place, block in enumerate(places[:-1]):
        follower = places[place + 1]
        same = case.sample_of(block) == case.sample_of(follower)
        if block not in begun and block not in required and same and follower in begun and not _unneeded(case, block):
            case.add(
                "run-gap", f"{follower}.date", f"{follower} is filled, but the place of {block} before it is empty",
                "warning", likely_cause=f"the readings of {block} were deleted, or the wrong place was filled",
            )  # fmt: skip


def _unneeded(case: Case, block: str) -> bool:
    return case.text(f"{block}.state") in UNCOUNTED


# --- readings ---------------------------------------------------------------------------------------------


def _off_record(case: Case) -> None:
    """5.30 where the record has no reading at 5.30 but one at 5.50."""
    for run in case.runs():
        times = case.parts.readings.get(f"{run}.record_time")
        listed = [float(one) for one in times if is_number(one)] if isinstance(times, list) else []
        for name in ("firing_time", "end_of_main"):
            one, typed = f"{run}.{name}", case.number(f"{run}.{name}")
            meant = as_minutes(typed) if typed is not None and listed and one not in case.spoiled else None
            if typed is None or meant is None or _has(listed, typed) or not _has(listed, meant):
                continue
            case.add(
                "moment-off-record", one,
                f"{_label(case, one)}: the record has no reading at {typed:.2f} min, but one at {meant:g}", "warning",
                found=typed, expected=meant, certain=False, false_alarm=OFF_GRID,
                likely_cause=f"minutes and seconds were probably typed: {typed:.2f} for {meant:g} min",
            )  # fmt: skip


def _label(case: Case, one: str) -> str:
    return called(case.place(one)[0].field.label)


def _has(times: list[float], moment: float) -> bool:
    return any(abs(one - moment) < MOMENT for one in times)


def _titres(case: Case) -> None:
    """A titre far from that of its duplicates, where no limit says so already."""
    told = {(one.field or "").partition(".")[0] for one in case.found if one.code.startswith(("nitric", "burette"))}
    for sample in case.samples():
        runs = [run for run in case.runs(sample) if case.is_counted(run)]
        usable = [run for run in runs if case.spoiled.isdisjoint((f"{run}.burette_start", f"{run}.burette_end"))]
        titres = {run: value for run in usable if (value := titre(case, run)) is not None and value > 0.0}
        for run, value in titres.items():
            others = [other for one, other in titres.items() if one != run]
            if len(others) == 0 or run in told or not told.isdisjoint(titres):
                continue
            middle = median(others)
            if value - middle > TITRE_APART and value > TITRE_RATIO * middle:
                causes = tuple(of_titre(case, run))
                case.add(
                    "titre-unlike", f"{run}.burette_end",
                    f"{run}: titre {value:.2f} mL, that of the duplicate {middle:.2f}", "warning",
                    found=value, expected=middle, certain=False, false_alarm=TITRE_ALARM,
                    likely_cause=causes[0] if causes else None, causes=causes,
                )  # fmt: skip


def _zeros(case: Case) -> None:
    """0 where not determined was meant; of an oil or an ash-free waste it may be true."""
    for sample in case.samples():
        if case.text(f"{sample}.role") != "sample" or case.text(f"{sample}.fuel_class").casefold() in MAY_BE_ZERO:
            continue
        for name in NEVER_ZERO:
            one = f"{sample}.{name}"
            if case.parts.readings.get(one) == 0 and one not in case.mistyped and not case.text(f"{one}_mark"):
                case.add(
                    "zero-not-determined", one, f"{_label(case, one)}: 0 in this class of fuel", "warning",
                    found=0.0, certain=False, false_alarm=ZERO_ALARM,
                    likely_cause="0 was probably typed for `not determined`: leave it blank, or type the limit with <",
                )  # fmt: skip


def _reference_as_sample(case: Case) -> None:
    """A certified lot entered as a sample of a client."""
    lots = {str(row["lot"]).casefold() for row in case.parts.record.tables.get("certified", ())}
    for sample in case.samples():
        name = case.text(f"{sample}.sample_id")
        if case.text(f"{sample}.role") == "sample" and name.casefold() in lots:
            case.add(
                "reference-as-sample", f"{sample}.role",
                f"{name} is a certified lot of the laboratory, but stands here as a sample", "warning",
                found="sample", expected="control",
                likely_cause="the worklist says sample where it should say control",
            )  # fmt: skip
