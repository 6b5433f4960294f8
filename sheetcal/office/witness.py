"""What LibreOffice says of one workbook: its readings pushed into the bare workbook, or the file itself opened."""

from __future__ import annotations

import os
from collections.abc import Callable, Mapping
from concurrent.futures import Future
from dataclasses import dataclass

from sheetcal.errors import SheetcalError
from sheetcal.kinds import Skeleton, load, skeleton
from sheetcal.model import Heard, Shape, Value
from sheetcal.office.failures import OfficeFailed, OfficeMissing
from sheetcal.office.jobs import Answer, Block, Content, Job, Open, Push, Template, Values
from sheetcal.office.pool import Pool
from sheetcal.office.rectangles import Pushed, Rectangles, rectangles

Cells = Mapping[str, Mapping[str, "tuple[str, Value, str | None]"]]
TEMPLATE, OPENED = "template", "opened"
FAILED_TWICE = "silent: office failed twice"
TOO_LARGE = "silent: larger than any workbook that is issued"
MOST_RUNS, MOST_READINGS = 1000, 100_000  # ten times the largest laboratory's day
PUSHABLE = ("n", "d", "s")  # truth values and error values lose their meaning on the way


@dataclass(frozen=True)
class Question:
    """What LibreOffice is asked: the layout, and the contents to push; None: it must open the file itself."""

    path: str
    kind: str
    version: int
    shape: Shape
    writes: tuple[Block, ...] | None

    @property
    def plan(self) -> Skeleton:
        """The layout."""
        return skeleton(load(self.kind, self.version), self.shape)

    @property
    def note(self) -> str:
        """How LibreOffice is to speak."""
        return OPENED if self.writes is None else TEMPLATE


def question(path: str, kind: str, version: int, shape: Shape, cells: Cells, own: bool) -> Question | None:
    """What to ask about a workbook. `own`: every formula in it is, as a parsed tree, the kind's own.

    None where its record states a size that no workbook has: laying that out would only cost memory.
    """
    runs = max(1, shape.samples) * shape.places
    if runs * shape.record_rows > MOST_READINGS or runs > MOST_RUNS:
        return None
    writes = _writes(rectangles(load(kind, version), shape), cells) if own else None
    return Question(os.path.abspath(path), kind, version, shape, writes)


def _writes(plan: Rectangles, cells: Cells) -> tuple[Block, ...] | None:
    """The contents of every pushed rectangle, blank cells included; None where one cannot be pushed as it is."""
    try:
        return tuple(_block(one, cells.get(one.tab, {})) for one in plan.pushed)
    except Unpushable:
        return None


class Unpushable(Exception):
    """A cell holds something that would lose its meaning."""


def _block(one: Pushed, cells: Mapping[str, tuple[str, Value, str | None]]) -> Block:
    found = [[cells.get(address) if address else None for address in row] for row in one.rows]
    return Block(
        one.tab, one.cell, tuple(tuple(None if cell is None else _content(cell) for cell in row) for row in found)
    )


def _content(cell: tuple[str, Value, str | None]) -> Content:
    kind, value, formula = cell
    if formula is not None or kind not in PUSHABLE:
        raise Unpushable
    if isinstance(value, str):
        if not value.isascii() and any("\ud800" <= one <= "\udfff" for one in value):
            raise Unpushable
        return value
    return None if value is None else float(value)


def ask(pool: Pool, asked: Question, bare: Callable[[Skeleton], tuple[str, Callable[[], bytes]]]) -> Future[Answer]:
    """Put the question. `bare` gives the key of a layout's bare workbook, and what makes it."""
    reads = rectangles(load(asked.kind, asked.version), asked.shape).read
    job: Job = Open(asked.path, reads)
    if asked.writes is not None:
        job = Push(Template(*bare(asked.plan)), asked.writes, reads)
    return pool.submit(job)


def heard(asked: Question, future: Future[Answer]) -> Heard:
    """What LibreOffice answered, or why it is silent; waits for it."""
    try:
        answer = future.result()
    except OfficeMissing as fault:
        return Heard(None, f"silent: LibreOffice {fault.what}", failed=True)
    except OfficeFailed:
        return Heard(None, FAILED_TWICE, failed=True)
    except SheetcalError as fault:
        return Heard(None, f"silent: LibreOffice says the file {fault.what}", failed=True)
    assert isinstance(answer, Values)  # nothing else answers a question
    return Heard(_results(rectangles(load(asked.kind, asked.version), asked.shape), answer), asked.note)


def _results(plan: Rectangles, answer: Values) -> dict[str, Value]:
    """Every result by id; what lies beyond the cells in use is blank."""
    blocks = [one.rows for one in answer.blocks]
    return {one: _at(blocks[number], row, column) for one, (number, row, column) in plan.results.items()}


def _at(rows: tuple[tuple[Content, ...], ...], row: int, column: int) -> Value:
    if row >= len(rows) or column >= len(rows[row]):
        return None
    return rows[row][column]
