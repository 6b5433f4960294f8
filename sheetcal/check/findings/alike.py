"""Runs that are too much alike: the same record twice, values filled down, counted up, rounded or averaged.

Statistical findings state their false-alarm chance. It stands on what two honest readings have in common: a mass
read to 0.1 mg in a band of 0.2 g is that of another run in 1 case of 2000, a rise to 0.1 mK in one of 14 000, and a
last digit is 0 in one of ten.
"""

from __future__ import annotations

from collections import Counter
from itertools import combinations, pairwise
from math import comb

from sheetcal.check.case import Case, called, is_number
from sheetcal.check.meant import decimals_of
from sheetcal.check.reasons import decimals

FIRED = ("calibration", "fuel")
SAME_MASS, SAME_RISE = 5e-4, 7e-5
RARE = 1e-3  # a statistical finding is made below this chance
RARE_ZEROS = 1e-4  # ... of which every workbook has several chances
LEAST_RECORD = 10  # readings
FINEST = 4  # trailing zeros that count
SPARE_DIGITS = 3  # beyond the instrument's: a balance's file may give two more
OVERLONG = 0.01
WEIGHED = ("sample_mass", "pellet_mass", "crucible_gross")
RISES = ("instrument_rise", "adiabatic_end", "three_temperature_c")


def look(case: Case) -> None:
    """Findings on runs of one workbook compared with each other."""
    if case.parts.kind.name in FIRED:
        equal = _equal_runs(case)
        _filled_down(case, equal)
        _in_series(case)
        _coarse(case)
    _overlong(case)


def _typed(case: Case, name: str) -> dict[str, float]:
    """A reading of every run begun, where it is a number, in order."""
    found = {}
    for run in case.runs():
        value = case.parts.readings.get(f"{run}.{name}")
        if is_number(value) and f"{run}.{name}" not in case.mistyped:
            found[run] = float(value)
    return found


def _name(case: Case, run: str) -> str:
    """The first of the weighed readings a run has."""
    return next((name for name in (*WEIGHED, *RISES) if f"{run}.{name}" in case.parts.readings), "date")


def _equal_runs(case: Case) -> set[str]:
    """Runs whose record, or whose mass and rise, are those of an earlier run."""
    equal: set[str] = set()
    masses = {run: case.number(f"{run}.{'pellet_mass' if _pellets(case) else 'mass'}") for run in case.runs()}
    rises = {name: _typed(case, name) for name in RISES}
    for first, second in combinations(case.runs(), 2):
        record, other = (case.parts.readings.get(f"{run}.record_temperature") for run in (first, second))
        mass = masses[first] is not None and masses[first] == masses[second]
        rise = any(first in one and one[first] == one.get(second) for one in rises.values())
        if isinstance(record, list) and record == other and len(record) >= LEAST_RECORD:
            what, at = "every reading of the record", "record_temperature"
        elif mass and rise:
            what, at = "mass and rise", _name(case, second)
        else:
            continue
        equal.add(second)
        case.add(
            "runs-equal", f"{second}.{at}", f"{second}: {what} are those of {first}", found=second, expected=None,
            likely_cause=f"the readings of {first} were entered a second time, or its record was loaded twice",
        )  # fmt: skip
    return equal


def _pellets(case: Case) -> bool:
    return "run1.pellet_mass" in case.parts.skeleton.places


def _filled_down(case: Case, equal: set[str]) -> None:
    """Three equal masses, or two equal rises where few runs were made."""
    for names, chance, least in ((WEIGHED[:2], SAME_MASS, 3), (RISES, SAME_RISE, 2)):
        for name in names:
            typed = {run: value for run, value in _typed(case, name).items() if run not in equal}
            for value, count in Counter(typed.values()).items():
                alarm = comb(len(typed), count) * chance ** (count - 1)
                if count >= least and alarm < RARE:
                    runs = [run for run, one in typed.items() if one == value]
                    _suspect(case, "readings-filled-down", f"{runs[1]}.{name}", value, alarm,
                             f"the same value in {', '.join(runs)}",
                             "one value was probably filled down the line")  # fmt: skip


