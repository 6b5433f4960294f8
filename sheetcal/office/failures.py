"""What can go wrong between sheetcal and LibreOffice, each as one line that says what to do."""

from __future__ import annotations

import errno
import importlib.util
import os
import sys
import tempfile
from dataclasses import dataclass
from pathlib import Path

from sheetcal.errors import SheetcalError
from sheetcal.office import find

GET = "Debian: `apt-get install libreoffice-calc python3-uno`; others: libreoffice.org; or set SHEETCAL_SOFFICE."
SPACE = {errno.ENOSPC, errno.EDQUOT, errno.EFBIG}
FORBIDDEN = {errno.EROFS, errno.EACCES, errno.EPERM, errno.ENOENT}


class OfficeMissing(SheetcalError):
    """LibreOffice, or a Python that can speak to it, is not there, or cannot run on this machine as it is."""


class OfficeFailed(SheetcalError):
    """LibreOffice failed on one job, and again on a fresh one."""


class OfficeUnreadable(SheetcalError):
    """LibreOffice is well, but the file is no workbook it can open."""


@dataclass(frozen=True)
class Place:
    """Where LibreOffice, the interpreter with uno, and pyoo are."""

    program: Path
    python: Path
    pyoo: Path


def find_place() -> Place:
    """What a worker needs. Raises OfficeMissing."""
    if sys.platform == "win32":
        raise OfficeMissing("LibreOffice", "is driven on Linux and macOS only", "", "Check without it.")
    program, python = _program(), _python()
    pyoo = importlib.util.find_spec("pyoo")
    if pyoo is None or pyoo.origin is None:
        raise OfficeMissing("pyoo", "not installed", "pyoo 1.4 or later", "Run `pip install pyoo`.")
    return Place(program, python, Path(pyoo.origin))


def _program() -> Path:
    """The program folder; one that the environment names must be one."""
    named = os.environ.get("SHEETCAL_SOFFICE")
    found = find.program_folder()
    if named and found != Path(named):
        do = "Correct or unset it."
        raise OfficeMissing("SHEETCAL_SOFFICE", f"{named} holds no soffice", "LibreOffice's program folder", do)
    if found is None:
        raise OfficeMissing("LibreOffice", "not found", "version 7 or later with its Python bridge", GET)
    return found


def _python() -> Path:
    """The interpreter; one that the environment names must import uno."""
    named = os.environ.get("SHEETCAL_UNO_PYTHON")
    found = find.uno_python(find.program_folder())
    if named and found != Path(named):
        expected, do = "a Python that imports uno, such as LibreOffice's own", "Correct or unset it."
        raise OfficeMissing("SHEETCAL_UNO_PYTHON", f"{named} does not import uno", expected, do)
    if found is None:
        do = "Debian, Ubuntu: `apt-get install python3-uno`; or set SHEETCAL_UNO_PYTHON."
        raise OfficeMissing("LibreOffice", "no Python found that speaks to it", "one that imports uno", do)
    return found


def start_failure(error: Exception) -> OfficeMissing:
    """Why no LibreOffice could be started, and what to do about it."""
    number = getattr(error, "errno", None)
    if number in SPACE or disk_is_full():
        return OfficeMissing(_temporary(), "no space left for LibreOffice", "50 MB", "Free some, or set TMPDIR.")
    if number in FORBIDDEN:
        do = "Set TMPDIR to a folder that you may write."
        return OfficeMissing(_temporary(), f"LibreOffice's user folder cannot be made ({error})", "", do)
    return OfficeMissing("LibreOffice", f"does not start: {error}", "", "Start it yourself once to see why.")


def _temporary() -> str:
    try:
        return tempfile.gettempdir()
    except FileNotFoundError:
        return os.environ.get("TMPDIR", "TMPDIR")


def disk_is_full() -> bool:
    """LibreOffice itself does not say that it found no space."""
    try:
        free = os.statvfs(_temporary())
    except OSError:
        return False
    return free.f_bavail * free.f_frsize < 1 << 20
