"""Open a workbook whatever its format: .xlsx and .ods by our own readers, .xls through LibreOffice.

An .xls is looked over, turned into an .xlsx by a hardened LibreOffice, and that goes through the gate like any
other file. LibreOffice computes it anew on the way: its stored values are not the file's own and are left out.
Formulas the old format cannot hold were given up by the program that saved it: they are taken as issued.
"""

from __future__ import annotations

import os
import tempfile
from collections.abc import Iterable, Iterator
from concurrent.futures import Future
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from sheetcal.check.findings.oldformat import LOST
from sheetcal.check.submission import NotOurs, take_apart
from sheetcal.errors import Refused, SheetcalError
from sheetcal.excel import ole
from sheetcal.excel.oldlimits import fits, is_lost
from sheetcal.excel.reader import read
from sheetcal.excel.sheetfile import SheetFile
from sheetcal.kinds.glance import glances
from sheetcal.office.failures import OfficeFailed, OfficeMissing, OfficeUnreadable
from sheetcal.office.jobs import Answer, Convert
from sheetcal.office.pool import Pool
from sheetcal.office.shared import shared_pool


@dataclass(frozen=True)
class Source:
    """A file as it was named, and the copy LibreOffice made of an .xls, or why there is none."""

    file: str
    copy: str = ""
    fault: SheetcalError | None = None

    def read(self, computed: bool = False) -> SheetFile:
        """What the file holds; name, hash and format are its own. Raises BadInput or Refused.

        computed: whether results of an .xls may be LibreOffice's, to be looked at and not to bear witness.
        """
        if self.fault is not None:
            raise self.fault
        if not self.copy:
            return read(Path(self.file))
        old = ole.look(self.file)
        book = read(Path(self.copy))
        book.format, book.sha256 = "xls", old.sha256
        for sort, facts in old.extras.items():
            for fact in facts:
                book.note(sort, fact)
        return _as_saved(book, old.where, computed)


def read_workbook(path: str | Path) -> SheetFile:
    """Read one workbook of any format, to look at it. Raises BadInput or Refused."""
    if not ole.is_old(path):
        return read(Path(path))
    with sources([str(path)]) as found:
        return found[0].read(computed=True)


@contextmanager
def sources(files: Iterable[str], pool: Pool | None = None) -> Iterator[list[Source]]:
    """The files in their order, every .xls among them turned into a copy; one LibreOffice serves all of them.

    The copies last as long as the context. pool: the one to use, where there is one already.
    """
    listed = list(files)
    old = [one for one in listed if ole.is_old(one)]
    if not old:
        yield [Source(one) for one in listed]
        return
    with tempfile.TemporaryDirectory(prefix="sheetcal-") as folder:
        copies = _copies(old, Path(folder), pool)
        yield [copies.get(one, Source(one)) for one in listed]


def _copies(files: list[str], folder: Path, pool: Pool | None) -> dict[str, Source]:
    """A source for each file in the old format; a fault of one says nothing of the others."""
    try:
        pool = pool or shared_pool()
    except OfficeMissing as missing:
        return {one: Source(one, fault=_unread(one, missing)) for one in files}
    jobs = {one: _started(one, folder / str(number), pool) for number, one in enumerate(files)}
    return {one: _finished(one, job) for one, job in jobs.items()}


Job = tuple[str, "Future[Answer]"] | SheetcalError


def _started(file: str, folder: Path, pool: Pool) -> Job:
    """The copy bears the file's own name, so that messages name it."""
    try:
        ole.look(file)
    except SheetcalError as fault:
        return fault
    folder.mkdir()
    copy = str(folder / os.path.basename(file))
    return copy, pool.submit(Convert(os.path.abspath(file), copy, "xlsx"))


def _finished(file: str, job: Job) -> Source:
    if isinstance(job, SheetcalError):
        return Source(file, fault=job)
    copy, future = job
    try:
        future.result()
    except OfficeMissing as fault:
        return Source(file, fault=_unread(file, fault))
    except (OfficeFailed, OfficeUnreadable) as fault:
        what = f"is in the old format (.xls), and LibreOffice cannot read it ({fault.what})"
        return Source(file, fault=Refused(os.path.basename(file), what, "a workbook", "Save it as .xlsx."))
    return Source(file, copy)


def _unread(file: str, missing: SheetcalError) -> Refused:
    what = f"is in the old format (.xls), which is read through LibreOffice: {missing.what}"
    return Refused(os.path.basename(file), what, missing.expected, missing.do)


def _as_saved(book: SheetFile, where: str, computed: bool) -> SheetFile:
    """Leave out what LibreOffice computed, and put back what the old format could not hold."""
    try:
        plan = take_apart(book, where).skeleton
    except NotOurs:
        return book
    issued = [(one.tab, one.cell, one.formula) for one in plan.places.values() if one.formula]
    issued += [(one.tab, one.cell, one.formula) for one in glances(plan)]
    for tab, ref, formula in issued:
        cell = book.cells.get(tab, {}).get(ref)
        if cell is None:
            continue
        if is_lost(str(cell[0]), cell[1], cell[2]) and not fits(formula):
            book.cells[tab][ref] = ("", None, formula)
            book.note(LOST, f"{tab}!{ref}")
        elif cell[2] is not None and not computed:
            book.cells[tab][ref] = ("", None, cell[2])
    results = {(tab, ref) for tab, ref, _ in issued}
    for tab, cells in book.cells.items():  # a typed #N/A is kept as the formula =NA()
        typed = [ref for ref, cell in cells.items() if cell[2] == "=NA()" and (tab, ref) not in results]
        cells.update(dict.fromkeys(typed, ("e", "#N/A", None)))
    return book
