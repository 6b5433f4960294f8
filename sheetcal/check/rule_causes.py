"""Probable causes where a limit of the kind is broken: what the other readings of the run and its duplicate say."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from statistics import median

from sheetcal.check.case import Case, is_number
from sheetcal.check.meant import TYPED, of_reading
from sheetcal.check.signatures import BASES
from sheetcal.model import Rule

NEAR = 0.15  # of a duplicate's figure
NEAR_TITRE, TWICE = 0.25, 0.05  # titres of duplicates differ more than masses do
OF_ESTIMATE = 0.06  # how near the composition gives a gross value
BURETTE_STARTS = (5.0, 10.0, 15.0, 20.0, 25.0)  # mL
MOMENT = 0.011  # min
ELEMENTS = ("carbon", "hydrogen", "nitrogen", "sulfur", "oxygen", "ash")


def of_rule(case: Case, rule: Rule, block: str) -> list[str]:
    """Sentences, best first; empty where nothing tells."""
    reason = REASONS.get(rule.code)
    return list(dict.fromkeys(reason(case, rule, block))) if reason else []


def _meant(case: Case, rule: Rule, block: str) -> Iterator[str]:
    """The reading itself, in another unit or with its point elsewhere."""
    one = f"{block}.{rule.place}"
    value = case.number(one)
    place, _ = case.place(one)
    if value is not None and place.field.step is None:
        yield from of_reading(case, one, place.field, value)


def _pressure(case: Case, rule: Rule, block: str) -> Iterator[str]:
    yield from _meant(case, rule, block)
    one, value = f"{block}.{rule.place}", case.number(f"{block}.{rule.place}")
    own = case.parts.record.ranges.get("run.oxygen_pressure", {})
    low, high = own.get("warn_low"), own.get("warn_high")
    if value is not None and low is not None and high is not None and case.place(one)[0].field.unit == "MPa":
        if low <= value - 0.1013 <= high < value:
            yield "absolute pressure was probably typed for gauge pressure (0.10 MPa more)"
        if low <= value + 0.1013 <= high and value < low:
            yield "gauge pressure was probably reduced by the pressure of the air (0.10 MPa less)"


def _duplicates(case: Case, block: str, value: Callable[[str], float | None]) -> float | None:
    """The middle of a figure in the other runs of the sample, else of the sheet."""
    runs = [run for run in case.runs() if run != block]
    own = [run for run in runs if case.sample_of(run) == case.sample_of(block)] or runs
    found = [one for one in map(value, own) if one is not None]
    return median(found) if found else None


def _near(value: float, other: float | None, within: float = NEAR) -> bool:
    return other is not None and abs(value - other) <= within * abs(other)


def titre(case: Case, run: str) -> float | None:
    """What was titrated in a run, mL."""
    start, end = case.number(f"{run}.burette_start"), case.number(f"{run}.burette_end")
    return None if end is None else end - (start or 0.0)


def of_titre(case: Case, run: str) -> Iterator[str]:
    """Why a titre is unlike that of the duplicate."""
    own, other = titre(case, run), _duplicates(case, run, lambda one: titre(case, one))
    if own is None or other is None:
        return
    if own < 0.0 and _near(-own, other, NEAR_TITRE):
        yield "start and end of the burette were probably exchanged"
    starts = [start for start in BURETTE_STARTS if own > start and _near(own - start, other, NEAR_TITRE)]
    if starts and not case.number(f"{run}.burette_start"):
        start = min(starts, key=lambda one: abs(own - one - other))
        yield f"the start of the burette was probably not 0 but {start:g} mL: {own - start:g} mL titrated"
    if _near(own, 2.0 * other, TWICE):
        yield "twice the titre of the duplicate: half of the wash in the other, or another strength of titrant"
    if _near(2.0 * own, other, TWICE):
        yield "half the titre of the duplicate: was only half of the wash titrated?"


def _titre(case: Case, rule: Rule, block: str) -> Iterator[str]:
    yield from of_titre(case, block)


def _wire(case: Case, rule: Rule, block: str) -> Iterator[str]:
    start, left = case.number(f"{block}.wire_start"), case.number(f"{block}.wire_left")
    fld = case.parts.kind.field("run.wire_left")
    if start is None or left is None or fld.warn_low is None or fld.warn_high is None:
        return
    if left > start:
        yield "length before and length left were probably exchanged"
    elif left > fld.warn_high and fld.warn_low <= start - left <= fld.warn_high:
        yield f"the length burnt was probably typed for the length left: {start:g} - {left:g} = {start - left:.1f} cm"


def as_minutes(value: float) -> float | None:
    """5.30 read as 5 min 30 s; None where the decimals are no seconds."""
    seconds = round(100.0 * (value % 1.0))
    return int(value) + seconds / 60.0 if 0 < seconds < 60 and abs(100.0 * (value % 1.0) - seconds) < 1e-6 else None


def _firing(case: Case, rule: Rule, block: str) -> Iterator[str]:
    """The moment against the one the record shows."""
    typed, shown = case.number(f"{block}.firing_time"), case.number(f"{block}.firing_found")
    if typed is None or shown is None:
        return
    meant = as_minutes(typed)
    if meant is not None and abs(meant - shown) < MOMENT:
        yield f"minutes and seconds were probably typed: {typed:.2f} for {int(shown)} min {60 * (shown % 1):.0f} s"
    if abs(typed * 60.0 - shown) < MOMENT or abs(typed / 60.0 - shown) < MOMENT:
        yield "seconds and minutes were probably mixed (factor 60)"
    times = case.parts.readings.get(f"{block}.record_time")
    steps = sorted(float(one) for one in times if is_number(one)) if isinstance(times, list) else []
    if typed in steps and shown in steps:
        off = steps.index(typed) - steps.index(shown)
        late = "late" if off > 0 else "early"
        yield f"the record shows the firing at {shown:g} min: typed {abs(off)} readings too {late}"


def _crucible(case: Case, rule: Rule, block: str) -> Iterator[str]:
    gross, tare = case.number(f"{block}.crucible_gross"), case.number(f"{block}.crucible_tare")
    target = case.number(f"{case.sample_of(block)}.target_mass")
    other = _duplicates(case, block, lambda one: case.number(f"{one}.mass")) or target
    if gross is not None and tare is not None and _near(tare - gross, other):
        yield f"full and empty crucible were probably exchanged: {tare - gross:.4f} g of sample"


def _moistures(case: Case, rule: Rule, block: str) -> Iterator[str]:
    ids = (f"{block}.total_moisture", f"{block}.analysis_moisture")
    total, own = (case.number(one) for one in ids)
    if total is None or own is None or any(case.text(f"{one}_source") not in ("", "measured") for one in ids):
        return
    ranges = [case.parts.record.ranges.get(one, {}) for one in ids]
    if all(_inside(value, limits) for value, limits in zip((own, total), ranges, strict=True)):
        yield f"total moisture and moisture of the analysis sample were probably exchanged ({total:g} and {own:g} %)"


def _inside(value: float, limits: Mapping[str, float]) -> bool:
    return limits.get("warn_low", 0.0) <= value <= limits.get("warn_high", 100.0)


def _gross(case: Case, rule: Rule, block: str) -> Iterator[str]:
    """A value in another unit, or a mass whose point is elsewhere, against what the composition lets expect."""
    found = case.number(f"{block}.gross_dry") or case.number(f"{block}.gross_analysed")
    expected = case.number(f"{block}.composition_estimate") or case.number(f"{block}.expected_gross")
    if not found or not expected:
        return
    for run in case.runs(block):
        typed = case.number(f"{run}.instrument_gross") if case.text(f"{run}.rise_source") == "value only" else None
        for unit, factor in TYPED["J/g"] if typed else ():
            if typed and _near(typed * factor, expected, OF_ESTIMATE):
                yield f"the instrument's value was probably typed in {unit}: {typed:g} is {typed * factor:.5g} J/g"
    for factor, words in ((10.0, "ten times too small"), (0.1, "ten times too large")):
        if _near(found / factor, expected, OF_ESTIMATE):
            yield f"the decimal point of the mass is probably in the wrong place: a mass {words}"


def _composition(case: Case, rule: Rule, block: str) -> Iterator[str]:
    """One element on another basis than stated, where that alone makes the sum 100."""
    total = case.number(f"{block}.composition_sum")
    if total is None:
        return
    for element in ELEMENTS:
        stated = case.text(f"{block}.{element}_basis")
        for basis in BASES.values():
            if stated and basis != stated and abs(total - 100.0) > 1.0:
                changed = case.right.values([f"{block}.composition_sum"], {f"{block}.{element}_basis": basis})
                value = changed[f"{block}.composition_sum"]
                if is_number(value) and abs(float(value) - 100.0) < 0.1 * abs(total - 100.0):
                    yield f"{element} was probably given {basis}, not {stated}: then the sum is {value:.2f} %"


REASONS: Mapping[str, Callable[[Case, Rule, str], Iterator[str]]] = {
    "nitric-heat": _titre, "nitric-heat-negative": _titre, "burette-order": _titre, "titre-unusual": _titre,
    "wire-left": _wire, "wire-order": _wire,
    "firing-time-late": _firing, "firing-time-early": _firing,
    "oxygen-pressure": _pressure, "oxygen-low": _pressure, "oxygen-high": _pressure,
    "calorimeter-water": _meant, "sample-mass": _meant, "mass-limit": _meant, "jacket-temperature": _meant,
    "vessel-water": _meant, "water-mass": _meant, "water-mass-impossible": _meant, "pellet-mass": _meant,
    "gross-below-tare": _crucible, "moisture-order": _moistures,
    "gross-impossible": _gross, "gross-unlikely": _gross, "composition-unlikely": _gross,
    "composition-sum": _composition, "composition-sum-impossible": _composition,
}  # fmt: skip
