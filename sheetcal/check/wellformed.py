"""Whether an issue record can be worked with at all: a hostile one must cost neither time nor a traceback."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from math import isfinite

from sheetcal.kinds.dates import serial
from sheetcal.model import IssueRecord, Shape, SheetKind

# Beyond what any version issues, and small enough to lay out in a moment.
MOST = {"samples": 99, "runs": 40, "spare": 40, "bodies": 20, "record_rows": 250}
MOST_BLOCKS = 200  # runs of all samples together
MOST_ROWS = 2000  # of tables and constants


def shape_faults(record: IssueRecord) -> Iterator[str]:
    """What is wrong with a record's shape, as far as it can be told without its kind."""
    shape = record.shape
    if type(record.kind_version) is not int or type(record.profile_version) is not int:
        yield "a version is not a number"
    wrong = [name for name, most in MOST.items() if not _is_size(getattr(shape, name), most)]
    if wrong:
        yield f"{wrong[0]} is not 0 to {MOST[wrong[0]]}"
    elif max(1, shape.samples) * shape.places > MOST_BLOCKS:
        yield "too many runs"
    else:
        yield from _table_faults(record, shape)


def _is_size(size: object, most: int) -> bool:
    return type(size) is int and 0 <= size <= most


def _table_faults(record: IssueRecord, shape: Shape) -> Iterator[str]:
    if shape.constants != tuple(one.name for one in record.constants) or len(shape.constants) > MOST_ROWS:
        yield "its constants are not those of its layout"
    elif not all(_is_number(one.value) and isinstance(one.name, str) for one in record.constants):
        yield "a constant is not a number"
    if not isinstance(record.tables, Mapping) or not all(_is_table(rows) for rows in record.tables.values()):
        yield "a table is not a list of rows"
    elif {f"{name} {rows!r}" for name, rows in shape.table_rows} != _sizes(record):
        yield "its tables are not those of its layout"
    elif sum(len(rows) for rows in record.tables.values()) > MOST_ROWS:
        yield "its tables are too long"


def _sizes(record: IssueRecord) -> set[str]:
    return {f"{name} {len(rows)}" for name, rows in record.tables.items()}


def value_faults(record: IssueRecord, kind: SheetKind, places: Mapping[str, object]) -> Iterator[str]:
    """What is wrong with a record's printed values and limits, its kind and layout being known."""
    missing = set(kind.tables) - set(record.tables)
    if missing:
        yield f"table {min(missing)} is missing"
    elif not all(map(_is_date, _dates(record, kind))):
        yield "a date of a table is none"
    if not isinstance(record.prefilled, dict) or not all(_is_value(one) for one in record.prefilled.values()):
        yield "a printed value is neither number nor text"
    elif not set(record.prefilled) <= set(places) or not set(record.locked) <= set(record.prefilled):
        yield "it prints values where the kind has no place"
    if not isinstance(record.ranges, dict) or not all(_is_range(one) for one in record.ranges.values()):
        yield "a range is not given by numbers"
    texts = [*_items(record.settings), *_items(record.cites)]
    if not all(isinstance(one, str) for one in texts):
        yield "a setting is not a text"


def _dates(record: IssueRecord, kind: SheetKind) -> Iterator[object]:
    """What stands in the columns of dates of a record's tables."""
    for table, columns in kind.tables.items():
        for column in columns:
            name, _, unit = column.partition(":")
            if unit == "date":
                yield from (row.get(name) for row in record.tables[table])


def _is_date(value: object) -> bool:
    """Whether a text is an ISO date; numbers and blanks are let through."""
    try:
        return not isinstance(value, str) or isinstance(serial(value), float)
    except ValueError:
        return False


def _items(mapping: object) -> list[object]:
    return list(mapping.values()) if isinstance(mapping, dict) else [mapping, None]


def _is_table(rows: object) -> bool:
    return isinstance(rows, tuple) and all(
        isinstance(row, dict) and all(_is_value(value) for value in row.values()) for row in rows
    )


def _is_range(limits: object) -> bool:
    return isinstance(limits, dict) and all(_is_number(one) for one in limits.values())


def _is_value(value: object) -> bool:
    return value is None or isinstance(value, bool | str) or _is_number(value)


def _is_number(value: object) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool) and abs(value) < 1e300 and isfinite(value)
