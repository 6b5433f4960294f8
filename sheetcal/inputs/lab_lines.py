"""Where the tables and keys of a TOML text stand: tomllib gives no line numbers."""

import re
from dataclasses import dataclass, field

HEADER = re.compile(r"\s*(\[\[?)\s*([^\[\]]+?)\s*\]\]?\s*(?:#.*)?$")
KEY = re.compile(r"\s*([A-Za-z0-9_-]+|\"[^\"]*\"|'[^']*')\s*(?:=|\.)")
STRING = re.compile(r'"(?:[^"\\]|\\.)*"|\'[^\']*\'')
LONG_QUOTES = ('"""', "'''")


@dataclass(frozen=True, slots=True)
class TomlLines:
    """Lines (from 1) by table, number of the block (from 0) and key; the key "" is the header's."""

    lines: dict[tuple[str, int, str], int] = field(default_factory=dict)

    def of(self, table: str, block: int = 0, key: str = "") -> int | None:
        """The line of a key, else of its block, else None."""
        return self.lines.get((table, block, key), self.lines.get((table, block, "")))


def find_lines(text: str) -> TomlLines:
    """The line of every table header and key."""
    found = TomlLines()
    blocks: dict[str, int] = {}
    table, block = "", 0
    for number, line in _outside_values(text):
        header = HEADER.match(line)
        key = KEY.match(line)
        if header:
            table = header.group(2).replace('"', "").replace("'", "").replace(" ", "")
            block = blocks.get(table, -1) + 1 if header.group(1) == "[[" else 0
            blocks[table] = block
            found.lines.setdefault((table, block, ""), number)
        elif key:
            found.lines.setdefault((table, block, key.group(1).strip("\"'")), number)
    return found


def _outside_values(text: str) -> list[tuple[int, str]]:
    """Lines that begin outside a value: the insides of long strings and lists are left out."""
    found = []
    quotes, depth = "", 0
    for number, line in enumerate(text.splitlines(), 1):
        if quotes:
            quotes = "" if line.count(quotes) % 2 else quotes
            continue
        if depth == 0:
            found.append((number, line))
        bare = STRING.sub("", line.split(" #")[0]) if '"""' not in line and "'''" not in line else ""
        if "=" in bare or depth:
            value = bare if depth else bare.split("=", 1)[1]
            depth = max(0, depth + value.count("[") - value.count("]"))
        quotes = next((one for one in LONG_QUOTES if line.count(one) % 2), "")
    return found
