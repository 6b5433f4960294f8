"""One workbook with its own constants and with new ones, and why each of its results moved."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from datetime import datetime

from sheetcal.archive.changed import Changes, Recomputed, changes
from sheetcal.archive.graph import Graph, Key, graph
from sheetcal.archive.in_force import boundaries, era, moment_of
from sheetcal.check.completeness import begun
from sheetcal.check.interpreter import PER_PLACE, Evaluator
from sheetcal.check.replay import sheet_cells
from sheetcal.check.submission import Submission
from sheetcal.check.values import CellError
from sheetcal.inputs.lab import Lab
from sheetcal.model import Value

Stored = tuple[str, Value, "str | None"]
Raw = dict[str, "Value | CellError"]


@dataclass
class Evaluated:
    """Every result by id with the old constants and with the new (blank None), and the new constants by block.

    `common` are the new constants of the workbook as a whole; `own` those of runs whose date falls under others.
    """

    parts: Submission
    before: dict[str, Value]
    after: dict[str, Value]
    common: Changes
    own: Mapping[str, Changes] = field(default_factory=dict)
    known: dict[str, tuple[str, ...]] = field(default_factory=dict)

    @property
    def graph(self) -> Graph:
        """What stands on what."""
        return graph(self.parts.kind, self.parts.record.shape)

    def of_block(self, one: str) -> Changes:
        """The new constants that hold for the block of a result."""
        return self.own.get(one.partition(".")[0], self.common)

    def causes(self, one: str) -> tuple[str, ...]:
        """Why a result moved: the changed constants it stands on, through inputs that moved themselves."""
        if one not in self.known:
            self.known[one] = ()  # formulas form no circle; a test of the kinds holds it
            found = dict.fromkeys(self._direct(one))
            for target in self.graph.inputs.get(one, ()):
                if differ(self.before.get(target), self.after.get(target), None):
                    found.update(dict.fromkeys(self.causes(target)))
            self.known[one] = tuple(found)
        return self.known[one]

    def _direct(self, one: str) -> list[str]:
        """Causes among the constants and table rows that the result's own formula names."""
        restated = self.of_block(one)
        inputs = self.graph.inputs.get(one, ())
        keys = self.graph.keys.get(one, ())
        return [
            cause
            for changed, cause in restated.causes.items()
            if changed.partition("[")[0] in inputs and _looked_up(self.parts, changed, keys)
        ]


def _looked_up(parts: Submission, changed: str, keys: tuple[Key, ...]) -> bool:
    """Whether a changed row of a table is one that these look-ups find; without a look-up all rows count."""
    if not changed.startswith("table."):
        return True
    _, table, rest = changed.split(".", 2)
    row = parts.record.tables[table][int(rest.partition("[")[2][:-1]) - 1]
    asked = [key for key in keys if key.table == table]
    sought = [(parts.readings.get(key.reading, parts.record.prefilled.get(key.reading)), key.column) for key in asked]
    return not asked or any(
        name is not None and str(name).casefold() == str(row.get(column)).casefold() for name, column in sought
    )


def differ(one: Value, other: Value, step: float | None) -> bool:
    """Whether two values differ beyond the replay tolerance."""
    if isinstance(one, int | float) and isinstance(other, int | float):
        return abs(one - other) > 1e-9 * max(abs(one), abs(other)) + 1e-6 * (step or 0.0)
    blank = (None, "")
    return (one in blank) != (other in blank) or (one not in blank and one != other)


def evaluate(parts: Submission, lab: Lab | None, chain: Recomputed) -> Evaluated:
    """Evaluate a workbook with its own constants, and again with those the lab file and the chain restate."""
    old = _run(parts, sheet_cells(parts, {}))
    before = {one: _plain(value) for one, value in old.items()}
    common, own = _by_block(parts, lab, chain)
    found = Evaluated(parts, before, before, common, own)
    if common.values or any(one.values for one in own.values()):
        pinned = _pinned(parts, found, old)
        found.after = {one: _plain(value) for one, value in _again(parts, common.values, pinned, old).items()}
    return found


def _by_block(parts: Submission, lab: Lab | None, chain: Recomputed) -> tuple[Changes, dict[str, Changes]]:
    """New constants as in force at the last run, and those of runs that fall under others."""
    if lab is None:
        return Changes(), {}
    moments = _moments(parts)
    bounds = boundaries(lab)
    last = max(moments.values(), default=None)
    common = changes(parts.record, lab, chain, last)
    known = {era(bounds, last): common} if last else {}
    own = {}
    for block, moment in moments.items():
        number = era(bounds, moment)
        if number not in known:
            known[number] = changes(parts.record, lab, chain, moment)
        if known[number].values != common.values:
            own[block] = known[number]
    return common, own


def _moments(parts: Submission) -> dict[str, datetime]:
    """Date and time of every block that has a date: runs, or the sheet of a kind without runs."""
    found = {}
    for one, place in parts.skeleton.places.items():
        if place.field.name == "date" and place.field.step is None:
            block = one.partition(".")[0]
            moment = moment_of(parts.readings.get(one), parts.readings.get(f"{block}.start"))
            if moment is not None:
                found[block] = moment
    return found


def _pinned(parts: Submission, found: Evaluated, old: Raw) -> Raw:
    """Looked-up results of the runs that fall under other constants than the workbook as a whole."""
    pinned: Raw = {}
    for constants in _distinct(found.own):
        values = _again(parts, constants.values, {}, old)
        roots = {one.partition("[")[0] for one in (*constants.values, *found.common.values)}
        direct = {user for root in roots for user in found.graph.feeds.get(root, ())}
        pinned.update(
            {one: values[one] for one in direct if found.own.get(one.partition(".")[0]) is constants and one in values}
        )
    return pinned


def _distinct(own: Mapping[str, Changes]) -> list[Changes]:
    return list({id(one): one for one in own.values()}.values())


def _again(parts: Submission, changed: Mapping[str, Value], pinned: Raw, old: Raw) -> Raw:
    """All results with changed constants: only what stands on them is evaluated, the rest is taken over."""
    roots = {one.partition("[")[0] for one in changed} | set(pinned)
    fresh = graph(parts.kind, parts.record.shape).above(roots) - set(pinned)
    cells = sheet_cells(parts, changed)
    for one, value in old.items():
        if one not in fresh:
            place = parts.skeleton.places[one]
            cells[place.tab][place.cell] = _stored(pinned.get(one, value))
    return _run(parts, cells)


def _run(parts: Submission, cells: Mapping[str, Mapping[str, Stored]]) -> Raw:
    """Every result of every block begun, as the formulas give it."""
    plan = parts.skeleton
    evaluator = Evaluator(cells, plan.names, work=PER_PLACE * len(plan.places))
    started = begun(parts.readings, parts.record)
    counted = _counting(started)
    return {
        one: evaluator.value(place.tab, place.cell)
        for one, place in parts.skeleton.places.items()
        if place.formula is not None and counted(one)
    }


def _counting(started: set[str]) -> Callable[[str], bool]:
    return lambda one: not one.startswith("run") or one.partition(".")[0] in started


def _stored(value: Value | CellError) -> Stored:
    if isinstance(value, CellError):
        return ("e", str(value), None)
    sort = "b" if isinstance(value, bool) else "s" if isinstance(value, str) else "n"
    return (sort, value, None)


def _plain(value: Value | CellError) -> Value:
    return str(value) if isinstance(value, CellError) else None if value == "" else value
