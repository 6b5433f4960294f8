"""The errors a user can meet: one line that says where, what, what was expected and what to do.

Facts are attributes, and every error pickles (it may cross a process pool).
"""

from typing import Any, Iterable, List, Tuple


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
