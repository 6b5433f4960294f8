"""Find LibreOffice: its program folder, its version, and an interpreter that can import uno."""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

SECONDS = 10
PLACES = (
    "/usr/lib/libreoffice/program",
    "/Applications/LibreOffice.app/Contents/MacOS",
    "C:/Program Files/LibreOffice/program",
)


def program_folder() -> Path | None:
    """The folder that holds soffice; the environment's SHEETCAL_SOFFICE comes first."""
    return next((one for one in _folders() if _has_soffice(one)), None)


def _folders() -> Iterator[Path]:
    named = os.environ.get("SHEETCAL_SOFFICE")
    if named:
        yield Path(named)
    yield Path(PLACES[0])
    yield from sorted(Path("/opt").glob("libreoffice*/program"))
    on_path = shutil.which("soffice")
    if on_path:
        yield Path(on_path).resolve().parent
    yield from map(Path, PLACES[1:])


def _has_soffice(folder: Path) -> bool:
    return any((folder / name).is_file() for name in ("soffice", "soffice.bin", "soffice.exe"))


def version(folder: Path) -> str | None:
    """The version stated in the program folder, or None."""
    for name in ("versionrc", "version.ini"):
        path = folder / name
        if path.is_file():
            found = re.search(r"^AboutBoxVersion=(.+)$", path.read_text("utf-8"), re.M)
            if found:
                return found.group(1).strip()
    return _debian_version()


def _debian_version() -> str | None:
    """Debian's soffice says its version itself."""
    soffice = shutil.which("soffice")
    if soffice is None:
        return None
    try:
        said = subprocess.run([soffice, "--version"], capture_output=True, text=True, timeout=SECONDS, check=False)
    except (OSError, subprocess.TimeoutExpired):
        return None
    found = re.search(r"LibreOffice (\S+)", said.stdout)
    return found.group(1) if found else None


def uno_python(folder: Path | None) -> Path | None:
    """An interpreter that can import uno: the environment's, LibreOffice's own, or the system's."""
    return next((one for one in _interpreters(folder) if _imports_uno(one)), None)


def _interpreters(folder: Path | None) -> Iterator[Path]:
    named = os.environ.get("SHEETCAL_UNO_PYTHON")
    if named:
        yield Path(named)
    if folder is not None:
        yield from sorted(one for one in folder.glob("python*") if one.is_file() and os.access(one, os.X_OK))
    yield Path("/usr/bin/python3")


def _imports_uno(interpreter: Path) -> bool:
    if not interpreter.is_file():
        return False
    try:
        said = subprocess.run(
            [str(interpreter), "-I", "-c", "import uno"], capture_output=True, timeout=SECONDS, check=False
        )
    except (OSError, subprocess.TimeoutExpired):
        return False
    return said.returncode == 0


def status() -> dict[str, str | None]:
    """Version, program folder, uno interpreter, add-in, network; None for what is not there."""
    folder = program_folder()
    python = uno_python(folder) if folder else None
    return {
        "version": version(folder) if folder else None,
        "program": str(folder) if folder else None,
        "python": str(python) if python else None,
        "own python": sys.executable,
        "add-in": _addin(folder),
        "network": _network(python) if python else None,
    }


def _network(python: Path) -> str:
    """Whether the LibreOffice that opens other people's files is kept from the network by the system too."""
    if sys.platform == "win32":
        return "not cut off: LibreOffice is driven on Linux and macOS only"
    from sheetcal.office.confine import can_be_cut_off

    return "cut off" if can_be_cut_off(str(python)) else "not cut off by this system; links are shut off all the same"


def _addin(folder: Path | None) -> str | None:
    """The installed add-in: its version and for whom."""
    from sheetcal.office.addin.places import installed

    found = installed(folder) if folder else []
    return "; ".join(map(str, found)) or None
