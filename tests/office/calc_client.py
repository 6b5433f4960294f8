"""A real, headless Calc that a test drives: `with Calc(...) as calc: calc.put(...)`."""

from __future__ import annotations

import contextlib
import json
import os
import re
import subprocess
from pathlib import Path
from typing import Any

from sheetcal.office.find import program_folder, uno_python

DRIVER = Path(__file__).with_name("calc_driver.py")
PREFIX = "ORG.SHEETCAL.FUNCTIONS."


class Calc:
    """The client side of calc_driver.py; what is not here is an order of that name there."""

    def __init__(self, user_folder: Path | None, *options: str, home: Path | None = None) -> None:
        program = program_folder()
        python = uno_python(program)
        assert program is not None and python is not None, "these tests need LibreOffice and a Python that imports uno"
        environment = {**os.environ, **({"HOME": str(home)} if home else {})}
        self.process = subprocess.Popen(
            [str(python), "-I", str(DRIVER)], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True, env=environment
        )
        folder = user_folder.as_uri() if user_folder else ""
        self._say({"program": str(program), "user_folder": folder, "options": list(options)})

    def _say(self, order: dict[str, Any]) -> Any:
        assert self.process.stdin and self.process.stdout
        self.process.stdin.write(json.dumps(order) + "\n")
        self.process.stdin.flush()
        line = self.process.stdout.readline()
        assert line, "the driver of Calc ended: see its standard error"
        return json.loads(line)

    def __getattr__(self, name: str) -> Any:
        return lambda **values: self._say({"do": name, **values})

    def __enter__(self) -> Calc:
        return self

    def __exit__(self, *_: object) -> None:
        assert self.process.stdin and self.process.stdout
        with contextlib.suppress(BrokenPipeError):
            self.process.stdin.close()
        self.process.wait(40)
        self.process.stdout.close()


def spelled(formula: str) -> str:
    """A formula for the programming interface, which wants the long names of add-in functions."""
    return re.sub(r"(?<![A-Z_.\"])([A-Z][A-Z_0-9]{3,})\(", lambda found: _long(found[1]) + "(", formula)


def _long(name: str) -> str:
    from sheetcal.cells import registry

    return PREFIX + name if name in {one.name for one in registry.all()} else name
