"""The hand on a real Calc: runs under LibreOffice's Python, takes orders as JSON lines, answers in the same way.

`python inside_driver.py PIPE`: connects to the LibreOffice that listens on the pipe. Standard library and uno only.
"""

from __future__ import annotations

import builtins
import hashlib
import json
import os
import sys
import time
from typing import Any

import uno
from com.sun.star.beans import PropertyValue

DOCUMENTS: dict[str, Any] = {}
OPENED: list[str] = []
FILTERS = {"xlsx": "Calc MS Excel 2007 XML", "ods": "calc8", "fods": "OpenDocument Spreadsheet Flat XML"}
DESKTOP: list[Any] = []
CONTEXT: list[Any] = []
STATIC = 86  # com.sun.star.accessibility.AccessibleRole
PASSED_OVER = (34, 35, 51, 56, 57, 58, 63, 84)  # menus, side and tool bars, status, the sheet itself


def value(name: str, content: Any) -> Any:
    return PropertyValue(name, 0, content, 0)


def connect(pipe: str, seconds: float = 60.0) -> None:
    local = uno.getComponentContext()
    resolver = local.ServiceManager.createInstanceWithContext("com.sun.star.bridge.UnoUrlResolver", local)
    until = time.monotonic() + seconds
    while True:
        try:
            context = resolver.resolve(f"uno:pipe,name={pipe};urp;StarOffice.ComponentContext")
            break
        except Exception:
            if time.monotonic() > until:
                raise
            time.sleep(0.1)
    CONTEXT.append(context)
    DESKTOP.append(context.ServiceManager.createInstanceWithContext("com.sun.star.frame.Desktop", context))


def open(path: str, readonly: bool = False) -> str:
    """Open a file (or "" for a new document) in a window; returns its key."""
    url = uno.systemPathToFileUrl(path) if path else "private:factory/scalc"
    given = (value("ReadOnly", readonly),) if readonly else ()
    document = DESKTOP[0].loadComponentFromURL(url, "_blank", 0, given)
    OPENED.append(path)
    key = f"d{len(OPENED)}"
    DOCUMENTS[key] = document
    return key


def current() -> str:
    """The key of the document in the active window."""
    DOCUMENTS["current"] = DESKTOP[0].getCurrentComponent()
    return "current"


def close(key: str) -> None:
    DOCUMENTS.pop(key).close(True)


def dispatch(key: str, command: str) -> None:
    """Give a command of the menu."""
    frame = DOCUMENTS[key].getCurrentController().getFrame()
    helper = CONTEXT[0].ServiceManager.createInstanceWithContext("com.sun.star.frame.DispatchHelper", CONTEXT[0])
    helper.executeDispatch(frame, f"org.sheetcal.inside:{command}", "_self", 0, ())


def timed(key: str, command: str) -> float:
    """Give a command of the menu: how long Calc was busy with it before it took the next one."""
    began = time.perf_counter()
    dispatch(key, command)
    return time.perf_counter() - began


def longest(key: str, seconds: float) -> float:
    """Keep asking Calc for a cell until nothing of ours is going on: how long it kept us waiting, at most."""
    document = DOCUMENTS[key]
    one, bar_of = document.Sheets.getByIndex(0).getCellByPosition(0, 0), document.getCurrentController()
    until, most, looked = time.perf_counter() + seconds, 0.0, time.perf_counter()
    while time.perf_counter() < until:
        asked = time.perf_counter()
        one.getString()
        bar_of.hasInfobar("sheetcal")
        most = max(most, time.perf_counter() - asked)
        if asked > looked + 0.5:
            looked = asked
            if document.Sheets.hasByName("Findings") and document.Sheets.getByName("Findings").isProtected():
                break
        time.sleep(0.002)
    return most


def bar(key: str) -> list[str]:
    """The words in the bar over the sheet, as an assistive program reads them; [] without a bar."""
    controller = DOCUMENTS[key].getCurrentController()
    if not controller.hasInfobar("sheetcal"):
        return []
    found: list[str] = []
    try:
        _words(controller.getFrame().getContainerWindow().getAccessibleContext(), found)
    except Exception:  # it was being replaced while it was read
        return []
    return found


def _words(node: Any, found: list[str]) -> None:
    role = PASSED_OVER[0] if node is None else node.getAccessibleRole()
    if role in PASSED_OVER:
        return
    if role == STATIC and node.getAccessibleName():
        found.append(node.getAccessibleName())
    for index in range(min(node.getAccessibleChildCount(), 40)):
        child = node.getAccessibleChild(index)
        if child is not None:
            _words(child.getAccessibleContext(), found)


def cell(key: str, tab: str, ref: str) -> Any:
    return DOCUMENTS[key].Sheets.getByName(tab).getCellRangeByName(ref)


def put(key: str, tab: str, ref: str, content: Any) -> None:
    """Type something into a cell, protected or not."""
    sheet = DOCUMENTS[key].Sheets.getByName(tab)
    was = sheet.isProtected()
    if was:
        sheet.unprotect("")
    one = sheet.getCellRangeByName(ref)
    one.setString(content) if isinstance(content, str) else one.setValue(content)
    if was:
        sheet.protect("")


def select(key: str, tab: str, ref: str) -> None:
    """Go to a cell."""
    controller = DOCUMENTS[key].getCurrentController()
    controller.setActiveSheet(DOCUMENTS[key].Sheets.getByName(tab))
    controller.select(cell(key, tab, ref))


def comment(key: str, tab: str, ref: str, content: str) -> None:
    """Put words of the user's own into the comment of a cell."""
    sheet = DOCUMENTS[key].Sheets.getByName(tab)
    sheet.unprotect("")
    place = cell(key, tab, ref).getCellAddress()
    there = cell(key, tab, ref).getCellByPosition(0, 0).getAnnotation().getString()
    sheet.Annotations.insertNew(place, there + content)
    sheet.protect("")


