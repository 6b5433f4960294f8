"""`check`: every workbook under the paths gets its verdict."""

from __future__ import annotations

import os
import platform
import sys
from collections import deque
from collections.abc import Iterator, Mapping, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass, replace
from functools import partial
from pathlib import Path
from typing import Any

from sheetcal import __version__
from sheetcal.archive.changed import Recomputed, changes
from sheetcal.archive.earlier import earlier
from sheetcal.archive.opening import Source, sources
from sheetcal.archive.register import record_hashes
from sheetcal.archive.walk import walk
from sheetcal.check.conclusion import conclude
from sheetcal.check.findings.oldformat import LOST, given_up, without_typed
from sheetcal.check.second import ALONE, Second
from sheetcal.check.sets.summary import Summary
from sheetcal.check.submission import NotOurs, take_apart
from sheetcal.check.verdict import Examined, examine, unreadable
from sheetcal.errors import BadInput, Refused, SheetcalError
from sheetcal.excel.sheetfile import SheetFile
from sheetcal.inputs import read_lab
from sheetcal.inputs.lab import Lab
from sheetcal.kinds.record import constant_cells
from sheetcal.model import Finding, Verdict
from sheetcal.office.witness import Question
from sheetcal.reports.document import document
from sheetcal.reports.document import text as json_text
from sheetcal.reports.lines import lines
from sheetcal.verbs import Output
from sheetcal.verbs.fourth import ALWAYS, NEVER, Asked, Office, question_of
from sheetcal.verbs.second import history_files, join, read_history, second
from sheetcal.verbs.standing import out_of_force

FORMAT = 1
LEAST = 5  # files of which the progress is shown


@dataclass(frozen=True)
class Against:
    """What the files are compared with, beside their own issue record."""

    lab: Lab | None = None
    register: Mapping[str, str] | None = None
    second: Second = ALONE


def run(
    paths: list[str],
    json: str | None = None,
    lab: str | None = None,
    register: str | None = None,
    workers: int = 1,
    office: str = NEVER,
    show_all: bool = False,
    force: bool = False,
    history: str | None = None,
    instrument_log: str | None = None,
) -> Output:
    """Check everything under the paths. Raises BadInput, Refused or OfficeMissing before any file is read."""
    found = walk(paths)
    if workers < 1:
        raise BadInput("--workers", f"{workers}", "1 or more", "Correct it.")
    past = history_files(history, found.files)
    against = Against(
        read_lab(lab) if lab else None, record_hashes(Path(register)) if register else None,
        second(history, instrument_log),
    )  # fmt: skip
    if json not in (None, "-"):
        _refuse_unwritable(str(json), found.files, force)
    witness = Office(office)
    verdicts = list(check_set(found.files, against, past, witness, workers))
    code = _code(verdicts)
    if json is not None:
        text = json_text(document(verdicts, found.skipped, tool(witness.version)))
        if json == "-":
            return Output((text.rstrip("\n"),), code)
        _write(Path(json), text)
    colour = sys.stdout.isatty() and "NO_COLOR" not in os.environ
    return Output(tuple(lines(verdicts, found.skipped, witness.words, show_all, colour)), code)


def tool(office: str | None = None) -> dict[str, Any]:
    """What made the document; `office` is the version of the LibreOffice that took part."""
    return {
        "name": "sheetcal",
        "version": __version__,
        "format": FORMAT,
        "python": platform.python_version(),
        "office": office,
    }


def _refuse_unwritable(path: str, inputs: tuple[str, ...], force: bool) -> None:
    """No output that exists goes without --force, and no file that is checked goes at all."""
    target = Path(path)
    if target.is_dir() or not target.parent.is_dir() or not os.access(target.parent, os.W_OK):
        raise BadInput(path, "cannot be written there", "a file in a writable folder", "Choose another.")
    if target.exists() and any(target.samefile(one) for one in inputs):
        raise Refused(path, "is one of the files to be checked", "a file of its own", "Choose another.")
    if target.exists() and not force:
        raise Refused(path, "exists already", "a new name", "Choose another or use --force.")


def _write(target: Path, text: str) -> None:
    temporary = target.with_name(f".{target.name}.new")
    temporary.write_text(text, "utf-8")
    os.replace(temporary, target)


def _code(verdicts: list[Verdict]) -> int:
    if any(one.verdict == "unreadable" for one in verdicts):
        return 2
    return 0 if all(one.sound for one in verdicts) else 1


def check_all(
    files: Sequence[str], against: Against, office: Office | None = None, workers: int = 1
) -> Iterator[Verdict]:
    """The verdict on each file by itself, in file order."""
    yield from (verdict for verdict, _ in _one_by_one(files, against, office or Office(NEVER), workers))


