"""Every step of every kind names a cell function, gives it all it needs, and its units fit."""

from __future__ import annotations

import pytest

from sheetcal import profiles, units
from sheetcal.cells import registry
from sheetcal.cells.registry import SAME, Argument, CellFunction
from sheetcal.formulas.expressions import read as read_expression
from sheetcal.kinds import source
from sheetcal.model import Field, SheetKind

KINDS = ("calibration", "fuel", "heat-balance", "specific-heat", "vaporisation")
DRAFTS = {name: source.read(name) for name in source.names()}
MANY = {"runs": "run", "samples": "sample", "bodies": "body"}
TEXT_TYPES = ("text", "choice")
ISSUE_CONSTANTS = {"other_unit": "J/g"}  # made by `issue` from the unit chosen


def steps(kind: SheetKind) -> list[Field]:
    return [one for one in kind.fields if one.step and one.step.cell]


def column_unit(kind: SheetKind, reference: str) -> str | None:
    _, table, name = reference.split(".")
    columns = dict(one.split(":", 1) for one in kind.tables[table])
    return None if columns[name] in ("text",) else columns[name]


def field_of(kind: SheetKind, scope: str, reference: str) -> Field:
    """The field a reference of a step or rule in `scope` means. Raises KeyError for none."""
    prefix, _, name = reference.rpartition(".")
    return kind.field(f"{MANY.get(prefix, prefix or scope)}.{name}")


def unit_of(kind: SheetKind, scope: str, reference: str) -> str | None:
    """Unit of what a reference means; None for text, "date" for dates."""
    if reference.startswith("table."):
        return column_unit(kind, reference)
    if reference.startswith("const."):
        name = reference[6:]
        if name in ISSUE_CONSTANTS:
            return ISSUE_CONSTANTS[name]
        own = registry.constants()
        return own[name].unit if name in own else profiles.known(name).unit
    found = field_of(kind, scope, reference)
    if found.type in ("date", "datetime"):
        return "date"
    return None if found.type in TEXT_TYPES else found.unit


def is_many(kind: SheetKind, scope: str, reference: str) -> bool:
    prefix = reference.rpartition(".")[0]
    if reference.startswith("const."):
        return False
    return prefix in MANY or reference.startswith("table.") or field_of(kind, scope, reference).series


def same_unit(one: str | None, other: str | None) -> bool:
    if one is None or other is None or "date" in (one, other):
        return one == other
    return units.dimensions(one) == units.dimensions(other) and units.convert(1.0, one, other) == pytest.approx(1.0)


def argument_fault(kind: SheetKind, one: Field, function: CellFunction, argument: Argument) -> str:
    assert one.step is not None
    reference = one.step.args.get(argument.name)
    if reference is None:
        return "" if argument.optional else "is not mapped"
    if is_many(kind, one.scope, reference) != argument.series:
        return f"{reference}: a series where one value is wanted, or the other way round"
    unit = unit_of(kind, one.scope, reference)
    if argument.text or argument.unit is None:
        return "" if unit is None else f"{reference} is in {unit}, text is wanted"
    if unit is None:
        return f"{reference} is text, a number is wanted"
    wanted = wanted_unit(kind, one, argument.unit)
    return "" if wanted == "any" or same_unit(unit, wanted) else f"{reference} is in {unit}, not {wanted}"


def wanted_unit(kind: SheetKind, one: Field, unit: str) -> str | None:
    assert one.step is not None
    if not unit.startswith(SAME):
        return unit
    reference = one.step.args.get(unit[len(SAME) :])
    return "any" if reference is None else unit_of(kind, one.scope, reference)


