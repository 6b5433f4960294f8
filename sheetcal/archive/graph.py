"""What each result of a workbook stands on, read from the kind's own formulas."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import lru_cache

from sheetcal.kinds import Skeleton, skeleton
from sheetcal.kinds.layout import REFERENCE
from sheetcal.model import Place, Shape, SheetKind

LOOK_UP = re.compile(r"MATCH\(\{([a-z_0-9.]+)\},\{table\.([a-z_0-9]+)\.([a-z_0-9]+)\},0\)")
WORD = re.compile(r"[a-z_][a-z_0-9]*")


@dataclass(frozen=True)
class Key:
    """A look-up of a step: the reading that names the row, the table, and the column it is sought in."""

    reading: str
    table: str
    column: str


@dataclass(frozen=True)
class Graph:
    """`inputs` of every result, by id: places, `const.NAME` and `table.TABLE.COLUMN`; `keys` of its look-ups.

    `feeds` is `inputs` the other way round.
    """

    inputs: Mapping[str, tuple[str, ...]]
    keys: Mapping[str, tuple[Key, ...]]
    feeds: Mapping[str, tuple[str, ...]]

    def above(self, roots: Iterable[str]) -> set[str]:
        """Every result that stands on one of the roots, directly or through others."""
        reached: set[str] = set()
        stack = list(roots)
        while stack:
            for one in self.feeds.get(stack.pop(), ()):
                if one not in reached:
                    reached.add(one)
                    stack.append(one)
        return reached


@lru_cache(maxsize=32)
def graph(kind: SheetKind, shape: Shape) -> Graph:
    """The graph of a kind in one shape; workbooks of an archive share a few shapes."""
    plan = skeleton(kind, shape)
    inputs: dict[str, tuple[str, ...]] = {}
    keys: dict[str, tuple[Key, ...]] = {}
    feeds: dict[str, list[str]] = {}
    for one, place in plan.places.items():
        if place.field.step is None:
            continue
        inputs[one] = _inputs(plan, place)
        keys[one] = _keys(plan, place)
        for target in inputs[one]:
            feeds.setdefault(target, []).append(one)
    return Graph(inputs, keys, {target: tuple(users) for target, users in feeds.items()})


def _inputs(plan: Skeleton, place: Place) -> tuple[str, ...]:
    assert place.field.step is not None
    references, words = _named(place.field.step.formula)
    found = dict.fromkeys(target for reference in references for target in plan.resolve(place, reference))
    found.update(dict.fromkeys(f"const.{word}" for word in words if word in plan.shape.constants))
    return tuple(found)


@lru_cache(maxsize=4096)
def _named(template: str) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """References in braces, and the small-letter words outside them, among which are defined names."""
    references = tuple(dict.fromkeys(REFERENCE.findall(template)))
    return references, tuple(dict.fromkeys(WORD.findall(REFERENCE.sub("", template))))


def _keys(plan: Skeleton, place: Place) -> tuple[Key, ...]:
    assert place.field.step is not None
    found = dict.fromkeys(LOOK_UP.findall(place.field.step.formula))
    return tuple(Key(plan.resolve(place, key)[0], table, column) for key, table, column in found)