def check_set(
    files: Sequence[str], against: Against, past: Sequence[str] = (), office: Office | None = None, workers: int = 1
) -> Iterator[Verdict]:
    """The verdicts in file order, with what the files say of each other; workbooks in `past` only serve as source."""
    log = against.second.log
    listed = list(_one_by_one(files, against, office or Office(NEVER), workers))
    yield from join(listed, read_history(list(past), log, workers), log)


def _one_by_one(
    files: Sequence[str], against: Against, office: Office, workers: int
) -> Iterator[tuple[Verdict, Summary | None]]:
    """Verdict and summary of each. The next files are examined while LibreOffice computes the ones before."""
    waiting: deque[tuple[Examined, Asked | None]] = deque()
    with sources(files, office.pool) as listed:
        for number, (examined, asked) in enumerate(_examined(listed, against, workers, office.speaks), start=1):
            waiting.append((examined, office.ask(asked)))
            while len(waiting) > office.ahead:
                yield _concluded(*waiting.popleft(), office)
            _progress(number, len(files))
    while waiting:
        yield _concluded(*waiting.popleft(), office)


def _concluded(examined: Examined, asked: Asked | None, office: Office) -> tuple[Verdict, Summary | None]:
    return conclude(examined, office.heard(asked), office.mode == ALWAYS), examined.summary


def _examined(
    files: list[Source], against: Against, workers: int, asking: bool
) -> Iterator[tuple[Examined, Question | None]]:
    many = len(files)
    if workers > 1 and many > 1:
        with ProcessPoolExecutor(workers) as pool:
            yield from pool.map(examine_source, files, [against] * many, [asking] * many, chunksize=4)
        return
    for file in files:
        yield examine_source(file, against, asking)


def _progress(number: int, of: int) -> None:
    if sys.stderr.isatty() and of >= LEAST:
        sys.stderr.write("\r\x1b[K" if number == of else f"\rchecked {number} of {of}" if number % LEAST == 0 else "")


def check_path(path: str, against: Against) -> Verdict:
    """The verdict on one file by the three witnesses that need no other program; what cannot be read gets one, too."""
    with sources([path]) as listed:
        return check_source(listed[0], against)


def check_source(source: Source, against: Against) -> Verdict:
    """The same of a file whose source is known."""
    return examine_source(source, against)[0].verdict


def examine_source(source: Source, against: Against, asking: bool = False) -> tuple[Examined, Question | None]:
    """What three witnesses say of a file as named, its cells read where its source says; and what to ask the fourth."""
    path = source.file
    try:
        return _examine(source, source.read(), against, asking)
    except Refused as fault:
        return Examined(unreadable(path, fault, "file-refused")), None
    except SheetcalError as fault:
        return Examined(unreadable(path, fault)), None
    except Exception as fault:  # one file that nobody thought of must not silence the check of all others
        return Examined(unreadable(path, _ours(path, fault))), None


def _ours(path: str, fault: Exception) -> SheetcalError:
    what = f"sheetcal stopped at this file by {type(fault).__name__}: {fault}"
    return SheetcalError(path, what[:300], do="This is a fault of sheetcal: report it.")


def _examine(source: Source, file: SheetFile, against: Against, asking: bool) -> tuple[Examined, Question | None]:
    """The same of a file that was read."""
    path = source.file
    findings = given_up(file.extras) + _against_lab(file, path, against.lab)
    lost = file.extras.get(LOST, ())
    past = partial(earlier, lab=against.lab) if against.lab else None
    examined = examine(file, path, findings, against.register, against.lab is not None, lost, past, against.second)
    if file.format == "xls":
        examined = replace(examined, verdict=without_typed(examined.verdict))
    return examined, question_of(examined, file, path) if asking else None


def _against_lab(file: SheetFile, path: str, lab: Lab | None) -> tuple[Finding, ...]:
    """Constants of the issue record that the lab file now states differently (same identity only)."""
    if lab is None:
        return ()
    try:
        parts = take_apart(file, path)
    except NotOurs:
        return ()
    restated = changes(parts.record, lab, Recomputed())
    cells = {one: (cell, value) for one, cell, value, _ in constant_cells(parts.kind, parts.record)}
    return out_of_force(parts, lab) + tuple(
        Finding(
            "constant-superseded",
            "fault",
            "warning",
            f"the lab file states another value: {restated.causes[one]}",
            "Constants",
            cells[one][0],
            None,
            cells[one][1],
            new,
            "the constant was corrected after this workbook was issued: recompute it",
            action="hold",
        )
        for one, new in restated.values.items()
    )
