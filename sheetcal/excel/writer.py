"""Write the workbook a technician gets: everything from issue record and values, rebuilt each time."""

from __future__ import annotations

import os
from datetime import UTC, datetime
from pathlib import Path

from openpyxl.packaging.custom import StringProperty
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.workbook.protection import WorkbookProtection

from sheetcal.errors import BadInput, Refused
from sheetcal.excel import constants_tab, explained, grid_tabs, records
from sheetcal.excel.book import Book, Values
from sheetcal.excel.package import to_bytes
from sheetcal.kinds import load, skeleton
from sheetcal.kinds.record import sha256, to_rows
from sheetcal.model import TABS, IssueRecord, SheetKind

ISSUE_TAB = "Issue record"
ID_PROPERTY, HASH_PROPERTY = "sheetcal_issue_id", "sheetcal_record_sha256"


def write_workbook(record: IssueRecord, values: Values, path: Path, force: bool = False) -> None:
    """Write the workbook of an issue record to `path`.

    values: readings and results by field id, series as lists, dates as ISO text; what is missing stays blank.
    Raises Refused where `path` exists and `force` is not given, BadInput where it cannot be written.
    """
    refuse_existing(path, force)
    data = workbook_bytes(record, values)
    store(data, path, force)


def workbook_bytes(record: IssueRecord, values: Values, kind: SheetKind | None = None) -> bytes:
    """The workbook as a file's content: the same record and values always give the same bytes."""
    kind = kind or load(record.kind, record.kind_version)
    book = Book.begin(kind, record, skeleton(kind, record.shape), values)
    for tab in ("Front", "Readings", "Results"):
        grid_tabs.draw(book, tab)
    records.draw(book)
    constants_tab.draw(book)
    explained.draw(book)
    _issue_record(book)
    _finish(book)
    return to_bytes(book.workbook, book.tables, _moment(record.issued_at))


def _issue_record(book: Book) -> None:
    """The hidden tab: key and text of each row, nothing else."""
    sheet, rows, look = book.sheet(ISSUE_TAB), book.tables[ISSUE_TAB], book.looks("raw", "@")
    for row, (key, text) in enumerate(to_rows(book.record), start=1):
        rows.put(row, 1, look, key)
        rows.put(row, 2, look, text)
    sheet.column_dimensions["A"].width, sheet.column_dimensions["B"].width = 20, 100
    sheet.sheet_state = "hidden"


def _finish(book: Book) -> None:
    """Protection, names, properties: what belongs to the workbook as a whole."""
    workbook, record = book.workbook, book.record
    for tab in TABS:
        sheet = book.sheet(tab)
        for area in book.tables[tab].merges:
            sheet.merged_cells.add(area)
        sheet.protection.sheet = True
        sheet.protection.formatColumns = sheet.protection.formatRows = False  # wider columns harm nobody
        sheet.sheet_view.showGridLines = False
        sheet.sheet_format.customHeight = True
    workbook.security = WorkbookProtection(lockStructure=True)
    for name, where in book.skeleton.names.items():
        workbook.defined_names[name] = DefinedName(name, attr_text=where)
    workbook.properties.creator = record.tool
    workbook.properties.title = f"{book.kind.title}, {record.issue_id}"
    workbook.custom_doc_props.append(StringProperty(name=ID_PROPERTY, value=record.issue_id))
    workbook.custom_doc_props.append(StringProperty(name=HASH_PROPERTY, value=sha256(record)))


def _moment(text: str) -> datetime:
    """UTC without zone; a record that states none gets the oldest date a zip can hold."""
    try:
        moment = datetime.fromisoformat(text)
    except ValueError:
        return datetime(1980, 1, 1)
    return moment.astimezone(UTC).replace(tzinfo=None) if moment.tzinfo else moment


def refuse_existing(path: Path, force: bool) -> None:
    if path.exists() and not force:
        raise Refused(str(path), "exists already", "a new name", "Choose another, or say --force.")


def store(data: bytes, path: Path, force: bool) -> None:
    """Write beside the goal under a temporary name, then rename: the goal is whole or absent."""
    draft = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        try:
            draft.write_bytes(data)
            refuse_existing(path, force)
            os.replace(draft, path)
        finally:
            draft.unlink(missing_ok=True)
    except OSError as fault:
        why = fault.strerror or str(fault)
        raise BadInput(
            str(path), f"cannot be written ({why})", "a folder that can be written", "Choose another."
        ) from None
