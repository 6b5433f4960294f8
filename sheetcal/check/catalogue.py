"""The list of everything the checker can find: its own codes, and the limits of every kind."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from importlib import resources

from sheetcal.kinds import load, names
from sheetcal.model import Rule

ALONE = "the workbook alone"


@dataclass(frozen=True)
class Entry:
    """One code: what it means, in which kinds it can occur, what must be given to look for it."""

    code: str
    meaning: str
    needs: str
    kinds: tuple[str, ...]
    severity: str | None
    sort: str | None


def catalogue() -> list[Entry]:
    """Every code, sorted. Limits of kinds carry severity and sort; those of the checker's own vary with the case."""
    return sorted([*_own(), *_limits()], key=lambda one: one.code)


def _own() -> list[Entry]:
    listed = tomllib.loads(resources.files("sheetcal.check").joinpath("faults.toml").read_text("utf-8"))
    every = tuple(names())
    return [
        Entry(code, row["meaning"], row.get("needs", ALONE), tuple(row.get("kinds", every)), None, None)
        for code, row in listed.items()
    ]


def _limits() -> list[Entry]:
    found: dict[str, list[tuple[str, Rule]]] = {}
    for name in names():
        for rule in load(name).rules:
            found.setdefault(rule.code, []).append((name, rule))
    own = {one.code for one in _own()}
    return [_limit(code, rows) for code, rows in found.items() if code not in own]


def _limit(code: str, rows: list[tuple[str, Rule]]) -> Entry:
    rule = rows[0][1]
    return Entry(code, rule.text, ALONE, tuple(dict.fromkeys(kind for kind, _ in rows)), rule.severity, rule.sort)
