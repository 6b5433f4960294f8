"""A real Calc for the tests of the add-in; runs under the Python that imports uno, JSON lines in and out.

First line: {"program", "user_folder", "options"}. Then orders, each {"do": NAME, ...}; each answer is one line.
"""

from __future__ import annotations

import contextlib
import json
import os
import signal
import subprocess
import sys
import time
from typing import Any

import uno
from com.sun.star.beans import PropertyValue

FILTERS = {"xlsx": "Calc MS Excel 2007 XML", "ods": "calc8"}


def prop(name: str, value: Any) -> Any:
    """A UNO property."""
    made = PropertyValue()
    made.Name, made.Value = name, value
    return made


class Calc:
    """One LibreOffice and its documents by name."""

    def __init__(self, program: str, user_folder: str, options: list[str]) -> None:
        self.name = f"sheetcal-test-{os.getpid()}"
        user = [f"-env:UserInstallation={user_folder}"] if user_folder else []
        quiet = ["--headless", "--norestore", "--nologo", "--nodefault", "--nofirststartwizard"]
        self.command = [f"{program}/soffice.bin", *quiet, f"--accept=pipe,name={self.name};urp", *user, *options]
        self.documents: dict[str, Any] = {}
        self.context = self._connect()
        self.desktop = self.context.ServiceManager.createInstance("com.sun.star.frame.Desktop")

    def _connect(self) -> Any:
        local = uno.getComponentContext()
        resolver = local.ServiceManager.createInstance("com.sun.star.bridge.UnoUrlResolver")
        self.process = subprocess.Popen(self.command, start_new_session=True, stdout=sys.stderr)
        for _ in range(1200):
            if self.process.poll() == 81:  # a new user folder is set up: once more
                self.process = subprocess.Popen(self.command, start_new_session=True, stdout=sys.stderr)
            try:
                return resolver.resolve(f"uno:pipe,name={self.name};urp;StarOffice.ComponentContext")
            except Exception:
                time.sleep(0.05)
        raise SystemExit("no LibreOffice")

    def new(self, document: str) -> None:
        self.documents[document] = self.desktop.loadComponentFromURL(
            "private:factory/scalc", "_blank", 0, (prop("Hidden", True),)
        )

    def open(self, document: str, path: str) -> None:
        url = uno.systemPathToFileUrl(path)
        self.documents[document] = self.desktop.loadComponentFromURL(url, "_blank", 0, (prop("Hidden", True),))

    def tab(self, document: str, tab: str) -> Any:
        sheets = self.documents[document].Sheets
        if not sheets.hasByName(tab):
            sheets.insertNewByName(tab, sheets.Count)
        return sheets.getByName(tab)

    def put(self, document: str, tab: str, column: int, row: int, rows: list[list[Any]]) -> None:
        """Values, a blank for an empty text."""
        place = (column, row, column + len(rows[0]) - 1, row + len(rows) - 1)
        self.tab(document, tab).getCellRangeByPosition(*place).setDataArray(tuple(map(tuple, rows)))

    def formulas(self, document: str, tab: str, column: int, row: int, texts: list[str]) -> None:
        """One formula a row, in the spelling of the programming interface."""
        cells = self.tab(document, tab).getCellRangeByPosition(column, row, column, row + len(texts) - 1)
        cells.setFormulaArray(tuple((text,) for text in texts))

    def unprotect(self, document: str, tab: str) -> None:
        self.tab(document, tab).unprotect("")

    def move(self, document: str, tab: str, cells: str, to: str) -> None:
        """Cut and paste."""
        sheet = self.tab(document, tab)
        place = sheet.getCellRangeByName(to).getCellByPosition(0, 0).getCellAddress()
        sheet.moveRange(place, sheet.getCellRangeByName(cells).getRangeAddress())

    def copy(self, document: str, tab: str, cells: str, to: str) -> None:
        """Copy and paste."""
        sheet = self.tab(document, tab)
        place = sheet.getCellRangeByName(to).getCellByPosition(0, 0).getCellAddress()
        sheet.copyRange(place, sheet.getCellRangeByName(cells).getRangeAddress())

    def read(self, document: str, tab: str, cells: str) -> list[list[Any]]:
        """Values; an error is the text that the cell shows."""
        place = self.tab(document, tab).getCellRangeByName(cells)
        found = [list(row) for row in place.getDataArray()]
        address = place.getRangeAddress()
        for area in place.queryFormulaCells(4).getRangeAddresses():
            for y in range(area.StartRow, area.EndRow + 1):
                for x in range(area.StartColumn, area.EndColumn + 1):
                    y0, x0 = y - address.StartRow, x - address.StartColumn
                    found[y0][x0] = place.getCellByPosition(x0, y0).String
        return found

    def texts(self, document: str, tab: str, cells: str) -> list[list[str]]:
        """The formulas as a person sees them."""
        place = self.tab(document, tab).getCellRangeByName(cells)
        address = place.getRangeAddress()
        columns = range(address.EndColumn - address.StartColumn + 1)
        return [
            [place.getCellByPosition(x, y).FormulaLocal for x in columns]
            for y in range(address.EndRow - address.StartRow + 1)
        ]

    def recalculate(self, document: str) -> float:
        """Seconds of a hard recalculation."""
        begin = time.perf_counter()
        self.documents[document].calculateAll()
        return time.perf_counter() - begin

    def store(self, document: str, path: str) -> None:
        kind = FILTERS[path.rpartition(".")[2]]
        self.documents[document].storeToURL(uno.systemPathToFileUrl(path), (prop("FilterName", kind),))

    def close(self, document: str) -> None:
        self.documents.pop(document).close(True)

    def wizard(self) -> dict[str, Any]:
        """What the function wizard knows of every function: by name."""
        known = self.context.ServiceManager.createInstance("com.sun.star.sheet.FunctionDescriptions")
        found = {}
        for index in range(known.Count):
            one = {entry.Name: entry.Value for entry in known.getByIndex(index)}
            arguments = [[a.Name, a.Description, a.IsOptional] for a in one["Arguments"] or ()]
            found[one["Name"]] = [one["Category"], one["Description"], arguments]
        return found

    def language(self) -> str:
        """The language of the user interface."""
        provider = self.context.ServiceManager.createInstance("com.sun.star.configuration.ConfigurationProvider")
        access = "com.sun.star.configuration.ConfigurationAccess"
        made = provider.createInstanceWithArguments(access, (prop("nodepath", "/org.openoffice.Setup/L10N"),))
        return str(made.getByName("ooLocale"))

    def extensions(self) -> list[str]:
        manager = self.context.getValueByName("/singletons/com.sun.star.deployment.ExtensionManager")
        return [one.Identifier.Value for group in manager.getAllExtensions(None, None) for one in group if one]

    def stop(self) -> None:
        """End as a person ends it."""
        with contextlib.suppress(Exception):  # the connection breaks as it ends
            self.desktop.terminate()
        try:
            self.process.wait(20)
        except subprocess.TimeoutExpired:
            os.killpg(self.process.pid, signal.SIGKILL)


def main() -> None:
    first = json.loads(sys.stdin.readline())
    calc = Calc(first["program"], first["user_folder"], first["options"])
    answer(True)
    try:
        for line in sys.stdin:
            order = json.loads(line)
            answer(getattr(calc, order.pop("do"))(**order))
    finally:
        calc.stop()
    os._exit(0)  # uno's own clean-up can crash once LibreOffice is gone


def answer(value: Any) -> None:
    sys.stdout.write(json.dumps(value) + "\n")
    sys.stdout.flush()


if __name__ == "__main__":
    main()
