"""What a reading may hold: type, choice, range; and the stop limits that no option silences."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from datetime import datetime

from sheetcal.errors import BadInput, Refused
from sheetcal.formulas.compute import Engine
from sheetcal.kinds.dates import iso, serial
from sheetcal.kinds.layout import Skeleton
from sheetcal.model import Field, IssueRecord, Place, Rule, Value

Readings = Mapping[str, "Value | list[Value]"]
LONGEST = 2000  # signs of one text
UNCOUNTED = ("void", "not needed")


def entered_text(text: str, fld: Field, one: str, where: str) -> str:
    """A text as it is stored: dates in one spelling, no sign that cannot be printed. Raises BadInput."""
    if fld.type in ("date", "datetime"):
        return _date(text, fld, one, where)
    if not text.isprintable() or len(text) > LONGEST:
        shown = "".join(c if c.isprintable() else f"\\x{ord(c):02x}" for c in text[:40])
        raise BadInput(where, f"{one}: {shown!r}", f"printable text of at most {LONGEST} signs", "Correct it.")
    return text


def _date(text: str, fld: Field, one: str, where: str) -> str:
    timed = fld.type == "datetime"
    expected = "local date and time as 2025-03-04T08:05" if timed else "a date as 2025-03-04"
    try:
        moment = datetime.fromisoformat(text)
    except ValueError:
        raise BadInput(where, f"{one}: {text!r}", expected, "Correct it.") from None
    if moment.tzinfo is not None:
        raise BadInput(where, f"{one}: {text!r} names a time zone", expected, "Give the laboratory's own time.")
    if not timed and moment.time() != datetime.min.time():
        raise BadInput(where, f"{one}: {text!r} has a time of day", expected, "Leave the time out.")
    return iso(serial(text), None if timed else False)


def check_choice(place: Place, value: Value, record: IssueRecord, where: str) -> None:
    """Raise BadInput for a value that is not among the choices of its field."""
    choices = place.field.choices
    if isinstance(choices, str):
        _, table, column = choices.split(".")
        choices = tuple(str(row.get(column)) for row in record.tables.get(table, ()))
    if choices and str(value) not in choices:
        raise BadInput(where, f"{place.id}: {value!r}", ", ".join(choices), "Choose one.")
    if place.field.name == "start" and place.field.unit is None and not _is_clock(value):
        raise BadInput(where, f"{place.id}: {value!r}", "a time as 08:05", "Correct it.")


def _is_clock(value: Value) -> bool:
    try:
        datetime.strptime(str(value), "%H:%M")
    except ValueError:
        return False
    return len(str(value)) == 5


def check_whole(place: Place, value: float, where: str) -> None:
    """Raise BadInput for a part of a number where whole ones are counted."""
    if place.field.type == "integer" and value != int(value):
        raise BadInput(where, f"{place.id}: {value:g}", "a whole number", "Correct it.")


def impossible(place: Place, value: float, record: IssueRecord) -> str | None:
    """The range a value lies outside of, in words, where entry refuses it."""
    own = record.ranges.get(place.id) or record.ranges.get(place.field.key) or {}
    return _outside(value, own.get("low", place.field.low), own.get("high", place.field.high), place.field.unit)


def unusual(place: Place, value: float, record: IssueRecord) -> str | None:
    """The usual range a value lies outside of, in words."""
    own = record.ranges.get(place.id) or record.ranges.get(place.field.key) or {}
    low, high = own.get("warn_low", place.field.warn_low), own.get("warn_high", place.field.warn_high)
    return _outside(value, low, high, place.field.unit)


def _outside(value: float, low: float | None, high: float | None, unit: str | None) -> str | None:
    if not ((low is not None and value < low) or (high is not None and value > high)):
        return None
    shown = "" if unit in (None, "1") else f" {unit}"
    if low is None or high is None:
        return f"at most {high:g}{shown}" if low is None else f"at least {low:g}{shown}"
    return f"{low:g} to {high:g}{shown}"


def new_stops(skeleton: Skeleton, record: IssueRecord, before: Readings, after: Readings) -> Iterator[tuple[str, Rule]]:
    """Stop limits broken by what was filled, as (id of the place they speak of, rule); void runs are evidence."""
    then, now = Engine(skeleton, record, before), Engine(skeleton, record, after)
    anchors: dict[str, Place] = {}
    for one, place in skeleton.places.items():
        anchors.setdefault(one.partition(".")[0], place)
    for rule in skeleton.kind.rules:
        for block, anchor in anchors.items() if rule.action == "stop" else ():
            if anchor.field.scope != rule.scope or after.get(f"{block}.state") in UNCOUNTED:
                continue
            if now.holds(anchor, rule) and not then.holds(anchor, rule):
                yield f"{block}.{rule.place}", rule


def stop(one: str, rule: Rule, where: str, value: Value | list[Value]) -> Refused:
    """The refusal that goes with a stop limit."""
    shown = "" if isinstance(value, list) or value is None else f" {value}"
    return Refused(where, f"{one}{shown}: {rule.text}", "", "No option covers a stop limit.")
