"""Comma-separated tables with a header: rows by column, each with its line."""

import csv
import io
import math
import os
import re
from collections.abc import Collection, Mapping
from dataclasses import dataclass
from datetime import date, datetime

from sheetcal.errors import BadInput
from sheetcal.inputs.text import Faults, TextFile, nearest, read_text

# A text cell of ours that begins like a formula carries a leading quote.
QUOTED_FORMULA = re.compile(r"'[=+\-@\t\r]")
NOT_DETERMINED = {"-", "--", "n.d.", "nd", "n.b.", "n/a", "na", "none", "null", "nan", "?"}


@dataclass(frozen=True, slots=True)
class Row:
    """One line of a table: cells by column, without surrounding blanks."""

    line: int
    cells: Mapping[str, str]

    def __getitem__(self, column: str) -> str:
        return self.cells.get(column, "")


@dataclass(frozen=True, slots=True)
class Table:
    """A table as read; `columns` in the file's order."""

    source: TextFile
    columns: tuple[str, ...]
    rows: tuple[Row, ...]


def read_table(path: str | os.PathLike[str], known: Collection[str], required: Collection[str]) -> Table:
    """The table in a comma-separated file. Raises BadInput or BadInputs, naming file and line.

    `known` columns may stand in any order; lines that start with `#` before the header are notes.
    """
    return parse_table(read_text(path), known, required)


def parse_table(source: TextFile, known: Collection[str], required: Collection[str]) -> Table:
    """As `read_table`, of text already read."""
    faults = Faults(source)
    lines = _lines(source)
    if not lines:
        raise BadInput(source.where(), "has no header", "a line " + ",".join(sorted(required)), "Add it.")
    header_line, header = lines[0]
    columns = tuple(cell.strip() for cell in header)
    _check_header(columns, header_line, known, required, faults)
    faults.close()
    rows = []
    for line, cells in lines[1:]:
        if len(cells) != len(columns):
            expected = f"{len(columns)} cells, as in the header"
            faults.add(line, f"has {len(cells)} cells", expected, "Quote a text that holds a comma.")
            continue
        rows.append(Row(line, {c: _clean(cell) for c, cell in zip(columns, cells, strict=True)}))
    faults.close()
    return Table(source, columns, tuple(rows))


def _lines(source: TextFile) -> list[tuple[int, list[str]]]:
    """(line, cells) of every line that holds anything; notes before the header are left out."""
    reader = csv.reader(io.StringIO(source.text, newline=""), strict=True)
    found: list[tuple[int, list[str]]] = []
    before = 0
    try:
        for cells in reader:
            first_line, before = before + 1, reader.line_num
            note = not found and cells and cells[0].lstrip().startswith("#")
            if any(cell.strip() for cell in cells) and not note:
                found.append((first_line, cells))
    except csv.Error as fault:
        line = reader.line_num or 1
        do = "Close the quotation mark."
        raise BadInput(source.where(line), f"is not comma-separated text ({fault})", "", do) from fault
    return found


def _check_header(
    columns: tuple[str, ...], line: int, known: Collection[str], required: Collection[str], faults: Faults
) -> None:
    """Note unknown, repeated and missing columns, and a wrong separator."""
    if len(columns) == 1 and (";" in columns[0] or "\t" in columns[0]):
        sign = ";" if ";" in columns[0] else "a tab"
        faults.add(line, f"columns are separated by {sign}", "commas", "Save it as comma-separated text.")
        return
    for position, column in enumerate(columns):
        if column in columns[:position]:
            faults.add(line, f"column '{column}' stands twice", "each column once", "Remove one.")
        elif not column:
            faults.add(line, f"column {position + 1} has no name", "a column name", "Name or remove it.")
        elif column not in known:
            faults.add(line, f"unknown column '{column}'", nearest(column, known), "Correct the header.")
    for column in sorted(set(required) - set(columns)):
        faults.add(line, f"column '{column}' is missing", "it in the header", "Add the column.")


def _clean(cell: str) -> str:
    text = cell.strip()
    return text[1:] if QUOTED_FORMULA.match(text) else text


def number(text: str) -> float:
    """The number a cell holds: decimal point, finite. Raises BadInput, saying what was meant."""
    if re.fullmatch(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?", text):
        value = float(text)
        if math.isfinite(value):
            return value
        raise BadInput(f"'{text}'", "is too large", "a finite number", "Correct the cell.")
    if re.fullmatch(r"[+-]?\d+,\d+", text):
        do = f"Write {text.replace(',', '.')}."
        raise BadInput(f"'{text}'", "has a decimal comma", "a decimal point", do)
    if text.lower() in NOT_DETERMINED:
        do = "Leave the cell empty, or give the limit with the mark <."
        raise BadInput(f"'{text}'", "is not a number", "a number or nothing", do)
    raise BadInput(f"'{_shown(text)}'", "is not a number", "a number with a decimal point", "Correct the cell.")


def marked_number(text: str) -> tuple[float, str]:
    """(number, mark) of a cell; `<0.05` has the mark `<`. Raises BadInput."""
    if text.startswith("<"):
        return number(text[1:].strip()), "<"
    return number(text), ""


def moment(text: str) -> datetime:
    """A local date and time, `2025-03-03T09:00`; a date alone is its midnight. Raises BadInput."""
    if re.fullmatch(r"\d{4}-\d\d-\d\d([T ]\d\d:\d\d(:\d\d)?)?", text):
        try:
            return datetime.fromisoformat(text)
        except ValueError:
            pass  # 30 February and 25:00 are said below
    raise BadInput(f"'{_shown(text)}'", "is not a date and time", "2025-03-03T09:00", "Correct the cell.")


def day(text: str) -> date:
    """A date, `2025-03-03`. Raises BadInput."""
    if re.fullmatch(r"\d{4}-\d\d-\d\d", text):
        try:
            return date.fromisoformat(text)
        except ValueError:
            pass  # 30 February is said below
    raise BadInput(f"'{_shown(text)}'", "is not a date", "2025-03-03", "Correct the cell.")


def _shown(text: str) -> str:
    """The text as a message may show it: printable and short."""
    clean = "".join(c if c.isprintable() else f"\\x{ord(c):02x}" for c in text)
    return clean if len(clean) <= 40 else clean[:37] + "..."
