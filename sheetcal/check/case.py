"""One file under examination: its parts, what the witnesses say, and the effect a correction would have."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from functools import cached_property

from sheetcal.check.balance import Balance
from sheetcal.check.completeness import missing
from sheetcal.check.replay import replay
from sheetcal.check.submission import Submission, element_place
from sheetcal.check.witness import Judge, Witnessed
from sheetcal.model import Finding, Place, Value

SEVERITIES = ("error", "warning", "note")


@dataclass
class Case:
    """What the finding modules look at; they never look at the file itself."""

    parts: Submission
    witnessed: Witnessed
    balances: Mapping[str, Balance]
    found: list[Finding] = field(default_factory=list)
    repairs: dict[str, Value] = field(default_factory=dict)

    @cached_property
    def judge(self) -> Judge:
        """Evaluates the kind's rules over the file's cells."""
        return Judge(self.parts, self.witnessed.evaluator)

    @cached_property
    def missing(self) -> list[str]:
        """Ids of required readings that hold nothing."""
        return missing(self.parts.kind, self.parts.skeleton, self.parts.record, self.parts.readings)

    @cached_property
    def expected(self) -> dict[str, Value]:
        """Every result by the kind's own formulas and the record's constants."""
        return replay(self.parts)

    def number(self, one: str) -> float | None:
        """A reading, printed value or result as a number."""
        value = self.value(one)
        return float(value) if isinstance(value, float | int) and not isinstance(value, bool) else None

    def value(self, one: str) -> Value:
        """What stands at an id: the reading, or the formula witness's result."""
        if one in self.witnessed.results:
            return self.witnessed.results[one]
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
        for block in self.judge.anchors:
            if block.startswith("run") and block in self.witnessed.started:
                anchor = self.parts.skeleton.places[self.judge.anchors[block]]
                if sample is None or anchor.sample == sample:
                    yield block

    def sample_of(self, block: str) -> str | None:
        """The sample a run belongs to; a sample block itself."""
        anchor = self.judge.anchors.get(block)
        return self.parts.skeleton.places[anchor].sample if anchor else None

    def add(self, code: str, one: str, message: str, severity: str = "error", **facts: object) -> None:
        """Note a finding at an id; the place follows from the id."""
        place, cell = self.place(one)
        action = {"error": "reject", "warning": "hold", "note": "note"}[severity]
        values = {"sort": "note" if severity == "note" else "fault", "action": action, **facts}
        self.found.append(
            Finding(code, severity=severity, message=message, sheet=place.tab, cell=cell, field=one, **values)  # type: ignore[arg-type]
        )

    def effect(self, one: str, right: Mapping[str, Value]) -> dict[str, object] | None:
        """What the result reported for `one`'s sample would be without the fault: as it stands less as it should be.

        right: corrected readings, constants or results by id; empty where only the file's own formulas differ.
        """
        corrected = replay(self.parts, right) if right else self.expected
        for result in self._reported(one):
            now, then = self.witnessed.results.get(result), corrected.get(result)
            if now is None:
                now = self.parts.typed.get(result)
            if isinstance(now, float | int) and isinstance(then, float | int) and now != then:
                return self._effect(result, float(now) - float(then), corrected)
        return None

    def _reported(self, one: str) -> list[str]:
        """Results that are reported (unrounded), those of the same sample first."""
        block = one.partition(".")[0]
        sample = self.sample_of(block)
        listed = [
            (place.sample != sample, place.id.removesuffix("_mj").removesuffix("_reported"))
            for place in self.parts.skeleton.places.values()
            if place.field.step and place.field.step.reported and (sample is None or place.sample == sample)
        ]
        return list(dict.fromkeys(name for _, name in sorted(listed, key=lambda pair: pair[0])))

    def _effect(self, result: str, change: float, corrected: Mapping[str, Value]) -> dict[str, object]:
        place = self.parts.skeleton.places[result]
        limit = self.number(f"{place.sample}.repeatability_limit") if place.sample else None
        rounded = f"{result}_reported"
        changes = self.value(rounded) != corrected.get(rounded) if rounded in self.parts.skeleton.places else None
        return {
            "result": result,
            "change": change,
            "unit": place.field.unit,
            "of_limit": abs(change) / limit if limit and place.field.unit == "J/g" else None,
            "of_uncertainty": None,
            "reported_changes": changes,
        }


def downstream(parts: Submission, roots: set[str]) -> set[str]:
    """Every result that stands on one of the roots, roots included."""
    feeds: dict[str, list[str]] = {}
    for one, place in parts.skeleton.places.items():
        step = place.field.step
        if step is None or not step.cell:
            continue
        for reference in step.args.values():
            for target in parts.skeleton.resolve(place, reference):
                feeds.setdefault(target, []).append(one)
    reached = set(roots)
    stack = [root.partition("[")[0] for root in roots]
    while stack:
        for follower in feeds.get(stack.pop(), ()):
            if follower not in reached:
                reached.add(follower)
                stack.append(follower)
    return reached
