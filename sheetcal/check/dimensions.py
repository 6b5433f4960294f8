"""Dimensional analysis of a formula: from the units of its cells to the unit of its result.

Numbers in a formula are pure, so a unit slip shows as a factor that has no name: J and kJ do not add. A degC
is a point on a scale with its own zero; its weight (weights.py) is carried along, so that a temperature is
told from a rise: T - T is in K, T + K in degC, T + T is wrong but its half is a mean. `%` is a pure number
here, because the formulas divide by 100 themselves. A literal 0 and "" go with every unit, and a literal
beside a cell in a comparison is a bound in the cell's own unit.
"""

from collections.abc import Callable
from fractions import Fraction
from functools import cached_property

from sheetcal.check import weights
from sheetcal.check.dimension_rules import RULES
from sheetcal.check.formula import COMPARISONS, write
from sheetcal.check.measures import (
    NEUTRAL,
    NUMBER,
    PURE,
    TEXT,
    Meaning,
    Measure,
    Neutral,
    Unit,
    Words,
    agrees,
    meaning,
    unit_of,
)
from sheetcal.check.program import arity, compile_tree
from sheetcal.check.tree import (
    Area,
    Binary,
    Call,
    ErrorLiteral,
    Missing,
    Name,
    Negative,
    Node,
    Number,
    Percent,
    Range,
    Reference,
    Slot,
    Text,
    TooComplex,
    walk,
)
from sheetcal.errors import SheetcalError

__all__ = [
    "NEUTRAL",
    "TEXT",
    "DimensionError",
    "Meaning",
    "Measure",
    "Unit",
    "agrees",
    "check_unit",
    "formula_unit",
    "meaning",
    "unit_of",
]

LARGEST_POWER = 20.0  # no law of calorimetry comes near it
MOST_TRIALS = 40  # weights settled by trying, for one formula; the trapezoid mean needs two


class DimensionError(SheetcalError):
    """A formula whose units do not go together; `where` is the smallest part that shows it."""


UnitOfReference = Callable[[Reference | Area | Name | Slot], Meaning]


def formula_unit(tree: Node, unit_of_reference: UnitOfReference) -> Meaning:
    """What a formula's result stands for: a Measure of weight 0 or 1 (degC, date), TEXT or NEUTRAL.

    `unit_of_reference` is asked for each Reference, Area, Name and Slot; `meaning` makes its answers.
    Raises DimensionError, naming the smallest part that is wrong.
    """
    try:
        return _settled(tree, Analysis(tree, unit_of_reference))
    except TooComplex as fault:
        raise error(tree, "is too complex for an analysis of its units") from fault


def _settled(tree: Node, analysis: "Analysis") -> Meaning:
    """The meaning of the whole formula, its weight settled to 0 or 1."""
    found = analysis.meaning(tree)
    if not isinstance(found, Measure):
        return found
    if analysis.same_weight(found.weight, weights.NONE):
        return Measure(found.unit)
    if found.is_point and analysis.same_weight(found.weight, weights.ONE):
        return Measure(found.unit, weights.ONE)
    raise analysis.zero_error(tree)


def check_unit(tree: Node, unit_of_reference: UnitOfReference, expected: str | None) -> None:
    """Raise DimensionError unless the result is in the expected unit (None: text)."""
    found, wanted = formula_unit(tree, unit_of_reference), meaning(expected)
    if not agrees(found, wanted):
        raise DimensionError(write(tree), f"gives {found.name}", wanted.name, "Correct the formula.")


def literal(node: Node) -> float | None:
    """The value of a part without references; None where there is none."""
    if any(isinstance(leaf, Reference | Area | Name | Slot) for leaf in walk(node)):
        return None
    value = compile_tree(node).run(())
    return value if type(value) is float else None


def error(node: Node, what: str) -> DimensionError:
    shown = write(node)
    where = shown if len(shown) <= 80 else f"{shown[:77]}..."
    return DimensionError(where, what, do="Correct the formula.")


