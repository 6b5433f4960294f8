"""The errors a user can meet: one line that says where, what, what was expected and what to do.

Facts are attributes, and every error pickles (it may cross a process pool).
"""

from typing import Any, Iterable, List, Tuple

# Letters and marks that are shown as nothing at all, though Python holds them to be printable.
INVISIBLE = frozenset("\u034f\u115f\u1160\u17b4\u17b5\u2800\u3164\uffa0").union(
    map(chr, range(0xFE00, 0xFE10)), map(chr, range(0xE0100, 0xE01F0))
)


def printable(text: str) -> str:
    """Foreign text as it may be shown: what acts on a terminal, turns its direction or is invisible, as `\\xNN`.

    NN is the number of the character, hexadecimal and as long as it is: `\\x1b`, `\\x202e`.
    """
    if text.isascii() and text.isprintable():
        return text
    return "".join(c if c.isprintable() and c not in INVISIBLE else f"\\x{ord(c):02x}" for c in text)


class SheetcalError(Exception):
    """One fault in one place; `str` is the line a user reads."""

    def __init__(self, where: str, what: str, expected: str = "", do: str = "") -> None:
        super().__init__(where, what, expected, do)
        self.where = where
        self.what = what
        self.expected = expected
        self.do = do

    def __str__(self) -> str:
        line = f"{self.where}: {self.what}"
        if self.expected:
            line += f"; expected {self.expected}"
        if not line.endswith("."):
            line += "."
        return f"{line} {self.do}".strip()

    def __reduce__(self) -> Tuple[Any, ...]:
        return (type(self), (self.where, self.what, self.expected, self.do))


class BadInput(SheetcalError):
    """An input (file, key, column, option, unit) is not as it must be."""


class Refused(SheetcalError):
    """The input is well formed, but the tool must not act on it."""


class OutOfRange(SheetcalError):
    """An argument lies outside the range or the relations a cell function is valid for."""


class BadInputs(SheetcalError):
    """Several faults found in one input; all are reported."""

    def __init__(self, faults: Iterable[SheetcalError]) -> None:
        self.faults: List[SheetcalError] = list(faults)
        first = self.faults[0]
        super().__init__(first.where, first.what, first.expected, first.do)

    def __str__(self) -> str:
        return "\n".join(str(fault) for fault in self.faults)

    def __reduce__(self) -> Tuple[Any, ...]:
        return (type(self), (self.faults,))
