"""A flat OpenDocument spreadsheet (.fods) taken apart for comparison: every cell with all that LibreOffice keeps of it.

Names of automatic styles are numbers given in passing; here each is replaced by what the style says.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any
from xml.etree import ElementTree

SPACE = "{urn:oasis:names:tc:opendocument:xmlns:%s:1.0}"
TABLE, STYLE, OFFICE = SPACE % "table", SPACE % "style", SPACE % "office"
FAR = 2_000  # a row or cell repeated so often is the empty rest of a tab
Cells = dict[tuple[str, int, int], tuple[Any, ...]]


def cells(path: Path) -> tuple[Cells, list[str]]:
    """All cells, by tab, row and column from 0; and everything else that belongs to a tab, as texts."""
    root = ElementTree.parse(path).getroot()
    looks = _looks(root)
    found: Cells = {}
    rest: list[str] = []
    for table in root.iter(TABLE + "table"):
        name = table.get(TABLE + "name", "")
        _rows(table, name, looks, found)
        state = {key: looks.get(value, value) for key, value in table.attrib.items()}
        rest += [f"{name} {sorted(state.items())}"]
        rest += [f"{name} {_text(one, looks)}" for one in table if one.tag not in PASSED_OVER]
    for tag in ("named-expressions", "content-validations", "calculation-settings"):
        rest += [_text(one, looks) for one in root.iter(TABLE + tag)]
    return found, rest


PASSED_OVER = {TABLE + name for name in ("table-row", "table-rows", "table-row-group", "table-header-rows")}
PASSED_OVER.add(OFFICE + "forms")  # empty, and there as soon as a tab was once looked at


def _looks(root: Any) -> dict[str, str]:
    """What each style says, by name: automatic and named ones and number formats."""
    named: dict[str, Any] = {}
    for group in ("automatic-styles", "styles"):
        for part in root.iter(OFFICE + group):
            named.update({one.get(STYLE + "name"): one for one in part if one.get(STYLE + "name")})
    looks: dict[str, str] = {}
    for _ in range(2):  # a style names number formats and parents, which are resolved the second time
        looks = {name: _text(one, looks) for name, one in named.items()}
    return looks


def _text(one: Any, looks: dict[str, str]) -> str:
    given = sorted((key, looks.get(value, value)) for key, value in one.attrib.items() if key != STYLE + "name")
    inner = "".join(_text(child, looks) for child in one)
    return f"<{one.tag} {given}>{(one.text or '').strip()}{inner}{(one.tail or '').strip()}"


def _rows(table: Any, name: str, looks: dict[str, str], found: Cells) -> None:
    row = 0
    for line in table.iter(TABLE + "table-row"):
        times = int(line.get(TABLE + "number-rows-repeated", 1))
        for number in range(row, row + times) if times < FAR else ():
            _cells(line, name, number, looks, found)
        row += times


def _cells(line: Any, name: str, row: int, looks: dict[str, str], found: Cells) -> None:
    column = 0
    for one in line:
        times = int(one.get(TABLE + "number-columns-repeated", 1))
        given = {key: looks.get(value, value) for key, value in one.attrib.items() if not key.endswith("-repeated")}
        content = (one.tag, tuple(sorted(given.items())), "".join(_text(child, looks) for child in one))
        for number in range(column, column + times) if times < FAR else ():
            found[name, row, number] = content
        column += times
