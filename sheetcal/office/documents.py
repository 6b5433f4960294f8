"""The documents of one LibreOffice: templates kept open and filled, files opened, recalculated, read and stored.

Worker side: 3.9 syntax, standard library, uno and pyoo.
"""

from __future__ import annotations

import contextlib
import os
import re
import shutil
import zipfile
from collections import OrderedDict
from pathlib import Path
from typing import Any

import uno

from sheetcal.office.jobs import Block, Content, Convert, Done, Open, Push, Span, Values
from sheetcal.office.printing import prepare_pages

ERRORS = {532: "#DIV/0!", 32767: "#N/A", 519: "#VALUE!", 524: "#REF!", 525: "#NAME?", 503: "#NUM!"}
LOAD = {"xlsx": "Calc MS Excel 2007 XML", "ods": "calc8", "xls": "MS Excel 97"}
STORE = {"xlsx": "Calc MS Excel 2007 XML", "ods": "calc8", "pdf": "calc_pdf_Export"}
LESS = ("CalcAsShown", "IsIterationEnabled")  # settings of a file that would give other results than full precision
NEVER, NO_UPDATE = 0, 0  # MacroExecMode.NEVER_EXECUTE, UpdateDocMode.NO_UPDATE
OLE = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"


class Unreadable(Exception):
    """The file cannot be opened as a workbook; that is the file's fault."""


class Unwritable(Exception):
    """The answer cannot be put where it is wanted; that is the place's fault."""


class Documents:
    """Documents of one engine. Every method raises Unreadable for a faulty file; any other error is the engine's."""

    def __init__(self, desktop: Any, folder: Path, keep: int) -> None:
        self.desktop = desktop
        self.folder = folder / "tmp"
        self.keep = keep
        self.templates: OrderedDict[str, _Kept] = OrderedDict()

    def push(self, job: Push) -> Values:
        """Fill the template, recalculate, read."""
        kept = self._template(job)
        kept.write(job.writes)
        kept.document.calculateAll()
        return Values(tuple(kept.read(tab, area) for tab, area in job.reads))

    def _template(self, job: Push) -> _Kept:
        """The template, opened when needed; the one used longest ago gives way."""
        key = job.template.key
        if key not in self.templates:
            while len(self.templates) >= self.keep:
                self.templates.popitem(last=False)[1].document.close(True)
            path = self.folder / "template.xlsx"
            path.write_bytes(job.template.make())
            self.templates[key] = _Kept(self._load(path, "xlsx", Hidden=True))
        self.templates.move_to_end(key)
        return self.templates[key]

    def open(self, job: Open) -> Values:
        """Open, recalculate, read, close."""
        with self._opened(job.path, Hidden=True, ReadOnly=True) as document:
            for name in LESS:
                document.setPropertyValue(name, False)
            document.calculateAll()
            return read(_sheets(document), job.reads)

    def convert(self, job: Convert) -> Done:
        """Open, recalculate, store. A workbook that is stored needs a view, or it loses its frozen panes and zoom."""
        made = self.folder / f"made.{job.form}"
        with self._opened(job.path, Hidden=job.form == "pdf") as document:
            document.calculateAll()
            if job.form == "pdf":
                prepare_pages(document, job.header)
            document.storeToURL(uno.systemPathToFileUrl(str(made)), _properties(FilterName=STORE[job.form]))
        _deliver(made, job.out)
        return Done()

    @contextlib.contextmanager
    def _opened(self, path: str, **how: Any) -> Any:
        """A private copy, opened: no lock file beside the original, no odd name, no way to its neighbours."""
        form = file_format(path)
        copy = self.folder / f"book.{form}"
        shutil.copyfile(path, str(copy))
        document = self._load(copy, form, **how)
        try:
            yield document
        finally:
            document.close(True)
            copy.unlink()

    def _load(self, path: Path, form: str, **how: Any) -> Any:
        """Load with everything switched off that a file could start. Raises Unreadable."""
        properties = _properties(
            FilterName=LOAD[form], MacroExecutionMode=NEVER, UpdateDocMode=NO_UPDATE, Silent=True, **how
        )
        document = self.desktop._open_url(uno.systemPathToFileUrl(str(path)), properties)
        if document is None:
            raise Unreadable(f"LibreOffice cannot open it as .{form}")
        if not document.supportsService("com.sun.star.sheet.SpreadsheetDocument"):
            document.close(True)
            raise Unreadable("LibreOffice opens it as something else than a workbook")
        return document


