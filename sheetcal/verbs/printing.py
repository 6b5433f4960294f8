"""`print`: workbooks as PDF for signature, each as it stands, computed anew by a hardened LibreOffice.

Only a workbook of ours is printed, after the gate. Every page bears issue id, hash of the readings (`check --json`
gives it in full, so that paper and file can be matched), what the checker says, and page n of m; the first page has
room for signatures. A workbook that is rejected is printed, for it may have to be discussed and kept, but every
page says so, nothing on it invites a signature, and the exit code is 1.
"""

from __future__ import annotations

import re
import tempfile
from collections import Counter
from collections.abc import Iterable, Iterator
from concurrent.futures import Future
from dataclasses import dataclass
from pathlib import Path

from sheetcal import __version__
from sheetcal.archive.opening import Source, sources
from sheetcal.archive.walk import walk
from sheetcal.check.completeness import begun
from sheetcal.check.fingerprint import readings_sha256, short
from sheetcal.check.submission import Submission, take_apart
from sheetcal.errors import BadInput, BadInputs, Refused, SheetcalError, printable
from sheetcal.excel.form import sizes
from sheetcal.excel.writer import store, workbook_bytes
from sheetcal.formulas.compute import compute
from sheetcal.kinds.layout import RECORD_VALUE_COLUMN, BlockPlace, column_letter
from sheetcal.model import TABS, Place, Verdict
from sheetcal.office.jobs import Answer, Convert, Header, Sizes, Span
from sheetcal.office.pool import Pool
from sheetcal.office.shared import shared_pool
from sheetcal.verbs import Output
from sheetcal.verbs.checking import Against, check_source
from sheetcal.verbs.workbook import readings_iso, shown

SIGN = ("Measured by", "Checked by", "Released by")
RECORDS, HIDDEN = "Records", "Issue record"
LONGEST = 50  # letters of a text at the head or foot
PAGE = re.compile(rb"/Type\s*/Page\b")


@dataclass(frozen=True)
class Print:
    """One workbook on its way to paper: where it goes, what the checker says, and the page's head and foot."""

    source: Source
    target: Path
    verdict: Verdict
    header: Header


def run(path: str, into: str, force: bool = False) -> Output:
    """Print a workbook, or every workbook under a folder. Raises BadInput or Refused before anything is written."""
    found = walk([path])
    targets = _targets(path, found.files, Path(into))
    _refuse_taken(into, targets.values(), force)
    pool = shared_pool()
    with sources(found.files, pool) as listed, tempfile.TemporaryDirectory(prefix="sheetcal-") as folder:
        outcomes = list(_printed(listed, targets, pool, Path(folder), force))
    counts = Counter(code for _, code in outcomes)
    total = f"{len(outcomes)} workbooks" if len(outcomes) != 1 else "1 workbook"
    last = f"{total}: {counts[0] + counts[1]} printed, {counts[1]} of them rejected, {counts[2]} not printed."
    return Output((*(line for line, _ in outcomes), last), max(counts, default=0))


def _targets(path: str, files: tuple[str, ...], into: Path) -> dict[str, Path]:
    """The PDF of each file: the same relative path; the old ending stays where two would bear one name."""
    base = Path(path) if Path(path).is_dir() else Path(path).parent
    plain = {one: into / Path(one).relative_to(base).with_suffix(".pdf") for one in files}
    taken = Counter(plain.values())
    return {one: to if taken[to] == 1 else to.with_name(f"{Path(one).name}.pdf") for one, to in plain.items()}


def _refuse_taken(into: str, targets: Iterable[Path], force: bool) -> None:
    """The folder is made where it is missing; nothing that exists goes without --force."""
    folder = Path(into)
    if folder.exists() and not folder.is_dir():
        raise BadInput(into, "is a file", "a folder", "Name a folder.")
    if not folder.exists() and not folder.parent.is_dir():
        raise BadInput(into, "its folder does not exist", "an existing folder", "Make it first.")
    taken = [one for one in targets if one.exists() and (one.is_dir() or not force)]
    if taken:
        faults = [Refused(str(one), "exists already", "a new name", "Use --force, or another folder.") for one in taken]
        raise BadInputs(faults)


def _printed(
    listed: list[Source], targets: dict[str, Path], pool: Pool, folder: Path, force: bool
) -> Iterator[tuple[str, int]]:
    """A line and an exit code for each file, in order; the next are read while LibreOffice prints."""
    jobs: list[tuple[Print, Path, Future[Answer]] | SheetcalError] = []
    for number, source in enumerate(listed):
        try:
            one, made = _prepared(source, targets[source.file]), folder / f"{number}.pdf"
            jobs.append((one, made, pool.submit(Convert(source.file, str(made), "pdf", one.header))))
        except SheetcalError as fault:
            jobs.append(fault)
    for source, job in zip(listed, jobs, strict=True):
        try:
            if isinstance(job, SheetcalError):
                raise job
            yield _finished(*job, force)
        except SheetcalError as fault:
            reason = "; expected ".join(part for part in (fault.what, fault.expected) if part)
            yield printable(f"not printed {source.file}  {reason}"), 2


