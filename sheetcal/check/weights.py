"""How a formula's result moves when the zero of the temperature scale moves: its weight.

A temperature in degC has weight 1, a rise 0, a sum of two temperatures 2, m c T has m c. A weight is itself a
small formula; most fold to a number. Where one does not (a trapezoid sum over its duration), it is settled by
trying: an identity that holds for arbitrary readings to nine digits is no accident.
"""

import random
from collections.abc import Callable, Iterator

from sheetcal.check.formula import write
from sheetcal.check.program import compile_tree
from sheetcal.check.tree import (
    Area,
    Call,
    Name,
    Node,
    Number,
    Range,
    Reference,
    Slot,
    TooComplex,
    binary,
    call,
    children,
    negative,
    replace_leaves,
    walk,
)
from sheetcal.check.values import Array, Value

NONE = Number(0.0)
ONE = Number(1.0)
TRIALS = 24  # positions in a record come in every order; about half of the draws make sense of them
LENGTH = 12  # readings of an invented series
CLOSE = 1e-9


def plus(one: Node, other: Node, sign: str = "+") -> Node:
    """The weight of a sum or a difference."""
    if isinstance(one, Number) and isinstance(other, Number):
        return Number(one.value + other.value if sign == "+" else one.value - other.value)
    if other == NONE:
        return one
    if one == NONE:
        return other if sign == "+" else negative(other)
    return binary(sign, one, other)


def times(weight: Node, factor: Node) -> Node:
    """The weight of a product whose other factor has none."""
    if weight == NONE:
        return NONE
    if isinstance(weight, Number) and isinstance(factor, Number):
        return Number(weight.value * factor.value)
    return factor if weight == ONE else binary("*", weight, factor)


def over(weight: Node, divisor: Node) -> Node:
    """The weight of a quotient whose divisor has none."""
    if isinstance(weight, Number) and isinstance(divisor, Number) and divisor.value != 0.0:
        return Number(weight.value / divisor.value)
    return NONE if weight == NONE else binary("/", weight, divisor)


def summed(weight: Node, terms: Node) -> Node:
    """The weight of SUMPRODUCT(terms): a plain number counts once for each term."""
    if weight == NONE:
        return NONE
    if isinstance(weight, Number):
        weight = binary("+", weight, binary("*", NONE, terms))
    return call("SUMPRODUCT", weight)


def same(one: Node, other: Node, is_series: Callable[[Node], bool]) -> bool:
    """Whether two weights are the same for all readings."""
    if one == other:
        return True
    difference = plus(one, other, "-")
    if isinstance(difference, Number):
        return abs(difference.value) < CLOSE
    try:
        return _vanishes(one, other, is_series)
    except TooComplex:
        return False


def _vanishes(one: Node, other: Node, is_series: Callable[[Node], bool]) -> bool:
    """Whether the two agree for invented readings, in at least one draw whose positions make sense."""
    both = binary("-", one, other)
    leaves = {write(leaf): leaf for leaf in walk(both) if isinstance(leaf, Reference | Area | Name | Slot)}
    slots: dict[Node, Node] = {leaf: Slot(text) for text, leaf in leaves.items()}
    programs = [compile_tree(replace_leaves(side, slots)) for side in (one, other)]
    positions = set(_positions(both))
    source = random.Random(20260304)  # any seed will do; a fixed one gives the same verdict every time
    for _ in range(TRIALS):
        drawn = {text: _invented(source, leaf in positions, is_series(leaf)) for text, leaf in leaves.items()}
        first, second = (program.run([drawn[slot] for slot in program.slots]) for program in programs)
        if _agree(first, second):
            return True
    return False


def _positions(node: Node) -> Iterator[Node]:
    """References that stand in a position of INDEX."""
    for one in walk(node):
        if isinstance(one, Call) and one.function == "INDEX":
            for place in one.arguments[1:]:
                yield from (leaf for leaf in walk(place) if not children(leaf))


def _invented(source: random.Random, position: bool, series: bool) -> Value:
    if series:
        readings = sorted(source.uniform(1.0, 9.0) for _ in range(LENGTH))
        return Array([*readings], LENGTH, 1)
    return float(source.randint(2, LENGTH - 1)) if position else source.uniform(1.0, 9.0)


def _agree(one: Value, other: Value) -> bool:
    if type(one) is not float or type(other) is not float:
        return False
    return abs(one - other) <= CLOSE * max(abs(one), abs(other))


def taken_as_series(tree: Node) -> set[Node]:
    """References that a formula uses as ranges though nothing else says so."""
    found: set[Node] = {node for node in walk(tree) if isinstance(node, Area)}
    for node in walk(tree):
        if isinstance(node, Range):
            continue
        if isinstance(node, Call) and node.function in _FIRST:
            found.update(node.arguments[:1])
        if isinstance(node, Call) and (node.function in _EVERY or (node.function in _ALONE and _alone(node))):
            found.update(node.arguments)
    return {node for node in found if isinstance(node, Area | Slot | Name)}


_FIRST = ("INDEX", "COUNTIF", "SUMIF")
_EVERY = ("SLOPE", "INTERCEPT", "STEYX", "CORREL", "SUMPRODUCT", "STDEV", "DEVSQ", "SUMSQ")
_ALONE = ("SUM", "AVERAGE", "MIN", "MAX", "COUNT", "COUNTA", "MEDIAN")


def _alone(node: Call) -> bool:
    return len(node.arguments) == 1