def _in_series(case: Case) -> None:
    """Masses that rise by the same step from run to run, as a spreadsheet continues a series."""
    for name in WEIGHED[:2]:
        typed = list(_typed(case, name).items())
        start = 0
        for end in range(2, len(typed) + 1):
            if end < len(typed) and start + 1 < end and _continues([value for _, value in typed[start : end + 1]]):
                continue
            length = end - start
            alarm = len(typed) * SAME_MASS ** (length - 2)
            if length >= 3 and alarm < RARE:
                step = typed[start + 1][1] - typed[start][1]
                _suspect(case, "readings-in-series", f"{typed[start + 1][0]}.{name}", typed[start + 1][1], alarm,
                         f"{length} runs in a row differ by {step:+.4f} each",
                         "the line was probably continued as a series by the program")  # fmt: skip
            start = end - 1


def _continues(values: list[float]) -> bool:
    steps = [later - earlier for earlier, later in pairwise(values)]
    return steps[0] != 0.0 and all(abs(step - steps[0]) < 1e-9 for step in steps)


def _coarse(case: Case) -> None:
    """More zeros at the end than a balance gives by chance."""
    for name in WEIGHED:
        typed = _typed(case, name)
        places = decimals(case.parts.kind.by_key()[f"run.{name}"].resolution) if typed else None
        if places is None or len(typed) < 2:
            continue
        zeros = {run: min(max(places - decimals_of(value), 0), FINEST) for run, value in typed.items()}
        whole, count = sum(zeros.values()), len(typed)
        alarm = comb(count + whole - 1, whole) * 10.0**-whole
        if alarm < RARE_ZEROS:
            run = max(zeros, key=lambda one: zeros[one])
            _suspect(case, "readings-coarse", f"{run}.{name}", typed[run], alarm,
                     f"{whole} zeros at the end of {count} values read to {places} decimals",
                     "rounded figures were probably typed")  # fmt: skip


def _overlong(case: Case) -> None:
    """More digits than the instrument gives, where the other runs have no more than it gives."""
    fields = [
        fld for fld in case.parts.kind.fields
        if (fld.scope, fld.origin, fld.type) == ("run", "person", "number") and fld.step is None and not fld.series
    ]  # fmt: skip
    for fld in fields:
        places = decimals(fld.resolution)
        typed = _typed(case, fld.name) if places is not None else {}
        long = [run for run, value in typed.items() if places is not None and _beyond(value, places + SPARE_DIGITS - 1)]
        if places is None or not long or 2 * len(long) > len(typed):
            continue
        for run in long:
            others = [value for other, value in typed.items() if other not in long]
            pairs = [pair for pair in combinations(others, 2) if abs(sum(pair) / 2 - typed[run]) < 0.51 * 10.0**-places]
            average = abs(sum(others) / len(others) - typed[run]) < 1e-6 or bool(pairs and len(others) <= 3)
            cause = (
                "the average of other runs was probably pasted" if average else "a computed value was probably pasted"
            )
            _suspect(case, "reading-overlong", f"{run}.{fld.name}", typed[run], OVERLONG,
                     f"more digits than the instrument gives ({places} decimals)", cause)  # fmt: skip


def _beyond(value: float, places: int) -> bool:
    """Whether a number has more decimals than `places`, the last bits of a computer's sum apart."""
    return abs(value - round(value, places)) > 1e-9 * max(abs(value), 1.0)


def _suspect(case: Case, code: str, one: str, value: float, alarm: float, what: str, cause: str) -> None:
    label = called(case.place(one)[0].field.label)
    case.add(
        code, one, f"{label}: {what}", "warning", found=value, certain=False, false_alarm=alarm, likely_cause=cause
    )
