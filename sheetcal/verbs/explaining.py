"""Follow one result down to readings, constants and certificates."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from difflib import get_close_matches
from typing import Any

from sheetcal.cells import registry
from sheetcal.check.completeness import missing, required_blocks
from sheetcal.check.submission import Submission
from sheetcal.errors import BadInput, printable
from sheetcal.formulas.compute import Engine
from sheetcal.kinds.record import constant_cells
from sheetcal.model import Place, Step
from sheetcal.verbs.substituting import substituted, with_unit
from sheetcal.verbs.workbook import readings_iso, shown

WORDS = "limits in words"


@dataclass(frozen=True)
class Explained:
    """One line of the tree and what it stands on."""

    id: str
    label: str
    value: Any
    unit: str | None
    cell: str
    function: str | None
    equation: str | None
    substituted: str | None
    source: str
    inputs: tuple[Explained, ...] = ()

    @property
    def is_missing(self) -> bool:
        """True for a reading that is required and not there."""
        return self.source.startswith("missing reading")

    def as_json(self) -> dict[str, Any]:
        """Keys in the order of the contract."""
        keys = ("id", "label", "value", "unit", "cell", "function", "equation", "substituted", "source")
        return {**{key: getattr(self, key) for key in keys}, "inputs": [one.as_json() for one in self.inputs]}


class Explainer:
    """Walks a workbook's steps from a result downwards; what was shown once is not unfolded again."""

    def __init__(self, parts: Submission) -> None:
        self.parts = parts
        self.engine = Engine(parts.skeleton, parts.record, readings_iso(parts))
        self.constants = {one: (cell, value) for one, cell, value, _ in constant_cells(parts.kind, parts.record)}
        self.stated = {f"const.{one.name}": one for one in parts.record.constants}
        self.missing = set(missing(parts.kind, parts.skeleton, parts.record, parts.readings))
        self.blocks = set(required_blocks(parts.kind, parts.skeleton, parts.record, parts.readings))
        self.unfolded: set[str] = set()

    def explain(self, one: str) -> Explained:
        """The tree of a result. Raises BadInput naming the nearest id."""
        place = self.parts.skeleton.places.get(one)
        if place is None or place.field.step is None:
            known = [name for name, other in self.parts.skeleton.places.items() if other.field.step]
            near = get_close_matches(one, known, 1, 0.3)
            raise BadInput(f"explain {one}", "is not a result of this workbook", near[0] if near else "a result id")
        return self._place(place)

    def _node(self, one: str) -> Explained:
        if one.startswith("const."):
            return self._constant(one)
        if one.startswith("table."):
            return self._column(one)
        return self._place(self.parts.skeleton.places[one])

    def _place(self, place: Place) -> Explained:
        value = self.engine.value(place.id)
        step = place.field.step
        if step is None:
            return self._leaf(place, value)
        return Explained(
            place.id,
            place.field.label,
            value,
            place.field.unit,
            place.where,
            step.cell or WORDS,
            step.equation or None,
            self._substituted(place, step),
            step.source or "limits of this kind",
            self._inputs(place, step),
        )

    def _inputs(self, place: Place, step: Step) -> tuple[Explained, ...]:
        """What the step stands on; places kept in reserve and not begun are left out."""
        if place.id in self.unfolded or not step.cell:
            return ()
        self.unfolded.add(place.id)
        ids = [one for reference in step.args.values() for one in self.parts.skeleton.resolve(place, reference)]
        return tuple(self._node(one) for one in dict.fromkeys(ids) if self._counts(one))

    def _counts(self, one: str) -> bool:
        block = one.partition(".")[0]
        return block in self.blocks or not block.startswith(("run", "body"))

    def _leaf(self, place: Place, value: Any) -> Explained:
        origin = "printed at issue" if place.id in self.parts.record.locked else place.field.origin
        content = series_summary(value) if isinstance(value, list) else shown(place, value)
        blank = value is None or (isinstance(value, list) and all(one is None for one in value))
        state = "missing reading" if place.id in self.missing else "reading left blank" if blank else "reading"
        return Explained(
            place.id,
            place.field.label,
            content,
            place.field.unit,
            place.where,
            None,
            None,
            None,
            f"{state} ({origin})",
        )

    def _constant(self, one: str) -> Explained:
        stated = self.stated[one]
        cell, value = self.constants[one]
        source = f"{stated.source} ({stated.standing})"
        return Explained(one, stated.label, value, stated.unit, f"Constants!{cell}", None, None, None, source)

    def _column(self, one: str) -> Explained:
        _, table, column = one.split(".")
        values = [value for value in self.engine.value(one) if value is not None]
        cells = [cell for name, (cell, _) in self.constants.items() if name.startswith(f"{one}[")]
        span = f"Constants!{cells[0]}:{cells[-1]}" if cells else "Constants"
        label = f"table of {table}s, column {column}"
        return Explained(one, label, series_summary(values), None, span, None, None, None, "lab file")

    def _substituted(self, place: Place, step: Step) -> str | None:
        """The step worked out with numbers and units."""
        if not step.cell:
            return None
        function = registry.get(step.cell)
        values: dict[str, Any] = {}
        texts: dict[str, str] = {}
        for argument in function.args:
            if argument.name in step.args:
                ids = self.parts.skeleton.resolve(place, step.args[argument.name])
                found = [self.engine.value(one) for one in ids]
                whole = found[0] if len(found) == 1 and (not argument.series or isinstance(found[0], list)) else found
                values[argument.name] = whole
                texts[argument.name] = with_unit(whole, self._unit(ids[0]) if len(ids) == 1 else None)
        return substituted(function, values, texts)

    def _unit(self, one: str) -> str | None:
        if one.startswith("const."):
            return self.stated[one].unit
        return None if one.startswith("table.") else self.parts.skeleton.places[one].field.unit


def series_summary(values: list[Any]) -> str:
    """Count, first and last of a series."""
    filled = [value for value in values if value is not None]
    if not filled:
        return "0 values"
    return f"{len(filled)} values, {filled[0]} .. {filled[-1]}"


def tree_lines(node: Explained) -> list[str]:
    """The tree as text, two blanks a level; what is missing is named at the end."""
    lines = [printable(line) for line in _lines(node, 0, set())]
    absent = dict.fromkeys(f"{one.id} ({one.label}, {one.cell})" for one in _leaves(node) if one.is_missing)
    return lines + [printable(f"Missing: {'; '.join(absent)}")] * bool(absent)


def _leaves(node: Explained) -> Iterator[Explained]:
    for one in node.inputs:
        yield from _leaves(one)
    if not node.inputs:
        yield node


def _lines(node: Explained, depth: int, unfolded: set[str]) -> Iterator[str]:
    pad = "  " * depth
    yield f"{pad}{node.label} = {_value(node)}   [{node.id}, {node.cell}]"
    if node.id in unfolded:
        yield f"{pad}  (worked out above)"
        return
    if node.function:
        unfolded.add(node.id)
        yield f"{pad}  by {node.function}: {node.equation}" if node.equation else f"{pad}  by {node.function}"
    if node.substituted:
        yield f"{pad}  {node.substituted if node.substituted.startswith('with ') else f'= {node.substituted}'}"
    yield f"{pad}  source: {node.source}"
    for one in node.inputs:
        yield from _lines(one, depth + 1, unfolded)


def _value(node: Explained) -> str:
    if node.value is None:
        return "missing" if node.is_missing or (node.function and node.function != WORDS) else "blank"
    number = f"{node.value:.10g}" if isinstance(node.value, float | int) else str(node.value)
    return number if node.unit in (None, "1") else f"{number} {node.unit}"
