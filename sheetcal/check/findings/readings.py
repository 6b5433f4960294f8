"""Readings: of the right type, within what nature and the method allow, and there at all."""

from __future__ import annotations

import re
import unicodedata

from sheetcal.check.case import Case
from sheetcal.check.causes import comma_readings
from sheetcal.check.submission import Cell
from sheetcal.kinds.dates import iso
from sheetcal.model import Field, Value

NUMBER_TYPES = ("number", "integer")
DATE_TYPES = ("date", "datetime")
NUMBER_AND_UNIT = re.compile(r"\s*[+-]?\s*\d+(\.\d*)?\s*[A-Za-z%]")
LATEST, EARLIEST = 73050.0, 29221.0  # serial numbers of 2100 and 1980


def look(case: Case) -> None:
    """Findings on every filled reading, and on those that are missing."""
    for one, cell in case.parts.cells.items():
        place, _ = case.place(one)
        if place.field.step is None and not place.field.locked and one not in case.parts.record.locked:
            _reading(case, one, place.field, cell)
    _missing(case)


def _reading(case: Case, one: str, fld: Field, cell: Cell) -> None:
    kind, value, formula = cell
    if formula is not None:
        case.add(
            "reading-formula",
            one,
            f"{fld.label.lower()}: a formula stands where a reading belongs",
            found=formula,
        )
    elif kind == "e":
        case.add(
            "reading-error-value",
            one,
            f"{fld.label.lower()}: an error value stands in the reading",
            found=value,
        )
    elif value in (None, ""):
        return
    elif fld.type in NUMBER_TYPES:
        _number(case, one, fld, kind, value)
    elif fld.type in DATE_TYPES:
        _date(case, one, fld, kind, value)
    else:
        _text(case, one, fld, kind, value)


def _number(case: Case, one: str, fld: Field, kind: str, value: Value) -> None:
    if kind == "d":
        number = float(value) if isinstance(value, float | int) else 0.0
        message = f"{fld.label.lower()}: a date or clock time stands where a number belongs ({iso(number)})"
        case.add("reading-date", one, message, found=value, expected=f"a number in {fld.unit}")
    elif isinstance(value, bool):
        case.add(
            "reading-not-number",
            one,
            f"{fld.label.lower()}: {str(value).upper()} stands where a number belongs",
            found=value,
        )
    elif isinstance(value, str):
        _text_for_number(case, one, fld, value)
    elif isinstance(value, float | int):
        _range(case, one, fld, float(value))


def _text_for_number(case: Case, one: str, fld: Field, value: str) -> None:
    both = comma_readings(value)
    expected = f"a number in {fld.unit}"
    if both is not None:
        decimal, thousands = both
        ambiguous = decimal != thousands and re.fullmatch(r"\D*\d{1,3},\d{3}\D*", value.strip()) is not None
        readings = f"{decimal:g}, or {thousands:g} if the comma separates thousands" if ambiguous else f"{decimal:g}"
        message = (
            f"{fld.label.lower()}: stored as text with a decimal comma ({value!r}); it reads {readings} {fld.unit}"
        )
        case.repairs[one] = decimal
        effect = case.effect(one, {one: decimal}) if "[" not in one else None
        case.add("reading-decimal-comma", one, message, found=value, expected=decimal, effect=effect,
                 likely_cause="a keyboard or program with a decimal comma")  # fmt: skip
        return
    case.add(
        "reading-not-number", one, f"{fld.label.lower()}: text stands where a number belongs", found=value,
        expected=expected, likely_cause=_why_text(value),
    )  # fmt: skip


def _why_text(value: str) -> str | None:
    """Why a number may have become text."""
    if NUMBER_AND_UNIT.match(value):
        return "the unit was typed with the number"
    if value.strip().lower() in ("n.d.", "nd", "-", "--", "n/a"):
        return "a word for `not determined`: leave the cell blank instead"
    if value.strip().startswith("<"):
        return "a limit: type the number, and < in the mark beside it"
    try:
        float(value.strip())
    except ValueError:
        pass
    else:
        return "a number stored as text: type it again"
    if any(unicodedata.category(c) in ("Nd", "Pd", "Sm", "Cf", "Zs") and not c.isascii() for c in value):
        return "signs that only look like digits or a minus"
    if re.fullmatch(r"[\dOolI.,+\- ]+", value.strip()):
        return "a letter O or l in place of a digit"
    return None


