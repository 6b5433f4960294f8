"""Readings: of the right type, and within what nature and the method allow."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Mapping
from dataclasses import replace

from sheetcal.check.case import Case, called, is_number, quoted
from sheetcal.check.causes import comma_readings
from sheetcal.check.submission import Cell
from sheetcal.kinds.dates import iso
from sheetcal.model import Field, Value

NUMBER_TYPES = ("number", "integer")
DATE_TYPES = ("date", "datetime")
NUMBER_AND_UNIT = re.compile(r"\s*([+-]?\s*\d+(?:[.,]\d*)?)\s*([A-Za-z%][A-Za-z%/ ]*)\s*")
PLAIN_NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d{1,2})?", re.ASCII | re.IGNORECASE)
CLOCK = re.compile(r"([01]\d|2[0-3]):[0-5]\d")
TRUTHS = {"=TRUE()": True, "=FALSE()": False}
LATEST, EARLIEST = 73050.0, 29221.0  # serial numbers of 2100 and 1980
NOT_DETERMINED = ("n.d.", "nd", "n. d.", "-", "--", "n/a", "?")


def look(case: Case) -> None:
    """Findings on every filled reading; what is not of its type is noted as such."""
    elements: dict[tuple[str, str], list[tuple[str, Cell]]] = {}
    for one, stored in case.parts.cells.items():
        place, _ = case.place(one)
        if place.field.step is not None or place.field.locked or one in case.parts.record.locked:
            continue
        cell = _as_typed(stored)
        if "[" in one:
            elements.setdefault((place.id, _sort(place.field, cell)), []).append((one, cell))
        else:
            _reading(case, one, place.field, cell)
    for (name, sort), listed in elements.items():
        fld = case.parts.skeleton.places[name].field
        if sort == "number":
            _series_range(case, name, fld, listed)
        else:
            _series(case, fld, listed)


def _as_typed(cell: Cell) -> Cell:
    """A cell as a person typed it: LibreOffice saves TRUE in a cell for numbers as a formula."""
    truth = TRUTHS.get((cell[2] or "").upper())
    return cell if truth is None else ("b", truth, None)


def _sort(fld: Field, cell: Cell) -> str:
    """Whether a series element is a plain number, or how it is not."""
    kind, value, formula = cell
    if formula is not None:
        return "formula"
    return "number" if kind == "n" and is_number(value) else kind


def _series(case: Case, fld: Field, listed: list[tuple[str, Cell]]) -> None:
    """The first element that is not a number gets the finding, which counts the others."""
    before = len(case.found)
    for one, cell in listed:
        _reading(case, one, fld, cell)
    del case.found[before + 1 :]
    if len(listed) > 1 and len(case.found) > before:
        _say_more(case, len(listed))


def _say_more(case: Case, count: int) -> None:
    more = f" ({count} readings of this record)"
    case.found[-1] = replace(case.found[-1], message=case.found[-1].message + more)


def _reading(case: Case, one: str, fld: Field, cell: Cell) -> None:
    kind, value, formula = cell
    label = called(fld.label)
    if formula is not None:
        case.mistyped.add(one)
        case.spoiled.add(one)
        _add(case, "reading-formula", one, f"{label}: a formula stands where a reading belongs", formula, "warning")
    elif kind == "e":
        _spoil(case, one)
        _add(case, "reading-error-value", one, f"{label}: an error value stands in the reading", value)
    elif fld.type in NUMBER_TYPES:
        _number(case, one, fld, kind, value)
    elif fld.type in DATE_TYPES:
        _date(case, one, fld, value)
    else:
        _text(case, one, fld, value)


def _spoil(case: Case, one: str) -> None:
    case.mistyped.add(one)
    case.spoiled.add(one)


def _add(case: Case, code: str, one: str, message: str, found: Value, severity: str = "error", **facts: object) -> None:
    """A finding on a reading; in a run that counts for nothing it is no more than a note."""
    block = one.partition(".")[0]
    if not case.is_counted(block):
        severity, message = "note", f"{message} (the run does not count)"
    case.add(code, one, message, severity, found=found, **facts)


def _number(case: Case, one: str, fld: Field, kind: str, value: Value) -> None:
    label, expected = called(fld.label), f"a number in {fld.unit}"
    if is_number(value) and kind != "d":
        _range(case, one, fld, float(value))
    elif isinstance(value, bool):
        _spoil(case, one)
        message = f"{label}: {str(value).upper()} stands where a number belongs"
        _add(case, "reading-not-number", one, message, value, "warning", expected=expected)
    elif is_number(value):
        _spoil(case, one)
        message = f"{label}: a date or clock time stands where a number belongs ({_moment(float(value))})"
        _add(case, "reading-date", one, message, value, expected=expected, likely_cause=_why_date(float(value), fld))
    else:
        _text_for_number(case, one, fld, str(value))


def _moment(value: float) -> str:
    """A date as written, a clock time as hours and minutes."""
    if 0.0 <= value < 1.0:
        minutes = round(value * 1440.0)
        return f"{minutes // 60}:{minutes % 60:02d}"
    return iso(value) if 0.0 <= value < LATEST else f"{value:g}"


def _why_date(value: float, fld: Field) -> str:
    if 0.0 <= value < 1.0 and fld.unit == "min":
        minutes = round(value * 1440.0)
        return (
            f"minutes and seconds typed as a clock time: {minutes // 60}:{minutes % 60:02d} min is {value * 24:g} min"
        )
    return "the program took the number for a date: type it again"


def _text_for_number(case: Case, one: str, fld: Field, value: str) -> None:
    both = comma_readings(value)
    case.mistyped.add(one)
    if both is not None:
        _decimal_comma(case, one, fld, value, *both)
        return
    right, why, severity = _read_as(value, fld)
    effect = None
    if right is None:
        case.spoiled.add(one)
    else:
        case.repairs[one] = right
    message = f"{called(fld.label)}: text stands where a number belongs"
    _add(case, "reading-not-number", one, message, value, severity, expected=f"a number in {fld.unit}",
         likely_cause=why, effect=effect)  # fmt: skip


def _decimal_comma(case: Case, one: str, fld: Field, value: str, decimal: float, thousands: float) -> None:
    ambiguous = decimal != thousands and re.fullmatch(r"\D*\d{1,3},\d{3}\D*", value.strip()) is not None
    reads = f"{decimal:g}, or {thousands:g} if the comma separates thousands" if ambiguous else f"{decimal:g}"
    case.repairs[one] = decimal
    message = f"{called(fld.label)}: stored as text with a decimal comma ({quoted(value)}); it reads {reads} {fld.unit}"
    _add(case, "reading-decimal-comma", one, message, value, expected=decimal,
         likely_cause="a keyboard or program with a decimal comma")  # fmt: skip


def _read_as(value: str, fld: Field) -> tuple[float | None, str | None, str]:
    """(the number meant where that is plain, why it may have become text, how grave that is)."""
    text = value.strip()
    if PLAIN_NUMBER.fullmatch(text):
        return float(text), "a number stored as text: type it again", "error"
    match = NUMBER_AND_UNIT.fullmatch(value)
    if match:
        same = match[2].strip() == fld.unit and "," not in match[1]
        right = float(match[1].replace(" ", "")) if same else None
        return right, "the unit was typed with the number", "warning"
    if text.lower() in NOT_DETERMINED:
        return None, "a word for `not determined`: leave the cell blank instead", "error"
    if text.startswith("<"):
        return None, "a limit: type the number, and < in the mark beside it", "error"
    if any(unicodedata.category(c) in ("Nd", "Pd", "Sm", "Cf", "Zs") and not c.isascii() for c in value):
        return None, "signs that only look like digits or a minus", "error"
    if re.fullmatch(r"[\dOolI.,+\- ]+", text):
        return None, "a letter O or l in place of a digit", "error"
    return None, None, "error"


def _date(case: Case, one: str, fld: Field, value: Value) -> None:
    if is_number(value) and EARLIEST < value < LATEST:
        return
    _spoil(case, one)
    _add(case, "reading-date", one, f"{called(fld.label)}: not a date", value, expected="a date such as 2025-03-04")


def _text(case: Case, one: str, fld: Field, value: Value) -> None:
    label = called(fld.label)
    if isinstance(fld.choices, tuple) and fld.choices and case.parts.readings.get(one) not in fld.choices:
        _spoil(case, one)
        message = f"{label}: {quoted(value)} is not one of the choices"
        _add(case, "reading-impossible", one, message, value, expected=", ".join(fld.choices))
    elif isinstance(fld.choices, str):
        _listed(case, one, fld.choices, label, value)
    elif fld.name == "start" and not _is_clock(value):
        _spoil(case, one)
        _add(case, "reading-impossible", one, "start: not a time of day", value, expected="hh:mm such as 08:05")


def _listed(case: Case, one: str, choices: str, label: str, value: Value) -> None:
    """A choice from a printed table."""
    _, table, column = choices.split(".")
    known = [str(row.get(column)) for row in case.parts.record.tables.get(table, ())]
    if known and str(value).casefold() not in [name.casefold() for name in known]:
        _spoil(case, one)
        message = f"{label}: {quoted(value)} is not on the sheet's list"
        _add(case, "reading-impossible", one, message, value, expected=", ".join(known))


def _is_clock(value: Value) -> bool:
    """hh:mm as text, or the part of a day a program makes of it."""
    if isinstance(value, str):
        return CLOCK.fullmatch(value.strip()) is not None
    return is_number(value) and 0.0 <= value < 1.0


def _limits(case: Case, one: str, fld: Field) -> Mapping[str, float]:
    """Limits that profile, class or lab file set for this place in place of the kind's."""
    ranges = case.parts.record.ranges
    return ranges.get(one.partition("[")[0]) or ranges.get(fld.key) or {}


