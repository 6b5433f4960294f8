"""The right half of the front page: cautions where they are seen first, and what the looks of cells mean."""

from __future__ import annotations

from sheetcal.excel.book import Book
from sheetcal.excel.grid import Grid
from sheetcal.excel.textfit import LEAST, LINE, height

FIRST, LAST = 7, 10  # columns G to J
SENSE = "Local rules and licensed practice come first. This workbook is no interlock."
LEGEND = (
    ("legend_box", "type here", "a reading: white, dark frame"),
    ("given", "given", "printed at issue, locked"),
    ("result", "0.00", "computed, locked"),
    ("reported", "0.00", "a result that is reported"),
    ("legend_hatch", "", "needed and still missing"),
    ("legend_warn", "0.00", "outside the usual range"),
    ("legend_stop", "STOP", "do not go on: read the line"),
)
TEXT_SIZE = 9.5


def panel(book: Book, grid: Grid) -> None:
    """Cautions, then the legend, beside the blocks that leave these columns free."""
    rows, looks = book.tables["Front"], book.looks
    top, bottom = free_rows(grid, book)
    legend = bottom - len(LEGEND)
    rows.put(top, FIRST, looks("block_inset"), "Before you begin")
    rows.fill(top, range(FIRST, LAST + 1), looks("block"))
    text = cautions(book)
    rows.put(top + 1, FIRST, looks("warn"), text)
    rows.merge(top + 1, FIRST, LAST, looks("warn"), last_row=legend - 1)
    _raise(grid, top + 1, legend - 1, height(text, sum(grid.widths[FIRST - 1 : LAST]), TEXT_SIZE) + LINE)
    rows.put(legend, FIRST, looks("block_inset"), "How to read the cells")
    rows.fill(legend, range(FIRST, LAST + 1), looks("block"))
    for row, (look, shown, meaning) in enumerate(LEGEND, start=legend + 1):
        rows.height(row, LEAST)
        rows.put(row, FIRST, looks(look), shown)
        rows.put(row, FIRST + 1, looks("legend"), meaning)
        rows.merge(row, FIRST + 1, LAST, looks("legend"))


def cautions(book: Book) -> str:
    """The kind's cautions, the general sense first."""
    texts = list(book.kind.cautions)
    if not any("local rules" in one.lower() for one in texts):
        texts.insert(0, SENSE)
    return "\n\n".join(f"•  {one}" for one in texts)


def free_rows(grid: Grid, book: Book) -> tuple[int, int]:
    """First and last row of the blocks that use no column beyond the value's own."""
    blocks = [one for one in book.skeleton.blocks if one.tab == "Front"]
    plain = []
    for one in blocks:
        if any(place.column >= FIRST for row in range(one.first_row, one.last_row + 1) for place in grid.lines[row]):
            break
        plain.append(one)
    return plain[0].title_row, plain[-1].last_row


def _raise(grid: Grid, first: int, last: int, points: float) -> None:
    """Make rows higher together until a text beside them has room."""
    rows = grid.rows
    have = sum(rows.heights.get(row, LEAST) for row in range(first, last + 1))
    more = max(0.0, points - have) / (last - first + 1)
    for row in range(first, last + 1):
        rows.height(row, rows.heights.get(row, LEAST) + more)
