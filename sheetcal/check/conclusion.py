"""The last word on one file: what LibreOffice said of its results, beside what the other witnesses say."""

from __future__ import annotations

from dataclasses import replace

from sheetcal.check.case import called, feeds_of, followers, is_number
from sheetcal.check.findings.disagree import agree
from sheetcal.check.values import CIRCLE, DIV0, LIMIT, NA, NAME, NUM, REF, VALUE
from sheetcal.check.verdict import Examined, decide, rank
from sheetcal.kinds import Skeleton, load, skeleton
from sheetcal.model import Finding, Heard, Place, ResultLine, Value, Verdict

MOST = 5  # more results than this on which the engines differ are one fault of an engine
ERRORS = {str(one) for one in (CIRCLE, DIV0, LIMIT, NA, NAME, NUM, REF, VALUE)}
CAUSE = "a fault of sheetcal or of this LibreOffice, not of the laboratory: report it with the workbook"


def conclude(examined: Examined, heard: Heard | None, demanded: bool = False) -> Verdict:
    """The verdict with what LibreOffice said. `demanded`: its failure on this file is a finding."""
    verdict = examined.verdict
    if heard is None or examined.shape is None:
        return verdict
    notes = {**verdict.witness_notes, "office": heard.note}
    if heard.values is None:
        found = (*verdict.findings, _failed(heard)) if demanded and heard.failed else verdict.findings
        return _decided(replace(verdict, witness_notes=notes), found)
    assert verdict.kind is not None  # a file with a shape has a kind
    plan = skeleton(load(verdict.kind, verdict.kind_version), examined.shape)
    values = {one: value for one, value in heard.values.items() if one not in examined.lost}
    lines = tuple(_line(one, values.get(one.id), plan.places[one.id].field.resolution) for one in verdict.results)
    found = (*verdict.findings, *_apart(lines, plan, examined.settled | examined.lost))
    spoken = replace(verdict, results=lines, witnesses=(*verdict.witnesses, "office"), witness_notes=notes)
    return _decided(spoken, found)


def _decided(verdict: Verdict, found: tuple[Finding, ...]) -> Verdict:
    if found == verdict.findings:
        return verdict
    return replace(verdict, findings=tuple(sorted(found, key=rank)), verdict=decide(found, bool(verdict.complete)))


def _failed(heard: Heard) -> Finding:
    message = f"LibreOffice was to be a witness and failed on this file ({heard.note.removeprefix('silent: ')})"
    return Finding(
        "office-failed", "fault", "error", message, action="reject",
        likely_cause="check it again; without `--office always` the other witnesses decide",
    )  # fmt: skip


def _line(line: ResultLine, office: Value, step: float | None) -> ResultLine:
    """The line with what LibreOffice gives."""
    if office is None:
        return line
    return ResultLine(
        line.id, line.label, line.unit, line.cell, line.typed, line.formula, line.balance, office,
        _agrees(line, office, step), line.reported, line.tolerance,
    )  # fmt: skip


def _agrees(line: ResultLine, office: Value, step: float | None) -> bool | None:
    """Whether all that spoke agree, LibreOffice among them; None where it spoke alone."""
    if line.agrees is False:
        return False
    others = [value for value in (line.typed, line.formula) if value is not None]
    same = all(same_value(value, office, step) for value in others)
    if line.agrees is not None or line.balance is None:
        return same if others else None
    return same and is_number(line.balance) and is_number(office) and _near(office - line.balance, line.tolerance)


def _near(gap: float, tolerance: float | None) -> bool:
    return abs(gap) <= (tolerance or 0.0)


def same_value(one: Value, office: Value, step: float | None) -> bool:
    """Whether a value is what LibreOffice gives: TRUE counts as 1 there, and it has error values of its own."""
    if isinstance(one, bool):
        one = float(one)
    return (_is_error(one) and _is_error(office)) or agree(one, office, step)


def _is_error(value: Value) -> bool:
    return isinstance(value, str) and (value in ERRORS or value.startswith("#ERR:"))


def _apart(lines: tuple[ResultLine, ...], plan: Skeleton, settled: frozenset[str]) -> list[Finding]:
    """A finding for each result that two engines compute differently, none for what stands on such a result."""
    apart = {
        one.id: one
        for one in lines
        if one.id not in settled and not same_value(one.formula, one.office, plan.places[one.id].field.resolution)
    }
    if not apart:
        return []
    feeds = feeds_of(plan)
    later = followers(feeds, (follower for one in apart for follower in feeds.get(one, ())))
    first = [line for one, line in apart.items() if one not in later]
    if len(first) > MOST:
        return [_differ(first[0], plan.places[first[0].id], f" (and {len(first) - 1} more results)")]
    return [_differ(line, plan.places[line.id], "") for line in first]


def _differ(line: ResultLine, place: Place, more: str) -> Finding:
    message = (
        f"{called(line.label)}: LibreOffice computes {_word(line.office)}, "
        f"sheetcal's reading of the same formula {_word(line.formula)}{more}"
    )
    return Finding(
        "engines-disagree", "fault", "error", message, place.tab, place.cell, place.id, line.office, line.formula,
        CAUSE, action="reject",
    )  # fmt: skip


def _word(value: Value) -> str:
    if value is None:
        return "nothing"
    return f"{value:.12g}" if is_number(value) else str(value)
