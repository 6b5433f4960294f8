"""The tree of a formula: a dozen kinds of node, builders that limit its depth, and ways over it.

Nodes are compared by meaning: where a formula stood, its brackets and its blanks are not part of the tree.
"""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

from sheetcal.errors import BadInput

DEEPEST = 128  # levels of the tree; a formula made for people stays under 30


class FormulaError(BadInput):
    """Formula text that does not follow the grammar."""


class TooComplex(FormulaError):
    """Formula text beyond the limits of length or nesting."""


@dataclass(frozen=True, slots=True)
class Number:
    """A literal number."""

    value: float


@dataclass(frozen=True, slots=True)
class Text:
    """A literal text."""

    value: str


@dataclass(frozen=True, slots=True)
class ErrorLiteral:
    """An error value written into the formula, such as a lost reference #REF!."""

    code: str


@dataclass(frozen=True, slots=True)
class Reference:
    """One cell; `tab` None means the formula's own tab. `$` signs carry no meaning here."""

    tab: str | None
    column: int
    row: int


@dataclass(frozen=True, slots=True)
class Area:
    """A rectangle of cells, first and last column and row included."""

    tab: str | None
    left: int
    top: int
    right: int
    bottom: int

    @property
    def size(self) -> int:
        """Number of cells."""
        return (self.right - self.left + 1) * (self.bottom - self.top + 1)


@dataclass(frozen=True, slots=True)
class Name:
    """A defined name."""

    name: str


@dataclass(frozen=True, slots=True)
class Slot:
    """The place of a reference in a template."""

    name: str


@dataclass(frozen=True, slots=True)
class Missing:
    """An argument left empty, as in IF(a,,b)."""


@dataclass(frozen=True, slots=True)
class Negative:
    """A minus sign before an operand; a plus sign changes nothing and is dropped."""

    operand: "Node"
    depth: int = field(compare=False)


@dataclass(frozen=True, slots=True)
class Percent:
    """An operand followed by %."""

    operand: "Node"
    depth: int = field(compare=False)


@dataclass(frozen=True, slots=True)
class Binary:
    """Two operands and an arithmetic, text or comparison operator."""

    operator: str
    left: "Node"
    right: "Node"
    depth: int = field(compare=False)


@dataclass(frozen=True, slots=True)
class Range:
    """`first:last` where at least one side is a call that returns a reference."""

    first: "Node"
    last: "Node"
    depth: int = field(compare=False)


@dataclass(frozen=True, slots=True)
class Call:
    """A function, its name in capitals without `_xlfn.`, and its arguments."""

    function: str
    arguments: tuple["Node", ...]
    depth: int = field(compare=False)


Leaf = Number | Text | ErrorLiteral | Reference | Area | Name | Slot | Missing
Node = Leaf | Negative | Percent | Binary | Range | Call


def depth(node: Node) -> int:
    """Levels below and including the node; leaves have one."""
    return getattr(node, "depth", 1)


def _above(*nodes: Node) -> int:
    """The depth of a node over these. Raises TooComplex beyond the limit."""
    level = 1
    for node in nodes:
        level = max(level, depth(node) + 1)
    if level > DEEPEST:
        raise TooComplex("formula", "is nested too deeply", f"at most {DEEPEST} levels")
    return level


def negative(operand: Node) -> Node:
    """Minus the operand."""
    return Negative(operand, _above(operand))


def percent(operand: Node) -> Node:
    """The operand divided by 100, written with %."""
    return Percent(operand, _above(operand))


def binary(operator: str, left: Node, right: Node) -> Node:
    """Two operands joined."""
    return Binary(operator, left, right, _above(left, right))


def joined(first: Node, last: Node) -> Node:
    """The range between two references. Raises FormulaError where a side is none."""
    for side in (first, last):
        if not isinstance(side, Reference | Slot | Name | Call):
            raise FormulaError("formula", "':' beside something that is no reference", "a cell or INDEX()")
    return Range(first, last, _above(first, last))


def call(function: str, *arguments: Node) -> Node:
    """A function of its arguments."""
    return Call(function, arguments, _above(*arguments))


def replace_leaves(node: Node, replacement: Mapping[Node, Node]) -> Node:
    """The tree with each leaf that is among the keys replaced."""
    below = children(node)
    if not below:
        return replacement.get(node, node)
    changed = [replace_leaves(one, replacement) for one in below]
    match node:
        case Negative():
            return negative(*changed)
        case Percent():
            return percent(*changed)
        case Binary(operator):
            return binary(operator, *changed)
        case Call(function):
            return call(function, *changed)
    return joined(*changed)


def children(node: Node) -> tuple[Node, ...]:
    """The nodes directly below."""
    match node:
        case Negative(operand) | Percent(operand):
            return (operand,)
        case Binary(_, left, right):
            return (left, right)
        case Range(first, last):
            return (first, last)
        case Call(_, arguments):
            return arguments
    return ()


def walk(node: Node) -> Iterator[Node]:
    """The node and everything below it, from the top."""
    waiting = [node]
    while waiting:
        one = waiting.pop()
        yield one
        waiting.extend(reversed(children(one)))
