"""Units: one pint registry of laboratory units, made when it is first needed.

The units stand in units.txt, one a line, each with its source. Unit text is ASCII (`J/(g K)`);
`%` is mass per cent and counts as 0.01; `1` is a pure number. A degC marks a point on the
temperature scale, a difference of temperatures is in K: `convert` moves points, and
`convert_difference` moves differences.
"""

import math
import re
from difflib import get_close_matches
from functools import cache, lru_cache
from pathlib import Path
from typing import TYPE_CHECKING, Any

from sheetcal.errors import BadInput

if TYPE_CHECKING:
    import pint

Dimensions = tuple[tuple[str, float], ...]

LONGEST_UNIT = 60  # characters; no laboratory unit comes near it, an attack on the parser does
NUMBER = r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?"
# A unit starts with a letter, % or 1/..., so that "12.5 K" and "3 1/min" both split.
QUANTITY = re.compile(rf"\s*({NUMBER})\s*(\S.*)?")
DECIMAL_COMMA = re.compile(r"\s*[+-]?\d+,\d+\s*(?:[A-Za-z%(].*)?")
BARE_HEAT = re.compile(r"(?<![A-Za-z_])(k|M|G|m)?(cal|Cal|Btu|BTU|btu)(?![A-Za-z_])")
WORD = re.compile(r"[A-Za-z_%]+[A-Za-z_0-9]*")
# "J/g K" reads as (J/g) K to a program and as J/(g K) to a person: neither is taken.
DIVIDED_THEN_PRODUCT = re.compile(r"/\s*[A-Za-z%][A-Za-z_0-9]*(?:\*\*-?\d+)?\s*[ *]\s*[A-Za-z%(]")


@cache
def registry() -> "pint.UnitRegistry[Any]":
    """The one registry; made at the first call, because pint costs a third of a second."""
    import pint

    return pint.UnitRegistry(str(Path(__file__).with_name("units.txt")), autoconvert_offset_to_baseunit=False)


@lru_cache(maxsize=1024)
def parse(text: str) -> "pint.Unit":
    """The unit that `text` names, e.g. "J/(g K)". Raises BadInput, saying what to write instead."""
    stripped = text.strip()
    _refuse_spelling(stripped)
    try:
        return registry().parse_units(stripped)
    except Exception as fault:  # pint and tokenize raise a dozen types on bad text
        raise BadInput(f"unit '{_shown(text)}'", "is not known", *_advice(stripped)) from fault


def _refuse_spelling(text: str) -> None:
    """Raise BadInput for text that pint would misread or need not see."""
    where = f"unit '{_shown(text)}'"
    if not text:
        raise BadInput(where, "is empty", "a unit, or 1 for a pure number", "Write the unit.")
    if len(text) > LONGEST_UNIT or not text.isascii():
        expected = "ASCII, such as degC, J/(g K), %"
        raise BadInput(where, "is not a unit", expected, _ascii_advice(text))
    heat = BARE_HEAT.search(text)
    if heat:
        expected = "cal_th (4.184 J), cal_IT (4.1868 J) or Btu_IT (1055.06 J)"
        raise BadInput(where, f"'{heat.group(0)}' has several sizes", expected, "Add the suffix.")
    if DIVIDED_THEN_PRODUCT.search(text):
        expected = "brackets, as in J/(g K)"
        raise BadInput(where, "can be read two ways", expected, "Add the brackets.")


def _shown(text: str) -> str:
    """The text as a message may show it: printable and short."""
    clean = "".join(c if c.isprintable() else f"\\x{ord(c):02x}" for c in text)
    return clean if len(clean) <= 40 else clean[:37] + "..."


def _ascii_advice(text: str) -> str:
    """What to write for the commonest characters that are not ASCII."""
    spelling = text.replace("\N{DEGREE SIGN}", "deg").replace("\N{MIDDLE DOT}", " ")
    spelling = spelling.replace("\N{MICRO SIGN}", "u").replace("\N{GREEK SMALL LETTER MU}", "u")
    if spelling.isascii() and 0 < len(spelling) <= LONGEST_UNIT:
        return f"Write '{spelling}'."
    return "Write the unit in ASCII."


def _advice(text: str) -> tuple[str, str]:
    """(expected, do) for an unknown unit: the nearest known spelling of its first unknown word."""
    names = known_names()
    folded = {name.lower(): name for name in names}
    for word in WORD.findall(text):
        if word in names or _is_unit(word):
            continue
        near = get_close_matches(word.lower(), list(folded), 1, 0.5)
        if near:
            return f"'{folded[near[0]]}' for '{word}'", "Correct the unit."
        return f"a unit of units.txt for '{word}'", "Correct the unit."
    return "a unit such as J/(g K), MPa, 1/min", "Correct the unit."


def _is_unit(word: str) -> bool:
    """True where the registry knows the word (with any prefix)."""
    try:
        registry().parse_units(word)
    except Exception:  # see parse
        return False
    return True


