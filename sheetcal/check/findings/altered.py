"""Formulas that are no longer the kind's own: typed over, deleted, rewritten, dimensionally wrong."""

from __future__ import annotations

from typing import Any

from sheetcal.check import dimensions
from sheetcal.check.case import Case, called, is_number
from sheetcal.check.findings import glanced, moved
from sheetcal.check.findings.printed import close
from sheetcal.check.formula import parse
from sheetcal.check.reasons import of_place
from sheetcal.check.slips.explain import explain
from sheetcal.check.tree import Area, FormulaError, Name, Reference, Slot
from sheetcal.kinds.layout import column_letter
from sheetcal.model import Field, Place, Value

MOST = 40  # more formulas than this are one fault of the whole workbook, not many
LONGEST = 84  # letters of a part of a formula in a message


def look(case: Case) -> None:
    """Findings on every result cell that lost its formula or holds another."""
    glanced.look(case)
    over, other = case.witnessed.typed_over, case.witnessed.altered
    case.altered.update(over, other)
    followed = moved.followers_of(case)
    if len(over) + len(other) > MOST:
        first = next(one for one in case.parts.skeleton.places if one in case.altered)
        message = f"{len(over) + len(other)} formulas are not the issued ones: fill a fresh copy of the workbook"
        case.add("formula-altered", first, message, found=other.get(first), expected=case.place(first)[0].formula)
        return
    for one in over:
        if one not in case.moved:
            _typed_over(case, one)
    for one, text in other.items():
        if one not in followed:
            _formula(case, one, text)


def _typed_over(case: Case, one: str) -> None:
    """A value where a formula must stand; an empty cell where nothing was ever stored counts too."""
    place, _ = case.place(one)
    typed, expected = case.parts.typed.get(one), case.expected.get(one)
    label = called(place.field.label)
    if typed is None:
        expected = place.formula if one not in case.witnessed.results else expected
        case.add("result-typed-over", one, f"{label}: its formula was deleted", expected=expected)
        return
    same = close(typed, expected)
    message = f"{label} was typed over" + (" (equal today: still no formula)" if same else "")
    causes = [] if same else of_place(case, one, typed, expected)
    case.add(
        "result-typed-over", one, message, found=typed, expected=expected,
        effect=None if same else case.effect(one, wrong={one: typed}),
        likely_cause=causes[0] if causes else None, causes=tuple(causes),
    )  # fmt: skip


def _formula(case: Case, one: str, text: str) -> None:
    """What the formula does now; one that gives the same whatever is typed is a note."""
    place, _ = case.place(one)
    told = explain(case, place, text)
    start = f"{called(place.field.label)}: the formula"
    if told.code == "formula-equivalent":
        case.altered.discard(one)
        case.add("formula-equivalent", one, f"{start} {told.what}", "note", found=text, expected=place.formula)
        return
    wrong = None if told.literal or told.silent else _dimension_fault(case, place, text)
    what = f" {told.what}" if told.what else " was altered"
    effect = None if told.silent else case.effect(one, wrong={one: text})
    facts: dict[str, Any] = {
        "found": text, "expected": place.formula, "effect": effect,
        "likely_cause": told.causes[0] if told.causes else None, "causes": told.causes,
    }  # fmt: skip
    if wrong:
        case.add("formula-dimension", one, f"{start}{what}; it is dimensionally wrong: {wrong}", **facts)
        return
    now, expected = case.witnessed.results.get(one), case.expected.get(one)
    quiet = told.silent or close(now, expected)
    values = "" if quiet else f"; it gives {_shown(now)} where {_shown(expected)} is right"
    case.add(told.code, one, f"{start}{what}{values}", **facts)


def _dimension_fault(case: Case, place: Place, text: str) -> str | None:
    """What is dimensionally wrong with a formula, or None; one that cannot be read is not judged here."""
    if place.field.step is None or not place.field.step.cell:
        return None  # a look line compares numbers in the units of their cells
    try:
        dimensions.check_unit(parse(text), Units(case, place.tab), _unit(place.field))
    except dimensions.DimensionError as fault:
        return f"{fault.where} {fault.what}" if len(fault.where) < LONGEST else f"it {fault.what}"
    except FormulaError:
        return None
    return None


class Units:
    """Units of what a formula refers to, by the skeleton; a cell nobody knows the unit of goes with all."""

    def __init__(self, case: Case, tab: str) -> None:
        self.plan, self.tab = case.parts.skeleton, tab
        self.constants = {one.name: one.unit for one in case.parts.record.constants}
        self.columns = {
            f"{table}_{name}": unit
            for table, columns in case.parts.kind.tables.items()
            for name, _, unit in (one.partition(":") for one in columns)
        }

    def __call__(self, leaf: Reference | Area | Name | Slot) -> dimensions.Meaning:
        if isinstance(leaf, Name):
            return self._named(leaf.name)
        place = self._in_area(leaf) if isinstance(leaf, Area) else self._at(leaf)
        if place is None:
            return dimensions.NEUTRAL
        return dimensions.meaning(_unit(place.field), isinstance(leaf, Area))

    def _named(self, name: str) -> dimensions.Meaning:
        if name in self.constants:
            return dimensions.meaning(self.constants[name], False)
        unit = self.columns.get(name)
        if unit is None:
            return dimensions.NEUTRAL
        return dimensions.meaning(None if unit == "text" else unit, True)

    def _at(self, leaf: Reference | Slot) -> Place | None:
        assert isinstance(leaf, Reference)  # a formula of a file has no slots
        return self.plan.at.get((leaf.tab or self.tab, f"{column_letter(leaf.column)}{leaf.row}"))

    def _in_area(self, area: Area) -> Place | None:
        """The first place a range touches."""
        tab = area.tab or self.tab
        for place in self.plan.places.values():
            if place.tab == tab and area.left <= place.column <= area.right and place.row <= area.bottom:
                last = place.row + (self.plan.shape.record_rows if place.field.series else 1) - 1
                if last >= area.top:
                    return place
        return None


def _unit(fld: Field) -> str | None:
    """The unit of a field's cell as the dimensions know it; None is text."""
    if fld.type in ("date", "datetime"):
        return "date"
    return fld.unit if fld.type in ("number", "integer") else None


def _shown(value: Value) -> str:
    return f"{value:.8g}" if is_number(value) else "nothing" if value is None else str(value)
