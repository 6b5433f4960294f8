"""A real Calc with the add-in for the tests of checking from inside the sheet: started here, driven from a worker."""

from __future__ import annotations

import contextlib
import json
import os
import shutil
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

from sheetcal.office import find
from sheetcal.office.addin.build import unpack

DRIVER = Path(__file__).with_name("inside_driver.py")
ROOT = Path(__file__).parents[2]
RESTART = 81  # what a fresh user folder ends the first start with
STARTS = 3
BUSY = ("being checked", "being marked")
START, ANSWER = 60.0, 60.0  # seconds
LANGUAGE = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry"><item oor:path="/org.openoffice.Office.Linguistic/General">
<prop oor:name="UILocale" oor:op="fuse"><value>%s</value></prop></item></oor:items>"""


class Failed(AssertionError):
    """An order to Calc that it answered with an error."""


class Calc:
    """One running LibreOffice; `do` gives an order of the driver and returns its answer."""

    def __init__(self, folder: Path, where: dict[str, str], display: str | None = None, language: str = "") -> None:
        self.folder, self._display = folder, display
        folder.mkdir(exist_ok=True)
        if language:
            (folder / "user-folder" / "user").mkdir(parents=True)
            (folder / "user-folder" / "user" / "registrymodifications.xcu").write_text(LANGUAGE % language, "utf-8")
        self.extension = unpack(folder / "extensions", where)
        self.temporary = folder / "tmp"
        self.temporary.mkdir()
        self._pipe = f"sheetcal_{os.getpid()}_{folder.name}"
        self._start()
        python = find.uno_python(find.program_folder())
        assert python is not None, "no Python that can import uno: install python3-uno"
        self._driver = subprocess.Popen(
            [str(python), str(DRIVER), self._pipe],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            text=True,
            env=self._environment,  # the pipe lies in the folder for temporary files
        )

    def _start(self) -> None:
        program = find.program_folder()
        assert program is not None, "no LibreOffice: install libreoffice-calc"
        kept = {name: os.environ[name] for name in ("PATH", "HOME", "LANG") if name in os.environ}
        display = {"DISPLAY": self._display, "SAL_USE_VCLPLUGIN": "gen"} if self._display else {}
        self._command = [
            str(program / "soffice.bin"), "--norestore", "--nologo", "--nodefault", "--nofirststartwizard",
            f"-env:UserInstallation={(self.folder / 'user-folder').as_uri()}",
            f"-env:BUNDLED_EXTENSIONS={(self.folder / 'extensions').as_uri()}",
            f"--accept=pipe,name={self._pipe};urp;", *([] if self._display else ["--headless"]),
        ]  # fmt: skip
        self._environment = {**kept, **display, "TMPDIR": str(self.temporary)}
        pipe = Path(f"/tmp/OSL_PIPE_{os.getuid()}_{self._pipe}")
        for _ in range(STARTS):
            self.process = subprocess.Popen(self._command, env=self._environment)
            until(self.process.poll, lambda code: code is not None or pipe.exists(), START)
            if self.process.poll() != RESTART:
                return
        raise AssertionError("LibreOffice wants to be started again and again")

    def do(self, order: str, **given: Any) -> Any:
        """The driver's answer. Raises Failed."""
        assert self._driver.stdin is not None and self._driver.stdout is not None
        self._driver.stdin.write(json.dumps({"do": order, **given}) + "\n")
        self._driver.stdin.flush()
        answer = json.loads(self._driver.stdout.readline() or '{"error": "the driver is gone"}')
        if "error" in answer:
            raise Failed(f"{order}: {answer['error']}")
        return answer["ok"]

    def open(self, path: Path) -> str:
        """Open a copy of a workbook; the original gets no lock beside it. Returns the document's key."""
        copy = self.folder / path.name
        shutil.copy(path, copy)
        return str(self.do("open", path=str(copy)))

    def removed(self, key: str) -> None:
        """Have the marks removed and wait until it is said."""
        self.do("dispatch", key=key, command="remove")
        until(lambda: self.do("bar", key=key), lambda said: said == ["The marks are removed."])

    def stated(self, **where: str) -> None:
        """Let where.json say something else from now on."""
        (self.extension / "where.json").write_text(json.dumps({**here(), **where}), "utf-8")

    def checked(self, key: str) -> list[str]:
        """Have a document checked and wait for the verdict: the words in the bar."""
        self.do("dispatch", key=key, command="check")
        return self.verdict(key)

    def verdict(self, key: str) -> list[str]:
        """Wait until the bar no longer says that the check or the marking is going on."""
        return until(lambda: self.do("bar", key=key), lambda said: bool(said) and not is_busy(said))

    def left_behind(self) -> list[str]:
        """Copies of worksheets that nobody removed."""
        return [path.name for path in self.temporary.glob("sheetcal-inside-*")]

    def end(self) -> None:
        """Stop both processes, by their own numbers."""
        with self._driver:
            self._driver.kill()
        with self.process:
            self.process.kill()
        shutil.rmtree(self.folder / "user-folder", ignore_errors=True)


def is_busy(said: list[str]) -> bool:
    """Whether the bar says that something is going on."""
    return any(words in " ".join(said) for words in BUSY)


def until(get: Callable[[], Any], enough: Callable[[Any], bool], seconds: float = ANSWER) -> Any:
    """Ask again and again until the answer will do; the last answer is in the failure."""
    end = time.monotonic() + seconds
    while True:
        got = get()
        if enough(got):
            return got
        assert time.monotonic() < end, f"still {got!r} after {seconds:g} s"
        time.sleep(0.1)


@contextlib.contextmanager
def running(folder: Path, display: str | None = None, language: str = "") -> Iterator[Calc]:
    """A Calc for the time of the block, its add-in knowing this interpreter and checkout."""
    one = Calc(folder, here(), display, language)
    try:
        yield one
    finally:
        one.end()


def slow(folder: Path, seconds: float) -> str:
    """An interpreter that takes its time before it does anything."""
    path = folder / f"slow-{seconds:g}"
    path.write_text(f'#!/bin/sh\nsleep {seconds:g}\nexec "{sys.executable}" "$@"\n', "utf-8")
    path.chmod(0o755)
    return str(path)


def here() -> dict[str, str]:
    """Where sheetcal is: this interpreter, this checkout."""
    return {"python": sys.executable, "sheetcal": str(ROOT)}
