"""How wide a text is and how many lines it takes: rows that wrap need their height stated."""

from __future__ import annotations

import math
from functools import lru_cache

LINE = 12.5  # points one line takes at the size of the body text
PAD = 1.75
LEAST = 14.25
INSET = 2.0  # digits that the indent and the frame take from a cell
_NARROW = set("iljtfrI.,:;'|!()[] -/")
_WIDE = set("mwMWABCDEGHKNOPQRSUVXYZ%@&")


def width(text: str) -> float:
    """The width of a text in digits of the body font; a little more than it really is."""
    return sum(0.58 if one in _NARROW else 1.3 if one in _WIDE else 1.03 for one in text)


@lru_cache(maxsize=4096)
def lines(text: str, columns: float, size: float = 10.0) -> int:
    """How many lines a text takes in a cell so many digits wide, breaking between words."""
    room = max(1.0, (columns - INSET) * 10.0 / size)
    return sum(_paragraph(one, room) for one in text.split("\n")) or 1


def _paragraph(text: str, room: float) -> int:
    count, used = 1, 0.0
    for word in text.split(" "):
        need = width(word)
        if used and used + 0.58 + need > room:
            count, used = count + 1, 0.0
        count += max(0, math.ceil(need / room) - 1)
        used = (used + 0.58 if used else 0.0) + min(need, room)
    return count


def height(text: str, columns: float, size: float = 10.0) -> float:
    """The height in points of a row that shows the whole text."""
    return max(LEAST, lines(text, columns, size) * LINE * size / 10.0 + PAD)
