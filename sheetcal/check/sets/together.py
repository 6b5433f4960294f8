"""Join what is said of a set of workbooks with the verdict on each."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field, replace

from sheetcal.check.case import ACTIONS
from sheetcal.check.sets import charts, clock, copies, habits, vessels
from sheetcal.check.sets.copies import Compare
from sheetcal.check.sets.said import Said
from sheetcal.check.sets.summary import Summary
from sheetcal.check.submission import element_place
from sheetcal.check.verdict import decide, rank
from sheetcal.kinds import load, skeleton
from sheetcal.model import Finding, Verdict

ANSWERED = "control-missing"


@dataclass
class Together:
    """What a set says: findings by file, and the runs of each file whose control stands in another workbook."""

    said: dict[str, list[Said]] = field(default_factory=dict)
    answered: dict[str, set[str]] = field(default_factory=dict)


def look(books: Iterable[Summary], compare: Compare) -> Together:
    """All findings on a set of summaries; those of workbooks not checked serve as a second source only."""
    listed = sorted(books, key=lambda book: (not book.checked, book.file))
    together = Together(answered=vessels.answered(listed))
    for said in _said(listed, compare):
        together.said.setdefault(said.file, []).append(said)
    return together


def _said(books: list[Summary], compare: Compare) -> Iterator[Said]:
    yield from copies.look(books, compare)
    yield from clock.look(books)
    yield from vessels.firings(books)
    yield from vessels.cited(books)
    yield from habits.look(books)
    yield from charts.look(books)


def joined(verdict: Verdict, summary: Summary | None, together: Together) -> Verdict:
    """The verdict on one file with what the set says of it."""
    if summary is None:
        return verdict
    free = together.answered.get(verdict.file, set())
    kept = [one for one in verdict.findings if one.code != ANSWERED or (one.field or "").partition(".")[0] not in free]
    found = (*kept, *_new(kept, [finding(said, summary) for said in together.said.get(verdict.file, ())]))
    if found == verdict.findings:
        return verdict
    return replace(verdict, findings=tuple(sorted(found, key=rank)), verdict=decide(found, bool(verdict.complete)))


def _new(kept: list[Finding], added: list[Finding]) -> Iterator[Finding]:
    """What is not known yet; chance has nothing to say of a cell with which something certain is wrong."""
    known = {(one.code, one.field) for one in kept}
    wrong = {one.field for one in kept if one.certain and one.sort == "fault"}
    for one in added:
        if (one.code, one.field) not in known and (one.certain or one.field not in wrong):
            yield one


def finding(said: Said, summary: Summary) -> Finding:
    """What is said of a workbook as a finding of it; the place follows from the id."""
    plan = skeleton(load(summary.kind, summary.kind_version), summary.shape)
    facts: Mapping[str, object] = {
        "sort": "note" if said.severity == "note" else "fault", "action": ACTIONS[said.severity], **said.facts,
    }  # fmt: skip
    if said.one.partition("[")[0] not in plan.places:
        return Finding(said.code, severity=said.severity, message=said.message, **facts)  # type: ignore[arg-type]
    place, cell = element_place(plan, said.one)
    where = {"sheet": place.tab, "cell": cell.partition(":")[0], "field": said.one}
    return Finding(said.code, severity=said.severity, message=said.message, **{**where, **facts})  # type: ignore[arg-type]