def result_fault(kind: SheetKind, one: Field, function: CellFunction) -> str:
    if function.unit is None:
        return "" if one.unit is None and one.type == "text" else "a text result with a unit or another type"
    if function.unit == "y / x":
        assert one.step is not None
        y, x = (unit_of(kind, one.scope, one.step.args[name]) for name in ("y", "x"))
        return "" if one.unit and same_unit(one.unit, f"({y})/({x})") else f"not ({y})/({x})"
    wanted = wanted_unit(kind, one, function.unit)
    shown = "date" if one.type == "date" else one.unit
    return "" if wanted == "any" or same_unit(shown, wanted) else f"is in {shown}, the function gives {wanted}"


def test_the_five_kinds_are_there() -> None:
    """Five kinds have a source file; the tests below look at all of them."""
    assert tuple(source.names()) == KINDS


@pytest.mark.parametrize("name", source.names())
def test_every_step_is_whole_and_its_units_fit(name: str) -> None:
    """A step maps every argument its function needs, each with the unit and the sort of reference it wants."""
    kind = DRAFTS[name]
    faults = []
    for one in steps(kind):
        assert one.step is not None
        function = registry.get(one.step.cell)
        strangers = set(one.step.args) - {argument.name for argument in function.args}
        found = {argument.name: argument_fault(kind, one, function, argument) for argument in function.args}
        found["result"] = result_fault(kind, one, function)
        faults += [f"{one.key}: {function.name}, {key}: {text}" for key, text in found.items() if text]
        faults += [f"{one.key}: {function.name} has no argument {stranger}" for stranger in strangers]
    assert not faults, "\n".join(faults)
    assert len(steps(kind)) >= 20


@pytest.mark.parametrize("name", source.names())
def test_every_step_speaks_or_says_why_not(name: str) -> None:
    """A result either is balanced or gives the reason for its silence; a reported one is always balanced."""
    for one in steps(DRAFTS[name]):
        assert one.step is not None
        assert (one.step.balance == "speaks") != bool(one.step.balance_reason), one.key
        assert one.step.balance == "speaks" or not one.step.reported, one.key


@pytest.mark.parametrize("name", source.names())
def test_steps_form_no_circle(name: str) -> None:
    """No result rests on itself, by whatever road."""
    kind = DRAFTS[name]
    done: set[str] = set()

    def visit(one: Field, above: tuple[str, ...]) -> None:
        assert one.key not in above, " -> ".join([*above, one.key])
        if one.key in done or one.step is None:
            return
        for reference in one.step.args.values() if one.step.cell else ():
            if not reference.startswith(("const.", "table.")):
                visit(field_of(kind, one.scope, reference), (*above, one.key))
        done.add(one.key)

    for one in steps(kind):
        visit(one, ())
    assert len(done) == len(steps(kind))


@pytest.mark.parametrize("name", source.names())
def test_every_rule_and_look_line_refers_to_what_there_is(name: str) -> None:
    """A rule's expression, its place and the rules a line shows are all there."""
    kind = DRAFTS[name]
    codes = [rule.code for rule in kind.rules]
    assert len(set(codes)) == len(codes)
    for rule in kind.rules:
        assert kind.field(f"{rule.scope}.{rule.place}")
        assert not rule.unless or rule.unless in codes
        for reference in read_expression(rule.when).references:
            unit_of(kind, rule.scope, reference)
    for one in kind.fields:
        if one.step and not one.step.cell:
            assert set(one.step.args.values()) <= set(codes), one.key


@pytest.mark.parametrize("name", source.names())
def test_every_reading_has_a_block_and_what_it_depends_on(name: str) -> None:
    """A field stands in a block of its own scope, and a condition for a reading names a field."""
    kind = DRAFTS[name]
    scopes = {block.id: block.scope for block in kind.blocks}
    for one in kind.fields:
        assert scopes[one.block] == one.scope, one.key
        for reference in one.needed or {}:
            field_of(kind, one.scope, reference)
        if isinstance(one.choices, str) and one.choices:
            column_unit(kind, one.choices)
        if one.beside:
            assert kind.field(f"{one.scope}.{one.beside}")
