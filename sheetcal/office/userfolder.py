"""LibreOffice's user folder: seeded so that it starts fast and trusts nothing, and gone after any end.

Whoever uses a folder holds a lock in it, so a folder that nobody holds is litter of a process killed without warning.
Used by the client and by the worker: 3.9 syntax, standard library only.
"""

from __future__ import annotations

import contextlib
import os
import re
import shutil
import sys
import tempfile
import time
from pathlib import Path
from xml.sax.saxutils import escape

if sys.platform != "win32":
    import fcntl

PREFIX = "sheetcal-office-"
LOCK = "lock"
PIPES = "pipes"
LOG = "log"
YOUNG = 60.0  # seconds in which a folder may still be without its lock
PATIENCE = 40  # times 50 ms for a killed LibreOffice to let go of its files

# Path in the registry, property, value. The first two sections make it start fast and alike on every machine.
SETTINGS = (
    ("org.openoffice.Setup/L10N", "ooSetupSystemLocale", "en-US"),  # text to number depends on it
    ("org.openoffice.Setup/L10N", "ooLocale", "en-US"),
    ("org.openoffice.Office.Common/Misc", "FirstRun", "false"),
    ("org.openoffice.Office.Common/Misc", "UseOpenCL", "false"),
    ("org.openoffice.Office.Calc/Formula/Calculation", "UseThreadedCalculationForFormulaGroups", "false"),
    ("org.openoffice.Office.Recovery/AutoSave", "Enabled", "false"),
    ("org.openoffice.Office.Recovery/RecoveryInfo", "Enabled", "false"),
    ("org.openoffice.Office.Java/VirtualMachine", "Enable", "false"),
    # Stored values are never believed: recalculate on load, always.
    ("org.openoffice.Office.Calc/Formula/Load", "OOXMLRecalcMode", "0"),
    ("org.openoffice.Office.Calc/Formula/Load", "ODFRecalcMode", "0"),
    # No link is followed, no macro runs. BlockUntrustedRefererLinks stops a picture linked from an .xlsx.
    ("org.openoffice.Office.Common/Security/Scripting", "BlockUntrustedRefererLinks", "true"),
    ("org.openoffice.Office.Common/Security/Scripting", "DisableMacrosExecution", "true"),
    ("org.openoffice.Office.Common/Security/Scripting", "MacroSecurityLevel", "3"),
    ("org.openoffice.Office.Calc/Content/Update", "Link", "2"),
    # What asks for an address all the same asks a proxy that is not there.
    ("org.openoffice.Inet/Settings", "ooInetProxyType", "2"),
    ("org.openoffice.Inet/Settings", "ooInetNoProxy", ""),
    ("org.openoffice.Inet/Settings", "ooInetHTTPProxyName", "127.0.0.1"),
    ("org.openoffice.Inet/Settings", "ooInetHTTPProxyPort", "9"),
    ("org.openoffice.Inet/Settings", "ooInetHTTPSProxyName", "127.0.0.1"),
    ("org.openoffice.Inet/Settings", "ooInetHTTPSProxyPort", "9"),
)
# LibreOffice's own names of what reads http, https, webdav, ftp and cmis addresses. Without them a picture or an
# object linked from an .ods, which the settings above let through, has nobody to fetch it.
FETCHERS = tuple(f"Provider{one}" for one in ("3", "4", "4a", "6", "12", "12a", "12b", "43"))
FETCHERS_PATH = "org.openoffice.ucb.Configuration/ContentProviders/Local/SecondaryKeys/Office/ProviderData"


def make(program: Path) -> tuple[Path, int]:
    """A new seeded folder, and the descriptor that holds it. Raises OSError: no space, no permission."""
    path = Path(tempfile.mkdtemp(prefix=PREFIX))
    try:
        held = _hold(path)
        _seed(path, program)
    except BaseException:
        shutil.rmtree(path, ignore_errors=True)
        raise
    return path, held


def _hold(path: Path) -> int:
    """Lock first, then give the lock its name: a lock that can be seen is always held."""
    held = os.open(path / "making", os.O_CREAT | os.O_RDWR, 0o600)
    fcntl.flock(held, fcntl.LOCK_EX | fcntl.LOCK_NB)
    os.rename(path / "making", path / LOCK)
    return held


