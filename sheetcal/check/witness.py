"""The formula witness: what the formulas found in the file give, and where they are not the kind's own."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from sheetcal.check.completeness import begun
from sheetcal.check.formula import same_formula
from sheetcal.check.interpreter import PER_PLACE, Evaluator
from sheetcal.check.replay import plain
from sheetcal.check.submission import Cells, Submission
from sheetcal.kinds.layout import REFERENCE
from sheetcal.model import Place, Rule, Value


@dataclass
class Witnessed:
    """What the formula witness found: results by id, and places whose formula is not the issued one."""

    evaluator: Evaluator
    results: dict[str, Value] = field(default_factory=dict)
    altered: dict[str, str] = field(default_factory=dict)
    typed_over: list[str] = field(default_factory=list)
    started: set[str] = field(default_factory=set)

    def held(self, typed: Mapping[str, Value]) -> dict[str, Value]:
        """What the sheet holds: its formulas' values, and what stands in place of a formula."""
        return {**self.results, **{one: typed.get(one) for one in self.typed_over if one in self.results}}


def witness(parts: Submission, cells: Cells, names: Mapping[str, str]) -> Witnessed:
    """Evaluate the file's own formulas from its readings; stored values of formula cells are never read.

    Runs not begun are compared as text only: their results stand on nothing. `names` are the file's own; those
    the kind issues count as issued, wherever the file's point (see `findings.printed`).
    """
    work = PER_PLACE * len(parts.skeleton.places)
    evaluator = Evaluator(cells, {**names, **parts.skeleton.names}, work=work)
    found = Witnessed(evaluator, started=begun(parts.readings, parts.record))
    for one, place in parts.skeleton.places.items():
        if place.formula is None:
            continue
        cell = parts.cells.get(one)
        text = cell[2] if cell else None
        if text is None:
            found.typed_over.append(one)
        elif text != place.formula and not same_formula(text, place.formula, place.tab):
            found.altered[one] = text
        if _counts(place, found.started):
            found.results[one] = None if text is None else plain(evaluator.value(place.tab, place.cell))
    return found


def _counts(place: Place, started: set[str]) -> bool:
    """Whether a place's block is in use: runs not begun are not."""
    return place.id[:3] != "run" or place.id.partition(".")[0] in started


class Judge:
    """Evaluates the kind's rules over a workbook's cells, as found or as they should be."""

    def __init__(self, parts: Submission, evaluator: Evaluator, anchors: Mapping[str, str]) -> None:
        """anchors: one place of every block, from where references are written."""
        self.parts = parts
        self.evaluator = evaluator
        self.anchors = anchors

    def holds(self, rule: Rule, block: str) -> bool:
        """Whether a rule's limit is broken in a block (`run3`, `sample1`, `sheet`)."""
        anchor = self.anchors[block]
        text = self.parts.skeleton.formula(anchor, rule.formula)
        return self.evaluator.evaluate(f"={text}", self.parts.skeleton.places[anchor].tab) is True

    def needs(self, rule: Rule, block: str) -> set[str]:
        """Ids of everything a rule looks at in a block."""
        anchor = self.parts.skeleton.places[self.anchors[block]]
        return {
            one
            for reference in REFERENCE.findall(rule.formula)
            for one in self.parts.skeleton.resolve(anchor, reference)
        }


def anchors_of(parts: Submission) -> dict[str, str]:
    """One place of every block."""
    found: dict[str, str] = {}
    for one in parts.skeleton.places:
        found.setdefault(one.partition(".")[0], one)
    return found
