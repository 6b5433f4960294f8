"""Open files in a LibreOffice with every guard off, under a Python with uno: the control that the hostile files bite.

Called as `unguarded.py PROGRAM PYOO FOLDER FILE...`; prints nothing.
"""

from __future__ import annotations

import importlib.util
import subprocess
import sys
import time
from pathlib import Path

ALWAYS, FULL_UPDATE = 4, 3  # MacroExecMode.ALWAYS_EXECUTE_NO_WARN, UpdateDocMode.FULL_UPDATE


def main(program: str, pyoo_file: str, folder: str, *files: str) -> None:
    """Start, open each, recalculate, close, end."""
    spec = importlib.util.spec_from_file_location("pyoo", pyoo_file)
    pyoo = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(pyoo)
    name = Path(folder).name
    command = [f"{program}/soffice.bin", f"-env:UserInstallation={Path(folder).as_uri()}", "--headless", "--norestore"]
    process = subprocess.Popen([*command, f"--accept=pipe,name={name};urp;"])
    try:
        desktop = connected(pyoo, process, name)
        for one in files:
            opened(pyoo, desktop, one)
    finally:
        process.kill()
        process.wait()
        for pipe in Path("/tmp").glob(f"OSL_PIPE_*_{name}"):
            pipe.unlink()


def connected(pyoo: object, process: subprocess.Popen[bytes], name: str) -> object:
    """The desktop, as soon as there is one."""
    for _ in range(400):
        try:
            return pyoo.Desktop(pipe=name)
        except Exception:
            if process.poll() == 81:
                process.__init__(process.args)
            time.sleep(0.05)
    raise SystemExit("no LibreOffice")


def opened(pyoo: object, desktop: object, path: str) -> None:
    """As a trusting person would: with a view, without which nothing runs on opening."""
    values = {"Hidden": False, "MacroExecutionMode": ALWAYS, "UpdateDocMode": FULL_UPDATE}
    properties = []
    for name, value in values.items():
        one = pyoo.uno.createUnoStruct("com.sun.star.beans.PropertyValue")
        one.Name, one.Value = name, value
        properties.append(one)
    document = desktop._open_url(Path(path).as_uri(), tuple(properties))
    document.calculateAll()
    document.close(True)


if __name__ == "__main__":
    main(*sys.argv[1:])
