"""Formula texts as LibreOffice's programming interface gives them, in the spelling of .xlsx.

There a reference to another tab is `$Readings.E5`, arguments are parted by `;`, and a constant array is `{1;2|3;4}`.
"""

from __future__ import annotations

import re

TAB = r"\$?(?:'(?:[^']|'')*'|[^\W\d]\w*)"
CELL = r"(?:\$?[A-Z]{1,3}\$?[0-9]+|\#REF!)"
TOKEN = re.compile(
    rf"""(?P<text>"(?:[^"]|"")*")
    |(?P<tab>{TAB})\.(?P<cell>{CELL}|\$?[A-Z]{{1,3}}(?=:)|\$?[0-9]+(?=:))
    |(?P<array>\{{(?:"(?:[^"]|"")*"|[^{{}}"])*\}})
    |(?P<error>\#(?:N/A|[A-Z0-9/]+[!?]))
    |(?P<word>[^\W\d][\w.]*)
    |(?P<sign>[;~!])""",
    re.VERBOSE,
)
IN_ARRAY = re.compile(r'"(?:[^"]|"")*"|[;|]')
SIGNS = {";": ",", "~": ",", "!": " ", "|": ";"}
PLAIN = re.compile(r"[^\W\d][\w.]*$")


def xlsx_spelling(formula: str) -> str:
    """`=SUM($Readings.E5;2)` as `=SUM(Readings!E5,2)`."""
    return TOKEN.sub(_token, formula)


def _token(match: re.Match[str]) -> str:
    if match["tab"] is not None:
        return f"{_tab(match['tab'])}!{match['cell']}"
    if match["array"] is not None:
        return IN_ARRAY.sub(lambda one: SIGNS.get(one[0], one[0]), match["array"])
    return SIGNS[match["sign"]] if match["sign"] is not None else match[0]


def _tab(text: str) -> str:
    name = text[1:] if text.startswith("$") else text
    if name.startswith("'") and PLAIN.match(name[1:-1]) and not re.match(r"[A-Za-z]{1,3}[0-9]+$", name[1:-1]):
        return name[1:-1]
    return name


def column_letters(index: int) -> str:
    """A for 0, AA for 26."""
    letters = ""
    number = index + 1
    while number:
        number, rest = divmod(number - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


def position(cell: str) -> tuple[int, int]:
    """(column, row) from 0 of `F14`, or of the first cell of a range. Raises ValueError."""
    found = re.match(r"([A-Z]{1,3})([0-9]{1,7})(?:$|:)", cell.replace("$", ""))
    if found is None:
        raise ValueError(cell)
    column = 0
    for letter in found[1]:
        column = column * 26 + ord(letter) - 64
    return column - 1, int(found[2]) - 1