def _finished(one: Print, made: Path, job: Future[Answer], force: bool) -> tuple[str, int]:
    """Put a PDF in its place once it is whole."""
    job.result()
    data = made.read_bytes()
    count = len(PAGE.findall(data))
    if not data.startswith(b"%PDF-") or not count:
        raise Refused(one.source.file, "LibreOffice made no PDF of it", "pages")
    one.target.parent.mkdir(parents=True, exist_ok=True)
    store(data, one.target, force)
    made.unlink()
    pages = "1 page" if count == 1 else f"{count} pages"
    return printable(f"printed {one.target}  {pages}  {one.verdict.verdict}"), int(one.verdict.verdict == "reject")


def _prepared(source: Source, target: Path) -> Print:
    """Raises BadInput or Refused for what is no workbook of ours."""
    file = source.read()
    parts = take_apart(file, Path(source.file).name)
    verdict = check_source(source, Against())
    header = Header(
        _brief(parts.record.issue_id),
        f"readings {short(readings_sha256(parts))}",
        f"REJECTED, NOT FOR SIGNATURE · {parts.kind.title}" if verdict.verdict == "reject" else parts.kind.title,
        _brief(parts.record.lab_name),
        words(verdict),
        () if verdict.verdict == "reject" else SIGN,
        tuple(areas(parts)),
        _sizes(parts),
    )
    return Print(source, target, verdict, header)


def _brief(text: str) -> str:
    """A text of the workbook's record, which may be anything, as one short line."""
    return printable(text if len(text) <= LONGEST else f"{text[: LONGEST - 1]}…")


def _sizes(parts: Submission) -> tuple[Sizes, ...]:
    """Columns and rows as our writer makes them for these readings: somebody may have made them too small to read.

    A workbook so spoiled that it cannot be written again is printed with the sizes it has.
    """
    try:
        readings = readings_iso(parts)
        data = workbook_bytes(parts.record, {**readings, **compute(parts.skeleton, parts.record, readings)})
    except (ArithmeticError, LookupError, TypeError, ValueError, SheetcalError):
        return ()
    return tuple((tab, *both) for tab, both in sizes(data).items() if tab != HIDDEN)


def words(verdict: Verdict) -> str:
    """What the checker says, for the foot of every page."""
    by = f"sheetcal {__version__}"
    certain = [one for one in verdict.findings if one.sort != "note"]
    errors = sum(one.severity == "error" and one.code != "reading-missing" for one in certain)
    others = sum(one.severity == "warning" for one in certain)
    told = {
        "reject": f"REJECTED, {_count(errors, 'error')}: NOT FOR SIGNATURE",
        "hold": f"on hold, {_count(others, 'warning')}: settle before release",
        "incomplete": f"incomplete, {_count(len(verdict.missing), 'reading')} missing",
    }
    return f"{told.get(verdict.verdict, verdict.verdict)} ({by})"


def _count(number: int, word: str) -> str:
    return f"{number} {word}{'' if number == 1 else 's'}"


def areas(parts: Submission) -> Iterator[Span]:
    """What is printed of each tab: all of it, of Records the runs that have a record or still want one."""
    for tab in TABS:
        if tab not in (RECORDS, HIDDEN):
            yield tab, ""
    blocks = [one for one in parts.skeleton.blocks if one.tab == RECORDS]
    if blocks:
        last = column_letter(RECORD_VALUE_COLUMN)
        listed = [one for one in blocks if _wanted(parts, one)] or blocks[:1]
        yield RECORDS, ",".join(f"A{one.title_row}:{last}{one.last_row}" for one in listed)


def _wanted(parts: Submission, block: BlockPlace) -> bool:
    """Whether a record holds anything typed, or its run is required and not begun."""
    run = f"run{block.run}"
    typed = any(
        place.tab == RECORDS and place.field.step is None and _is_new(parts, place)
        for one, place in parts.skeleton.places.items()
        if one.startswith(f"{run}.")
    )
    return typed or (run not in begun(parts.readings, parts.record) and not _is_spare(parts, block.run or 0))


def _is_new(parts: Submission, place: Place) -> bool:
    value = parts.readings.get(place.id)
    if isinstance(value, list):
        return any(one is not None for one in value)
    return value is not None and shown(place, value) != parts.record.prefilled.get(place.id)


def _is_spare(parts: Submission, run: int) -> bool:
    """Whether a run lies beyond those its sample, or the sheet, requires."""
    shape = parts.skeleton.shape
    sample, turn = divmod(run - 1, max(1, shape.places))
    stated = parts.record.prefilled.get(f"sample{sample + 1}.runs_required") if shape.samples else None
    return turn >= (stated if isinstance(stated, int | float) else shape.runs)


__all__ = ["areas", "run", "words"]
