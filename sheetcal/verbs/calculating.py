"""`calc`: one cell function from values with units."""

from __future__ import annotations

from typing import Any

from sheetcal import units
from sheetcal.cells import registry
from sheetcal.errors import BadInput


def calculate(name: str, arguments: list[str], to: str | None) -> str:
    """The result with its unit as text. Raises BadInput or OutOfRange."""
    try:
        function = registry.get(name.upper())
    except KeyError:
        nearest = ", ".join(registry.nearest(name))
        raise BadInput(f"calc {name}", "no such cell function", nearest, "See `sheetcal cells`.") from None
    given = _pairs(function, arguments)
    known_units = _any_units(function, given)
    values = {arg: _value(function.argument(arg), text, known_units) for arg, text in given.items()}
    try:
        result = registry.call(function.name, **values)
    except TypeError:
        lacking = [one.name for one in function.args if not (one.optional or one.column or one.name in values)]
        raise BadInput(
            f"calc {function.name}", f"lacks {', '.join(lacking)}", _signature(function), "Give every argument."
        ) from None
    unit = _result_unit(function, known_units)
    if isinstance(result, str) or unit is None:
        return str(result)
    if to is not None:
        result, unit = units.convert(float(result), unit, to), to
    return f"{result:.12g}" if unit == "1" else f"{result:.12g} {unit}"


def _pairs(function: registry.CellFunction, arguments: list[str]) -> dict[str, str]:
    known = [argument.name for argument in function.args]
    found: dict[str, str] = {}
    for entry in arguments:
        name, sign, value = entry.partition("=")
        if not sign or name not in known:
            raise BadInput(
                f"calc {function.name}",
                f"argument {entry!r}",
                _signature(function),
                "Write NAME='VALUE UNIT'.",
            )
        if name in found:
            raise BadInput(f"calc {function.name}", f"{name} is given twice", "once", "Leave one out.")
        found[name] = value
    return found


def _signature(function: registry.CellFunction) -> str:
    return ", ".join(f"{argument.name} ({argument.unit or 'text'})" for argument in function.args)


def _any_units(function: registry.CellFunction, given: dict[str, str]) -> dict[str, str]:
    """The unit each argument of any unit is given in."""
    found = {}
    for argument in function.args:
        if argument.unit == "any" and argument.name in given:
            found[argument.name] = units.split(given[argument.name].split(",")[-1])[1] or "1"
    return found


def _value(argument: registry.Argument, text: str, known_units: dict[str, str]) -> Any:
    if argument.text:
        return [part.strip() for part in text.split(",")] if argument.series else text
    unit = _unit(argument.unit or "1", known_units, argument.name)
    return units.quantities(text, unit) if argument.series else units.quantity(text, unit)


def _unit(stated: str, known_units: dict[str, str], name: str) -> str:
    if stated == "any":
        return known_units[name]
    if stated.startswith(registry.SAME):
        return known_units.get(stated.removeprefix(registry.SAME), "1")
    return stated


def _result_unit(function: registry.CellFunction, known_units: dict[str, str]) -> str | None:
    return None if function.unit is None else _unit(function.unit, known_units, next(iter(known_units), ""))
