"""`check`: every workbook under the paths gets its verdict."""

from __future__ import annotations

import os
import platform
import sys
from collections.abc import Iterator, Mapping
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sheetcal import __version__
from sheetcal.archive.changed import Recomputed, changes
from sheetcal.archive.opening import Source, sources
from sheetcal.archive.register import record_hashes
from sheetcal.archive.walk import walk
from sheetcal.check.findings.oldformat import given_up
from sheetcal.check.submission import NotOurs, take_apart
from sheetcal.check.verdict import check_file, unreadable
from sheetcal.errors import BadInput, Refused, SheetcalError
from sheetcal.excel.sheetfile import SheetFile
from sheetcal.inputs import read_lab
from sheetcal.inputs.lab import Lab
from sheetcal.kinds.record import constant_cells
from sheetcal.model import Finding, Verdict
from sheetcal.reports.document import document
from sheetcal.reports.document import text as json_text
from sheetcal.reports.lines import lines
from sheetcal.verbs import Output

FORMAT = 1
OFFICE_LATER = "LibreOffice not asked"


@dataclass(frozen=True)
class Against:
    """What the files are compared with, beside their own issue record."""

    lab: Lab | None = None
    register: Mapping[str, str] | None = None


def run(
    paths: list[str],
    json: str | None = None,
    lab: str | None = None,
    register: str | None = None,
    workers: int = 1,
    show_all: bool = False,
    force: bool = False,
) -> Output:
    """Check everything under the paths. Raises BadInput or Refused for misuse before any file is read."""
    found = walk(paths)
    if workers < 1:
        raise BadInput("--workers", f"{workers}", "1 or more", "Correct it.")
    against = Against(read_lab(lab) if lab else None, record_hashes(Path(register)) if register else None)
    if json not in (None, "-"):
        _refuse_unwritable(str(json), found.files, force)
    with sources(found.files) as listed:
        verdicts = list(_verdicts(listed, against, workers))
    code = _code(verdicts)
    if json is not None:
        text = json_text(document(verdicts, found.skipped, tool()))
        if json == "-":
            return Output((text.rstrip("\n"),), code)
        _write(Path(json), text)
    colour = sys.stdout.isatty() and "NO_COLOR" not in os.environ
    return Output(tuple(lines(verdicts, found.skipped, OFFICE_LATER, show_all, colour)), code)


def tool() -> dict[str, Any]:
    """What made the document."""
    return {
        "name": "sheetcal",
        "version": __version__,
        "format": FORMAT,
        "python": platform.python_version(),
        "office": None,
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


def _verdicts(files: list[Source], against: Against, workers: int) -> Iterator[Verdict]:
    if workers > 1 and len(files) > 1:
        with ProcessPoolExecutor(workers) as pool:
            yield from pool.map(check_source, files, [against] * len(files), chunksize=4)
        return
    for number, file in enumerate(files, start=1):
        yield check_source(file, against)
        if sys.stderr.isatty() and number % 5 == 0:
            sys.stderr.write(f"\rchecked {number} of {len(files)}")
    if sys.stderr.isatty() and len(files) >= 5:
        sys.stderr.write("\r\x1b[K")


def check_path(path: str, against: Against) -> Verdict:
    """The verdict on one file; what cannot be read gets one, too."""
    with sources([path]) as listed:
        return check_source(listed[0], against)


def check_source(source: Source, against: Against) -> Verdict:
    """The verdict on one file as named, its cells read where its source says."""
    path = source.file
    try:
        file = source.read()
    except Refused as fault:
        return unreadable(path, fault, "file-refused")
    except SheetcalError as fault:
        return unreadable(path, fault)
    findings = given_up(file.extras) + _against_lab(file, path, against.lab)
    return check_file(file, path, findings, against.register, against.lab is not None)


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
    return tuple(
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
