"""What was printed or locked at issue: formulas, constants, labels and the issue record itself."""

from __future__ import annotations

from collections.abc import Mapping

from sheetcal.check import dimensions
from sheetcal.check.case import Case, downstream
from sheetcal.check.causes import of_value
from sheetcal.check.formula import parse
from sheetcal.check.tree import Area, FormulaError, Name, Reference, Slot
from sheetcal.kinds.dates import serial
from sheetcal.kinds.layout import column_letter
from sheetcal.kinds.record import constant_cells
from sheetcal.model import Finding, Place, Value

TOLERANCE = 1e-9


def look(case: Case, constants: Mapping[str, tuple[str, Value, str | None]]) -> set[str]:
    """Findings on locked cells; returns every result that a finding already explains. `constants`: the tab's cells."""
    _record(case)
    roots = _constants(case, constants) | _labels(case)
    for one in case.witnessed.typed_over:
        if _typed_over(case, one):
            roots.add(one)
    for one, text in case.witnessed.altered.items():
        _formula(case, one, text)
        roots.add(one)
    return downstream(case.parts, roots) if roots else set()


def _record(case: Case) -> None:
    parts = case.parts
    if not parts.record_whole or parts.record.skeleton_sha256 not in ("", parts.skeleton.sha256):
        case.found.append(
            Finding(
                "record-altered", "fault", "error", "the issue record was altered after issue", "Issue record",
                action="reject", likely_cause="somebody edited the hidden tab",
            )
        )  # fmt: skip


def _typed_over(case: Case, one: str) -> bool:
    """A value where a formula must stand; an empty cell where nothing was ever stored counts too."""
    place, _ = case.place(one)
    typed = case.parts.typed.get(one)
    expected = case.expected.get(one)
    label = place.field.label.lower()
    if typed is None:
        if one not in case.parts.cells and expected is None and not _in_use(case, one):
            case.add("result-typed-over", one, f"{label}: its formula was deleted", expected=place.formula)
        else:
            case.add("result-typed-over", one, f"{label}: its formula was deleted", expected=expected)
        return True
    same = _close(typed, expected)
    message = f"{label} was typed over" + (" (equal today: still no formula)" if same else "")
    causes = _causes(case, one, typed, expected)
    effect = None if same else case.effect(one, {})
    case.add(
        "result-typed-over", one, message, found=typed, expected=expected, effect=effect,
        likely_cause=causes[0] if causes else None, causes=tuple(causes),
    )  # fmt: skip
    return True


def _in_use(case: Case, one: str) -> bool:
    return one.partition(".")[0] in case.witnessed.started


def _causes(case: Case, one: str, found: Value, expected: Value) -> list[str]:
    if not isinstance(found, float | int) or not isinstance(expected, float | int) or found == expected:
        return []
    sample = case.sample_of(one.partition(".")[0])
    moisture = case.number(f"{sample}.analysis_moisture") if sample else None
    return of_value(float(found), float(expected), moisture)


def _formula(case: Case, one: str, text: str) -> None:
    place, _ = case.place(one)
    wrong = _dimension_fault(case, place, text)
    now, expected = case.witnessed.results.get(one), case.expected.get(one)
    label = place.field.label.lower()
    if wrong:
        case.add("formula-dimension", one, f"{label}: the formula is dimensionally wrong: {wrong}", found=text,
                 expected=place.formula, effect=case.effect(one, {}))  # fmt: skip
        return
    values = "" if _close(now, expected) else f"; it gives {_shown(now)} where {_shown(expected)} is right"
    case.add("formula-altered", one, f"{label}: the formula was altered{values}", found=text, expected=place.formula,
             effect=case.effect(one, {}))  # fmt: skip


def _dimension_fault(case: Case, place: Place, text: str) -> str | None:
    """What is dimensionally wrong with a formula, or None; one that cannot be read is not judged here."""
    try:
        dimensions.check_unit(parse(text), _Units(case, place.tab), place.field.unit)
    except dimensions.DimensionError as fault:
        return f"{fault.where} {fault.what}"
    except FormulaError:
        return None
    return None