@cache
def known_names() -> frozenset[str]:
    """The spellings used in the laboratory: what the nearest known unit is looked for among."""
    contract = (
        "g mg kg t lb K mK degC s min h d J kJ MJ GJ kWh N Pa kPa MPa bar atm torr mm cm m"
        " mL L cm3 dm3 m3 mol mmol V mV A mA W kW ohm % ppm cal_th kcal_th cal_IT kcal_IT Btu_IT"
    )
    return frozenset(contract.split())


@lru_cache(maxsize=1024)
def dimensions(unit: str | None) -> Dimensions:
    """Exponents of the base dimensions, sorted: J/g -> (("length", 2.0), ("time", -2.0)).

    A pure number, a per cent, and text or a date (None) have none. Raises BadInput.
    """
    if unit is None:
        return ()
    powers = dict(parse(unit).dimensionality)
    return tuple(sorted((str(name).strip("[]"), float(str(p))) for name, p in powers.items()))


def is_scale(unit: str | None) -> bool:
    """True where a value in the unit is a point on the temperature scale with its own zero."""
    return unit is not None and _offset(unit) != 0.0


@lru_cache(maxsize=1024)
def factor(unit: str) -> float:
    """How many base units (g, m, s, A, K, mol) one unit is, as a difference: kJ -> 1e6."""
    reg = registry()
    bare = parse(unit)
    if is_scale(unit):
        return 1.0  # the only scale is degC, and its degree is the kelvin
    return float(str(reg.get_base_units(bare, check_nonmult=False)[0]))


@lru_cache(maxsize=1024)
def _offset(unit: str) -> float:
    """Kelvin at the unit's zero, for a bare temperature scale; 0 for everything else."""
    return 273.15 if str(parse(unit)) == "degree_Celsius" else 0.0


def _require_same(from_: str, to: str) -> None:
    """Raise BadInput unless the two units measure the same kind of quantity."""
    if dimensions(from_) != dimensions(to):
        what = f"'{from_}' does not measure what '{to}' measures"
        raise BadInput("unit", what, f"a unit that converts to {to}", "Correct the unit.")


def convert(value: float, from_: str, to: str) -> float:
    """The value in another unit; degC and K move as points of the scale (20 degC -> 293.15 K).

    Raises BadInput where the units do not measure the same thing.
    """
    if from_ == to:
        return value
    _require_same(from_, to)
    kelvin_or_base = value * factor(from_) + _offset(from_)
    return (kelvin_or_base - _offset(to)) / factor(to)


def convert_difference(value: float, from_: str, to: str) -> float:
    """A difference in another unit: a rise of 2.5 degC is one of 2.5 K. Raises BadInput."""
    if from_ == to:
        return value
    _require_same(from_, to)
    return value * factor(from_) / factor(to)


def split(text: str) -> tuple[float, str | None]:
    """(number, unit text) of "98.2 mg"; unit None where there is none. Raises BadInput."""
    where = f"'{_shown(text)}'"
    if DECIMAL_COMMA.fullmatch(text):
        raise BadInput(where, "has a decimal comma", "a decimal point", "Write the point.")
    match = QUANTITY.fullmatch(text)
    if not match:
        raise BadInput(where, "is not a number with a unit", "text like '98.2 mg'", "Correct it.")
    value = float(match.group(1))
    if not math.isfinite(value):
        raise BadInput(where, "is too large for a number", "a finite number", "Correct it.")
    unit = match.group(2)
    return value, unit.strip() if unit else None


def quantity(text: str, to: str) -> float:
    """The number in unit `to` of text such as "98.2 mg"; without a unit only where `to` is "1".

    A degC is refused where K is wanted: 12.5 degC may be a temperature (285.65 K) or a rise
    (12.5 K), and only the writer knows. Raises BadInput.
    """
    value, unit = split(text)
    if unit is None:
        if to == "1":
            return value
        do = f"Write '{text.strip()} {to}'."
        raise BadInput(f"'{_shown(text)}'", "has no unit", f"a value in {to}", do)
    parse(unit)
    if is_scale(unit) and not is_scale(to) and dimensions(unit) == dimensions(to):
        rise, point = f"{value:.12g} K", f"{value + 273.15:.12g} K"
        do = f"Write '{rise}' for a difference, '{point}' for a temperature."
        raise BadInput(f"'{_shown(text)}'", "is in degC where K is wanted", "K", do)
    return convert(value, unit, to)


def quantities(text: str, to: str) -> list[float]:
    """The numbers in unit `to` of "22.31, 22.35 degC" (one unit, last). Raises BadInput."""
    parts = text.split(",")
    _, unit = split(parts[-1])
    suffix = f" {unit}" if unit else ""
    return [quantity(part + suffix, to) for part in parts[:-1]] + [quantity(parts[-1], to)]
