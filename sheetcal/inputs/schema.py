"""What a key of the lab file may hold: kinds of value, checked and converted into the dataclasses of lab.py.

A dataclass field made by `text`, `quantity` and the others carries its kind as metadata; the reader
walks the dataclass, so that the shape in Python and the keys in the file cannot drift apart.
"""

import dataclasses
from collections.abc import Callable
from dataclasses import dataclass
from datetime import date, datetime, time
from typing import Any

from sheetcal import units
from sheetcal.errors import BadInput

MISSING = dataclasses.MISSING


@dataclass(frozen=True, slots=True)
class Kind:
    """How one key is read: `read` turns the TOML value into Python's or raises BadInput."""

    read: Callable[[Any], Any]
    expected: str


def _field(kind: Kind, default: Any) -> Any:
    return dataclasses.field(default=default, kw_only=True, metadata={"kind": kind})


def kind_of(field: "dataclasses.Field[Any]") -> Kind | None:
    """The kind of a key, or None for a field that the reader fills itself."""
    found: Kind | None = field.metadata.get("kind")
    return found


def required(field: "dataclasses.Field[Any]") -> bool:
    """True where the key must be there."""
    return field.default is MISSING


def _refuse(value: Any, what: str, expected: str, do: str = "Correct it.") -> BadInput:
    shown = f"'{value}'" if isinstance(value, str) else str(value).lower()
    return BadInput(shown[:60], what, expected, do)


def _text(value: Any) -> str:
    if isinstance(value, str) and value.strip() and value.isprintable():
        return value
    raise _refuse(value, "is not a text", "a text in quotation marks")


def _texts(value: Any) -> tuple[str, ...]:
    if isinstance(value, list):
        return tuple(_text(one) for one in value)
    raise _refuse(value, "is not a list", 'a list of texts such as ["fuel"]')


def _integer(value: Any) -> int:
    if isinstance(value, int) and not isinstance(value, bool) and value >= 0:
        return value
    raise _refuse(value, "is not a whole number", "a whole number, not below 0")


def _flag(value: Any) -> bool:
    if isinstance(value, bool):
        return value
    raise _refuse(value, "is not true or false", "true or false")


def _day(value: Any) -> date:
    if isinstance(value, date) and not isinstance(value, datetime):
        return value
    raise _refuse(value, "is not a date", "a date such as 2025-03-31, without quotation marks")


def _moment(value: Any, at: time) -> datetime:
    """A local date and time; a date alone stands for `at` on that day."""
    if isinstance(value, datetime):
        if value.tzinfo is not None:
            raise _refuse(value, "carries a time zone", "local time without one")
        return value
    if isinstance(value, date):
        return datetime.combine(value, at)
    expected = "a date and time such as 2025-03-06T10:40:00, without quotation marks"
    raise _refuse(value, "is not a date and time", expected)


def _quantity(value: Any, unit: str) -> float:
    """A number in `unit`, from text with its unit; a bare number only where the unit is 1."""
    if isinstance(value, bool):
        raise _refuse(value, "is not a quantity", f"a value in {unit}")
    if isinstance(value, int | float):
        if unit == "1":
            return units.quantity(repr(value), "1")
        raise _refuse(value, "has no unit", f"a text with its unit, in {unit}", f'Write "{value} {unit}".')
    if isinstance(value, str):
        return units.quantity(value, unit)
    raise _refuse(value, "is not a quantity", f"a text with its unit, in {unit}")


def _pair(value: Any, unit: str) -> tuple[float, float]:
    expected = f'two values, lowest first, such as ["1 {unit}", "2 {unit}"]'
    if not isinstance(value, list) or len(value) != 2:
        raise _refuse(value, "is not a range", expected)
    low, high = _quantity(value[0], unit), _quantity(value[1], unit)
    if low > high:
        raise _refuse(value, "is a range from high to low", expected, "Exchange the two.")
    return low, high


def text(default: Any = MISSING) -> Any:
    """A text on one line."""
    return _field(Kind(_text, "a text"), default)


def texts(default: Any = MISSING) -> Any:
    """A list of texts."""
    return _field(Kind(_texts, "a list of texts"), default)


def choice(*allowed: str, default: Any = MISSING) -> Any:
    """One of a few texts."""

    def read(value: Any) -> str:
        if value in allowed:
            return str(value)
        raise _refuse(value, "is not known", " or ".join(f"'{one}'" for one in allowed))

    return _field(Kind(read, " or ".join(allowed)), default)


def integer(default: Any = MISSING) -> Any:
    """A whole number, not below 0."""
    return _field(Kind(_integer, "a whole number"), default)


def flag(default: Any = MISSING) -> Any:
    """true or false."""
    return _field(Kind(_flag, "true or false"), default)


def day(default: Any = MISSING) -> Any:
    """A date."""
    return _field(Kind(_day, "a date"), default)


def start(default: Any = MISSING) -> Any:
    """A local date and time at which something begins; a date alone is its first moment."""
    return _field(Kind(lambda value: _moment(value, time.min), "a date and time"), default)


def end(default: Any = MISSING) -> Any:
    """A local date and time at which something ends; a date alone is its last second."""
    return _field(Kind(lambda value: _moment(value, time(23, 59, 59)), "a date and time"), default)


def quantity(unit: str, default: Any = MISSING, low: float | None = None) -> Any:
    """A value with its unit, converted into `unit`; `low` is the value it must lie above."""

    def read(value: Any) -> float:
        found = _quantity(value, unit)
        if low is not None and found <= low:
            raise _refuse(value, "is too small", f"more than {low:g} {unit}")
        return found

    return _field(Kind(read, f"a value in {unit}"), default)


def pair(unit: str, default: Any = MISSING) -> Any:
    """A range: two values with their unit, lowest first."""
    return _field(Kind(lambda value: _pair(value, unit), f"a range in {unit}"), default)


def heat(default: Any = MISSING) -> Any:
    """A heat with the unit it is bought by: (value, "J/g", "J/cm" or "J")."""
    return _field(Kind(_heat, "a heat in J/g, J/cm or J"), default)


def _heat(value: Any) -> tuple[float, str]:
    expected = "a heat in J/g, J/cm or J (one piece)"
    if not isinstance(value, str):
        raise _refuse(value, "is not a quantity", expected, "Write it as text with its unit.")
    _, unit = units.split(value)
    for known in ("J/g", "J/cm", "J"):
        if unit is not None and units.dimensions(unit) == units.dimensions(known):
            return units.quantity(value, known), known
    raise _refuse(value, "is not a heat", expected)


def read_pair(value: Any, unit: str) -> tuple[float, float]:
    """A range read outside a dataclass. Raises BadInput."""
    return _pair(value, unit)


def read_quantity(value: Any, unit: str) -> float:
    """A quantity read outside a dataclass. Raises BadInput."""
    return _quantity(value, unit)
