"""Signatures of slips: the values that a well-known slip would have left in place of the right one.

Every signature is a candidate: a value, and the sentence that names the slip. A candidate is named only where it
fits far better than an accident would. Let d be how far the value found lies from the right one. Among values that
are wrong by anything of the size of d, a share t/d falls within t of a given candidate; with some forty candidates
spread over three powers of ten (about 7 in natural logarithms), a random value is therefore explained with a chance
of about 40 t/(7 d). The fit asked for, t = d/1000 or the half of the last digit typed, whichever is more, and no
candidate at all where that half is above d/100, keeps this chance below 1 per cent as a rule and at about 5 at worst.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass

FIT = 2e-5  # of the value; two kinds of calories differ by 3e-4
SHARE = 1e-3  # of the disagreement
EXACT = 1e-9  # a sign or a power of ten of a short number, which no rounding blurs
COARSEST = 0.01  # half a last digit above this share of the disagreement says nothing
HEAT, TEMPERATURE, PRESSURE = ("J", "cal", "W"), ("K", "degC"), ("MPa", "kPa")
ATMOSPHERE = 0.101325  # MPa, standard
LEAST_DIGITS = 4  # fewer, and too many numbers differ by one digit or by two exchanged
POWERS = {10: "ten", 100: "a hundred", 1000: "a thousand (kJ and J, mg and g)", 1000000: "a million"}
RATIOS: Mapping[float, tuple[tuple[str, ...], str]] = {
    4.184: (HEAT, "thermochemical calories and joules were probably mixed (factor 4.184)"),
    4.1868: (HEAT, "IT calories and joules were probably mixed (factor 4.1868)"),
    4.1855: (HEAT, "15 degC calories and joules were probably mixed (factor 4.1855)"),
    4184.0: (HEAT, "kilocalories and joules were probably mixed (factor 4184)"),
    4186.8: (HEAT, "IT kilocalories and joules were probably mixed (factor 4186.8)"),
    1000.0 / 4.184: (HEAT, "kilocalories and megajoules were probably mixed (factor 4184 and a power of ten)"),
    1000.0 / 4.1868: (HEAT, "IT kilocalories and megajoules were probably mixed (factor 4186.8 and a power of ten)"),
    2.326: (HEAT, "Btu/lb and J/g were probably mixed (factor 2.326)"),
    1000.0 / 2.326: (HEAT, "Btu/lb and MJ/kg were probably mixed (factor 429.92)"),
    1055.06: (HEAT, "Btu and joules were probably mixed (factor 1055.06)"),
    3.6: (HEAT, "kWh and MJ were probably mixed (factor 3.6)"),
    1.8: ((*HEAT, *TEMPERATURE), "degF and degC steps were probably mixed (factor 1.8)"),
    60.0: (("min", "s"), "minutes and seconds were probably mixed (factor 60)"),
    101.325: (PRESSURE, "atmospheres and kPa were probably mixed (factor 101.325)"),
    7.50062: (PRESSURE, "mmHg and kPa were probably mixed (factor 7.50062)"),
}
BASES = {"dry": "dry", "analysed": "as analysed", "as_received": "as received", "daf": "dry ash-free"}


@dataclass(frozen=True, slots=True)
class Candidate:
    """What a slip would have left, and its sentence; a lower tier is named first where several fit."""

    value: float
    sentence: str
    tier: int = 1


@dataclass(frozen=True, slots=True)
class Known:
    """What is known of the place beside its two numbers.

    `moisture` (as analysed), `total_moisture` in %, `ash` dry in %, `molar_mass` in g/mol of the declared
    substance; `digits`: decimals of the instrument, for a reading; `half`: half the step the value is rounded to.
    """

    unit: str | None = None
    name: str = ""
    digits: int | None = None
    half: float = 0.0
    moisture: float | None = None
    total_moisture: float | None = None
    ash: float | None = None
    molar_mass: float | None = None


def named(found: float, expected: float, known: Known, more: Iterable[Candidate] = ()) -> list[str]:
    """Sentences of the candidates that fit, best first."""
    off = abs(found - expected)
    half = max(half_digit(found), known.half)
    sentences = [*cut(found, expected, known)]
    if found and off:
        fine = half <= COARSEST * off
        fitting = []
        for one in [*of_numbers(expected, known), *more]:
            miss = abs(one.value - found)
            limit = max(half * (1.0 + 1e-9), min(SHARE * off, FIT * abs(one.value))) if fine else EXACT * abs(found)
            if miss <= limit and abs(one.value - expected) > 2.0 * limit and (fine or one.tier == 0):
                fitting.append((one.tier, miss, one.sentence))
        sentences += [sentence for _, _, sentence in sorted(fitting)]
    return list(dict.fromkeys([*sentences, *mistyped(found, expected, known.digits)]))


def half_digit(value: float) -> float:
    """Half a unit of the last digit a person typed; 0 for a number no person types in full."""
    text = repr(abs(value))
    if "e" in text or len(text.replace(".", "").strip("0")) > 9:
        return 0.0
    decimals = text.partition(".")[2].rstrip("0")
    return 0.5 * 10.0 ** -len(decimals)


def of_numbers(expected: float, known: Known) -> Iterator[Candidate]:
    """Candidates that follow from the right value alone, and what is known of the sample."""
    if not expected:
        return
    yield Candidate(-expected, "the sign was probably lost or added", 0)
    for power, word in POWERS.items():
        for value in (expected * power, expected / power):
            yield Candidate(value, f"the decimal point is probably off by a factor of {word}", 0)
    for factor, (groups, sentence) in RATIOS.items():
        if _fits(known.unit, groups):
            yield Candidate(expected * factor, sentence)
            yield Candidate(expected / factor, sentence)
    yield from _offsets(expected, known.unit)
    yield from _moles(expected, known)
    if known.unit in (None, "J/g", "MJ/kg", "%", "kJ/g"):
        yield from _bases(expected, known)


def _fits(unit: str | None, groups: tuple[str, ...]) -> bool:
    """Whether a unit is of one of the groups; where it is unknown, every factor is tried."""
    if unit is None:
        return True
    parts = unit.replace("(", " ").replace(")", " ").replace("/", " ").split()
    return any(part == group or part in (f"k{group}", f"M{group}") for part in parts for group in groups)


def _offsets(expected: float, unit: str | None) -> Iterator[Candidate]:
    if unit in (None, "degC", "K"):
        for value in (expected + 273.15, expected - 273.15):
            yield Candidate(value, "degC and kelvin were probably mixed (273.15)")
    if unit in PRESSURE:
        step = ATMOSPHERE * (1.0 if unit == "MPa" else 1000.0)
        yield Candidate(expected + step, "absolute pressure was probably typed for gauge pressure (1 atm more)")
        yield Candidate(expected - step, "gauge pressure was probably typed for absolute pressure (1 atm less)")


def _moles(expected: float, known: Known) -> Iterator[Candidate]:
    if known.molar_mass:
        sentence = f"per gram and per mole were probably mixed (molar mass {known.molar_mass:g} g/mol)"
        for factor in (known.molar_mass, known.molar_mass / 1000.0):
            yield Candidate(expected * factor, sentence)
            yield Candidate(expected / factor, sentence)


def _bases(expected: float, known: Known) -> Iterator[Candidate]:
    """The value on another basis, and the factor between them turned upside down or taken twice."""
    factors = _factors(known)
    own = next((one for one in sorted(BASES, key=len, reverse=True) if f"_{one}" in known.name), None)
    if own is None or own not in factors:
        yield from _moisture(expected, known.moisture)
        return
    for other, factor in factors.items():
        ratio = factor / factors[own]
        if other != own and ratio != 1.0:
            what = "ash" if "daf" in (own, other) else "moisture"
            words = f"the {what} factor ({BASES[other]} to {BASES[own]})"
            yield Candidate(
                expected * ratio,
                f"it is probably the value {BASES[other]}: {words} was left out, ratio {ratio:.4f}", 2,
            )  # fmt: skip
            yield Candidate(expected * ratio**2, f"{words} was probably turned upside down", 2)
            yield Candidate(expected / ratio, f"{words} was probably applied twice", 3)
    yield from _as_fraction(expected, known.moisture, own == "dry")


def _factors(known: Known) -> dict[str, float]:
    """A value on each basis known, over the dry value."""
    found = {"dry": 1.0}
    for name, share in (("analysed", known.moisture), ("as_received", known.total_moisture)):
        if share is not None and 0.0 < share < 100.0:
            found[name] = (100.0 - share) / 100.0
    if known.ash is not None and 0.0 < known.ash < 100.0:
        found["daf"] = 100.0 / (100.0 - known.ash)
    return found


def _as_fraction(expected: float, moisture: float | None, dry: bool) -> Iterator[Candidate]:
    if dry and moisture is not None and 0.0 < moisture < 100.0:
        value = expected * (100.0 - moisture) / (100.0 - moisture / 100.0)
        yield Candidate(
            value, f"the moisture was probably taken as a fraction: {moisture / 100.0:g} for {moisture:g} %"
        )


def _moisture(expected: float, moisture: float | None) -> Iterator[Candidate]:
    """The moisture factor where the basis of the place is not known."""
    if moisture is None or not 0.0 < moisture < 100.0:
        return
    dry = 100.0 / (100.0 - moisture)
    shown = f"100/(100 - {moisture:g})"
    yield Candidate(
        expected * dry,
        "the moisture factor was probably applied twice, or a dry value stands in its place: "
        f"ratio {dry:.4f} = {shown}", 2,
    )  # fmt: skip
    yield Candidate(
        expected / dry, f"the moisture factor was probably left out: ratio {1.0 / dry:.4f} = 1/({shown})", 2
    )
    yield Candidate(expected / dry**2, "the moisture factor was probably inverted", 2)


# --- digits -----------------------------------------------------------------------------------------------


def cut(found: float, expected: float, known: Known) -> Iterator[str]:
    """The right value with its last digits rounded away or cut off."""
    text = repr(abs(found))
    if found == expected or "e" in text or not found or half_digit(found) == 0.0 or known.digits is not None:
        return
    decimals = len(text.partition(".")[2].rstrip("0"))
    unit = 10.0**-decimals
    if abs(found - expected) <= 0.5 * unit * (1.0 + 1e-9):
        yield f"a rounded figure was probably typed: {found:.10g} for {expected:.10g}"
    elif 0.0 < abs(expected) - abs(found) < unit and found * expected > 0.0 and decimals:
        yield f"the last digits were probably cut off: {found:.10g} for {expected:.10g}"


def mistyped(found: float, expected: float, digits: int | None) -> Iterator[str]:
    """Neighbouring digits exchanged, or one digit wrong, at the instrument's resolution.

    One wrong digit among the last two is no signature: any small difference looks like that.
    """
    if digits is None or abs(found) >= 1e9 or abs(expected) >= 1e9:
        return
    one, other = f"{abs(found):.{digits}f}", f"{abs(expected):.{digits}f}"
    if len(one) != len(other) or sum(letter.isdigit() for letter in one) < LEAST_DIGITS:
        return
    off = [index for index in range(len(one)) if one[index] != other[index]]
    if _exchanged(one, other, off):
        yield f"two digits were probably exchanged: {one} for {other}"
    elif len(off) == 1 and off[0] < len(one) - 2:
        yield f"one digit was probably mistyped: {one} for {other}"


def _exchanged(one: str, other: str, off: list[int]) -> bool:
    """Whether the two texts differ by two digits next to each other (a decimal point may stand between)."""
    if len(off) != 2:
        return False
    first, second = off
    between = one[first + 1 : second]
    return one[first] == other[second] and one[second] == other[first] and between in ("", ".")
