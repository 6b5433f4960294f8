"""Duplicates far apart: slips that, put right, bring them together. Said only where hardly any accident would.

Each slip tried moves a run by some amount. Where it must move by d to agree and a slip of about that size lands
within half the limit r of the others, an accident does so with a chance of about r/(2 d); the chances of all slips
tried of about that size are added, and nothing is said above one in five. The false-alarm chance stated is this sum:
it holds for runs that are far apart for another reason, and honest duplicates are in less than one of ten thousand.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from itertools import combinations
from statistics import median

from sheetcal.check.case import Case, called, is_number
from sheetcal.check.meant import swapped
from sheetcal.check.reasons import decimals
from sheetcal.model import Value

APART = 2.0  # times the limit: nearer duplicates have many explanations
WITHIN = 0.5  # of the limit: what counts as coming right
CHANCE = 0.2
MOST = 60  # slips tried in one sample
DIGITS = ("sample_mass", "crucible_gross", "crucible_tare", "aid1_mass", "instrument_rise", "instrument_gross")
INCLUDED = ("nothing", "wire", "wire and acids", "wire and acids and aids")


@dataclass(frozen=True, slots=True)
class Slip:
    """What would put a slip right, the reading it is said of, and its words."""

    changed: Mapping[str, Value]
    at: str
    words: str


def look(case: Case) -> None:
    """One finding for each sample whose runs a single slip explains."""
    for sample in case.samples():
        span, limit = case.number(f"{sample}.range"), case.number(f"{sample}.critical_range")
        runs = [run for run in case.runs(sample) if case.is_counted(run)]
        told = any(
            (one.field or "").partition(".")[0] in (*runs, sample) for one in case.found if one.severity == "error"
        )
        if span is not None and limit and span > APART * limit and not told and not case.exchanged.intersection(runs):
            _sample(case, sample, runs, span, limit)


def _sample(case: Case, sample: str, runs: list[str], span: float, limit: float) -> None:
    found: list[tuple[float, Slip]] = []
    chance = 0.0
    for _, slip in zip(range(MOST), _slips(case, runs), strict=False):
        spread = case.right.values([f"{sample}.range"], {**case.repairs, **slip.changed})[f"{sample}.range"]
        if not is_number(spread) or abs(float(spread) - span) < 0.1 * limit:
            continue
        if abs(float(spread) - span) < 2.0 * span:
            chance += WITHIN * limit / span
        if float(spread) <= WITHIN * limit:
            found.append((float(spread), slip))
    if found and chance <= CHANCE:
        _add(case, min(found, key=lambda one: one[0]), chance)


def _add(case: Case, best: tuple[float, Slip], chance: float) -> None:
    spread, slip = best
    label = called(case.place(slip.at)[0].field.label)
    case.add(
        "slip-suspected", slip.at, f"{label}: {slip.words}, and the runs agree to {spread:.0f} J/g", "warning",
        found=case.value(slip.at), expected=slip.changed[slip.at], certain=False, false_alarm=chance,
        likely_cause=slip.words, effect=case.effect(slip.at, slip.changed),
    )  # fmt: skip


def _slips(case: Case, runs: list[str]) -> Iterator[Slip]:
    yield from _exchanged(case, runs)
    for run in runs:
        for name in DIGITS:
            yield from _digits(case, f"{run}.{name}")
        yield from _included(case, run)
        yield from _forgotten_start(case, run, runs)


def _exchanged(case: Case, runs: list[str]) -> Iterator[Slip]:
    """The masses of two runs of the sample in each other's column."""
    for first, second in combinations(runs, 2):
        for names in (("sample_mass",), ("crucible_gross", "crucible_tare"), ("aid1_mass",)):
            pairs = {(f"{first}.{name}", f"{second}.{name}") for name in names}
            values = {one: case.number(one) for pair in pairs for one in pair}
            if None not in values.values() and any(values[one] != values[other] for one, other in pairs):
                swap: dict[str, Value] = {one: values[other] for one, other in pairs}
                swap |= {other: values[one] for one, other in pairs}
                words = f"the masses of {first} and {second} were probably exchanged"
                yield Slip(swap, f"{first}.{names[0]}", f"{words}: exchange them")


def _digits(case: Case, one: str) -> Iterator[Slip]:
    """Two neighbouring digits exchanged."""
    value = case.parts.readings.get(one)
    place = case.parts.skeleton.places.get(one)
    places = decimals(place.field.resolution) if place else None
    if place is None or places is None or not is_number(value) or one in case.mistyped:
        return
    for other in swapped(f"{float(value):.{places}f}"):
        yield Slip({one: other}, one, f"if {value:g} were {other:g}, two digits exchanged")


def _included(case: Case, run: str) -> Iterator[Slip]:
    """An instrument's value with other corrections in it than stated."""
    one = f"{run}.instrument_includes"
    stated = case.text(one) if case.text(f"{run}.rise_source") == "value only" else ""
    for other in INCLUDED if stated else ():
        if other != stated:
            yield Slip({one: other}, one, f"if the instrument's value had {other} taken off already, not {stated}")


def _forgotten_start(case: Case, run: str, runs: list[str]) -> Iterator[Slip]:
    """A burette that did not start at 0."""
    if case.number(f"{run}.burette_start") == 0.0:
        starts = [value for one in runs if one != run and (value := case.number(f"{one}.burette_start"))]
        if starts:
            start = median(starts)
            yield Slip(
                {f"{run}.burette_start": start}, f"{run}.burette_start", f"if the burette started at {start:g} mL"
            )
