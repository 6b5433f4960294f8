"""Whether two formulas mean the same: both are run at many random points of all that either refers to."""

from __future__ import annotations

import random
from collections.abc import Iterator, Mapping
from itertools import permutations

from sheetcal.check.formula import address
from sheetcal.check.interpreter import Evaluator
from sheetcal.check.program import compile_tree
from sheetcal.check.replay import Stored, plain
from sheetcal.check.slips.words import Words, leaves
from sheetcal.check.tree import Area, Call, FormulaError, Name, Node, Number, Reference, Text
from sheetcal.model import Place, Value

POINTS = 60
LEAST_TOLD = 8  # points at which both must give something; two formulas that are blank everywhere prove nothing
LARGEST = 1500  # cells two formulas may refer to together
NEAR = 1e-9
MOST_TRIALS = 600_000  # cell values for one workbook: about two seconds; a formula takes some ten thousand
MOST_LIMITS, MOST_CELLS = 8, 20  # numbers that only one formula names, and cells set beside each

Cell = tuple[str, str]
Tabs = dict[str, dict[str, Stored]]


def equivalent(expected: Node, found: Node, text: str, words: Words) -> bool:
    """Whether a changed formula gives what the issued one gives, whatever stands in its cells."""
    if unwrapped(found) == expected:  # needs no trial
        return True
    cells = _cells([*leaves(expected), *leaves(found)], words)
    formula = words.place.formula
    if cells is None or formula is None or _other_cells(expected, found, words):
        return False
    points = _Points(cells, [leaves(expected), leaves(found)], words, random.Random(text))
    told: list[Value] = []
    try:
        for tabs in points.draw(POINTS):
            words.case.trials += len(points.known)
            if words.case.trials > MOST_TRIALS:
                return False
            evaluator = Evaluator(tabs, words.case.parts.skeleton.names)
            right, now = (plain(evaluator.evaluate(one, words.tab)) for one in (formula, text))
            if not _same(right, now):
                return False
            if right is not None and not (isinstance(right, str) and right.startswith("#")):
                told.append(right)
    except FormulaError:
        return False
    return len(told) >= LEAST_TOLD and (len(set(told)) > 1 or isinstance(told[0], str | bool))


def _other_cells(expected: Node, found: Node, words: Words) -> bool:
    """Whether a cell is no longer taken, or another is, or a range was cut short: it may hold something one day."""
    issued, now = ([frozenset(group) for group in _cells(leaves(side), words) or ()] for side in (expected, found))
    cut = any(len(one) > 1 and one not in issued and any(one < other for other in issued) for one in now)
    return cut or frozenset().union(*issued) != frozenset().union(*now)


def unwrapped(node: Node) -> Node:
    """The formula without an IF round it whose condition is always true."""
    while isinstance(node, Call) and node.function == "IF" and len(node.arguments) > 1 and _always(node.arguments[0]):
        node = node.arguments[1]
    return node


def _always(condition: Node) -> bool:
    if any(isinstance(leaf, Reference | Area | Name) for leaf in leaves(condition)):
        return False
    return compile_tree(condition).run(()) is True


def _same(one: Value, other: Value) -> bool:
    if isinstance(one, float) and isinstance(other, float):
        return abs(one - other) <= NEAR * max(abs(one), abs(other), 1e-12)
    return type(one) is type(other) and one == other


def _cells(found: list[Node], words: Words) -> list[list[Cell]] | None:
    """The cells of each reference, range and name; None where they are too many or cannot be told."""
    groups: dict[Node, list[Cell]] = {}
    for leaf in found:
        if not isinstance(leaf, Reference | Area | Name) or leaf in groups:
            continue
        where = words.resolved(leaf)
        if isinstance(where, Area) and where.size > LARGEST:
            return None
        taken = words.cells(where)
        if taken is None:
            return None
        tab = getattr(where, "tab", None) or words.tab
        groups[leaf] = [(tab, address(column, row)) for _, column, row in sorted(taken)]
    return list(groups.values()) if sum(map(len, groups.values())) <= LARGEST else None


