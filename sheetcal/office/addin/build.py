"""The add-in as an .oxt: the files of parts/, and what the registry of cell functions makes of the rest."""

from __future__ import annotations

import io
import json
import zipfile
from collections.abc import Iterator, Mapping
from pathlib import Path

from sheetcal import __version__
from sheetcal.cells import registry
from sheetcal.office.addin.interface import idl
from sheetcal.office.addin.manifest import description, manifest
from sheetcal.office.addin.wizard import xcu
from sheetcal.office.addin.words import languages, words

PARTS = Path(__file__).parent / "parts"
INSIDE = Path(__file__).parent / "inside"
PACKAGE = Path(__file__).parents[2]
LONG_AGO = (1980, 1, 1, 0, 0, 0)


def files(where: Mapping[str, str] | None = None) -> dict[str, bytes]:
    """Every file of the extension by its path. `where`: what where.json says of sheetcal's own Python."""
    functions = registry.all()
    made = {path.relative_to(PARTS).as_posix(): path.read_bytes() for path in _sources(PARTS)}
    for path in _modules():
        made[f"pythonpath/sheetcal/{path.relative_to(PACKAGE).as_posix()}"] = path.read_bytes()
    texts = {
        "XFunctions.idl": idl(functions),
        "CalcAddIns.xcu": xcu(functions),
        "description.xml": description(__version__, {one: words(one).sentences["extension"] for one in languages()}),
        "where.json": json.dumps({"python": "", "sheetcal": "", "version": __version__, **(where or {})}),
    }
    made.update({path: text.encode() for path, text in texts.items()})
    made["META-INF/manifest.xml"] = manifest([path for path in made if "/" not in path]).encode()
    return made


def _modules() -> Iterator[Path]:
    """What of sheetcal itself goes along, unchanged; a package brings the packages it lies in."""
    yield PACKAGE / "errors.py"
    for folder in (PACKAGE, PACKAGE / "office", PACKAGE / "office" / "addin"):
        yield folder / "__init__.py"
    yield from _sources(PACKAGE / "cells")
    yield from _sources(INSIDE)


def _sources(folder: Path) -> Iterator[Path]:
    for path in sorted(folder.rglob("*")):
        if path.is_file() and "__pycache__" not in path.parts:
            yield path


def build(where: Mapping[str, str] | None = None) -> bytes:
    """The .oxt; the same bytes for the same sources."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w") as archive:
        for path, content in sorted(files(where).items()):
            archive.writestr(zipfile.ZipInfo(path, LONG_AGO), content, zipfile.ZIP_DEFLATED)
    return buffer.getvalue()


def unpack(folder: Path, where: Mapping[str, str] | None = None) -> Path:
    """Write the extension unpacked into a new folder below `folder`, for -env:BUNDLED_EXTENSIONS=file:///folder."""
    for path, content in files(where).items():
        target = folder / "sheetcal" / path
        target.parent.mkdir(parents=True, exist_ok=True)
        target.write_bytes(content)
    return folder / "sheetcal"
