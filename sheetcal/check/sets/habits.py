"""Habits that show over many runs only: favourite last digits, duplicates closer than the calorimeter can repeat."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass

from sheetcal.check.sets.chances import above_chi_square, below_f
from sheetcal.check.sets.said import Run, Said, distinct, every_run, statistical
from sheetcal.check.sets.summary import WEIGHED, Summary

LEVEL = 1e-3  # one set of honest workbooks in so many gets such a finding
LEAST_DIGITS = 100
LEAST_PAIRS = 10  # degrees of freedom of the duplicates
LEAST_REPEATS = 8  # and of what the calorimeter repeats
DIGITS = 10


@dataclass(frozen=True, slots=True)
class Read:
    """One reading by its last digit: value in whole steps."""

    run: Run
    name: str
    steps: int


def look(books: list[Summary]) -> Iterator[Said]:
    """All findings on habits."""
    runs = every_run(distinct(books))
    yield from end_digits(runs)
    yield from too_close(runs)


def end_digits(runs: list[Run]) -> Iterator[Said]:
    """Last digits of masses and rises, by operator: chi-square against equal shares, for more than 100 readings."""
    groups = {name: reads for name, reads in _by_operator(runs).items() if len(reads) > LEAST_DIGITS}
    for name, reads in groups.items():
        digits = Counter(read.steps % DIGITS for read in reads)
        chance = len(groups) * digit_chance([digits[digit] for digit in range(DIGITS)])
        last = next((read for read in reversed(reads) if read.run.book.checked), None)
        if chance < LEVEL and last:
            yield _favourite(name, reads, digits, chance, last)


def digit_chance(counts: Sequence[int]) -> float:
    """Chance that ten equally likely last digits differ as much as these counts, or more (chi-square, df 9)."""
    expected = sum(counts) / DIGITS
    return above_chi_square(sum((count - expected) ** 2 for count in counts) / expected, DIGITS - 1)


def _by_operator(runs: list[Run]) -> dict[str, list[Read]]:
    """Readings of high resolution by who took them, each kind of reading in the steps it is really read in."""
    kinds: dict[tuple[str, str], list[Read]] = {}
    for run in sorted(runs, key=lambda one: (one.book.latest, one.book.file)):
        for name, value, step in run.fired.fine:
            read = Read(run, name, round(value / step))
            kinds.setdefault((run.fired.operator, "mass" if name in WEIGHED else name), []).append(read)
    found: dict[str, list[Read]] = {}
    for (operator, _), reads in kinds.items():
        found.setdefault(operator, []).extend(_as_read(reads))
    return found


def _as_read(reads: list[Read]) -> list[Read]:
    """In steps of ten where all of them end in 0: such a balance shows one place less than the sheet has."""
    while len(reads) > 5 and all(read.steps % DIGITS == 0 for read in reads) and any(read.steps for read in reads):
        reads = [Read(read.run, read.name, read.steps // DIGITS) for read in reads]
    return reads


def _favourite(name: str, reads: list[Read], digits: Counter[int], chance: float, last: Read) -> Said:
    often = [str(digit) for digit, number in digits.most_common() if number > 1.5 * len(reads) / DIGITS] or ["few"]
    files = len({read.run.book.file for read in reads})
    message = (
        f"last digits of {len(reads)} readings by {name or 'an unnamed operator'} in {files} workbooks are not evenly "
        f"spread: {', '.join(often[:3])} too often"
    )
    cause = "readings estimated or rounded in the head"
    facts = {"likely_cause": cause, **statistical(chance)}
    return Said("digits-preferred", last.run.book.file, last.run.at(last.name), message, "note", facts)


def too_close(runs: list[Run]) -> Iterator[Said]:
    """Duplicates, by operator, against what calibrations and controls of one day repeat: ratio of variances."""
    repeats = _pooled(_sets(run for run in runs if run.fired.role in ("calibration", "control")))
    if repeats is None or repeats[1] < LEAST_REPEATS:
        return
    samples = [run for run in runs if run.fired.role in ("sample", "")]
    by_operator: dict[str, list[Run]] = {}
    for run in samples:
        by_operator.setdefault(run.fired.operator, []).append(run)
    pooled = {name: _pooled(_sets(of_one)) for name, of_one in by_operator.items()}
    enough = {name: one for name, one in pooled.items() if one and one[1] >= LEAST_PAIRS}
    for name, (variance, freedom) in enough.items():
        chance = len(enough) * below_f(variance / repeats[0], freedom, repeats[1])
        last = next((run for run in reversed(by_operator[name]) if run.book.checked), None)
        if chance < LEVEL and last:
            yield _close(name, variance, freedom, repeats, chance, last)


def _sets(runs: Iterable[Run]) -> list[list[float]]:
    """Values that ought to repeat: of one sample, or of one vessel calibrated or controlled on one workbook."""
    groups: dict[tuple[str, str | None, str], list[float]] = {}
    for run in runs:
        if run.fired.counts and run.fired.value:
            vessel = "" if run.fired.role in ("sample", "") else run.fired.typed_vessel
            groups.setdefault((run.book.file, run.fired.sample, vessel), []).append(run.fired.value)
    return [values for values in groups.values() if len(values) > 1 and min(values) > 0.0]


def _pooled(groups: list[list[float]]) -> tuple[float, int] | None:
    """(relative variance, degrees of freedom) within groups; None without any, or where nothing varies."""
    freedom = sum(len(values) - 1 for values in groups)
    total = 0.0
    for values in groups:
        mean = sum(values) / len(values)
        total += sum((value / mean - 1.0) ** 2 for value in values)
    return (total / freedom, freedom) if freedom else None


def _close(name: str, variance: float, freedom: int, repeats: tuple[float, int], chance: float, last: Run) -> Said:
    message = (
        f"duplicates by {name or 'an unnamed operator'} agree too well: {100.0 * variance**0.5:.3f} % over {freedom} "
        f"pairs, while calibrations and controls repeat to {100.0 * repeats[0] ** 0.5:.3f} %"
    )
    cause = "runs chosen, or values made to agree"
    facts = {"likely_cause": cause, **statistical(chance)}
    place = f"{last.fired.sample}.range" if last.fired.sample else last.at("state")
    return Said("duplicates-too-close", last.book.file, place, message, "warning", facts)