class Analysis:
    """One walk over one formula; made by `formula_unit`."""

    def __init__(self, tree: Node, unit_of_reference: UnitOfReference) -> None:
        self._tree = tree
        self._ask = unit_of_reference
        self._known: dict[Node, Meaning] = {}
        self._trials = 0

    def meaning(self, node: Node) -> Meaning:
        """What a part stands for. Raises DimensionError."""
        found = self._known.get(node)
        if found is None:
            found = self._known[node] = self._find(node)
        return found

    def _find(self, node: Node) -> Meaning:
        match node:
            case Reference() | Area() | Name() | Slot():
                return self._ask(node)
            case Number(value):
                return NUMBER if value else NEUTRAL
            case Text(value):
                return TEXT if value else NEUTRAL
            case ErrorLiteral() | Missing():
                return NEUTRAL
            case Negative(operand):
                return self._scaled(node, operand, -1.0)
            case Percent(operand):
                return self._scaled(node, operand, 0.01)
            case Binary():
                return self._binary(node)
            case Range(first, last):
                return self.one_of(node, [first, last], "joins")
        assert isinstance(node, Call)
        return self._call(node)

    def _call(self, node: Call) -> Meaning:
        rule, allowed = RULES.get(node.function), arity(node.function)
        if rule is None or allowed is None:
            raise error(node, f"has the unknown function {node.function}")
        if not allowed[0] <= len(node.arguments) <= allowed[1]:
            raise error(node, f"gives {node.function} {len(node.arguments)} arguments")
        return rule(self, node)

    def error(self, node: Node, what: str) -> DimensionError:
        """The fault of a part of the formula."""
        return error(node, what)

    @cached_property
    def _series(self) -> set[Node]:
        return weights.taken_as_series(self._tree)

    def is_series(self, leaf: Node) -> bool:
        """Whether a reference is a range: as its owner says, else by how the formula uses it."""
        found = self.meaning(leaf)
        if isinstance(found, Measure) and found.series is not None:
            return found.series
        return leaf in self._series

    def same_weight(self, one: Node, other: Node) -> bool:
        """Whether two weights are the same for all readings. Raises DimensionError when asked too often."""
        if not (isinstance(one, Number) and isinstance(other, Number)) and one != other:
            self._trials += 1
            if self._trials > MOST_TRIALS:
                raise error(self._tree, "is too complex for an analysis of its units")
        return weights.same(one, other, self.is_series)

    def zero_error(self, node: Node) -> DimensionError:
        """The fault of a result that moves with the zero of the temperature scale."""
        part = self._culprit(node)
        return error(part, f"{self._deed(part)}: the result depends on where its scale has its zero")

    def _culprit(self, node: Node) -> Node:
        """The innermost part, from the left, whose weight no temperature can have."""
        for part in reversed(list(walk(node))):
            found = self._known.get(part)
            if isinstance(found, Measure) and found.weight not in (weights.NONE, weights.ONE):
                return part
        return node

    def _deed(self, node: Node) -> str:
        if isinstance(node, Binary):
            names = [self.meaning(side).name for side in (node.left, node.right)]
            verbs = {"+": "adds {0} to {1}", "-": "takes {1} from {0}", "*": "multiplies {0} by {1}"}
            return verbs.get(node.operator, "divides {0} by {1}").format(*names)
        return f"gives {self.meaning(node).name} from temperatures"

    def number(self, node: Node, verb: str) -> Measure:
        """A part that must be a number; `verb` says what is done to it. Raises DimensionError."""
        found = self.meaning(node)
        if isinstance(found, Words):
            raise error(node, f"{verb} text")
        return found if isinstance(found, Measure) else NUMBER

    def rise(self, node: Node, verb: str) -> Measure:
        """A number that does not hang on the zero of the temperature scale. Raises DimensionError."""
        found = self.number(node, verb)
        if not self.same_weight(found.weight, weights.NONE):
            raise error(node, f"{verb} a point on a scale, such as a temperature in degC")
        return found

    def pure(self, node: Node, verb: str) -> Measure:
        """A pure number. Raises DimensionError."""
        found = self.rise(node, verb)
        if not found.unit.same(PURE):
            raise error(node, f"{verb} {found.name}, no pure number")
        return found

    def one_of(self, node: Node, parts: list[Node], verb: str) -> Meaning:
        """What parts have in common that must agree; NEUTRAL ones go along. Raises DimensionError."""
        common: Meaning = NEUTRAL
        for part in parts:
            found = self.meaning(part)
            if isinstance(common, Neutral):
                common = found
            elif not self._agree(common, found):
                raise error(node, f"{verb} {common.name} and {found.name}")
        return common

    def _agree(self, one: Meaning, other: Meaning) -> bool:
        if isinstance(one, Measure) and isinstance(other, Measure):
            return one.unit.same(other.unit) and self.same_weight(one.weight, other.weight)
        return isinstance(other, Neutral) or type(one) is type(other)

    def _scaled(self, node: Node, operand: Node, factor: float) -> Meaning:
        if isinstance(self.meaning(operand), Neutral):
            return NEUTRAL
        found = self.number(operand, "reckons with")
        return Measure(found.unit, weights.times(found.weight, Number(factor)))

    def _binary(self, node: Binary) -> Meaning:
        if node.operator == "&":
            self.meaning(node.left), self.meaning(node.right)
            return TEXT
        if node.operator in COMPARISONS:
            return self._compared(node)
        if node.operator in "+-":
            return self._added(node)
        if node.operator == "^":
            return self.raised(node, node.left, node.right)
        return self.multiplied(node, node.left, node.right)

    def _added(self, node: Binary) -> Meaning:
        verb = "adds" if node.operator == "+" else "takes away"
        one, other = self.number(node.left, verb), self.number(node.right, verb)
        kinds = self.meaning(node.left), self.meaning(node.right)
        if isinstance(kinds[1], Neutral):
            return kinds[0]
        if isinstance(kinds[0], Neutral):
            return self._scaled(node, node.right, 1.0 if node.operator == "+" else -1.0)
        if not one.unit.same(other.unit):
            link = "to" if node.operator == "+" else "from"
            names = (one.name, other.name) if node.operator == "+" else (other.name, one.name)
            raise error(node, f"{verb} {names[0]} {link} {names[1]}")
        return Measure(one.unit, weights.plus(one.weight, other.weight, node.operator))

    def multiplied(self, node: Node, left: Node, right: Node) -> Meaning:
        """A product, or a quotient where the node says so. Raises DimensionError."""
        if any(isinstance(self.meaning(one), Neutral) for one in (left, right)):
            return NEUTRAL
        divided = isinstance(node, Binary) and node.operator == "/"
        one, other = self.number(left, "reckons with"), self.number(right, "reckons with")
        unit = one.unit.times(other.unit, -1 if divided else 1)
        if self.same_weight(other.weight, weights.NONE):
            factor = self._number_node(right)
            weight = weights.over(one.weight, factor) if divided else weights.times(one.weight, factor)
            return Measure(unit, weight)
        if divided:
            raise error(node, "divides by a point on a scale, such as a temperature in degC")
        if not self.same_weight(one.weight, weights.NONE):
            raise error(node, "multiplies two points on a scale, such as temperatures in degC")
        return Measure(unit, weights.times(other.weight, self._number_node(left)))

    def _number_node(self, node: Node) -> Node:
        value = literal(node)
        return node if value is None else Number(value)

    def raised(self, node: Node, base: Node, exponent: Node) -> Meaning:
        """A power: of any unit to a literal, of a pure number to a pure number. Raises DimensionError."""
        if isinstance(self.meaning(base), Neutral):
            return NEUTRAL
        power = literal(exponent)
        if power is None:
            self.pure(base, "raises"), self.pure(exponent, "raises to")
            return NUMBER
        if abs(power) > LARGEST_POWER:
            raise error(node, f"raises to the power {power:g}")
        found = self.rise(base, "raises")
        return Measure(PURE.times(found.unit, Fraction(power).limit_denominator(1000)))

    def _compared(self, node: Binary) -> Meaning:
        if not self._is_bound(node.left, node.right) and not self._is_bound(node.right, node.left):
            self.one_of(node, [node.left, node.right], "compares")
        return NUMBER

    def _is_bound(self, bound: Node, tested: Node) -> bool:
        """Whether a number bounds a cell, or one, the least or the greatest of some: it is in their unit."""
        if isinstance(tested, Call) and tested.function in ("MIN", "MAX", "INDEX"):
            tested = tested.arguments[0]
        if not isinstance(tested, Reference | Area | Slot | Name) or literal(bound) is None:
            return False
        return isinstance(self.meaning(tested), Measure)
