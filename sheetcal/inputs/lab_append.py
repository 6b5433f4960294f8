"""Append a dated block to a lab file: what was there stays, byte for byte."""

import os
import tempfile
from collections.abc import Mapping
from datetime import date, datetime
from pathlib import Path
from typing import Any

from sheetcal.errors import BadInput, Refused
from sheetcal.inputs.lab_reader import ARRAYS, keys_of, parse_lab
from sheetcal.inputs.text import TextFile, nearest, read_text


def block_text(table: str, values: Mapping[str, Any], note: str = "") -> str:
    """The block `[[table]]` as text; keys in the table's own order, None left out. Raises BadInput.

    A value is text (with its unit, such as "8803.8 J/K"), a number of unit 1, a date, a moment, a flag,
    or a list of those. `note` is written as a comment before the block.
    """
    if table not in ARRAYS:
        raise BadInput(f"table '{table}'", "takes no blocks", nearest(table, ARRAYS), "Correct the name.")
    known = keys_of(table)
    for key in values:
        if key not in known:
            raise BadInput(f"{table}.{key}", "is not known", nearest(key, known), "Correct the key.")
    lines = [f"# {line}" for line in note.splitlines()] + [f"[[{table}]]"]
    lines += [f"{key} = {_toml(values[key])}" for key in known if values.get(key) is not None]
    return "\n".join(lines) + "\n"


def _toml(value: Any) -> str:
    """One value in TOML. Raises BadInput for what TOML or the lab file cannot hold."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int | float):
        return repr(value)
    if isinstance(value, datetime):
        return value.replace(microsecond=0, tzinfo=None).isoformat()
    if isinstance(value, date):
        return value.isoformat()
    if isinstance(value, list | tuple):
        return "[" + ", ".join(_toml(one) for one in value) + "]"
    if isinstance(value, str) and value.isprintable():
        return '"' + value.replace("\\", "\\\\").replace('"', '\\"') + '"'
    raise BadInput(repr(value)[:40], "cannot stand in a lab file", "a text, number, date or list", "Correct it.")


def append_block(path: str | os.PathLike[str], table: str, values: Mapping[str, Any], note: str = "") -> str:
    """Append a block to the lab file at `path` and return its text; the old text stays as it is.

    The file with its new block is read as a lab file first; what would not read is not written. The new
    file is complete before it takes the old one's name. Raises BadInput, BadInputs or Refused.
    """
    where = Path(path)
    old = read_text(where)
    before = where.read_bytes()
    block = block_text(table, values, note)
    joined = before + (b"\n" if before.endswith(b"\n") else b"\n\n") + block.encode("utf-8")
    parse_lab(TextFile(where, old.sha256, joined.decode("utf-8-sig")))
    _replace(where, joined, before)
    return block


def _replace(path: Path, data: bytes, before: bytes) -> None:
    """Put `data` in the file's place at one stroke. Raises Refused where the file changed meanwhile."""
    try:
        handle, name = tempfile.mkstemp(dir=path.parent, prefix=f".{path.name}-")
        try:
            with os.fdopen(handle, "wb") as stream:
                stream.write(data)
                stream.flush()
                os.fsync(stream.fileno())
            os.chmod(name, path.stat().st_mode & 0o7777)
            if path.read_bytes() != before:
                raise Refused(str(path), "was changed by somebody else meanwhile", "", "Try again.")
            os.replace(name, path)
        finally:
            Path(name).unlink(missing_ok=True)
    except OSError as fault:
        reason = (fault.strerror or "failed").lower()
        raise BadInput(str(path), f"cannot be written ({reason})", "a writable file", "See to it.") from fault
