"""Examine one file: gather the witnesses, look for faults, and say what to do with it."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Protocol

from sheetcal.check.balance import balances
from sheetcal.check.case import SEVERITIES, Case
from sheetcal.check.completeness import missing
from sheetcal.check.findings import (
    absent,
    altered,
    candidates,
    days,
    disagree,
    exchanges,
    limits,
    logged,
    moved,
    printed,
    readings,
    runs,
    sight,
    state,
    work,
)
from sheetcal.check.second import ALONE, Second
from sheetcal.check.sets.summary import Summary, summary_of
from sheetcal.check.submission import Cells, NotOurs, Submission, take_apart
from sheetcal.check.witness import witness
from sheetcal.errors import SheetcalError
from sheetcal.kinds.record import sha256
from sheetcal.model import TABS, Finding, IssueRecord, ResultLine, Shape, Verdict

NEEDS = {
    "lab": "constants against today's lab file (give --lab)",
    "register": "the issue record against the register (give --register)",
}
NEVER_HERE = ("conditional formats (limits are judged from the readings, whatever the cells show)",)
Earlier = Mapping[str, tuple[tuple[float, str], ...]]  # see `Case.earlier`
Past = Callable[[IssueRecord], Earlier]
NO_OFFICE = "silent: LibreOffice not asked"


class File(state.File, sight.File, Protocol):
    """A workbook as a reader gives it."""

    @property
    def cells(self) -> Cells: ...
    @property
    def names(self) -> Mapping[str, str]: ...
    @property
    def sha256(self) -> str: ...
    @property
    def properties(self) -> Mapping[str, str]: ...


def unreadable(path: str, fault: SheetcalError, code: str = "file-unreadable", digest: str | None = None) -> Verdict:
    """The verdict on a file that cannot be examined."""
    message = "; expected ".join(part for part in (fault.what, fault.expected) if part)
    finding = Finding(code, "fault", "error", message, action="reject", likely_cause=fault.do or None)
    return Verdict(path, "unreadable", digest, findings=(finding,))


@dataclass(frozen=True)
class Examined:
    """One file after typed, formula and balance have spoken; small enough to travel between processes.

    `shape` is None for a file that is no workbook of ours. `own`: every formula is, as a parsed tree, the kind's
    own. `settled`: results on which a finding has been made already, or that stand on one. `lost`: those whose
    formula the file's format could not hold, and what stands on them; LibreOffice knows nothing of these.
    """

    verdict: Verdict
    shape: Shape | None = None
    own: bool = False
    settled: frozenset[str] = frozenset()
    lost: frozenset[str] = frozenset()
    summary: Summary | None = None


def check_file(
    file: File, path: str, lab_findings: tuple[Finding, ...] = (), register: Mapping[str, str] | None = None,
    with_lab: bool = False,
) -> Verdict:  # fmt: skip
    """The verdict on a workbook as read, by the three witnesses that need no other program; see `examine`."""
    return examine(file, path, lab_findings, register, with_lab).verdict


def examine(
    file: File, path: str, lab_findings: tuple[Finding, ...] = (), register: Mapping[str, str] | None = None,
    with_lab: bool = False, lost: Sequence[str] = (), past: Past | None = None,
    second: Second = ALONE,
) -> Examined:  # fmt: skip
    """What three witnesses say of a workbook as read.

    `register`: record hash by issue id. `lab_findings`: more findings. `lost`: `Tab!A1` of formulas that its format
    could not hold. `past`: gives what the constants of a record were before, by a lab file.
    """
    try:
        parts = take_apart(file, path)
    except NotOurs as fault:
        return Examined(unreadable(path, fault, fault.code, file.sha256))
    case, lines = gather(file, parts, past(parts.record) if past else {})
    case.found += lab_findings
    summary = _looked_up(case, lines, path, file.sha256, second)
    against = _register(case, register) + (("lab",) if with_lab else ())
    verdict = _verdict(path, file.sha256, case, lines, ("record", *against), second, summary.readings)
    own = not case.witnessed.altered and not case.witnessed.typed_over
    return Examined(verdict, parts.record.shape, own, _settled(case), _lost(case, lost), summary)


def _looked_up(case: Case, found: list[ResultLine], path: str, digest: str, second: Second) -> Summary:
    """What is kept for the set, after the log has had its say."""
    results = {one.id: one.formula for one in found if one.formula is not None}
    book = summary_of(case.parts, path, digest, results)
    if second.log is None or case.shifted:
        return book
    logged.look(case, second.log, book)
    return replace(book, logged=logged.lines(book, second.log))


def _settled(case: Case) -> frozenset[str]:
    """Results that a finding speaks of already; every one where the rows were moved."""
    roots = case.witnessed.results if case.shifted else case.altered | case.mistyped
    return frozenset(case.stands_on(roots)) if roots else frozenset()


def _lost(case: Case, cells: Sequence[str]) -> frozenset[str]:
    """Results in these cells, and what stands on them."""
    at = case.parts.skeleton.at
    places = [at.get((tab, cell)) for tab, _, cell in (one.partition("!") for one in cells)]
    return frozenset(case.stands_on(one.id for one in places if one is not None)) if places else frozenset()


def gather(file: File, parts: Submission, earlier: Earlier | None = None) -> tuple[Case, list[ResultLine]]:
    """All findings on one workbook, and a line for each of its results."""
    witnessed = witness(parts, file.cells, file.names)
    spoken = balances(parts.kind, parts.record, parts.readings, witnessed.held(parts.typed))
    case = Case(parts, witnessed, spoken, file.cells, file.names, earlier=earlier or {})
    state.look(case, file)
    printed.look(case, file.properties)
    if not case.shifted:
        sight.look(case, file)
        moved.look(case)
        readings.look(case)
        days.look(case, file.properties)
        absent.look(case)
        altered.look(case)
        limits.look_at_evident(case)
        exchanges.look(case)
        limits.look(case)
        runs.look(case)
        work.look(case)
        candidates.look(case)
    return case, disagree.look(case)


def _register(case: Case, register: Mapping[str, str] | None) -> tuple[str, ...]:
    if register is None:
        return ()
    stated = register.get(case.parts.record.issue_id)
    if stated != sha256(case.parts.record):
        what = "is not in the register" if stated is None else "is not the one the register noted at issue"
        case.found.append(
            Finding(
                "record-altered",
                "fault",
                "error",
                f"the issue record {what}",
                "Issue record",
                action="reject",
            )
        )
    return ("register",)


def _verdict(
    path: str, digest: str, case: Case, lines: list[ResultLine], against: tuple[str, ...], second: Second, readings: str
) -> Verdict:
    parts = case.parts
    found = tuple(sorted(_once(case.found), key=rank))
    complete = not open_readings(case)
    return Verdict(
        file=path,
        verdict=decide(found, complete),
        sha256=digest,
        kind=parts.kind.name,
        kind_version=parts.kind.version,
        complete=complete,
        issue_id=parts.record.issue_id,
        profile=parts.record.profile,
        profile_version=parts.record.profile_version,
        stage=stage(case),
        constants_checked_against=against,
        missing=tuple(case.missing),
        witnesses=_witnesses(case),
        witness_notes=_notes(case),
        results=tuple(lines),
        findings=found,
        not_checked=(
            *_rises_taken(case),
            *(text for key, text in NEEDS.items() if key not in against),
            *second.lacking,
            *NEVER_HERE,
        ),
        readings_sha256=readings,
    )


def _rises_taken(case: Case) -> tuple[str, ...]:
    """Says how many rises an instrument gave without its record."""
    taken = sum(case.text(f"{run}.rise_source") in ("instrument", "value only") for run in case.runs())
    return (f"the corrected rise of {taken} runs (no record: the instrument's own value was taken)",) if taken else ()


def decide(found: tuple[Finding, ...], complete: bool) -> str:
    """The first verdict that applies; notes and statistical findings never change it."""
    certain = [one for one in found if one.certain and one.sort != "note"]
    if any(one.severity == "error" and one.code != "reading-missing" for one in certain):
        return "reject"
    if not complete:
        return "incomplete"
    return "hold" if any(one.severity in ("error", "warning") or one.sort == "duty" for one in certain) else "sound"


def open_readings(case: Case) -> list[str]:
    """Required readings that hold nothing, or something that is not of their type."""
    if not case.mistyped:
        return case.missing
    parts = case.parts
    wrong = {one.partition("[")[0] for one in case.mistyped}
    usable = {one: value for one, value in parts.readings.items() if one not in wrong}
    return missing(parts.kind, parts.skeleton, parts.record, usable)


def stage(case: Case) -> str:
    """issued, bench, waiting or complete."""
    if not case.witnessed.started:
        return "issued"
    open_ids = open_readings(case)
    if not open_ids:
        return "complete"
    return "waiting" if all(absent.is_late(case, one) for one in open_ids) and _benched(case, open_ids) else "bench"


def _benched(case: Case, open_ids: list[str]) -> bool:
    """Whether every sample that still lacks a value has been at the bench."""
    samples = {case.sample_of(one.partition(".")[0]) for one in open_ids}
    return all(sample is None or any(True for _ in case.runs(sample)) for sample in samples)


def _witnesses(case: Case) -> tuple[str, ...]:
    spoken = [("typed", case.parts.stores_results), ("formula", True), ("balance", bool(case.balances))]
    return tuple(name for name, spoke in spoken if spoke)


def _notes(case: Case) -> dict[str, str]:
    notes = {} if case.parts.stores_results else {"typed": "silent: no stored values"}
    if not case.balances:
        notes["balance"] = "silent: nothing to balance yet"
    return {**notes, "office": NO_OFFICE}


def _once(found: list[Finding]) -> list[Finding]:
    """One fault, one finding: the same code in the same cell is said once."""
    seen: dict[tuple[str, str | None, str | None, str], Finding] = {}
    for one in found:
        seen.setdefault((one.code, one.sheet, one.cell, one.message), one)
    return list(seen.values())


def rank(one: Finding) -> tuple[int, int, int, int]:
    """What findings are sorted by: severity, tab, row, column."""
    tab = TABS.index(one.sheet) if one.sheet in TABS else len(TABS)
    column, row = _position(one.cell)
    return SEVERITIES.index(one.severity), tab, row, column


def _position(cell: str | None) -> tuple[int, int]:
    if not cell:
        return 0, 0
    first = cell.partition(":")[0]
    letters = "".join(c for c in first if c.isalpha())
    column = 0
    for letter in letters:
        column = column * 26 + ord(letter) - 64
    digits = "".join(c for c in first if c.isdigit())
    return column, int(digits or 0)
