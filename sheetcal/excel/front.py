"""The right half of the front page: cautions where they are seen first, and what the looks of cells mean."""

from __future__ import annotations

from itertools import groupby

from sheetcal.excel.book import Book
from sheetcal.excel.grid import Grid
from sheetcal.excel.textfit import LEAST, LINE, height
from sheetcal.kinds.layout import BlockPlace
from sheetcal.kinds.words import shown

FIRST, LAST = 7, 10  # columns G to J
SENSE = "Local rules and licensed practice come first. This workbook is no interlock."
LEGEND = (
    ("legend_box", "type here", "a reading: white, dark frame"),
    ("given", "given", "printed at issue, locked"),
    ("result", "0.00", "computed, locked"),
    ("reported", "0.00", "a result that is reported"),
    ("legend_hatch", "", "needed and still missing"),
    ("legend_warn", "0.00", "outside the usual range, or no number"),
    ("legend_idle", "", "does not apply as things are chosen"),
    ("legend_stop", "STOP", "do not go on: read the line"),
)
TEXT_SIZE = 9.5


def panel(book: Book, grid: Grid) -> None:
    """Cautions and legend beside the blocks that leave these columns free, on the first stretch of them if it can."""
    rows, looks = book.tables["Front"], book.looks
    text, stretches = cautions(book), free_rows(grid, book)
    need = height(text, sum(grid.widths[FIRST - 1 : LAST]), TEXT_SIZE) + LINE
    (top, bottom), legend = stretches[0], stretches[-1][0] if len(stretches) > 1 else 0
    together = sum(rows.heights.get(row, LEAST) for row in range(top + 1, bottom - len(LEGEND)))
    if together >= need or not legend:
        legend = bottom - len(LEGEND)
        bottom = legend - 1
    rows.put(top, FIRST, looks("block_inset"), "Before you begin")
    rows.fill(top, range(FIRST, LAST + 1), looks("block"))
    rows.put(top + 1, FIRST, looks("warn"), text)
    rows.merge(top + 1, FIRST, LAST, looks("warn"), last_row=bottom)
    _raise(grid, top + 1, bottom, need)
    _legend(book, legend)


def _legend(book: Book, top: int) -> None:
    """What the looks of cells mean. top: the row of its head."""
    rows, looks = book.tables["Front"], book.looks
    rows.put(top, FIRST, looks("block_inset"), "How to read the cells")
    rows.fill(top, range(FIRST, LAST + 1), looks("block"))
    for row, (look, sample, meaning) in enumerate(LEGEND, start=top + 1):
        rows.height(row, LEAST)
        rows.put(row, FIRST, looks(look), sample)
        rows.put(row, FIRST + 1, looks("legend"), meaning)
        rows.merge(row, FIRST + 1, LAST, looks("legend"))


def cautions(book: Book) -> str:
    """The kind's cautions, the general sense first."""
    texts = list(book.kind.cautions)
    if not any("local rules" in one.lower() for one in texts):
        texts.insert(0, SENSE)
    return "\n\n".join(f"•  {shown(one)}" for one in texts)


def free_rows(grid: Grid, book: Book) -> list[tuple[int, int]]:
    """First and last rows of each stretch of blocks that use no column beyond the value's own."""
    blocks = [one for one in book.skeleton.blocks if one.tab == "Front"]
    stretches = [list(group) for plain, group in groupby(blocks, key=lambda one: _is_plain(grid, one)) if plain]
    return [(group[0].title_row, group[-1].last_row) for group in stretches]


def _is_plain(grid: Grid, block: BlockPlace) -> bool:
    rows = range(block.first_row, block.last_row + 1)
    wide = any(place.column >= FIRST for row in rows for place in grid.lines.get(row, []))
    return not wide and block.block.columns != "glance"


def _raise(grid: Grid, first: int, last: int, points: float) -> None:
    """Make rows higher together until a text beside them has room."""
    rows = grid.rows
    have = sum(rows.heights.get(row, LEAST) for row in range(first, last + 1))
    more = max(0.0, points - have) / (last - first + 1)
    for row in range(first, last + 1):
        rows.height(row, rows.heights.get(row, LEAST) + more)
