"""Readings: of the right type, and within what nature and the method allow."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import replace

from sheetcal.check.case import Case, called, is_number, quoted
from sheetcal.check.causes import comma_readings
from sheetcal.check.meant import of_reading
from sheetcal.check.reasons import decimals
from sheetcal.check.spelled import read_as, without_marks
from sheetcal.check.submission import Cell
from sheetcal.kinds.dates import iso
from sheetcal.model import Field, Value

NUMBER_TYPES = ("number", "integer")
DATE_TYPES = ("date", "datetime")
CLOCK = re.compile(r"([01]\d|2[0-3]):[0-5]\d")
TRUTHS = {"=TRUE()": True, "=FALSE()": False}
LATEST, EARLIEST = 73050.0, 29221.0  # serial numbers of 2100 and 1980
NAMES = ("crucible_id", "control_ref", "record_file", "record_vessel", "instrument_file")  # looked up or compared
MARKED = "a blank or a mark that nobody sees stands at its ends: type it again"


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
    if EARLIEST < value < LATEST:
        day, month = int(iso(value, False)[8:10]), int(iso(value, False)[5:7])
        return f"the program took the number for a date: probably {day}.{month:02d} or {month}.{day:02d}; type it again"
    return "the program took the number for a date: type it again"


def _text_for_number(case: Case, one: str, fld: Field, value: str) -> None:
    both = comma_readings(value)
    case.mistyped.add(one)
    if both is not None:
        _decimal_comma(case, one, fld, value, *both)
        return
    meant = read_as(value, fld)
    if meant.value is None:
        case.spoiled.add(one)
    else:
        case.repairs[one] = meant.value
    message = f"{called(fld.label)}: text stands where a number belongs"
    expected: Value = f"a number in {fld.unit}" if meant.value is None else meant.value
    _add(case, "reading-not-number", one, message, value, meant.severity, expected=expected,
         likely_cause=meant.why)  # fmt: skip


def _decimal_comma(case: Case, one: str, fld: Field, value: str, decimal: float, thousands: float) -> None:
    ambiguous = decimal != thousands and re.fullmatch(r"\D*\d{1,3},\d{3}\D*", value.strip()) is not None
    reads = f"{decimal:g}, or {thousands:g} if the comma separates thousands" if ambiguous else f"{decimal:g}"
    case.repairs[one] = decimal
    message = f"{called(fld.label)}: stored as text with a decimal comma ({quoted(value)}); it reads {reads} {fld.unit}"
    _add(case, "reading-decimal-comma", one, message, value, expected=decimal,
         likely_cause="a keyboard or program with a decimal comma")  # fmt: skip


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
        _add(case, "reading-impossible", one, message, value, expected=", ".join(fld.choices),
             likely_cause=_marked(value, fld.choices))  # fmt: skip
    elif isinstance(fld.choices, str):
        _listed(case, one, fld.choices, label, value)
    elif fld.name == "start" and not _is_clock(value):
        _spoil(case, one)
        _add(case, "reading-impossible", one, "start: not a time of day", value, expected="hh:mm such as 08:05")
    elif fld.name in NAMES and isinstance(value, str) and without_marks(value) != value:
        message = f"{label}: blanks or marks that nobody sees stand in the name"
        _add(case, "reading-stray-marks", one, message, value, "note", expected=without_marks(value))


def _listed(case: Case, one: str, choices: str, label: str, value: Value) -> None:
    """A choice from a printed table."""
    _, table, column = choices.split(".")
    known = [str(row.get(column)) for row in case.parts.record.tables.get(table, ())]
    if known and str(value).casefold() not in [name.casefold() for name in known]:
        _spoil(case, one)
        message = f"{label}: {quoted(value)} is not on the sheet's list"
        _add(case, "reading-impossible", one, message, value, expected=", ".join(known),
             likely_cause=_marked(value, tuple(known)))  # fmt: skip


def _marked(value: Value, known: tuple[str, ...]) -> str | None:
    """The cause where only blanks or unseen marks keep a name from being one that is known."""
    return MARKED if without_marks(str(value)).casefold() in [one.casefold() for one in known] else None


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
        _off(case, "reading-impossible", one, "is impossible here", "error", fld, value, _span(low, high, fld.unit))
        return
    low, high = own.get("warn_low", fld.warn_low), own.get("warn_high", fld.warn_high)
    if _outside(value, low, high):
        sourced = "warn_low" in own or "warn_high" in own
        _unusual(case, one, fld, value, _span(low, high, fld.unit), sourced)


def _unusual(case: Case, one: str, fld: Field, value: float, span: str, sourced: bool) -> None:
    """Unusual; a note once somebody confirmed it in the remarks, where no method or laboratory set the range."""
    confirmed = not sourced and bool(case.text(f"{one.partition('.')[0]}.remarks"))
    what = "is outside the usual range" + (" (confirmed in the remarks)" if confirmed else "")
    _off(case, "reading-out-of-range", one, what, "note" if confirmed else "warning", fld, value, span)


def _off(case: Case, code: str, one: str, what: str, severity: str, fld: Field, value: float, span: str) -> None:
    """A reading out of its range, with what it was probably meant to be."""
    causes = of_reading(case, one, fld, value)
    if code == "reading-impossible" and "[" not in one:
        causes = causes or _read_otherwise(case, one, fld, value)
    case.add(code, one, f"{called(fld.label)} {what}", severity, found=value, expected=span,
             likely_cause=causes[0] if causes else None, causes=tuple(causes))  # fmt: skip


def _read_otherwise(case: Case, one: str, fld: Field, value: float) -> list[str]:
    """What the hand or a program may have made of what was meant, where only what is possible here can tell."""
    own = _limits(case, one, fld)
    low, high, places = own.get("low", fld.low), own.get("high", fld.high), decimals(fld.resolution)
    found = []
    if value < 0.0 and low is not None and not _outside(-value, low, high):
        found.append(f"the sign was probably lost or added: {-value:g}")
    if value.is_integer() and places and not _outside(value / 10.0**places, low, high):
        comma = ", or a comma taken for one between thousands" if places == 3 else ""
        found.append(f"the decimal point was probably forgotten{comma}: {value / 10.0**places:g} {fld.unit}")
    if value.is_integer() and EARLIEST < value < LATEST:
        found.append(_why_date(value, fld))  # in a cell with a number format a date is a bare serial number
    return found


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
