"""One file under examination: its parts, what the witnesses say, and the effect a correction would have."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from functools import cached_property, lru_cache
from math import isfinite
from typing import TypeGuard

from sheetcal.check.balance import Balance
from sheetcal.check.completeness import UNCOUNTED, missing
from sheetcal.check.replay import Replay, plain, read_off
from sheetcal.check.submission import Cells, Submission, element_place
from sheetcal.check.witness import Judge, Witnessed, anchors_of
from sheetcal.kinds.layout import REFERENCE, Skeleton
from sheetcal.model import Finding, Place, Value

NAME = re.compile(r"[a-z][a-z0-9_]*")
SEVERITIES = ("error", "warning", "note")
ACTIONS = {"error": "reject", "warning": "hold", "note": "note"}
LONGEST = 60  # letters of a workbook's text in a message
MOST_EFFECTS = 60  # a file spoiled all over costs no more than this many recalculations


@dataclass
class Case:
    """What the finding modules look at, and what they learn from each other.

    `moved`: places whose cell was cut and pasted elsewhere, and where it stands now. `trials`: cell values spent on
    trying whether altered formulas mean the same.
    `mistyped`: readings that hold something else than their type. `spoiled`: ids whose value means nothing, so
    that whatever stands on them is not judged. `altered`: locked cells that are not as issued. `repairs`: the
    right value where the workbook itself shows it; limits are judged with these in place. `shifted`: tabs whose
    rows are no longer where they were issued; then nothing else can be judged. `earlier`: what a constant was
    before, by id, each with words for it; known only where a lab file was given.
    """

    parts: Submission
    witnessed: Witnessed
    balances: Mapping[str, Balance]
    cells: Cells = field(default_factory=dict)
    names: Mapping[str, str] = field(default_factory=dict)
    found: list[Finding] = field(default_factory=list)
    mistyped: set[str] = field(default_factory=set)
    spoiled: set[str] = field(default_factory=set)
    altered: set[str] = field(default_factory=set)
    exchanged: set[str] = field(default_factory=set)
    shifted: set[str] = field(default_factory=set)
    repairs: dict[str, Value] = field(default_factory=dict)
    moved: dict[str, str] = field(default_factory=dict)
    earlier: Mapping[str, tuple[tuple[float, str], ...]] = field(default_factory=dict)
    trials: int = 0
    _effects: int = 0
    _judges: dict[object, Judge] = field(default_factory=dict)

    @cached_property
    def missing(self) -> list[str]:
        """Ids of required readings that hold nothing."""
        there = {one: self.repairs[one] for one in self.moved if one in self.repairs}
        readings = {**self.parts.readings, **there} if there else self.parts.readings
        return missing(self.parts.kind, self.parts.skeleton, self.parts.record, readings)

    @cached_property
    def right(self) -> Replay:
        """The workbook with formulas, labels and constants as issued."""
        return Replay(self.parts)

    @cached_property
    def expected(self) -> dict[str, Value]:
        """Every result by the kind's own formulas and the record's constants, from the readings as found."""
        return self.right.values(self.right.results)

    @cached_property
    def anchors(self) -> dict[str, str]:
        """One place of every block."""
        return anchors_of(self.parts)

    @property
    def judge(self) -> Judge:
        """Evaluates the kind's rules, with everything known to be wrong put right."""
        return self._judge(self.repairs)

    @property
    def judge_as_read(self) -> Judge:
        """Evaluates the kind's rules on the readings as they are meant, no other error corrected."""
        return self._judge({one: value for one, value in self.repairs.items() if one in self.mistyped})

    def _judge(self, repairs: Mapping[str, Value]) -> Judge:
        """The judge of one state of repair; the last two are kept."""
        state = (bool(self.altered), tuple(repairs.items()))
        if state not in self._judges:
            touched = self.altered or repairs
            evaluator = self.right.evaluator(repairs) if touched else self.witnessed.evaluator
            self._judges = dict([*self._judges.items()][-1:])
            self._judges[state] = Judge(self.parts, evaluator, self.anchors)
        return self._judges[state]

    def number(self, one: str) -> float | None:
        """A reading, printed value or result as a number."""
        value = self.value(one)
        return float(value) if is_number(value) else None

    def value(self, one: str) -> Value:
        """What stands at an id: the reading as found, or the result with everything known to be wrong put right."""
        place = self.parts.skeleton.places.get(one)
        if place is not None and place.formula is not None:
            return plain(self.judge.evaluator.value(place.tab, place.cell))
        value = self.parts.readings.get(one)
        return None if isinstance(value, list) else value

    def text(self, one: str) -> str:
        """What stands at an id as text; blank is empty."""
        value = self.value(one)
        return "" if value is None else str(value)

    def place(self, one: str) -> tuple[Place, str]:
        """(place, cell) of an id, also of one element of a series."""
        return element_place(self.parts.skeleton, one)

    def runs(self, sample: str | None = None) -> Iterator[str]:
        """Run blocks begun, of one sample or of all, in order."""
        for block in self.anchors:
            begun = block.startswith("run") and block in self.witnessed.started
            if begun and (sample is None or self.sample_of(block) == sample):
                yield block

    def samples(self) -> list[str]:
        """Sample blocks in order."""
        return [f"sample{number}" for number in range(1, self.parts.skeleton.shape.samples + 1)]

    def sample_of(self, block: str) -> str | None:
        """The sample a run belongs to; a sample block itself."""
        anchor = self.anchors.get(block)
        return self.parts.skeleton.places[anchor].sample if anchor else None

    def is_counted(self, block: str) -> bool:
        """False for a run that is void or not needed."""
        return self.text(f"{block}.state") not in UNCOUNTED

    def stands_on(self, roots: Iterable[str]) -> set[str]:
        """Every result that stands on one of the roots, roots included; elements count as their series."""
        return followers(self.feeds, roots)

    @cached_property
    def feeds(self) -> dict[str, list[str]]:
        """For each reading, constant column and result the results that take it."""
        return feeds_of(self.parts.skeleton)

    def add(self, code: str, one: str, message: str, severity: str = "error", **facts: object) -> None:
        """Note a finding at an id; the place follows from the id."""
        place, cell = self.place(one)
        values = {"sort": "note" if severity == "note" else "fault", "action": ACTIONS[severity], **facts}
        values.update({key: _told(values[key]) for key in ("found", "expected") if key in values})
        where = {"sheet": place.tab, "cell": cell.partition(":")[0], "field": one}
        self.found.append(Finding(code, severity=severity, message=message, **{**where, **values}))  # type: ignore[arg-type]

    def effect(
        self, one: str, right: Mapping[str, Value] | None = None, wrong: Mapping[str, Value] | None = None
    ) -> dict[str, object] | None:
        """What the fault at `one` does to the result reported for its sample: as it stands less as it should be.

        right: what corrects it, by id. wrong: where the sheet as issued is right, what stands in it instead.
        """
        if self._effects >= MOST_EFFECTS:
            return None
        self._effects += 1
        now, then = self.right.evaluator(wrong), self.right.evaluator(right)
        for result, printed in self._reported(one):
            values = [read_off(side, self.parts, (result, printed)) for side in (now, then)]
            change = _change(values[0][result], values[1][result])
            if change is not None:
                return self._effect(result, change, values[0][printed] != values[1][printed])
        return None

    def _reported(self, one: str) -> list[tuple[str, str]]:
        """(unrounded result, reported one) pairs: `one` itself, those of the same sample, else all."""
        sample = self.sample_of(one.partition(".")[0])
        found: dict[str, str] = {}
        for place in self.parts.skeleton.places.values():
            if place.field.step and place.field.step.reported and (sample is None or place.sample == sample):
                if place.id == one:
                    found = {one: one, **found}
                whole = place.id.removesuffix("_mj").removesuffix("_reported")
                found.setdefault(whole if whole in self.parts.skeleton.places else place.id, place.id)
        return list(found.items())

    def _effect(self, result: str, change: float, reported_changes: bool) -> dict[str, object]:
        place = self.parts.skeleton.places[result]
        limit = self.number(f"{place.sample}.repeatability_limit") if place.sample else None
        return {
            "result": result,
            "change": change,
            "unit": place.field.unit,
            "of_limit": abs(change) / limit if limit and place.field.unit == "J/g" else None,
            "of_uncertainty": None,
            "reported_changes": reported_changes,
        }