class _Points:
    """Values for all cells: as they are, near them, with gaps, beyond limits, with other words."""

    def __init__(self, groups: list[list[Cell]], sides: list[list[Node]], words: Words, chance: random.Random) -> None:
        self.groups, self.words, self.chance = groups, words, chance
        numbers = [{one.value for one in side if isinstance(one, Number)} for side in sides]
        self.texts = list(dict.fromkeys(one.value for side in sides for one in side if isinstance(one, Text)))
        self.numbers, self.apart = sorted(numbers[0] | numbers[1]), sorted(numbers[0] ^ numbers[1])
        evaluator = words.case.right.evaluator()
        self.known: dict[Cell, Value] = {}
        for group in groups:
            for tab, cell in group:
                self.known[tab, cell] = plain(evaluator.value(tab, cell))
        words_there = {value for value in self.known.values() if isinstance(value, str)}
        self.texts += [*sorted(words_there - set(self.texts))[:MOST_CELLS], "another word"]
        self.places: Mapping[Cell, Place] = {
            one: place for one in self.known if (place := words.case.parts.skeleton.at.get(one)) is not None
        }

    def draw(self, count: int) -> Iterator[Tabs]:
        """`count` points, the sheet as it is first."""
        yield self._tabs(self.known)
        for turn in range(1, count):
            values = self._near(wide=turn % 4 == 3)
            if turn % 4 == 1:
                self._emptied(values)
            if turn % 4 == 2:
                self._other_words(values)
            if turn % 4 == 3:
                self._beyond(values)
            yield self._tabs(values)
        yield from self._about_limits()
        yield from self._about_words()

    def _about_words(self) -> Iterator[Tabs]:
        """Each word the formulas name in each cell that can hold words, alone and several at once."""
        wordy = [one for one, value in self.known.items() if isinstance(value, str) or self._takes_words(one)]
        for one in wordy[:MOST_CELLS]:
            for word in self.texts[:MOST_LIMITS]:
                yield self._tabs({**self._near(wide=False), one: word or None})
        for _ in range(POINTS if wordy else 0):
            drawn = {one: self.chance.choice(self.texts) or None for one in wordy}
            yield self._tabs({**self._near(wide=True), **drawn})

    def _takes_words(self, one: Cell) -> bool:
        place = self.places.get(one)
        return place is not None and place.field.type in ("text", "choice")

    def _about_limits(self) -> Iterator[Tabs]:
        """Each cell beside each number that only one of the formulas names: a limit may have been moved."""
        alone = [group[0] for group in self.groups if len(group) == 1 and isinstance(self.known[group[0]], float)]
        for number in self.apart[:MOST_LIMITS]:
            for one in alone[:MOST_CELLS]:
                for factor in (0.99, 1.0, 1.01):
                    yield self._tabs({**self.known, one: number * factor})
        yield from self._about_ties(alone)

    def _about_ties(self, alone: list[Cell]) -> Iterator[Tabs]:
        """One cell half way between two steps of another, where rounding is asked which way it goes."""
        if "INT(" in (self.words.place.formula or ""):
            for one, step in permutations(alone[:MOST_LIMITS], 2):
                for steps in (2.5, 3.5):
                    yield self._tabs({**self.known, one: steps * float(str(self.known[step]))})

    def _emptied(self, values: dict[Cell, Value]) -> None:
        """One cell, or all of one range, left blank; sometimes a word where a number belongs."""
        group = self.chance.choice(self.groups)
        for one in group if self.chance.random() < 0.6 else [self.chance.choice(group)]:
            values[one] = None if self.chance.random() < 0.8 else "n.d."

    def _beyond(self, values: dict[Cell, Value]) -> None:
        """One number far from where it is, or close to a number that the formulas name."""
        numbers = [one for one, value in values.items() if isinstance(value, float)]
        if numbers:
            far = [0.0, -1.0, 1e-3, 1e3, 30.0, *(number * 1.01 for number in self.numbers), *self.numbers]
            values[self.chance.choice(numbers)] = self.chance.choice(far)

    def _near(self, wide: bool) -> dict[Cell, Value]:
        """Every number moved, each range as a whole so that a record stays in order; gaps filled."""
        values: dict[Cell, Value] = {}
        for group in self.groups:
            factor = 1.0 + (0.5 if wide else 0.05) * (2.0 * self.chance.random() - 1.0)
            several = len(group) > 1
            for one in group:
                own = 1.0 + (1e-3 if several else 0.0) * self.chance.random()
                values[one] = self._moved(one, factor * own)
                if values[one] is None and wide and one not in self.places:
                    values[one] = self._beside(group) * factor  # beside the sheet anything may be typed one day
        return values

    def _moved(self, one: Cell, factor: float) -> Value:
        value = self.known[one]
        if isinstance(value, float):
            return value * factor if value else (factor - 1.0)
        place = self.places.get(one)
        if value is None and place is not None and place.field.type in ("number", "integer"):
            return self._guess(place) * factor
        return value

    def _beside(self, group: list[Cell]) -> float:
        """A number such as the others of a range hold."""
        numbers = [value for one in group if isinstance(value := self.known[one], float)]
        return numbers[0] if numbers else 1.0

    @staticmethod
    def _guess(place: Place) -> float:
        """A number that a place would allow."""
        low, high = place.field.low, place.field.high
        if low is None or high is None:
            return 1.0 if high is None else high / 2.0
        return (low + high) / 2.0

    def _other_words(self, values: dict[Cell, Value]) -> None:
        """Another word in one of the cells that hold words."""
        wordy = [one for one, value in values.items() if isinstance(value, str)]
        if wordy and self.texts:
            values[self.chance.choice(wordy)] = self.chance.choice(self.texts) or None

    def _tabs(self, values: Mapping[Cell, Value]) -> Tabs:
        tabs: Tabs = {tab: {} for tab in (*self.words.case.right.tabs, self.words.tab)}
        for (tab, cell), value in values.items():
            if value is not None:
                kind = "s" if isinstance(value, str) else "b" if isinstance(value, bool) else "n"
                tabs.setdefault(tab, {})[cell] = (kind, value, None)
        return tabs
