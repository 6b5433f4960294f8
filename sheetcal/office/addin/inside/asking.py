"""Ask the checker: sheetcal in its own Python, as a process beside LibreOffice, with a limit and a way to stop it."""

from __future__ import annotations

import json
import os
import shutil
import signal
import subprocess
import tempfile
import threading
from dataclasses import dataclass
from pathlib import Path
from typing import Any

SECONDS = 120.0
PLACE = "where.json"
PREFIX = "sheetcal-inside-"
NAME = "worksheet.xlsx"
KEPT = ("PATH", "HOME", "LANG", "TMPDIR", "TEMP", "TMP", "SYSTEMROOT", "USERPROFILE", "APPDATA", "LOCALAPPDATA")
NOT_THERE = "No module named"


class Unanswered(Exception):
    """No verdict; `why` is a key of `words`, `detail` goes into its text."""

    def __init__(self, why: str, detail: str = "") -> None:
        super().__init__(why, detail)
        self.why = why
        self.detail = detail


@dataclass(frozen=True)
class Checker:
    """Where sheetcal is: an interpreter, and the folder to start it in ("" where it is installed)."""

    python: str
    folder: str


def checker(root: Path) -> Checker:
    """What the extension knows of sheetcal's own Python. Raises Unanswered when it is gone."""
    try:
        stated = json.loads((root / PLACE).read_text("utf-8"))
        python, folder = str(stated["python"]), str(stated.get("sheetcal") or "")
    except (OSError, ValueError, KeyError, TypeError, AttributeError):
        raise Unanswered("no place") from None
    if not python or not Path(python).is_file():
        raise Unanswered("not found", python)
    if folder and not Path(folder).is_dir():
        raise Unanswered("not found", folder)
    return Checker(python, folder)


class Check:
    """One run of the checker over one copy; `answer` waits, `stop` ends it from another thread."""

    def __init__(self, where: Checker, seconds: float = SECONDS) -> None:
        self._where, self._seconds = where, seconds
        self._process: subprocess.Popen[str] | None = None
        self._stopped = False
        self._lock = threading.Lock()

    def answer(self, workbook: bytes) -> dict[str, Any]:
        """What the checker says of the workbook. Raises Unanswered."""
        _sweep(tempfile.gettempdir())
        try:
            folder = tempfile.mkdtemp(prefix=f"{PREFIX}{os.getpid()}-")
        except OSError as error:
            raise Unanswered("failed", error.strerror or str(error)) from None
        try:
            return self._ask(workbook, folder)
        except OSError as error:
            raise Unanswered("failed", error.strerror or str(error)) from None
        finally:
            shutil.rmtree(folder, ignore_errors=True)

    def _ask(self, workbook: bytes, folder: str) -> dict[str, Any]:
        path = Path(folder, NAME)
        path.write_bytes(workbook)
        process = self._start(str(path), folder)
        try:
            said, complaint = process.communicate(timeout=self._seconds)
        except subprocess.TimeoutExpired:
            _kill(process)
            process.communicate()
            raise Unanswered("too long", f"{self._seconds:g}") from None
        if self._stopped:
            raise Unanswered("stopped")
        return _read(said, complaint, self._where)

    def _start(self, path: str, folder: str) -> subprocess.Popen[str]:
        with self._lock:
            if self._stopped:
                raise Unanswered("stopped")
            self._process = subprocess.Popen(
                [self._where.python, "-m", "sheetcal", "check", "--json", "-", "--office", "never", path],
                cwd=self._where.folder or folder,
                env=_environment(),
                stdin=subprocess.DEVNULL,
                stdout=subprocess.PIPE,
                stderr=subprocess.PIPE,
                encoding="utf-8",
                errors="replace",
                start_new_session=True,
                creationflags=getattr(subprocess, "CREATE_NO_WINDOW", 0),
            )
            return self._process

    def stop(self) -> None:
        """End it; `answer` then raises Unanswered("stopped")."""
        with self._lock:
            self._stopped = True
            if self._process is not None:
                _kill(self._process)


def _sweep(folder: str) -> None:
    """Remove the copies that a LibreOffice killed outright could not remove."""
    for path in Path(folder).glob(f"{PREFIX}*"):
        number = path.name[len(PREFIX) :].partition("-")[0]
        if os.name == "posix" and number.isdigit() and not _is_alive(int(number)):
            shutil.rmtree(path, ignore_errors=True)


def _is_alive(number: int) -> bool:
    try:
        os.kill(number, 0)  # asks only; elsewhere than on POSIX it would end the process
    except ProcessLookupError:
        return False
    except OSError:
        return True
    return True


def _environment() -> dict[str, str]:
    """The user's own, without what LibreOffice set for its own Python."""
    kept = {name: value for name, value in os.environ.items() if name.upper() in KEPT or name.startswith("LC_")}
    return {**kept, "PYTHONIOENCODING": "utf-8"}


def _kill(process: subprocess.Popen[str]) -> None:
    """The process and what it started; one that has ended is left alone."""
    if process.poll() is not None:
        return
    try:
        if hasattr(os, "killpg"):
            os.killpg(process.pid, signal.SIGKILL)
        else:
            process.kill()
    except OSError:
        process.kill()


def _read(said: str, complaint: str, where: Checker) -> dict[str, Any]:
    try:
        files = json.loads(said)["files"]
        entry: dict[str, Any] = files[0]
    except (ValueError, KeyError, IndexError, TypeError):
        lines = complaint.strip().splitlines()
        last = lines[-1] if lines else "it said nothing"
        if NOT_THERE in last:
            raise Unanswered("not found", where.python) from None
        raise Unanswered("failed", last.rstrip(".")[:300]) from None
    return entry
