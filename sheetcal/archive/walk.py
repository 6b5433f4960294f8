"""Which files a command takes: directories walked in sorted order, other files counted."""

from __future__ import annotations

import os
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from sheetcal.errors import BadInput

TAKEN = (".xlsx", ".xlsm", ".xls", ".ods")


@dataclass(frozen=True)
class Found:
    """Files to be tried, each once and sorted, as given or found; and how many others were passed over."""

    files: tuple[str, ...]
    skipped: int


def walk(paths: Iterable[str]) -> Found:
    """All workbooks under the paths. Raises BadInput for a path that is not there or a folder without any."""
    files: dict[str, str] = {}
    skipped = 0
    for path in paths:
        if os.path.isdir(path):
            inside, others = _folder(path)
            skipped += others
            if not inside:
                raise BadInput(path, "holds no workbook", " ".join(TAKEN), "Name the right folder.")
        elif os.path.lexists(path):
            inside = [path]
        else:
            raise BadInput(path, "does not exist", "a file or folder", "Correct the path.")
        for one in inside:
            files.setdefault(os.path.realpath(one), one)
    return Found(tuple(sorted(files.values())), skipped)


def _folder(path: str) -> tuple[list[str], int]:
    found: list[str] = []
    others = 0
    for folder, folders, names in os.walk(path, followlinks=False):
        folders[:] = sorted(one for one in folders if not one.startswith("."))
        for name in sorted(names):
            if name.startswith((".", "~$")):
                continue
            if Path(name).suffix.lower() in TAKEN:
                found.append(os.path.join(folder, name))
            else:
                others += 1
    return found, others
