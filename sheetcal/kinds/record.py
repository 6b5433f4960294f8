"""The issue record: written into the hidden tab row by row, read back, hashed; and the constants' cells."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Iterator
from dataclasses import asdict, replace
from typing import Any

from sheetcal.errors import Refused
from sheetcal.kinds.dates import serial
from sheetcal.kinds.layout import FIRST_ROW, column_letter
from sheetcal.model import Constant, IssueRecord, Shape, SheetKind, Value

CHUNK = 30_000  # a spreadsheet cell holds 32 767 characters


def to_rows(record: IssueRecord) -> list[tuple[str, str]]:
    """(key, text) rows for the hidden tab: one row a key, long texts in numbered pieces, the hash last."""
    rows: list[tuple[str, str]] = []
    for key, value in asdict(record).items():
        text = value if isinstance(value, str) else _json(value)
        pieces = [text[start : start + CHUNK] for start in range(0, len(text), CHUNK)] or [""]
        names = [key] if len(pieces) == 1 else [f"{key}/{number}" for number in range(1, len(pieces) + 1)]
        rows += list(zip(names, pieces, strict=True))
    return [*rows, ("record_sha256", sha256(record))]


def from_rows(rows: Iterable[tuple[str, str]], where: str) -> tuple[IssueRecord, bool]:
    """The record and whether its own hash still holds; Refused when it cannot be read at all."""
    texts: dict[str, str] = {}
    for key, text in rows:
        name = key.partition("/")[0]
        texts[name] = texts.get(name, "") + text
    stated = texts.pop("record_sha256", "")
    try:
        record = _build(texts)
    except (KeyError, TypeError, ValueError, AttributeError) as fault:
        raise Refused(
            where,
            f"the issue record cannot be read ({fault})",
            "a workbook issued by sheetcal",
            "Issue it again.",
        ) from None
    return record, stated == sha256(record)


def sha256(record: IssueRecord) -> str:
    """Hash of the whole record in one canonical text."""
    return hashlib.sha256(_json(asdict(record)).encode()).hexdigest()


def constants_sha256(record: IssueRecord) -> str:
    """Hash of constants and tables only: the id of the set of constants printed on the front page."""
    return hashlib.sha256(_json([asdict(record)["constants"], asdict(record)["tables"]]).encode()).hexdigest()


def with_values(record: IssueRecord, **changes: Any) -> IssueRecord:
    """A copy with some entries replaced."""
    return replace(record, **changes)


def constant_cells(kind: SheetKind, record: IssueRecord) -> Iterator[tuple[str, str, Value, str]]:
    """(id, cell on Constants, value, type) of every constant and table cell, in sheet order.

    Ids are `const.NAME` and `table.TABLE.COLUMN[ROW]`; dates come as serial numbers.
    """
    row = FIRST_ROW + 1
    for one in record.constants:
        yield f"const.{one.name}", f"C{row}", one.value, "number"
        row += 1
    for table, columns in kind.tables.items():
        entries = record.tables.get(table, ())
        for line, entry in enumerate(entries):
            for number, column in enumerate(columns, start=1):
                name, _, unit = column.partition(":")
                value = entry.get(name)
                if unit == "date" and isinstance(value, str):
                    value = serial(value)
                kinds = {"text": "text", "date": "date"}
                cell = f"{column_letter(number)}{row + 3 + line}"
                yield f"table.{table}.{name}[{line + 1}]", cell, value, kinds.get(unit, "number")
        row += 3 + max(1, len(entries))


def _json(value: Any) -> str:
    return json.dumps(value, ensure_ascii=False, separators=(",", ":"), allow_nan=False)


def _build(texts: dict[str, str]) -> IssueRecord:
    plain = ("issue_id", "kind", "profile", "issued_at", "tool", "lab_name", "lab_sha256", "skeleton_sha256")
    values: dict[str, Any] = {key: texts[key] for key in plain}
    for key in ("kind_version", "profile_version", "prefilled", "ranges", "settings", "cites"):
        values[key] = json.loads(texts[key])
    shape = json.loads(texts["shape"])
    shape["table_rows"] = tuple((name, rows) for name, rows in shape["table_rows"])
    shape["constants"] = tuple(shape["constants"])
    values["shape"] = Shape(**shape)
    values["constants"] = tuple(Constant(**one) for one in json.loads(texts["constants"]))
    values["tables"] = {name: tuple(rows) for name, rows in json.loads(texts["tables"]).items()}
    values["locked"] = tuple(json.loads(texts["locked"]))
    return IssueRecord(**values)
