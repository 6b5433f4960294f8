"""The hand of a person at LibreOffice, under a Python with uno; sheetcal takes no part.

Called as `hand.py PROGRAM FOLDER`, orders as JSON on standard input: `file`, `out`, `filter`, and `steps`, each the
name of a function below and its arguments. What is entered goes the way of the keyboard: the program decides whether it
is a number, a date or a text.
"""

from __future__ import annotations

import json
import subprocess
import sys
import time
from pathlib import Path

import uno
from com.sun.star.beans import PropertyValue


def main(program, folder):
    """Start, do every order, end."""
    name = Path(folder).name
    command = [f"{program}/soffice.bin", f"-env:UserInstallation={Path(folder).as_uri()}", "--headless", "--norestore"]
    process = subprocess.Popen([*command, f"--accept=pipe,name={name};urp;"])
    try:
        context = connected(process, command, name)
        for order in json.load(sys.stdin):
            done(context, order)
    finally:
        process.kill()
        process.wait()
        for pipe in Path("/tmp").glob(f"OSL_PIPE_*_{name}"):
            pipe.unlink()


def connected(process, command, name):
    """The context of LibreOffice, as soon as there is one; a first start ends once with 81 to begin anew."""
    local = uno.getComponentContext()
    resolver = local.ServiceManager.createInstance("com.sun.star.bridge.UnoUrlResolver")
    for _ in range(1200):
        try:
            return resolver.resolve(f"uno:pipe,name={name};urp;StarOffice.ComponentContext")
        except Exception:
            if process.poll() == 81:
                process.__init__(process.args)
            time.sleep(0.05)
    raise SystemExit("no LibreOffice")


def done(context, order):
    """Open with a view, take every step, save under another name."""
    desktop = context.ServiceManager.createInstanceWithContext("com.sun.star.frame.Desktop", context)
    document = desktop.loadComponentFromURL(Path(order["file"]).as_uri(), "_blank", 0, properties(Hidden=False))
    hand = Hand(context, document)
    for step, *values in order["steps"]:
        getattr(hand, step)(*values)
    document.calculateAll()
    document.storeToURL(Path(order["out"]).as_uri(), properties(FilterName=order["filter"]))
    document.close(True)


class Hand:
    """What people do in an open workbook."""

    def __init__(self, context, document):
        """The dispatcher takes the same commands as menu and keyboard."""
        self.document = document
        self.controller = document.getCurrentController()
        self.dispatcher = context.ServiceManager.createInstance("com.sun.star.frame.DispatchHelper")

    def tab(self, name):
        """A tab, brought to the front."""
        sheet = self.document.Sheets.getByName(name)
        self.controller.setActiveSheet(sheet)
        return sheet

    def enter(self, tab, cell, typed):
        """Type something into a cell and press Enter."""
        self.controller.select(self.tab(tab).getCellRangeByName(cell))
        self.command(".uno:EnterString", StringName=typed, DontCommit=False)

    def command(self, name, **values):
        """A command of the menu."""
        self.dispatcher.executeDispatch(self.controller.Frame, name, "", 0, properties(**values))

    def clear(self, tab, cell):
        """The delete key."""
        self.controller.select(self.tab(tab).getCellRangeByName(cell))
        self.command(".uno:ClearContents")

    def unprotect(self, tab):
        """Switch protection off; there is no password."""
        self.tab(tab).unprotect("")

    def protect(self, tab):
        """Switch it on again, so that nobody sees."""
        self.tab(tab).protect("")

    def insert_row(self, tab, row):
        """A new row above this one."""
        self.tab(tab).Rows.insertByIndex(row - 1, 1)

    def hide_row(self, tab, row):
        """Hide a row."""
        self.tab(tab).Rows.getByIndex(row - 1).IsVisible = False

    def rename(self, tab, name):
        """Another name for a tab; the structure is unlocked for it."""
        self.document.unprotect("")
        self.document.Sheets.getByName(tab).setName(name)

    def move(self, tab, cell, to):
        """Cut and paste; formulas follow what they pointed at."""
        sheet = self.tab(tab)
        where = sheet.getCellRangeByName(cell).getRangeAddress()
        sheet.moveRange(sheet.getCellRangeByName(to).getCellAddress(), where)

    def copy(self, tab, cell, to):
        """Copy and paste."""
        self.controller.select(self.tab(tab).getCellRangeByName(cell))
        self.command(".uno:Copy")
        self.controller.select(self.tab(tab).getCellRangeByName(to))
        self.command(".uno:Paste")

    def sort(self, tab, area):
        """Sort rows by their second column, downwards."""
        field = uno.createUnoStruct("com.sun.star.table.TableSortField")
        field.Field, field.IsAscending = 1, False
        fields = uno.Any("[]com.sun.star.table.TableSortField", (field,))
        area = self.tab(tab).getCellRangeByName(area)
        area.sort(properties(SortFields=fields, ContainsHeader=False))


def properties(**values):
    """Property values of the interface."""
    return tuple(PropertyValue(name, 0, value, 0) for name, value in values.items())


if __name__ == "__main__":
    main(*sys.argv[1:])
