"""Type into documents as a person at LibreOffice does, under a Python with uno; sheetcal takes no part.

Called as `typist.py PROGRAM PYOO FOLDER`, orders as JSON on standard input: `file`, `out`, `filter`, `password`,
`cells` by tab and address. Prints for each what the document says of itself when it has been opened.
"""

from __future__ import annotations

import importlib.util
import json
import subprocess
import sys
import time
from pathlib import Path


def main(program, pyoo_file, folder):
    """Start, do every order, end."""
    spec = importlib.util.spec_from_file_location("pyoo", pyoo_file)
    pyoo = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(pyoo)
    name = Path(folder).name
    command = [f"{program}/soffice.bin", f"-env:UserInstallation={Path(folder).as_uri()}", "--headless", "--norestore"]
    process = subprocess.Popen([*command, f"--accept=pipe,name={name};urp;"])
    try:
        desktop = connected(pyoo, process, name)
        print(json.dumps([done(pyoo, desktop, order) for order in json.load(sys.stdin)]))
    finally:
        process.kill()
        process.wait()
        for pipe in Path("/tmp").glob(f"OSL_PIPE_*_{name}"):
            pipe.unlink()


def connected(pyoo, process, name):
    """The desktop, as soon as there is one; a first start ends once with 81 to begin anew."""
    for _ in range(400):
        try:
            return pyoo.Desktop(pipe=name)
        except Exception:
            if process.poll() == 81:
                process.__init__(process.args)
            time.sleep(0.05)
    raise SystemExit("no LibreOffice")


def done(pyoo, desktop, order):
    """Open with a view, note what there is, type, store."""
    document = desktop._open_url(Path(order["file"]).as_uri(), properties(pyoo, Hidden=False))
    facts = told(document)
    document.enableAutomaticCalculation(False)
    for tab, cells in order.get("cells", {}).items():
        sheet = document.getSheets().getByName(tab)
        for address, value in cells.items():
            cell = sheet.getCellRangeByName(address)
            (cell.setString if isinstance(value, str) else cell.setValue)(value)
    document.enableAutomaticCalculation(True)
    document.calculateAll()
    if "out" in order:
        more = {"Password": order["password"]} if order.get("password") else {}
        document.storeToURL(Path(order["out"]).as_uri(), properties(pyoo, FilterName=order["filter"], **more))
    document.close(True)
    return facts


def told(document):
    """Locks, views, rules and marks as LibreOffice itself sees them."""
    controller, tabs = document.getCurrentController(), {}
    facts = {"locked": document.isProtected(), "front": controller.getActiveSheet().getName(), "tabs": tabs}
    for sheet in document.getSheets():
        visible = sheet.IsVisible
        if visible:
            controller.setActiveSheet(sheet)
        tabs[sheet.getName()] = {
            "protected": sheet.isProtected(),
            "visible": visible,
            "frozen": controller.getSplitRow() if visible and controller.hasFrozenPanes() else 0,
            "marks": len(sheet.ConditionalFormats.getConditionalFormats()),
            "charts": sheet.getCharts().getCount(),
        }
    return facts


def properties(pyoo, **values):
    """Property values of the interface."""
    listed = []
    for name, value in values.items():
        one = pyoo.uno.createUnoStruct("com.sun.star.beans.PropertyValue")
        one.Name, one.Value = name, value
        listed.append(one)
    return tuple(listed)


if __name__ == "__main__":
    main(*sys.argv[1:])