def feeds_of(plan: Skeleton) -> dict[str, list[str]]:
    """For each reading, constant column and result of a layout the results that take it."""
    feeds: dict[str, list[str]] = {}
    for one, place in plan.places.items():
        step = place.field.step
        if step is None:
            continue
        for reference in _references(step.formula, plan.kind.constants):
            for target in plan.resolve(place, reference):
                feeds.setdefault(target, []).append(one)
    return feeds


def followers(feeds: Mapping[str, list[str]], roots: Iterable[str]) -> set[str]:
    """Every result that stands on one of the roots, roots included; elements count as their series."""
    reached = {root.partition("[")[0] for root in roots}
    stack = list(reached)
    while stack:
        for follower in feeds.get(stack.pop(), ()):
            if follower not in reached:
                reached.add(follower)
                stack.append(follower)
    return reached


def called(label: str) -> str:
    """A label inside a sentence: only a first letter that stands before a small one is made small."""
    return label[:1].lower() + label[1:] if label[1:2].islower() or label[1:2] == "" else label


def quoted(value: Value) -> str:
    """A value between quotes, the beginning of a long text only."""
    text = str(value)
    return repr(text if len(text) <= LONGEST else f"{text[:LONGEST]}...")


def is_number(value: object) -> TypeGuard[float | int]:
    """Whether a value is a number; a truth value is none."""
    return isinstance(value, float | int) and not isinstance(value, bool)


@lru_cache(maxsize=2048)
def _references(formula: str, constants: tuple[str, ...]) -> tuple[str, ...]:
    """What a template takes: references in braces, and the cell function's own constants by name."""
    names = set(NAME.findall(formula))
    return tuple(dict.fromkeys([*REFERENCE.findall(formula), *(f"const.{one}" for one in constants if one in names)]))


def _change(now: Value, then: Value) -> float | None:
    if not is_number(now) or not is_number(then) or now == then:
        return None
    change = float(now) - float(then)
    return change if isfinite(change) else None


def _told(value: object) -> object:
    """A value as a finding states it: number, text or nothing."""
    return str(value).upper() if isinstance(value, bool) else value