def _date(case: Case, one: str, fld: Field, kind: str, value: Value) -> None:
    if isinstance(value, float | int) and not isinstance(value, bool) and EARLIEST < value < LATEST:
        return
    case.add(
        "reading-date",
        one,
        f"{fld.label.lower()}: not a date",
        found=value,
        expected="a date such as 2025-03-04",
    )


def _text(case: Case, one: str, fld: Field, kind: str, value: Value) -> None:
    if fld.choices and not isinstance(fld.choices, str) and str(value) not in fld.choices:
        case.add(
            "reading-impossible", one, f"{fld.label.lower()}: {value!r} is not one of the choices", found=value,
            expected=", ".join(fld.choices),
        )  # fmt: skip
    elif isinstance(fld.choices, str):
        _, table, column = fld.choices.split(".")
        known = [str(row.get(column)) for row in case.parts.record.tables.get(table, ())]
        if known and str(value).lower() not in [name.lower() for name in known]:
            message = f"{fld.label.lower()}: {value!r} is not on the sheet's list"
            case.add("reading-impossible", one, message, found=value, expected=", ".join(known))
    elif fld.name == "start" and re.fullmatch(r"([01]\d|2[0-3]):[0-5]\d", str(value)) is None:
        case.add("reading-impossible", one, "start: not a time of day", found=value, expected="hh:mm such as 08:05")


def _range(case: Case, one: str, fld: Field, value: float) -> None:
    ranges = case.parts.record.ranges
    own = ranges.get(one.partition("[")[0]) or ranges.get(fld.key) or {}
    low, high = own.get("low", fld.low), own.get("high", fld.high)
    if (low is not None and value < low) or (high is not None and value > high):
        message = f"{fld.label.lower()}: {value:g} {fld.unit} is impossible here"
        case.add("reading-impossible", one, message, found=value, expected=_span(low, high, fld.unit))
        return
    low, high = own.get("warn_low", fld.warn_low), own.get("warn_high", fld.warn_high)
    if "[" not in one and ((low is not None and value < low) or (high is not None and value > high)):
        confirmed = _confirmed(case, one)
        message = f"{fld.label.lower()}: {value:g} {fld.unit} is unusual" + (
            " (confirmed in the remarks)" if confirmed else ""
        )
        case.add(
            "reading-out-of-range", one, message, "note" if confirmed else "warning", found=value,
            expected=_span(low, high, fld.unit),
        )  # fmt: skip


def _confirmed(case: Case, one: str) -> bool:
    """An unusual reading with a remark in its block was seen by the person who typed it."""
    return bool(case.text(f"{one.partition('.')[0]}.remarks"))


def _span(low: float | None, high: float | None, unit: str | None) -> str:
    if low is None:
        return f"at most {high:g} {unit}"
    if high is None:
        return f"at least {low:g} {unit}"
    return f"{low:g} to {high:g} {unit}"


def _missing(case: Case) -> None:
    """One finding per begun block, one for all blocks not begun; analysis values still to come are a duty."""
    blocks: dict[str, list[str]] = {}
    for one in case.missing:
        blocks.setdefault(one.partition(".")[0], []).append(one)
    unbegun: list[str] = []
    for block, ids in blocks.items():
        if block in case.witnessed.started and block.startswith("run"):
            _block(case, block, ids)
        elif block.startswith("sample") and _benched(case, block):
            _awaited(case, block, ids)
        elif block == "sheet" and case.witnessed.started:
            _block(case, block, ids)
        else:
            unbegun += ids
    if unbegun:
        case.add("reading-missing", unbegun[0], f"{len(unbegun)} readings missing in blocks not begun")


def _block(case: Case, block: str, ids: list[str]) -> None:
    labels = ", ".join(case.place(one)[0].field.label.lower() for one in ids[:4])
    more = f" and {len(ids) - 4} more" if len(ids) > 4 else ""
    case.add("reading-missing", ids[0], f"{block}: missing {labels}{more}; what stands on it is withheld")


def _benched(case: Case, sample: str) -> bool:
    """Whether all runs of a sample that have been begun are done: then only other benches are waited for."""
    runs = list(case.runs(sample))
    return bool(runs) and not any(one.partition(".")[0] in runs for one in case.missing)


def _awaited(case: Case, sample: str, ids: list[str]) -> None:
    labels = ", ".join(case.place(one)[0].field.label.lower() for one in ids)
    case.add(
        "value-awaited", ids[0], f"{case.text(f'{sample}.sample_id') or sample}: waiting for {labels}", "warning",
        sort="duty",
    )  # fmt: skip
