"""Numbers that arrived as text: what was meant where that is plain, and how they may have become text."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Callable
from dataclasses import dataclass

from sheetcal import units
from sheetcal.errors import SheetcalError
from sheetcal.model import Field

PLAIN_NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d{1,2})?", re.ASCII | re.IGNORECASE)
UNIT = r"[A-Za-z%][A-Za-z0-9%/*() ]*"
NUMBER_AND_UNIT = re.compile(rf"([+-]?\d+(?:\.\d*)?)\s*({UNIT})", re.ASCII)
# What balances send: a status of capital letters, a sign set apart, the unit, a mark for a reading not at rest.
BALANCE = re.compile(
    r"(?P<status>(?:[A-Z]{1,4}[ ,:]+)*)(?P<sign>[+-]?)(?P<gap>\s*)(?P<number>\d+(?:\.\d*)?)\s*"
    rf"(?P<unit>{UNIT})?[?*]?",
    re.ASCII,
)
SCANNED = re.compile(r"(?:\*(?P<starred>[+-]?[\d.]+)\*|\][A-Za-z]\d(?P<marked>[+-]?[\d.]+))", re.ASCII)
CLOCK = re.compile(r"(\d{1,3}):([0-5]\d)(?:[.,](\d+))?", re.ASCII)
PRIMES = re.compile(r"(\d{1,3})\s*'\s*([0-5]?\d)\s*(?:''|\")", re.ASCII)
GROUPED = re.compile(r"[+-]?\d{1,3}(?:[ '\u00a0\u2009\u202f]\d{3})+(?:\.\d+)?", re.ASCII)
NOT_DETERMINED = ("n.d.", "nd", "n. d.", "-", "--", "n/a", "?")
# The signs on the keys of digits where a scanner or a balance sends key strokes for another layout, from 1 to 0.
LAYOUTS = {"French": "&é\"'(-è_çà", "Czech": "+ěščřžýáíé", "Slovak": "+ľščťžýáíé", "shifted": "!@#$%^&*()"}
LETTERED = re.compile(r"[+-]?[\dOolI]*\.?[\dOolI]+")
LETTER = "a letter O or l in place of a digit"
POINTS = ".,;:"
SHORTEST = 3  # signs of a text that a layout explains


@dataclass(frozen=True, slots=True)
class Meant:
    """The number meant, or None where that is not plain; how it became text; how grave that is."""

    value: float | None
    why: str | None
    severity: str = "error"


def read_as(value: str, fld: Field) -> Meant:
    """What a text in a number's place was meant to be."""
    for reading in READINGS:
        meant = reading(value, fld)
        if meant is not None:
            return meant
    return Meant(None, None)


def without_marks(text: str) -> str:
    """The text without blanks at its ends and without marks that nobody sees."""
    return "".join(one for one in text if unicodedata.category(one) not in ("Cf", "Cc")).strip()


def _plain(value: str, fld: Field) -> Meant | None:
    if PLAIN_NUMBER.fullmatch(value.strip()):
        return Meant(float(value.strip()), "a number stored as text: type it again")
    clean = without_marks(value)
    if PLAIN_NUMBER.fullmatch(clean):
        return Meant(float(clean), "a mark that nobody sees was pasted with the number: type it again")
    return None


def _words(value: str, fld: Field) -> Meant | None:
    text = value.strip().lower()
    if text in NOT_DETERMINED:
        return Meant(None, "a word for `not determined`: leave the cell blank instead")
    if text.startswith("<"):
        return Meant(None, "a limit: type the number, and < in the mark beside it")
    return None


def _layout(value: str, fld: Field) -> Meant | None:
    text = value.strip()
    if len(text) < SHORTEST or any(one.isdigit() for one in text):
        return None
    for name, keys in LAYOUTS.items():
        digits = "".join("." if one in POINTS else str((keys.find(one) + 1) % 10) for one in text)
        if not set(text) - set(keys) - set(POINTS) and PLAIN_NUMBER.fullmatch(digits):
            where = "the shift key was down" if name == "shifted" else f"the keyboard is set to {name}"
            return Meant(float(digits), f"sent by a scanner or a balance while {where}: {digits}")
    return None


def _balance(value: str, fld: Field) -> Meant | None:
    match = BALANCE.fullmatch(without_marks(value))
    if match is None or not (match["status"] or (match["sign"] and match["gap"])):
        return None
    number = _converted(float(match["sign"] + match["number"]), match["unit"], fld)
    return Meant(number, "the whole line of the balance was sent to the cell", "warning")


def _scanned(value: str, fld: Field) -> Meant | None:
    match = SCANNED.fullmatch(without_marks(value))
    number = (match["starred"] or match["marked"]) if match else ""
    if not PLAIN_NUMBER.fullmatch(number):
        return None
    return Meant(float(number), "the scanner sent its own marks with the number")


def _clock(value: str, fld: Field) -> Meant | None:
    text = value.strip()
    match = CLOCK.fullmatch(text) or PRIMES.fullmatch(text)
    if match is None:
        return None
    if fld.unit != "min":
        return Meant(None, "a clock time")
    meant = int(match[1]) + float(match[2]) / 60.0
    return Meant(meant, f"minutes and seconds were typed: {text} is {meant:g} min")


def _grouped(value: str, fld: Field) -> Meant | None:
    if not GROUPED.fullmatch(value.strip()):
        return None
    number = re.sub("[ '\u00a0\u2009\u202f]", "", value.strip())
    return Meant(float(number), "blanks or apostrophes part the thousands: type the number without")


def _with_unit(value: str, fld: Field) -> Meant | None:
    match = NUMBER_AND_UNIT.fullmatch(without_marks(value))
    if match is None:
        return None
    return Meant(_converted(float(match[1]), match[2], fld), "the unit was typed with the number", "warning")


def _converted(number: float, unit: str | None, fld: Field) -> float | None:
    """A number in the field's unit; None for a unit that is another quantity or none, or makes it impossible."""
    if unit is None or unit.strip() == fld.unit:
        return number
    try:
        meant = units.convert(number, unit.strip(), fld.unit or "1")
    except SheetcalError:
        return None
    possible = (fld.low is None or meant >= fld.low) and (fld.high is None or meant <= fld.high)
    return meant if possible else None


def _alike(value: str, fld: Field) -> Meant | None:
    if any(unicodedata.category(c) in ("Nd", "Pd", "Sm", "Cf", "Zs") and not c.isascii() for c in value):
        return Meant(None, "signs that only look like digits or a minus")
    if re.fullmatch(r"[\dOolI.,+\- ]+", value.strip()):
        return Meant(None, LETTER)
    return None


def _letter(value: str, fld: Field) -> Meant | None:
    """1.OO12: a letter among the digits is no unit behind them."""
    text = value.strip()
    return Meant(None, LETTER) if LETTERED.fullmatch(text) and not text.rstrip("l").replace(".", "").isdigit() else None


READINGS: tuple[Callable[[str, Field], Meant | None], ...] = (
    _plain, _words, _layout, _letter, _balance, _scanned, _clock, _grouped, _with_unit, _alike,
)  # fmt: skip
