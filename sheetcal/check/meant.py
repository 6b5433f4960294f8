"""What a reading outside its range was probably meant to be: another unit, another place of the decimal point.

A guess counts only where it lands beside what is expected here: the same reading of other runs, the mass aimed at,
or a usual range that is narrow. A factor of ten must also leave the digits of the instrument: 1001.2 may be
milligrams of 1.0012 g, 1001.2345 may not. A figure typed at random passes both in about one case of thirty.
"""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise
from math import inf, log10
from statistics import median

from sheetcal.check.case import Case, is_number
from sheetcal.check.reasons import decimals
from sheetcal.check.signatures import LEAST_DIGITS
from sheetcal.model import Field

NEAR = 0.15  # of what is expected
NEAR_BY_UNIT = {"MPa": 0.05, "kPa": 0.05, "min": 0.05}  # readings that are set, or that vary little
CLOSE = 0.02  # of what is expected: here the digits need not tell as well
NEAR_KELVIN = 1.0
FAR = 1.5  # times the highest usual value: less than that is no decimal point
SWAP, NEARER = 2, 0.2  # digits exchanged back must bring a reading five times nearer to its like
NARROW = 3.0  # highest over lowest of a usual range that tells anything
CLOCK = "minutes and seconds, which became a clock time"
# unit of the field -> (unit typed, what one of it is in the field's unit)
TYPED: dict[str, tuple[tuple[str, float], ...]] = {
    "g": (("mg", 1e-3), ("kg", 1e3)),
    "MPa": (("bar", 0.1), ("kPa", 1e-3), ("psi", 0.00689476), ("kgf/cm2", 0.0980665), ("atm", 0.101325)),
    "kPa": (("hPa (mbar)", 0.1), ("mmHg", 0.133322), ("atm", 101.325), ("bar", 100.0), ("MPa", 1e3), ("Pa", 1e-3)),
    "min": (("s", 1.0 / 60.0), ("h", 60.0), ("parts of a day, a clock time", 1440.0), (CLOCK, 24.0)),
    "s": (("min", 60.0), ("parts of a day, a clock time", 86400.0), (CLOCK, 1440.0)),
    "mL": (("L", 1e3), ("cL", 10.0)),
    "cm": (("mm", 0.1), ("m", 100.0), ("inches", 2.54)),
    "J": (("cal", 4.184), ("kJ", 1e3)),
    "J/g": (("MJ/kg", 1e3), ("cal/g", 4.184), ("Btu/lb", 2.326)),
    "J/K": (("kJ/K", 1e3), ("cal/K", 4.184)),
    "J/(g K)": (("J/(kg K)", 1e-3), ("cal/(g K)", 4.184)),
    "%": (("a fraction of 1", 100.0), ("per mille", 0.1)),
    "g/mL": (("kg/m3", 1e-3),),
    "g/cm3": (("kg/m3", 1e-3),),
    "mg/L": (("g/L", 1e3),),
    "K/min": (("K/s", 60.0), ("mK/min", 1e-3)),
    "V": (("mV", 1e-3), ("kV", 1e3)),
    "A": (("mA", 1e-3),),
    "g/mol": (("kg/mol", 1e3),),
}


def of_reading(case: Case, one: str, fld: Field, value: float) -> list[str]:
    """Sentences on a reading out of range, best first; empty where no guess lands near what is expected."""
    if "[" in one:
        return _of_series(case, one, fld)
    place = _expected(case, one, fld)
    if place is None or not value:
        return []
    low, high = place
    centre = 0.5 * (low + high)
    if not _alike(case, one, fld) and high < value < FAR * high:
        return []  # a little above a range alone: rather an unusual sample than a slip
    fitting = sorted(
        (tier, abs(meant - centre), sentence)
        for tier, meant, sentence in _guesses(fld, value, centre)
        if low <= meant <= high and (tier < SWAP or abs(meant - centre) <= NEARER * abs(value - centre))
    )
    return list(dict.fromkeys(sentence for _, _, sentence in fitting))


def _of_series(case: Case, one: str, fld: Field) -> list[str]:
    """The whole record in another unit: times in seconds, temperatures in kelvin or degF."""
    values = case.parts.readings.get(one.partition("[")[0])
    numbers = [float(value) for value in values if is_number(value)] if isinstance(values, list) else []
    block = one.partition(".")[0]
    firing, ended = (case.parts.readings.get(f"{block}.{name}") for name in ("firing_time", "end_of_main"))
    if fld.unit == "min" and is_number(firing) and is_number(ended):
        inside = min(numbers) / 60.0 <= firing < ended <= max(numbers) / 60.0
        return ["the times of this record are probably in seconds"] if inside else []
    own = case.parts.record.ranges.get(fld.key, {})
    low, high = own.get("warn_low"), own.get("warn_high")
    if fld.unit != "degC" or low is None or high is None:
        return []
    meant = {"kelvin": [v - 273.15 for v in numbers], "degF": [(v - 32.0) / 1.8 for v in numbers]}
    fitting = [unit for unit, listed in meant.items() if low <= min(listed) <= max(listed) <= high]
    return [f"the temperatures of this record are probably in {unit}" for unit in fitting]


