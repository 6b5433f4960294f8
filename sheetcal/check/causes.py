"""Probable causes: signatures that a wrong value shares with a well-known slip. None is named unless it fits well."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping

BLANKS = re.compile("[ \u00a0\u2009\u202f]")
WITH_COMMA = re.compile(r"[+-]?\d{1,15},\d{1,15}", re.ASCII)
FIT = 2e-5  # relative: closer than any accident among so few signatures
RATIOS: Mapping[float, str] = {
    4.184: "thermochemical calories and joules were probably mixed (factor 4.184)",
    4.1868: "IT calories and joules were probably mixed (factor 4.1868)",
    4.1855: "15 degC calories and joules were probably mixed (factor 4.1855)",
    2.326: "Btu/lb and J/g were probably mixed (factor 2.326)",
    1055.06: "Btu and joules were probably mixed (factor 1055.06)",
    1.8: "degF and degC steps were probably mixed (factor 1.8)",
}
POWERS = {10: "ten", 100: "a hundred", 1000: "a thousand (kJ and J, mg and g)", 1000000: "a million"}


def of_value(found: float, expected: float, moisture: float | None = None, digits: int | None = None) -> list[str]:
    """Sentences that explain `found` in place of `expected`, best first."""
    return list(
        dict.fromkeys(
            [
                *_digits(found, expected, digits),
                *_ratios(found, expected),
                *_moisture(found, expected, moisture),
            ]
        )
    )


def _ratios(found: float, expected: float) -> Iterator[str]:
    if not found or not expected:
        return
    ratio = found / expected
    if abs(ratio + 1.0) < FIT:
        yield "the sign was probably lost or added"
    for power, word in POWERS.items():
        if _near(ratio, power) or _near(ratio, 1.0 / power):
            yield f"the decimal point is probably off by a factor of {word}"
    for factor, sentence in RATIOS.items():
        if _near(ratio, factor) or _near(ratio, 1.0 / factor):
            yield sentence


def _moisture(found: float, expected: float, moisture: float | None) -> Iterator[str]:
    if moisture is None or not 0.0 < moisture < 100.0 or not expected:
        return
    dry = 100.0 / (100.0 - moisture)
    ratio = found / expected
    shown = f"100/(100 - {moisture:g})"
    if _near(ratio, dry):
        yield (
            "the moisture factor was probably applied twice, or a dry value stands in its place: "
            f"ratio {ratio:.4f} = {shown}"
        )
    if _near(ratio, 1.0 / dry):
        yield f"the moisture factor was probably left out: ratio {ratio:.4f} = 1/({shown})"
    if _near(ratio, 1.0 / dry**2):
        yield "the moisture factor was probably inverted"


def _digits(found: float, expected: float, digits: int | None) -> Iterator[str]:
    """Neighbouring digits exchanged, or one digit wrong, at the instrument's resolution."""
    if digits is None or abs(found) >= 1e9 or abs(expected) >= 1e9:
        return
    one, other = f"{abs(found):.{digits}f}", f"{abs(expected):.{digits}f}"
    if len(one) != len(other):
        return
    off = [index for index in range(len(one)) if one[index] != other[index]]
    if _exchanged(one, other, off):
        yield f"two digits were probably exchanged: {one} for {other}"
    elif len(off) == 1:
        yield f"one digit was probably mistyped: {one} for {other}"


def _exchanged(one: str, other: str, off: list[int]) -> bool:
    """Whether the two texts differ by two digits next to each other (a decimal point may stand between)."""
    if len(off) != 2:
        return False
    first, second = off
    between = one[first + 1 : second]
    return one[first] == other[second] and one[second] == other[first] and between in ("", ".")


def _near(ratio: float, value: float) -> bool:
    return abs(ratio / value - 1.0) < FIT


def comma_readings(text: str) -> tuple[float, float] | None:
    """Both readings of a number written with a comma: decimal, and thousands; None when it is no such number."""
    clean = BLANKS.sub("", text)
    if not WITH_COMMA.fullmatch(clean):
        return None
    return float(clean.replace(",", ".")), float(clean.replace(",", ""))