def _seed(path: Path, program: Path) -> None:
    """Write the settings, and the two marks without which LibreOffice sets a folder up at every start."""
    (path / "user" / "extensions").mkdir(parents=True)
    (path / "tmp").mkdir()
    build = _stated(program, "versionrc", "buildid")
    if build:
        (path / "user" / "extensions" / "buildid").write_text(build, "utf-8")
    major = re.search(r"\d+\.\d+", _stated(program, "bootstraprc", "ProductKey"))
    last = (("org.openoffice.Setup/Product", "ooSetupLastVersion", major.group()),) if major else ()
    (path / "user" / "registrymodifications.xcu").write_text(registry(SETTINGS + last), "utf-8")


def _stated(program: Path, name: str, key: str) -> str:
    """What the program folder states under `key`; empty where it does not."""
    for one in (program / name, program / name.replace("rc", ".ini"), program.parent / "Resources" / name):
        if one.is_file():
            found = re.search(rf"^{key}=(.+)$", one.read_text("utf-8", "replace"), re.M)
            return found.group(1).strip() if found else ""
    return ""


def registry(settings: tuple[tuple[str, str, str], ...]) -> str:
    """The settings in the form in which LibreOffice keeps them."""
    items = [
        f'<item oor:path="/{path}"><prop oor:name="{name}" oor:op="fuse"><value>{escape(value)}</value></prop></item>'
        for path, name, value in settings
    ]
    items += [f'<item oor:path="/{FETCHERS_PATH}"><node oor:name="{one}" oor:op="remove"/></item>' for one in FETCHERS]
    return (
        '<?xml version="1.0" encoding="UTF-8"?>\n'
        '<oor:items xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema" '
        'xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance">\n' + "\n".join(items) + "\n</oor:items>\n"
    )


def note_pipes(path: Path, pipes: list[str]) -> None:
    """Remember the pipes that LibreOffice opened outside its folder, for the one who cleans up."""
    (path / PIPES).write_text("\n".join(pipes), "utf-8")


def last_words(path: Path) -> str:
    """The last line LibreOffice or the worker left, for a message."""
    try:
        lines = (path / LOG).read_text("utf-8", "replace").split("\n")
    except OSError:
        return ""
    return next((line.strip() for line in reversed(lines) if line.strip()), "")


def remove(path: Path) -> None:
    """Take the folder and its pipes away; a LibreOffice that is just dying may still write into it."""
    for pipe in _pipes(path):
        pipe.unlink(missing_ok=True)
    for _ in range(PATIENCE):
        shutil.rmtree(path, ignore_errors=True)
        if not path.exists():
            return
        time.sleep(0.05)


def has_pipe(path: Path) -> bool:
    """Whether a pipe of this folder's name is there; before a start that is somebody else's."""
    return any(one.exists() for one in _own_pipes(path))


def _own_pipes(path: Path) -> list[Path]:
    return [one for place in ("/tmp", "/var/tmp") for one in Path(place).glob(f"OSL_PIPE_*_{path.name}")]


def _pipes(path: Path) -> list[Path]:
    """Only what carries the name of a LibreOffice pipe: the list was written by a process that met strange files."""
    try:
        noted = (path / PIPES).read_text("utf-8").split("\n")
    except (OSError, UnicodeDecodeError):
        noted = []
    return _own_pipes(path) + [
        Path(one) for one in noted if re.fullmatch(r"(/var)?/tmp/OSL_PIPE_\d+_SingleOfficeIPC_[0-9a-f]+", one)
    ]


def sweep() -> None:
    """Remove the folders whose holders are dead."""
    with contextlib.suppress(FileNotFoundError):  # no folder for temporary files at all: whoever makes one says so
        _sweep(Path(tempfile.gettempdir()))


def _sweep(folder: Path) -> None:
    for path in folder.glob(PREFIX + "*"):
        if path.is_dir() and not path.is_symlink() and _abandoned(path):
            remove(path)


def _abandoned(path: Path) -> bool:
    """Nobody holds the lock; a folder still without one is left for a minute."""
    try:
        held = os.open(path / LOCK, os.O_RDWR)
    except FileNotFoundError:
        return time.time() - path.stat().st_mtime > YOUNG
    except OSError:
        return False
    try:
        fcntl.flock(held, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        return False
    finally:
        os.close(held)
    return True
