"""CalcAddIns.xcu: what the function wizard shows of each cell function, in every language that has words."""

from __future__ import annotations

from collections.abc import Callable
from xml.sax.saxutils import escape, quoteattr

from sheetcal.cells.registry import SAME, Argument, CellFunction
from sheetcal.office.addin.interface import parameter
from sheetcal.office.addin.manifest import HEAD
from sheetcal.office.addin.words import FIRST, Words, languages, words

SERVICE = "org.sheetcal.Functions"
# LibreOffice knows its own categories only and shows every other one under Add-in. Ours is stated all the same, and
# each description begins with it.
CATEGORY = "sheetcal"
SPACES = (
    'xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema" '
    'oor:name="CalcAddIns" oor:package="org.openoffice.Office"'
)


def xcu(functions: list[CellFunction]) -> str:
    """The configuration of all functions."""
    spoken = [words(language) for language in languages()]
    nodes = "".join(_function(one, spoken) for one in functions)
    inside = _node("AddInInfo", _node(SERVICE, _node("AddInFunctions", "\n" + nodes), replace=True))
    return f"{HEAD}<oor:component-data {SPACES}>\n{inside}</oor:component-data>\n"


def _function(function: CellFunction, spoken: list[Words]) -> str:
    parameters = "".join(
        _node(parameter(place), _parameter(function, argument, spoken), replace=True)
        for place, argument in enumerate(function.args)
    )
    inside = (
        _prop("DisplayName", {FIRST: function.name})
        + _prop("Description", _texts(spoken, lambda one: described(function, one)))
        + f'<prop oor:name="Category"><value>{CATEGORY}</value></prop>'
        + _prop("CategoryDisplayName", _texts(spoken, lambda one: one.sentences["category"]))
        + _prop("CompatibilityName", {FIRST: function.name})
        + _node("Parameters", parameters)
    )
    return _node(function.name, inside, replace=True)


def _parameter(function: CellFunction, argument: Argument, spoken: list[Words]) -> str:
    return _prop("DisplayName", _texts(spoken, lambda one: one.label(function, argument))) + _prop(
        "Description", _texts(spoken, lambda one: helped(function, argument, one))
    )


def described(function: CellFunction, spoken: Words) -> str:
    """What the function gives, in which unit, and where its equation comes from."""
    says = spoken.sentences
    return says["function"].format(
        category=says["category"],
        what=spoken.what(function),
        result=_result(function.unit, says),
        source=spoken.source(function).rstrip("."),
    )


def _result(unit: str | None, says: dict[str, str]) -> str:
    if unit is None:
        return says["result_text"]
    if unit in ("1", "date"):
        return says["result_number" if unit == "1" else "result_date"]
    return says["result_any"] if unit.startswith(SAME) or " / " in unit else says["result_unit"].format(unit=unit)


def helped(function: CellFunction, argument: Argument, spoken: Words) -> str:
    """An argument's name, unit, range and what else may stand there."""
    says = spoken.sentences
    parts = [
        _unit(function, argument, spoken),
        _between(argument, says),
        says["choices"].format(choices="; ".join(argument.choices)) if argument.choices else "",
        says["series"] if argument.series else "",
        says[_need(argument)],  # LibreOffice itself calls every single argument optional
    ]
    return f"{spoken.label(function, argument)}: {', '.join(part for part in parts if part)}"


def _need(argument: Argument) -> str:
    if not (argument.optional or argument.column):
        return "needed"
    return "optional_number" if argument.optional and not argument.text else "optional"


def _unit(function: CellFunction, argument: Argument, spoken: Words) -> str:
    says, unit = spoken.sentences, argument.unit
    fixed = {None: "text", "1": "number", "date": "date", "any": "any_unit"}
    if unit in fixed:
        return says[fixed[unit]]
    if unit is not None and unit.startswith(SAME):
        other = function.argument(unit.removeprefix(SAME))
        return says["unit_of"].format(argument=spoken.label(function, other))
    return says["unit"].format(unit=unit)


def _between(argument: Argument, says: dict[str, str]) -> str:
    low, high = _number(argument.low, says), _number(argument.high, says)
    key = "between" if low and high else "above" if low else "below" if high else ""
    return says[key].format(low=low, high=high) if key else ""


def _number(value: float | None, says: dict[str, str]) -> str:
    return "" if value is None else f"{value:.15g}".replace(".", says["decimal"])


def _texts(spoken: list[Words], say: Callable[[Words], str]) -> dict[str, str]:
    return {one.language: say(one) for one in spoken}


def _prop(name: str, texts: dict[str, str]) -> str:
    values = "".join(f'<value xml:lang="{language}">{escape(text)}</value>' for language, text in texts.items())
    return f"<prop oor:name={quoteattr(name)}>{values}</prop>"


def _node(name: str, inside: str, replace: bool = False) -> str:
    how = ' oor:op="replace"' if replace else ""
    return f"<node oor:name={quoteattr(name)}{how}>{inside}</node>\n"
