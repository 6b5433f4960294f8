"""The end of a recomputation: counts per calorimeter, and ten lines with the largest visible effect first."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass, field
from typing import Any

from sheetcal.archive.recompute import Outcome
from sheetcal.archive.rows import COLUMNS, Row

LARGEST = 10


@dataclass
class Tally:
    """Counts that grow file by file, and the rows with the largest effects."""

    read: int = 0
    recomputed: int = 0
    incomplete: int = 0
    unreadable: int = 0
    skipped: int = 0
    compared: int = 0
    moved: int = 0
    reported_changed: int = 0
    beyond_limit: int = 0
    by_calorimeter: dict[str, Counter[str]] = field(default_factory=dict)
    largest: list[Row] = field(default_factory=list)
    not_recomputed: list[tuple[str, str]] = field(default_factory=list)
    reissue: dict[str, None] = field(default_factory=dict)

    def add(self, outcome: Outcome) -> None:
        """Count one workbook."""
        self.read += 1
        self.unreadable += outcome.unreadable
        self.recomputed += not outcome.unreadable
        self.incomplete += not outcome.unreadable and not outcome.complete
        if outcome.reason:
            self.not_recomputed.append((outcome.file, outcome.reason))
        self.compared += outcome.compared
        for row in outcome.rows:
            self._row(row)

    def _row(self, row: Row) -> None:
        if not row.moved:
            return
        is_reported = row.field.endswith("_reported") and row.reported_changes == "yes"
        count = self.by_calorimeter.setdefault(row.calorimeter or "none", Counter())
        self.moved += 1
        count["moved"] += 1
        if is_reported:
            self.reported_changed += 1
            count["reported_changed"] += 1
            self.reissue[row.file] = None
        if row.change_of_limit is not None and abs(row.change_of_limit) > 1.0:
            self.beyond_limit += 1
        self.largest = sorted([*self.largest, row], key=_weight)[:LARGEST]

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
        """At most ten lines for people."""
        head = [
            f"{self.read} workbooks read, {self.recomputed} recomputed with {lab}; "
            f"{self.incomplete} incomplete, {self.unreadable} unreadable, {self.skipped} other files.",
            f"{self.moved} of {self.compared} results moved; {self.reported_changed} reported figures change in "
            f"{len(self.reissue)} workbooks; {self.beyond_limit} moved by more than the repeatability limit.",
        ]
        head += [
            f"{one}: {count['moved']} moved, {count['reported_changed']} reported figures changed"
            for one, count in sorted(self.by_calorimeter.items())
        ][:3]
        return head + _largest_lines(self.largest)[: LARGEST - len(head)]


def _weight(row: Row) -> tuple[int, int, float, str, str]:
    """What the customer would see comes first: a reported figure that changes, then share of the limit."""
    seen = row.field.endswith("_reported") and row.reported_changes == "yes"
    return (
        0 if seen else 1,
        0 if row.unit == "J/g" else 1,
        -abs(row.change_of_limit or 0.0),
        row.file,
        row.field,
    )


def _largest_lines(largest: Iterable[Row]) -> list[str]:
    return [
        f"{row.file}  {row.sample_id or row.field}  {row.label}: {_number(row.old)} -> {_number(row.new)} {row.unit} "
        f"({row.change:+.4g}{'' if row.change_of_limit is None else f', {abs(row.change_of_limit):.2g} x the limit'})"
        for row in largest
        if row.change is not None
    ]


def _number(value: Any) -> str:
    return f"{value:.6g}" if isinstance(value, float) else str(value)
