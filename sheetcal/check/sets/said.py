"""What is said of one workbook because of others, before it becomes a finding of that workbook."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from typing import Any

from sheetcal.check.sets.summary import Fired, Summary


@dataclass(frozen=True, slots=True)
class Said:
    """One finding to come: code, file, the id it stands at (empty: nowhere), message, severity and other facts."""

    code: str
    file: str
    one: str
    message: str
    severity: str = "warning"
    facts: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Run:
    """A run with the workbook it stands in."""

    book: Summary
    fired: Fired

    @property
    def name(self) -> str:
        """How another workbook calls it."""
        return f"{self.fired.run} of {self.book.file}"

    def at(self, name: str) -> str:
        """The id of one of its lines."""
        return f"{self.fired.run}.{name}"


def every_run(books: Iterable[Summary]) -> list[Run]:
    """All runs begun, in the order of the workbooks."""
    return [Run(book, fired) for book in books for fired in book.runs]


def related(one: Summary, other: Summary) -> bool:
    """Whether two files are versions of one workbook, or one revises the other: then they share their readings."""
    return one.issue_id == other.issue_id or other.issue_id in one.cites or one.issue_id in other.cites


def distinct(books: Iterable[Summary]) -> list[Summary]:
    """One file for each workbook: a checked one before one that is only at hand, the fuller before the emptier.

    A workbook that revises another of the set is left out: its runs are those of the original.
    """
    best: dict[str, Summary] = {}
    for book in books:
        held = best.get(book.issue_id)
        if held is None or _worth(book) > _worth(held):
            best[book.issue_id] = book
    return [book for book in best.values() if not _revises(book, best)]


def _revises(book: Summary, best: Mapping[str, Summary]) -> bool:
    return any(cited in best and same(book, best[cited]) for cited in book.cites)


def _worth(book: Summary) -> tuple[bool, int]:
    return book.checked, len(book.runs)


def same(book: Summary, other: Summary) -> bool:
    """Whether two workbooks hold the same readings throughout; that is said once."""
    return book is not other and book.measured is not None and book.measured == other.measured


def statistical(chance: float) -> dict[str, Any]:
    """The facts that mark a finding as one of chance."""
    return {"certain": False, "false_alarm": min(1.0, max(chance, 0.0))}
