"""Where LibreOffice keeps extensions: the user's folder and the one for all users, and what of ours is there."""

from __future__ import annotations

import os
import re
import sys
from dataclasses import dataclass
from pathlib import Path
from urllib.parse import unquote, urlsplit

from sheetcal.office.addin.manifest import IDENTIFIER

OXT = "sheetcal.oxt"


@dataclass(frozen=True)
class Installed:
    """An add-in that LibreOffice knows."""

    version: str
    shared: bool

    def __str__(self) -> str:
        return f"{self.version}, {'for all users' if self.shared else 'for this user'}"


def user_folder(program: Path) -> Path:
    """The user's folder of that LibreOffice, made or not; HOME and XDG_CONFIG_HOME move it as they move it there."""
    stated = re.search(r"^UserInstallation=(.+)$", _text(program / "bootstraprc"), re.M)
    pattern = stated.group(1).strip() if stated else "$SYSUSERCONFIG/libreoffice/4"
    place = pattern.replace("$SYSUSERCONFIG", _settings().as_posix()).replace("$ORIGIN", program.as_posix())
    return Path(unquote(urlsplit(place).path) if place.startswith("file:") else place)


def _settings() -> Path:
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Application Support"
    named = os.environ.get("XDG_CONFIG_HOME", "")
    return Path(named) if named and Path(named).is_dir() else Path.home() / ".config"


def store(program: Path, shared: bool) -> Path:
    """The folder of installed extensions; a variable of LibreOffice in the environment moves the shared one."""
    if not shared:
        return user_folder(program) / "user" / "uno_packages" / "cache"
    named = os.environ.get("UNO_SHARED_PACKAGES_CACHE", "")
    return Path(unquote(urlsplit(named).path)) if named else program.parent / "share" / "uno_packages" / "cache"


def installed(program: Path) -> list[Installed]:
    """What is installed, the user's first. LibreOffice is not started for it."""
    found = [_found(store(program, shared), shared) for shared in (False, True)]
    return [one for one in found if one is not None]


def _found(folder: Path, shared: bool) -> Installed | None:
    for place in _folders(folder, shared):
        version = re.search(r'<version value="([^"]*)"', _text(place / OXT / "description.xml"))
        return Installed(version.group(1) if version else "unknown version", shared)
    return None


def _folders(folder: Path, shared: bool) -> list[Path]:
    """The folder of the installed add-in, NAME.tmp_; a shared one that is to go has a file NAME.tmpremoved."""
    if shared:
        there = [place for place in sorted(folder.glob("uno_packages/*.tmp_")) if (place / OXT).is_dir()]
        return [place for place in there if not place.with_suffix(".tmpremoved").exists()]
    listed = _bytes(folder / "uno_packages.pmap")  # identifier, line feed, name, byte 255, and so on
    entry = re.search(re.escape(IDENTIFIER.encode()) + rb"\n([\w.]+)\xff", listed)
    return [folder / "uno_packages" / f"{entry.group(1).decode()}_"] if entry else []


def _bytes(path: Path) -> bytes:
    try:
        return path.read_bytes()
    except OSError:
        return b""


def _text(path: Path) -> str:
    return _bytes(path).decode("utf-8", "replace")