def lock(key: str, tab: str, password: str) -> None:
    """Protect a tab, or with "" for its name the list of tabs, anew with a password."""
    one = DOCUMENTS[key].Sheets.getByName(tab) if tab else DOCUMENTS[key]
    one.unprotect("")
    one.protect(password)


def copy(key: str, path: str) -> None:
    """Write the copy of the cells that the add-in gives to the checker."""
    sys.path.insert(0, os.path.dirname(os.path.dirname(os.path.dirname(os.path.abspath(__file__)))))
    from sheetcal.office.addin.inside import outline, reading, snapshot

    taken = reading.Copy()
    for part in (reading.take, outline.look):
        for _ in part(DOCUMENTS[key], taken):
            pass
    with builtins.open(path, "wb") as stream:
        stream.write(snapshot.workbook(taken))


def spoil(key: str, tab: str, formula: str, merge: str, row: int, column: int) -> None:
    """Unlock a formula, merge cells, hide a row and a column (from 0), and leave the protection off."""
    sheet = DOCUMENTS[key].Sheets.getByName(tab)
    sheet.unprotect("")
    one = sheet.getCellRangeByName(formula)
    protection = one.CellProtection
    protection.IsLocked = False
    one.CellProtection = protection
    sheet.getCellRangeByName(merge).merge(True)
    sheet.Rows.getByIndex(row).IsVisible = False
    sheet.Columns.getByIndex(column).IsVisible = False


def steps(key: str) -> list[str]:
    """What the user can undo, last step first."""
    return list(DOCUMENTS[key].getUndoManager().getAllUndoActionTitles())


def undo(key: str, beginning: str) -> int:
    """Undo the last steps whose names begin so; how many there were."""
    history = DOCUMENTS[key].getUndoManager()
    count = 0
    while history.isUndoPossible() and history.getCurrentUndoActionTitle().startswith(beginning):
        history.undo()
        count += 1
    return count


def quit() -> bool:
    """Ask LibreOffice to end, as its menu does."""
    DOCUMENTS.clear()
    return bool(DESKTOP[0].terminate())


def settle(key: str) -> None:
    """Make the document count as saved."""
    DOCUMENTS[key].setModified(False)


def recalculate(key: str) -> None:
    """Every formula anew, so that what LibreOffice does at its first recalculation is done."""
    DOCUMENTS[key].calculateAll()


def save(key: str, path: str) -> None:
    """Store a copy; the format by the ending."""
    form = FILTERS[path.rpartition(".")[2]]
    DOCUMENTS[key].storeToURL(uno.systemPathToFileUrl(path), (value("FilterName", form),))


def facts(key: str) -> dict[str, Any]:
    """Everything a mark could touch: state, contents, formulas, comments, conditions, view, styles."""
    document = DOCUMENTS[key]
    controller = document.getCurrentController()
    return {
        "modified": document.isModified(),
        "structure": document.isProtected(),
        "tabs": [_tab(one) for one in _each(document.Sheets)],
        "styles": list(document.StyleFamilies.getByName("CellStyles").ElementNames),
        "active": controller.getActiveSheet().Name,
        "selection": controller.getSelection().AbsoluteName,
        "corner": [controller.getFirstVisibleRow(), controller.getFirstVisibleColumn()],
    }


def _each(container: Any) -> list[Any]:
    return [container.getByIndex(index) for index in range(container.Count)]


def _tab(sheet: Any) -> dict[str, Any]:
    cursor = sheet.createCursor()
    cursor.gotoEndOfUsedArea(False)
    end = cursor.RangeAddress
    area = sheet.getCellRangeByPosition(0, 0, end.EndColumn, end.EndRow)
    return {
        "name": sheet.Name,
        "visible": sheet.IsVisible,
        "protected": sheet.isProtected(),
        "values": _hash(area.getDataArray()),
        "formulas": _hash(area.getFormulaArray()),
        "comments": [[one.Position.Column, one.Position.Row, one.String] for one in _each(sheet.Annotations)],
        "conditions": len(sheet.ConditionalFormats.getConditionalFormats()),
    }


def _hash(rows: Any) -> str:
    return hashlib.sha256(repr(rows).encode()).hexdigest()


def style(key: str, tab: str, ref: str) -> str:
    """The cell style of a cell."""
    return str(cell(key, tab, ref).CellStyle)


def text(key: str, tab: str, ref: str) -> str:
    """What a cell shows."""
    return str(cell(key, tab, ref).getCellByPosition(0, 0).String)


def link(key: str, tab: str, ref: str) -> str:
    """Where the link in a cell leads."""
    fields = cell(key, tab, ref).getCellByPosition(0, 0).getTextFields()
    return str(fields.createEnumeration().nextElement().URL)


ORDERS = [
    open, current, close, dispatch, timed, longest, bar, put, recalculate, save, facts, style, text, link, select,
    comment, lock, copy, spoil, steps, undo, quit, settle,
]  # fmt: skip


def main() -> None:
    connect(sys.argv[1])
    orders = {one.__name__: one for one in ORDERS}
    out = os.fdopen(os.dup(1), "w", encoding="utf-8")
    os.dup2(2, 1)
    for line in sys.stdin:
        order = json.loads(line)
        try:
            answer = {"ok": orders[order.pop("do")](**order)}
        except Exception as error:
            answer = {"error": f"{type(error).__name__}: {error}"}
        out.write(json.dumps(answer) + "\n")
        out.flush()
    os._exit(0)  # uno's own end crashes now and then


if __name__ == "__main__":
    main()