class _Kept:
    """A template kept open: unprotected, without recalculating at every write."""

    def __init__(self, document: Any) -> None:
        self.document = document
        self.sheets = _sheets(document)
        self.ranges: dict[_Key, Any] = {}
        self.original: dict[_Key, Any] = {}
        self.holds: dict[_Key, Any] = {}
        document.enableAutomaticCalculation(False)
        document.getUndoManager().lock()
        document.addActionLock()
        for sheet in self.sheets.values():
            if sheet.isProtected():
                sheet.unprotect("")

    def write(self, blocks: tuple[Block, ...]) -> None:
        """Write the blocks; whatever an earlier job wrote elsewhere is as the template had it."""
        wanted = {_key(block): block for block in blocks if block.rows and block.rows[0]}
        if not wanted.keys() >= self.original.keys():
            for key, values in self.original.items():
                self._put(key, values)
        for key in wanted.keys() - self.original.keys():
            self.holds[key] = self.original[key] = self._range(key).getDataArray()
        for key, block in wanted.items():
            self._put(key, _plain(block.rows))

    def read(self, tab: str, area: str) -> Block:
        """The contents of a span: one call, for the cells are known and the tab is no larger than we made it."""
        first, _, last = area.partition(":")
        left, top = position(first)
        right, bottom = position(last or first)
        if tab not in self.sheets:
            return Block(tab, first, ())
        return Block(tab, first, _contents(self._range((tab, first, bottom - top + 1, right - left + 1))))

    def _put(self, key: _Key, values: tuple[tuple[Any, ...], ...]) -> None:
        """Write what is not there already: most of one file's blanks and constants are those of the file before."""
        if self.holds.get(key) != values:
            self._range(key).setDataArray(values)
            self.holds[key] = values

    def _range(self, key: _Key) -> Any:
        """The cells of a key; kept, for asking for them costs more than writing them."""
        if key not in self.ranges:
            tab, cell, rows, columns = key
            left, top = position(cell)
            self.ranges[key] = self.sheets[tab].getCellRangeByPosition(left, top, left + columns - 1, top + rows - 1)
        return self.ranges[key]


_Key = tuple[str, str, int, int]  # tab, first cell, numbers of rows and columns


def _key(block: Block) -> _Key:
    return block.tab, block.cell, len(block.rows), len(block.rows[0])


def _plain(rows: tuple[tuple[Content, ...], ...]) -> tuple[tuple[Any, ...], ...]:
    """What UNO takes: texts and floats; '' empties a cell."""
    return tuple(
        tuple("" if one is None else _text(one) if isinstance(one, str) else float(one) for one in row) for row in rows
    )


def _text(text: str) -> str:
    """Half a character pair, which no text may hold, makes the bridge fail: a question mark stands for it."""
    return text if text.isascii() else text.encode("utf-8", "replace").decode("utf-8")


def _sheets(document: Any) -> dict[str, Any]:
    return {sheet.getName(): sheet for sheet in document.getSheets()}


def read(sheets: dict[str, Any], spans: tuple[Span, ...]) -> Values:
    """The contents of the spans, one bulk call each, never more than the span or the used area."""
    return Values(tuple(_read(sheets.get(tab), tab, area) for tab, area in spans))


def _read(sheet: Any, tab: str, area: str) -> Block:
    first, _, last = area.partition(":")
    left, top = position(first)
    if sheet is None:
        return Block(tab, first, ())
    right, bottom = position(last or first)
    cursor = sheet.createCursor()
    cursor.gotoEndOfUsedArea(False)
    end = cursor.getRangeAddress()
    right, bottom = min(right, end.EndColumn), min(bottom, end.EndRow)
    if right < left or bottom < top:
        return Block(tab, first, ((),))
    cells = sheet.getCellRangeByPosition(left, top, right, bottom)
    return Block(tab, first, _contents(cells))


def _contents(cells: Any) -> tuple[tuple[Content, ...], ...]:
    """Blank for '', the error's text for None, which is how a bulk read shows an error."""
    return tuple(
        tuple(
            one if one.__class__ is float else _error(cells, column, line) if one is None else one or None
            for column, one in enumerate(row)
        )
        for line, row in enumerate(cells.getDataArray())
    )


def _error(cells: Any, column: int, line: int) -> str:
    code = cells.getCellByPosition(column, line).getError()
    return ERRORS.get(code, f"#ERR:{code}")


def position(cell: str) -> tuple[int, int]:
    """Column and row from 0 of "E5". Raises ValueError."""
    found = re.fullmatch(r"\$?([A-Z]{1,3})\$?([1-9][0-9]*)", cell)
    if found is None:
        raise ValueError(f"{cell} is no cell")
    column = 0
    for letter in found.group(1):
        column = column * 26 + ord(letter) - 64
    return column - 1, int(found.group(2)) - 1


def file_format(path: str) -> str:
    """xlsx, ods or xls by what the file is, not by its name. Raises Unreadable."""
    try:
        with open(path, "rb") as file:
            start = file.read(8)
        if start == OLE:
            return "xls"
        with zipfile.ZipFile(path) as archive:
            names = set(archive.namelist())
    except (zipfile.BadZipFile, OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else "it is no workbook"
        raise Unreadable(reason) from error
    if "content.xml" in names:
        return "ods"
    if "[Content_Types].xml" in names:
        return "xlsx"
    raise Unreadable("it is no workbook")


def _deliver(made: Path, out: str) -> None:
    """Put the file in its place at once, or not at all. Raises Unwritable."""
    part = out + ".part"
    try:
        shutil.copyfile(str(made), part)
        os.replace(part, out)
    except OSError as error:
        raise Unwritable(error.strerror or str(error)) from error
    finally:
        made.unlink()
        with contextlib.suppress(OSError):
            os.unlink(part)


def _properties(**values: Any) -> tuple[Any, ...]:
    return tuple(_property(name, value) for name, value in values.items())


def _property(name: str, value: Any) -> Any:
    one = uno.createUnoStruct("com.sun.star.beans.PropertyValue")
    one.Name, one.Value = name, value
    return one
