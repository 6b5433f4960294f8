"""The text of an input file, its hash, and the collecting of faults with their lines."""

import hashlib
import os
from collections.abc import Iterable
from dataclasses import dataclass
from difflib import get_close_matches
from pathlib import Path

from sheetcal.errors import BadInput, BadInputs, SheetcalError

LARGEST = 20_000_000  # bytes; a day of one-second readings is 2 MB
MOST_FAULTS = 20  # reported of one input


@dataclass(frozen=True, slots=True)
class TextFile:
    """A file as read once: what is parsed and what is hashed are the same bytes."""

    path: Path
    sha256: str
    text: str

    def where(self, line: int | None = None) -> str:
        """`lab.toml, line 12`, with the path as given."""
        return str(self.path) if line is None else f"{self.path}, line {line}"


def read_text(path: str | os.PathLike[str]) -> TextFile:
    """The file's text (UTF-8, with or without a byte-order mark). Raises BadInput where it is none."""
    where = Path(path)
    data = _bytes(where)
    if not data.strip():
        raise BadInput(str(where), "is empty", "a text file", "Give the right file.")
    if b"\0" in data:
        raise BadInput(str(where), "holds NUL bytes", "UTF-8 text", "Save it as UTF-8 text.")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as fault:
        line = data.count(b"\n", 0, fault.start) + 1
        raise BadInput(f"{where}, line {line}", "is not UTF-8", "UTF-8 text", "Save it as UTF-8.") from fault
    return TextFile(where, hashlib.sha256(data).hexdigest(), text)


def _bytes(path: Path) -> bytes:
    """The file's bytes. Raises BadInput, saying why it cannot be read."""
    if path.is_dir():
        raise BadInput(str(path), "is a directory", "a file", "Give the file.")
    try:
        with path.open("rb") as stream:
            data = stream.read(LARGEST + 1)
    except FileNotFoundError as fault:
        raise BadInput(str(path), "does not exist", "a file", "Correct the path.") from fault
    except OSError as fault:
        reason = (fault.strerror or "failed").lower()
        raise BadInput(str(path), f"cannot be read ({reason})", "a readable file", "See to it.") from fault
    if len(data) > LARGEST:
        raise BadInput(str(path), "is too large", f"at most {LARGEST // 1_000_000} MB", "Give the right file.")
    return data


class Faults:
    """Collects the faults of one input, so that a reader can name several at once."""

    def __init__(self, source: TextFile) -> None:
        self.source = source
        self.found: list[SheetcalError] = []

    def add(self, line: int | None, what: str, expected: str = "", do: str = "") -> None:
        """Note a fault on a line (counted from 1)."""
        self.found.append(BadInput(self.source.where(line), what, expected, do))

    def add_error(self, line: int | None, name: str, error: SheetcalError) -> None:
        """Note an error raised while the value called `name` was read."""
        what = f"{name}: {error.where} {error.what}".strip()
        self.add(line, what, error.expected, error.do)

    def close(self) -> None:
        """Raise BadInputs with the first faults, or do nothing where there are none."""
        if self.found:
            raise BadInputs(self.found[:MOST_FAULTS])


def nearest(name: str, known: Iterable[str]) -> str:
    """`'value'`, the known name nearest to `name`, or all of them where none is near."""
    names = sorted(set(known))
    near = get_close_matches(name, names, 1, 0.5) or _holding(name, names)
    return f"'{near[0]}'" if near else "one of " + ", ".join(names)


def _holding(name: str, names: list[str]) -> list[str]:
    """Known names that the name begins with: `value_J_K` was meant as `value`."""
    return sorted((one for one in names if len(one) > 2 and name.startswith(one)), key=len, reverse=True)