def _expected(case: Case, one: str, fld: Field) -> tuple[float, float] | None:
    """Where the reading should lie: beside its like and within its limits, or in a narrow usual range."""
    low, high = _usual(case, one, fld)
    like = _alike(case, one, fld)
    if like:
        middle = median(like)
        off = NEAR_KELVIN if fld.unit == "degC" else NEAR_BY_UNIT.get(fld.unit or "", NEAR) * abs(middle)
        return max(middle - off, low), min(middle + off, high)
    return (low, high) if high < inf and (fld.unit == "%" or 0.0 < low < high < NARROW * low) else None


def _usual(case: Case, one: str, fld: Field) -> tuple[float, float]:
    """The usual range, else the allowed one; infinite where nobody set one."""
    own = case.parts.record.ranges.get(one) or case.parts.record.ranges.get(fld.key) or {}
    low, high = own.get("warn_low", own.get("low", fld.warn_low)), own.get("warn_high", own.get("high", fld.warn_high))
    if low is None or high is None:
        low, high = own.get("low", fld.low), own.get("high", fld.high)
    return (-inf if low is None else low), (inf if high is None else high)


def _alike(case: Case, one: str, fld: Field) -> list[float]:
    """The same reading of the other runs or bodies of the sample, else of the sheet; else the mass aimed at."""
    block = one.partition(".")[0]
    if fld.scope not in ("run", "body") or "[" in one:
        return []
    found: dict[str, float] = {}
    for other, place in case.parts.skeleton.places.items():
        home = other.partition(".")[0]
        value = case.parts.readings.get(other)
        usable = place.field.key == fld.key and home != block and other not in case.mistyped
        if usable and is_number(value) and value and not _outside(fld, float(value)):
            found[home] = float(value)
    own = [value for home, value in found.items() if case.sample_of(home) == case.sample_of(block)]
    target = case.number(f"{case.sample_of(block)}.target_mass") if fld.name == "sample_mass" else None
    return own or ([target] if target else list(found.values()))


def _outside(fld: Field, value: float) -> bool:
    return (fld.low is not None and value < fld.low) or (fld.high is not None and value > fld.high)


def _guesses(fld: Field, value: float, centre: float) -> Iterator[tuple[int, float, str]]:
    """(tier, what was meant, sentence)."""
    yield 0, -value, f"the sign was probably lost or added: {-value:g}"
    for unit, factor in TYPED.get(fld.unit or "", ()):
        if _keeps_digits(fld, value, factor) or (factor > 1.0 and abs(value * factor - centre) <= CLOSE * abs(centre)):
            yield 0, value * factor, _typed_in(value, unit, value * factor, fld)
    if fld.unit == "degC":
        yield 0, value - 273.15, _typed_in(value, "kelvin", value - 273.15, fld)
        yield 0, (value - 32.0) / 1.8, _typed_in(value, "degF", (value - 32.0) / 1.8, fld)
    for power in (-4, -3, -2, -1, 1, 2, 3):
        factor = 10.0**power
        if _keeps_digits(fld, value, factor):
            sentence = f"the decimal point is probably in the wrong place, or lost: {value * factor:.10g} {fld.unit}"
            yield 1, value * factor, sentence
    text = f"{value:.{decimals(fld.resolution) or 0}f}"
    for other in swapped(text) if fld.scope == "run" and sum(map(str.isdigit, text)) >= LEAST_DIGITS else ():
        yield SWAP, other, f"two digits were probably exchanged: {value:g} for {other:g}"


def _typed_in(value: float, unit: str, meant: float, fld: Field) -> str:
    return f"{value:.10g} was probably typed in {unit}: {meant:.6g} {fld.unit}"


def _keeps_digits(fld: Field, value: float, factor: float) -> bool:
    """Whether a shift of the decimal point leaves as many digits as the instrument gives."""
    shift = log10(factor)
    places = decimals(fld.resolution)
    if places is None or abs(shift - round(shift)) > 1e-9:
        return True
    typed = decimals_of(value)
    return typed <= max(places + round(shift), 0) if shift < 0.0 else typed > places


def decimals_of(value: float) -> int:
    """Decimal places a number is written with."""
    text = f"{abs(value):.10f}".rstrip("0")
    return len(text.partition(".")[2])


def swapped(text: str) -> Iterator[float]:
    """The number with each two neighbouring digits exchanged; a decimal point may stand between."""
    digits = [index for index, letter in enumerate(text) if letter.isdigit()]
    for first, second in pairwise(digits):
        if text[first] != text[second]:
            letters = list(text)
            letters[first], letters[second] = letters[second], letters[first]
            yield float("".join(letters))
