"""Follow one result down to readings, constants and certificates."""

from __future__ import annotations

import re
from dataclasses import dataclass
from difflib import get_close_matches
from typing import Any

from sheetcal.check.submission import Submission
from sheetcal.errors import BadInput
from sheetcal.formulas.compute import Engine
from sheetcal.kinds.record import constant_cells
from sheetcal.model import Place, Value
from sheetcal.verbs.workbook import readings_iso, shown

DEEPEST = 40


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

    def as_json(self) -> dict[str, Any]:
        """Keys in the order of the contract."""
        keys = ("id", "label", "value", "unit", "cell", "function", "equation", "substituted", "source")
        return {**{key: getattr(self, key) for key in keys}, "inputs": [one.as_json() for one in self.inputs]}


class Explainer:
    """Walks a workbook's steps from a result downwards."""

    def __init__(self, parts: Submission) -> None:
        self.parts = parts
        self.engine = Engine(parts.skeleton, parts.record, readings_iso(parts))
        self.constants = {one: (cell, value) for one, cell, value, _ in constant_cells(parts.kind, parts.record)}
        self.stated = {f"const.{one.name}": one for one in parts.record.constants}

    def explain(self, one: str) -> Explained:
        """The tree of a result. Raises BadInput naming the nearest id."""
        place = self.parts.skeleton.places.get(one)
        if place is None or place.field.step is None:
            known = [name for name, other in self.parts.skeleton.places.items() if other.field.step]
            near = get_close_matches(one, known, 1, 0.3)
            raise BadInput(f"explain {one}", "is not a result of this workbook", near[0] if near else "a result id")
        return self._place(place, 0)

    def _node(self, one: str, depth: int) -> Explained:
        if one.startswith("const."):
            return self._constant(one)
        if one.startswith("table."):
            return self._column(one)
        return self._place(self.parts.skeleton.places[one], depth)

    def _place(self, place: Place, depth: int) -> Explained:
        value = self.engine.value(place.id)
        step = place.field.step
        if step is None:
            return self._leaf(place, value)
        children: list[Explained] = []
        if depth < DEEPEST and step.cell:
            for reference in dict.fromkeys(step.args.values()):
                ids = self.parts.skeleton.resolve(place, reference)
                children += [self._node(one, depth + 1) for one in ids]
        return Explained(
            place.id,
            place.field.label,
            value,
            place.field.unit,
            place.where,
            step.cell or "limits in words",
            step.equation or None,
            self._substituted(place, value),
            step.source or "limits of this kind",
            tuple(children),
        )

    def _leaf(self, place: Place, value: Any) -> Explained:
        origin = "printed at issue" if place.id in self.parts.record.locked else place.field.origin
        content = series_summary(value) if isinstance(value, list) else shown(place, value)
        source = f"missing reading ({origin})" if value in (None, []) else f"reading ({origin})"
        return Explained(place.id, place.field.label, content, place.field.unit, place.where, None, None, None, source)

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

    def _substituted(self, place: Place, value: Value) -> str | None:
        """The equation's right side with numbers and units in place of names."""
        step = place.field.step
        assert step is not None
        if not step.equation or not step.cell:
            return None
        text = step.equation
        for name, reference in sorted(step.args.items(), key=lambda pair: -len(pair[0])):
            ids = self.parts.skeleton.resolve(place, reference)
            if len(ids) == 1:
                shown_value = self._with_unit(ids[0]).replace("\\", "")
                text = re.sub(rf"\b{re.escape(name)}\b", shown_value, text)
        return text

    def _with_unit(self, one: str) -> str:
        value = self.engine.value(one)
        if isinstance(value, list):
            return f"[{len(value)} values]"
        if one.startswith("const."):
            unit: str | None = self.stated[one].unit
        else:
            unit = self.parts.skeleton.places[one].field.unit
        if value is None:
            return "(missing)"
        text = f"{value:.10g}" if isinstance(value, float | int) else str(value)
        return text if unit in (None, "1") else f"{text} {unit}"


def series_summary(values: list[Any]) -> str:
    """Count, first and last of a series."""
    filled = [value for value in values if value is not None]
    if not filled:
        return "0 values"
    return f"{len(filled)} values, {filled[0]} .. {filled[-1]}"


def tree_lines(node: Explained, depth: int = 0) -> list[str]:
    """The tree as text, two blanks a level."""
    pad = "  " * depth
    number = (
        f"{node.value:.10g}" if isinstance(node.value, float) else "missing" if node.value is None else str(node.value)
    )
    unit = "" if node.unit in (None, "1") else f" {node.unit}"
    lines = [f"{pad}{node.label} = {number}{unit}   [{node.id}, {node.cell}]"]
    if node.function:
        shown_equation = f": {node.equation}" if node.equation else ""
        lines.append(f"{pad}  by {node.function}{shown_equation}")
    if node.substituted and node.substituted != node.equation:
        lines.append(f"{pad}  {node.substituted}")
    lines.append(f"{pad}  source: {node.source}")
    for one in node.inputs:
        lines += tree_lines(one, depth + 1)
    return lines