def _outside(value: float, low: float | None, high: float | None) -> bool:
    return (low is not None and value < low) or (high is not None and value > high)


def _range(case: Case, one: str, fld: Field, value: float) -> None:
    if not case.is_counted(one.partition(".")[0]):
        return
    own = _limits(case, one, fld)
    low, high = own.get("low", fld.low), own.get("high", fld.high)
    if _outside(value, low, high):
        message = f"{called(fld.label)} is impossible here"
        case.add("reading-impossible", one, message, found=value, expected=_span(low, high, fld.unit))
        return
    low, high = own.get("warn_low", fld.warn_low), own.get("warn_high", fld.warn_high)
    if _outside(value, low, high):
        sourced = "warn_low" in own or "warn_high" in own
        _unusual(case, one, fld, value, _span(low, high, fld.unit), sourced)


def _unusual(case: Case, one: str, fld: Field, value: float, span: str, sourced: bool) -> None:
    """Unusual; a note once somebody confirmed it in the remarks, where no method or laboratory set the range."""
    confirmed = not sourced and bool(case.text(f"{one.partition('.')[0]}.remarks"))
    message = f"{called(fld.label)} is outside the usual range"
    message += " (confirmed in the remarks)" if confirmed else ""
    case.add("reading-out-of-range", one, message, "note" if confirmed else "warning", found=value, expected=span)


def _series_range(case: Case, name: str, fld: Field, listed: list[tuple[str, Cell]]) -> None:
    """One finding for all elements of a series that are out of the same range."""
    own = _limits(case, name, fld)
    limits = [(own.get(f"{end}low", low), own.get(f"{end}high", high))
              for end, low, high in (("", fld.low, fld.high), ("warn_", fld.warn_low, fld.warn_high))]  # fmt: skip
    for low, high in limits:
        off = [one for one, cell in listed if _outside(float(cell[1] or 0.0), low, high)]
        if off:
            before = len(case.found)
            _range(case, off[0], fld, float(case.parts.cells[off[0]][1] or 0.0))
            if len(off) > 1 and len(case.found) > before:
                _say_more(case, len(off))
            return


def _span(low: float | None, high: float | None, unit: str | None) -> str:
    if low is None:
        return f"at most {high:g} {unit}"
    if high is None:
        return f"at least {low:g} {unit}"
    return f"{low:g} to {high:g} {unit}"
