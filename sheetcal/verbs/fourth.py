"""LibreOffice as the fourth witness of one `check`: whether it is asked, what it is asked, what it says."""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import Future
from functools import partial

from sheetcal.check.verdict import Examined
from sheetcal.excel.bare import bare_key, bare_workbook
from sheetcal.excel.sheetfile import SheetFile
from sheetcal.kinds import Skeleton
from sheetcal.model import Heard
from sheetcal.office import find
from sheetcal.office.failures import OfficeMissing
from sheetcal.office.jobs import Answer
from sheetcal.office.pool import Pool
from sheetcal.office.shared import shared_pool
from sheetcal.office.witness import TOO_LARGE, Question, ask, heard, question

AUTO, NEVER, ALWAYS = "auto", "never", "always"
NOT_ASKED = "LibreOffice not asked"
Asked = tuple[Question, "Future[Answer]"]


def bare(plan: Skeleton) -> tuple[str, Callable[[], bytes]]:
    """The key of a layout's bare workbook, and what makes it."""
    return bare_key(plan), partial(bare_workbook, plan)


class Office:
    """The LibreOffice of one `check`. Raises OfficeMissing where it must speak (`always`) and is not there."""

    def __init__(self, mode: str = AUTO, pool: Pool | None = None) -> None:
        """`pool`: the LibreOffices to ask; those of the process where none are given."""
        self.mode = mode
        self.pool = pool
        self.version: str | None = None
        self.absent = NOT_ASKED
        self.failed = 0
        if mode != NEVER:
            self._open()

    def _open(self) -> None:
        try:
            self.pool = self.pool or shared_pool()
        except OfficeMissing as missing:
            if self.mode == ALWAYS:
                raise
            self.absent = f"{missing.where} {missing.what}"
            return
        self.version = find.version(self.pool.place.program)
        self.absent = ""

    @property
    def speaks(self) -> bool:
        """Whether there is anybody to ask."""
        return not self.absent

    @property
    def words(self) -> str:
        """How it took part, for the last line of a report."""
        if self.absent:
            return self.absent
        failed = f", failed on {self.failed} {'file' if self.failed == 1 else 'files'}" if self.failed else ""
        return f"LibreOffice {self.version or 'of unknown version'}{failed}"

    @property
    def ahead(self) -> int:
        """How many files may be examined before LibreOffice has answered on the first of them."""
        return 2 * self.pool.size + 2 if self.pool is not None else 0

    def close(self) -> None:
        """End the LibreOffices, where what follows needs none."""
        if self.pool is not None:
            self.pool.close()

    def ask(self, asked: Question | None) -> Asked | None:
        """Put a question, where there is one and somebody to ask."""
        if asked is None or self.pool is None or not self.speaks:
            return None
        return asked, ask(self.pool, asked, bare)

    def heard(self, asked: Asked | None) -> Heard:
        """What it says of one file, or why it is silent; waits for it."""
        if asked is None:
            return Heard(None, f"silent: {self.absent}" if self.absent else TOO_LARGE, failed=self.mode != NEVER)
        said = heard(*asked)
        self.failed += said.failed
        if isinstance(asked[1].exception(), OfficeMissing):
            self.absent = said.note.removeprefix("silent: ")  # it does not start: no use in asking again
        return said


def question_of(examined: Examined, file: SheetFile, path: str) -> Question | None:
    """What to ask about a file; nothing where it is no workbook of ours."""
    verdict = examined.verdict
    if examined.shape is None or verdict.kind is None or verdict.kind_version is None:
        return None
    return question(path, verdict.kind, verdict.kind_version, examined.shape, file.cells, examined.own)
