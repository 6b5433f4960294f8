"""What a number format shows of a number: compared by a few numbers, not by text, since programs rewrite formats."""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache

LONGEST = 255  # letters of a format; programs allow no more
SAMPLES = (1.2345678, -1.2345678, 1234.5678, 0.0)
_PIECE = re.compile(r'"([^"]*)"|\\(.)|_.|\*.|\[([^\[\]]*)\]|(General|Standard)|(.)', re.IGNORECASE | re.DOTALL)
_DATE = re.compile(r"[dmyhs]", re.IGNORECASE)
_CONDITION = re.compile(r"[<>=]")
_INVISIBLE = ("white", "color2")


@dataclass(frozen=True)
class Section:
    """One of up to four parts of a format, taken apart.

    digits: the letters that stand for digits, with point, commas and exponent. words: what is shown beside them.
    """

    digits: str
    words: str
    general: bool
    invisible: bool
    date: str

    @property
    def empty(self) -> bool:
        """Whether it shows no number at all."""
        return self.invisible or not (self.general or self.date or re.search(r"[0#?@]", self.digits))


@dataclass(frozen=True)
class Seen:
    """What a reader sees: the number (None where there is none), whether a minus or brackets, words beside it."""

    number: float | None
    minus: bool
    words: str


class Odd(Exception):
    """A format with conditions or fractions: nothing is said about it."""


def _sections(code: str) -> list[Section]:
    """The parts of a format. Raises Odd."""
    parts: list[dict[str, str]] = [{"digits": "", "words": "", "general": "", "colour": "", "date": ""}]
    for quoted, escaped, bracket, general, other in _PIECE.findall(code[:LONGEST]):
        now = parts[-1]
        if quoted or escaped:
            now["words"] += quoted or escaped
        elif bracket:
            _bracket(bracket, now)
        elif general:
            now["general"] = "yes"
        elif other == ";":
            parts.append(dict.fromkeys(now, ""))
        elif other and _DATE.match(other):
            now["date"] += other.lower()
        elif other:
            exponent = other == "-" and now["digits"].endswith(("e", "E"))
            now["digits" if other in "0#?@.,eE+%/" or exponent else "words"] += other
    return [_section(one) for one in parts]


def _bracket(text: str, now: dict[str, str]) -> None:
    """`[Red]`, `[$EUR-407]`, `[h]`, `[<100]`. Raises Odd for a condition."""
    if text.startswith("$"):
        now["words"] += text[1:].partition("-")[0]
    elif _CONDITION.search(text):
        raise Odd
    elif text.lower() in ("h", "hh", "m", "mm", "s", "ss"):
        now["date"] += text.lower()
    else:
        now["colour"] = text.lower().replace(" ", "")


def _section(one: dict[str, str]) -> Section:
    digits = one["digits"]
    if "/" in digits and re.search(r"[0#?]/", digits) and not one["date"]:
        raise Odd
    return Section(digits, one["words"], bool(one["general"]), one["colour"] in _INVISIBLE, one["date"])


@lru_cache(maxsize=512)
def seen(code: str, value: float) -> Seen:
    """What a format shows of a number. Raises Odd."""
    sections = _sections(code)
    numeric = sections[:3]
    turn = 0 if value > 0 or len(numeric) == 1 else 1 if value < 0 else 2 if len(numeric) == 3 else 0
    section = numeric[turn]
    if section.empty:
        return Seen(None, False, section.words.strip())
    own = turn == 1  # a part of its own for negative numbers shows a minus only where it says so
    minus = value < 0 and (not own or "-" in section.words or "(" in section.words or "\u2212" in section.words)
    words = re.sub(r"[-()\u2212\s]", "", section.words)
    if section.general or section.digits.strip() == "@":
        return Seen(abs(value), minus, words)
    return Seen(_rounded(section, abs(value)), minus, words)


def _rounded(section: Section, value: float) -> float:
    """The size of the number as it reads."""
    mantissa, exponent, _ = re.match(r"([^eE]*)([eE]?)(.*)", section.digits).groups()  # type: ignore[union-attr]
    _, _, decimals = mantissa.partition(".")
    places = len(re.findall(r"[0#?]", decimals))
    if exponent:
        return float(f"{value:.{places}e}")
    thousands = len(mantissa.rstrip("%")) - len(mantissa.rstrip("%").rstrip(","))
    value *= 100.0 ** section.digits.count("%") / 1000.0**thousands
    return round(value, places)


@lru_cache(maxsize=512)
def hidden(expected: str, found: str) -> str | None:
    """What the found number format hides or adds where the expected one does not; None where nothing."""
    if expected == found:
        return None
    try:
        was, now = _sections(expected)[0], _sections(found)[0]
        if was.date:
            return _date(was, now)
        if now.date and not now.general:
            return "shows a number as a date or a time"
        return _number(expected, found)
    except Odd:
        return None


def _number(expected: str, found: str) -> str | None:
    for value in SAMPLES:
        right, now = seen(expected, value), seen(found, value)
        if now.number is None:
            return f"shows '{now.words[:20]}' instead of the number" if now.words else "shows nothing of the number"
        if right.minus and not now.minus:
            return "hides the minus sign"
        if now.words != right.words:
            return f"shows '{now.words[:20]}' beside the number, which is not its unit"
        told = _size(abs(value), right.number or 0.0, now.number)
        if told:
            return told
    return None


def _size(value: float, right: float, now: float) -> str | None:
    if value and abs(now / value - 1.0) > 0.6:
        return "shows the number in per cent" if now > value else "shows the number in thousands, or none of its digits"
    return "hides decimals" if abs(now - value) > abs(right - value) + 1e-9 else None


def _date(was: Section, now: Section) -> str | None:
    if not now.date:
        return None if now.digits == "@" else "shows a date as a number"
    lost = [name for letter, name in (("y", "year"), ("d", "day"), ("h", "hour")) if letter in was.date.replace("m", "")
            and letter not in now.date]  # fmt: skip
    if "m" not in now.date:
        lost.append("month")
    return f"hides the {lost[0]}" if lost else None
