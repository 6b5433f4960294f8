"""Install the add-in into LibreOffice and remove it again, for the user or for all users."""

from __future__ import annotations

import contextlib
import json
import os
import shutil
import signal
import subprocess
import sys
import sysconfig
import tempfile
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sheetcal import __version__
from sheetcal.errors import Refused, SheetcalError
from sheetcal.office.addin import places
from sheetcal.office.addin.build import build
from sheetcal.office.addin.manifest import IDENTIFIER
from sheetcal.office.failures import Place, find_place

MANAGE = Path(__file__).with_name("manage.py")
SECONDS = 180
ROOM = 20 << 20  # bytes; a first user folder takes 5 MB, the add-in less than one


@dataclass(frozen=True)
class Outcome:
    """What was done: the version that was there before (None: none), and whether LibreOffice ran meanwhile."""

    before: str | None
    running: bool


def install(shared: bool = False) -> Outcome:
    """Build the add-in and install it, over an older one too. Raises SheetcalError: one line, what to do."""
    return _run("put", shared, build(where()))


def remove(shared: bool = False) -> Outcome:
    """Take the add-in away; where none is, LibreOffice is not even started. Raises SheetcalError."""
    if not any(one.shared == shared for one in places.installed(find_place().program)):
        return Outcome(None, False)
    return _run("take", shared, b"")


def where() -> dict[str, str]:
    """How the add-in starts sheetcal: this interpreter, and the folder it finds the package in; empty if installed."""
    folder = Path(__file__).parents[3]
    libraries = {Path(sysconfig.get_path(name)).resolve() for name in ("purelib", "platlib")}
    inside = folder.resolve() in libraries
    return {"python": sys.executable, "sheetcal": "" if inside else str(folder), "version": __version__}


def _run(action: str, shared: bool, oxt: bytes) -> Outcome:
    place = find_place()
    _refuse_unwritable(place.program, shared)
    with _folder() as folder:
        file = folder / places.OXT
        file.write_bytes(oxt)
        order = {
            "action": action,
            "program": str(place.program),
            "repository": "shared" if shared else "user",
            # For all users nothing of this user's folder is needed, and root's is not made.
            "user_folder": (folder / "user").as_uri() if shared else "",
            "url": file.as_uri(),
            "identifier": IDENTIFIER,
        }
        said = _ask(place, order)
    return Outcome(said["before"], said["running"])


@contextlib.contextmanager
def _folder() -> Any:
    """A temporary folder that all users may read: LibreOffice may be another process of another owner."""
    try:
        folder = Path(tempfile.mkdtemp(prefix="sheetcal-addin-"))
    except OSError as error:
        raise SheetcalError("TMPDIR", f"no temporary folder ({error.strerror})", "", "Set TMPDIR.") from None
    try:
        yield folder
    finally:
        shutil.rmtree(folder, ignore_errors=True)


def _refuse_unwritable(program: Path, shared: bool) -> None:
    """LibreOffice itself would show a dialogue, or nothing. Raises Refused."""
    target = places.store(program, shared)
    held = next(one for one in (target, *target.parents) if one.exists())
    do = "Ask the administrator, or leave out --shared." if shared else "Set HOME to a folder that you may write."
    if not held.is_dir():
        raise Refused(str(held), "is no folder", "a folder for LibreOffice's extensions", do)
    if not os.access(held, os.W_OK):
        raise Refused(str(held), "may not be written", "a folder for LibreOffice's extensions", do)
    free = os.statvfs(held)
    if free.f_bavail * free.f_frsize < ROOM:
        raise Refused(str(held), "no space left", f"{ROOM >> 20} MB for the add-in", "Free some and try again.")


def _ask(place: Place, order: dict[str, str]) -> dict[str, Any]:
    """Let the process that speaks to LibreOffice do it. Raises SheetcalError."""
    command = [str(place.python), "-I", str(MANAGE), json.dumps(order)]
    process = subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, start_new_session=True)
    try:
        out, _ = process.communicate(timeout=SECONDS)
        said: dict[str, Any] = json.loads(out)
    except subprocess.TimeoutExpired:
        os.killpg(process.pid, signal.SIGKILL)
        process.communicate()
        said = {"error": f"no answer in {SECONDS} s"}
    except ValueError:
        said = {"error": "its helper ended without an answer"}
    if "error" in said:
        do = "Close LibreOffice and try again."
        raise SheetcalError("LibreOffice", f"did not take the order: {said['error']}", "", do)
    return said
