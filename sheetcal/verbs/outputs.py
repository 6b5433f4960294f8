"""Write a workbook as .xlsx or .ods: the one by our writer, the other from it by LibreOffice, then read back.

Nothing is put in place before it was read again by our own reader and holds what was to be written: the issue
record, every formula, every reading, every name, the locks, the rules of entry, the marks, the lock on its tabs.
"""

from __future__ import annotations

import tempfile
from collections.abc import Iterator
from pathlib import Path

from sheetcal.check.fingerprint import readings_sha256
from sheetcal.check.formula import same_formula
from sheetcal.check.submission import NotOurs, Submission, take_apart
from sheetcal.errors import BadInput, Refused
from sheetcal.excel.book import Values
from sheetcal.excel.form import differences, xlsx_form
from sheetcal.excel.odsform import finished, ods_form
from sheetcal.excel.reader import read
from sheetcal.excel.sheetfile import SheetFile
from sheetcal.excel.writer import refuse_existing, store, workbook_bytes
from sheetcal.kinds.record import sha256
from sheetcal.model import IssueRecord
from sheetcal.office.jobs import Convert
from sheetcal.office.shared import shared_pool

XLSX, ODS = ".xlsx", ".ods"
FORMATS = (XLSX, ODS)
LAST_DIGITS = 1e-12  # what another program may change of a number in saving, as a part of it


def refuse_contradiction(out: str, form: str | None) -> None:
    """Hold an output's ending against the format asked for. Raises BadInput where they contradict each other."""
    suffix = Path(out).suffix.lower()
    if form and suffix in FORMATS and suffix != f".{form}":
        raise BadInput(out, f"ends in '{suffix}', but --format is {form}", f"a name that ends in .{form}", "Rename it.")


def refuse_unwritable(target: Path) -> None:
    """Raise OfficeMissing where this ending needs LibreOffice and there is none."""
    if target.suffix.lower() == ODS:
        shared_pool()


def write(record: IssueRecord, values: Values, target: Path, force: bool = False) -> None:
    """Write the workbook of an issue record in the format its name asks for.

    values: as `write_workbook` takes them. Raises Refused, BadInput or, for an .ods, OfficeMissing; then nothing
    is written.
    """
    refuse_existing(target, force)
    data = workbook_bytes(record, values)
    store(_as_ods(data, target) if target.suffix.lower() == ODS else data, target, force)


def _as_ods(data: bytes, target: Path) -> bytes:
    """The workbook as .ods, read back and found to be the same. Raises Refused where it is not."""
    with tempfile.TemporaryDirectory(prefix="sheetcal-") as folder:
        ours, theirs = Path(folder) / f"{target.stem}{XLSX}", Path(folder) / target.name
        ours.write_bytes(data)
        shared_pool().run(Convert(str(ours), str(theirs), "ods"))
        form = xlsx_form(data)
        try:
            whole = finished(theirs.read_bytes(), form)
        except ValueError:
            raise _lost(target, "the lock on its tabs") from None
        theirs.write_bytes(whole)
        wrong = next(differences(form, ods_form(whole), same_formula), None) or _difference(ours, theirs)
    if wrong is not None:
        raise _lost(target, wrong)
    return whole


def _lost(target: Path, what: str) -> Refused:
    return Refused(str(target), f"LibreOffice did not keep {what}", "the workbook as written", "Use .xlsx; report it.")


def _difference(ours: Path, theirs: Path) -> str | None:
    """What the two files do not hold alike, in words."""
    one, other = read(ours), read(theirs)
    try:
        parts, again = take_apart(one, ours.name), take_apart(other, theirs.name)
    except NotOurs as fault:
        return f"the issue record ({fault.what})"
    return next(_differences(one, other, parts, again), None)


def _differences(one: SheetFile, other: SheetFile, parts: Submission, again: Submission) -> Iterator[str]:
    if not again.record_whole or sha256(again.record) != sha256(parts.record):
        yield "the issue record"
    if readings_sha256(again) != readings_sha256(parts):
        yield "the readings"
    names = parts.skeleton.names
    if any(not same_formula(other.names.get(name, ""), one.names[name]) for name in names):
        yield "the names of constants"
    if any(other.properties.get(name) != text for name, text in one.properties.items() if name.startswith("sheetcal")):
        yield "its properties"
    for tab, cells in one.cells.items():
        for ref, cell in cells.items():
            if not _same_cell(tab, cell, other.cells.get(tab, {}).get(ref, ("", None, None))):
                yield f"{tab}!{ref}"


def _same_cell(tab: str, ours: tuple[str, object, str | None], theirs: tuple[str, object, str | None]) -> bool:
    """The same formula as a parsed tree; without one the same number, or the same text but for white space."""
    if ours[2] is not None:
        return theirs[2] is not None and same_formula(ours[2], theirs[2], tab)
    if theirs[2] is not None:
        return False
    if isinstance(ours[1], int | float) and isinstance(theirs[1], int | float):
        return abs(ours[1] - theirs[1]) <= LAST_DIGITS * max(abs(ours[1]), abs(theirs[1]))
    return str(ours[1]).split() == str(theirs[1]).split()


__all__ = ["FORMATS", "refuse_contradiction", "refuse_unwritable", "write"]
