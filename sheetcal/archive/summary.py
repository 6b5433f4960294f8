"""The end of a recomputation: counts per calorimeter, and ten lines with the largest visible effect first."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from typing import Any

from sheetcal.archive.recompute import Outcome
from sheetcal.archive.rows import COLUMNS, Row
from sheetcal.errors import printable

LINES = 10


@dataclass
class Tally:
    """Counts that grow file by file, and the rows with the largest effects.

    `largest` goes by share of the limit; `visible` is what customers would see, one row a sample.
    """

    read: int = 0
    recomputed: int = 0
    incomplete: int = 0
    unreadable: int = 0
    skipped: int = 0
    compared: int = 0
    moved: int = 0
    reported_changed: int = 0
    beyond_limit: int = 0
    differing: int = 0
    by_calorimeter: dict[str, Counter[str]] = field(default_factory=dict)
    largest: list[Row] = field(default_factory=list)
    visible: list[Row] = field(default_factory=list)
    not_recomputed: list[tuple[str, str]] = field(default_factory=list)
    reissue: int = 0

    def add(self, outcome: Outcome) -> None:
        """Count one workbook."""
        self.read += 1
        self.unreadable += outcome.unreadable
        self.recomputed += outcome.compared > 0
        self.incomplete += not outcome.unreadable and not outcome.complete
        if outcome.reason:
            self.not_recomputed.append((outcome.file, outcome.reason))
        self.compared += outcome.compared
        self.differing += sum(row.status != "moved" for row in outcome.rows)
        moved = [row for row in outcome.rows if row.moved]
        for row in moved:
            self._row(row)
        seen = [row for row in moved if row.seen]
        self.reissue += bool(seen)
        self.largest = _first([*self.largest, *moved], _by_limit)
        self.visible = _first([*self.visible, *_one_a_sample(seen)], _by_sight)

    def _row(self, row: Row) -> None:
        count = self.by_calorimeter.setdefault(row.calorimeter or "none", Counter())
        self.moved += 1
        count["moved"] += 1
        self.reported_changed += row.seen
        count["reported_changed"] += row.seen
        self.beyond_limit += row.change_of_limit is not None and abs(row.change_of_limit) > 1.0

    def as_json(self, tool: dict[str, Any], lab: dict[str, Any] | None) -> dict[str, Any]:
        """summary.json: no times or durations, so that the same archive gives the same bytes."""
        names = ("read", "recomputed", "incomplete", "unreadable", "skipped")
        results = ("compared", "moved", "reported_changed", "beyond_limit")
        return {
            "tool": tool,
            "lab": lab,
            "files": {name: getattr(self, name) for name in names},
            "results": {name: getattr(self, name) for name in results},
            "by_calorimeter": {
                one: {"moved": count["moved"], "reported_changed": count["reported_changed"]}
                for one, count in sorted(self.by_calorimeter.items())
            },
            "largest": [{name: getattr(row, name) for name in COLUMNS} for row in self.largest],
        }

    def lines(self, lab: str) -> list[str]:
        """At most ten lines for people; what a customer would see stands first among the results."""
        head = [
            f"{self.read} workbooks read, {self.recomputed} recomputed with {lab}; "
            f"{self.incomplete} incomplete, {self.unreadable} unreadable, {self.skipped} other files.",
            f"{self.moved} of {self.compared} results moved; {self.reported_changed} reported figures change in "
            f"{self.reissue} workbooks; {self.beyond_limit} moved by more than the repeatability limit.",
        ]
        if self.differing:
            head.append(f"{self.differing} results stood otherwise in the file than its own readings give.")
        by_calorimeter = "; ".join(
            f"{one} {count['moved']} moved, {count['reported_changed']} reported figures changed"
            for one, count in sorted(self.by_calorimeter.items())
        )
        head += [f"By calorimeter: {by_calorimeter}."] if by_calorimeter else []
        return head + [_line(row) for row in self.visible or self.largest][: LINES - len(head)]


def _first(listed: list[Row], order: Callable[[Row], tuple[Any, ...]]) -> list[Row]:
    return sorted(listed, key=order)[:LINES]


def _by_limit(row: Row) -> tuple[float, str]:
    """By share of the limit; results without one come last. The sort keeps file and workbook order."""
    return (-abs(row.change_of_limit) if row.change_of_limit is not None else 1.0, row.file)


def _by_sight(row: Row) -> tuple[float, float, str]:
    """By share of the limit, then by relative change."""
    return (-abs(row.change_of_limit or 0.0), -abs(row.change_relative or 0.0), row.file)


def _one_a_sample(listed: Iterable[Row]) -> list[Row]:
    """The row of each sample (or workbook) that moved most."""
    found: dict[str, Row] = {}
    for row in sorted(listed, key=_by_sight):
        found.setdefault(row.sample_id, row)
    return list(found.values())


def _line(row: Row) -> str:
    share = "" if row.change_of_limit is None else f", {abs(row.change_of_limit):.2g} x the limit"
    change = "" if row.change is None else f" ({row.change:+.4g}{share})"
    unit = "" if row.unit in ("", "1") else f" {row.unit}"
    values = f"{_number(row.old)} -> {_number(row.new)}{unit}{change}"
    text = f"{row.file}  {row.sample_id or row.field}  {row.label}: {values}"
    return printable(text)


def _number(value: Any) -> str:
    return f"{value:.6g}" if isinstance(value, float) else "blank" if value is None else str(value)