class _Units:
    """Units of what a formula refers to, by the skeleton."""

    def __init__(self, case: Case, tab: str) -> None:
        self.case, self.tab = case, tab
        self.constants = {one.name: one.unit for one in case.parts.record.constants}
        self.columns = {
            f"{table}_{column.partition(':')[0]}": column.partition(":")[2]
            for table, columns in case.parts.kind.tables.items()
            for column in columns
        }

    def __call__(self, leaf: Reference | Area | Name | Slot) -> dimensions.Meaning:
        if isinstance(leaf, Name):
            unit = self.constants.get(leaf.name) or self.columns.get(leaf.name)
            return dimensions.meaning(None if unit in (None, "text", "date") else unit)
        if isinstance(leaf, Slot):
            return dimensions.meaning(None)
        tab = leaf.tab or self.tab
        if isinstance(leaf, Area):
            place = self._in_area(tab, leaf)
        else:
            place = self.case.parts.skeleton.at.get((tab, f"{column_letter(leaf.column)}{leaf.row}"))
        if place is None or place.field.type not in ("number", "integer"):
            return dimensions.meaning(None)
        return dimensions.meaning(place.field.unit)

    def _in_area(self, tab: str, area: Area) -> Place | None:
        for place in self.case.parts.skeleton.places.values():
            if place.tab == tab and area.left <= place.column <= area.right and place.row <= area.bottom:
                last = place.row + (self.case.parts.skeleton.shape.record_rows if place.field.series else 1) - 1
                if last >= area.top:
                    return place
        return None


def _constants(case: Case, stored: Mapping[str, tuple[str, Value, str | None]]) -> set[str]:
    """Constants that no longer hold what the issue record says; returns their ids without the row."""
    roots: set[str] = set()
    for one, cell, value, _ in constant_cells(case.parts.kind, case.parts.record):
        found = stored.get(cell, ("", None, None))
        if value in (None, "") or (_close(found[1], value) and found[2] is None):
            continue
        causes = _value_causes(found[1], value)
        name = one.partition(".")[2]
        roots.add(one.partition("[")[0])
        case.found.append(
            Finding(
                "constant-altered", "fault", "error", f"constant {name} is not the one issued", "Constants", cell, None,
                found[1], value, causes[0] if causes else None, action="reject", causes=tuple(causes),
                effect=_first_effect(case),
            )
        )  # fmt: skip
    return roots


def _first_effect(case: Case) -> dict[str, object] | None:
    """The effect on the first reported result that moved, whichever sample."""
    for sample in range(1, max(1, case.parts.skeleton.shape.samples) + 1):
        block = f"sample{sample}" if case.parts.skeleton.shape.samples else "sheet"
        found = case.effect(f"{block}.", {})
        if found:
            return found
    return None


def _value_causes(found: Value, expected: Value) -> list[str]:
    numbers = [isinstance(one, float | int) and not isinstance(one, bool) for one in (found, expected)]
    return of_value(float(found), float(expected)) if all(numbers) else []  # type: ignore[arg-type]


def _labels(case: Case) -> set[str]:
    """Printed labels and locked readings that no longer hold what was printed."""
    roots: set[str] = set()
    for one in case.parts.record.locked:
        place, _ = case.place(one)
        printed = case.parts.record.prefilled.get(one)
        found = case.parts.readings.get(one)
        if place.field.type in ("date", "datetime") and isinstance(printed, str):
            printed = _serial(printed)
        if isinstance(found, list) or _close(found, printed):
            continue
        message = f"{place.field.label.lower()}: what was printed at issue was changed"
        case.add(
            "label-altered",
            one,
            message,
            found=found,
            expected=printed,
            effect=case.effect(one, {one: printed}),
        )
        roots.add(one)
    return roots


def _serial(text: str) -> Value:
    try:
        return serial(text)
    except ValueError:
        return text


def _close(one: Value, other: Value) -> bool:
    if isinstance(one, float | int) and isinstance(other, float | int):
        return abs(one - other) <= TOLERANCE * max(abs(one), abs(other), 1e-300)
    return (one in (None, "") and other in (None, "")) or one == other


def _shown(value: Value) -> str:
    return f"{value:.8g}" if isinstance(value, float | int) else "nothing" if value is None else str(value)
