"""Formula templates compiled to closures: parsed once, run for every cell that holds the same template.

Inside SUMPRODUCT closures work cell by cell over ranges (`array` below); elsewhere a range where one value is
wanted is #VALUE!, because only the program that shows the sheet could say which cell is meant.
"""

import operator
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import lru_cache

from sheetcal.check import closures, functions
from sheetcal.check.closures import Closure, constant
from sheetcal.check.formula import COMPARISONS, parse_template
from sheetcal.check.functions import Single, Whole
from sheetcal.check.tree import (
    Binary,
    Call,
    ErrorLiteral,
    FormulaError,
    Missing,
    Name,
    Negative,
    Node,
    Number,
    Percent,
    Range,
    Slot,
    Text,
    walk,
)
from sheetcal.check.values import NAME, REF, VALUE, CellError, Value


@dataclass(frozen=True, slots=True)
class Program:
    """A compiled template.

    `slots` are its `{tokens}` in order, then its defined names, each written `=name`; `run` takes their
    values in this order. `weight` counts the nodes: the work of one run is about weight x cells.
    """

    slots: tuple[str, ...]
    run: Closure
    weight: int

    def __call__(self, *values: Value) -> Value:
        """The result for these values of the slots."""
        return self.run(values)


@lru_cache(maxsize=4096)
def compile_template(template: str) -> Program:
    """The program of a template (`{token}` for references). Raises FormulaError for other text."""
    return compile_tree(parse_template(template))


def compile_tree(tree: Node) -> Program:
    """The program of a tree whose references are slots. Raises FormulaError where one is not."""
    nodes = list(walk(tree))
    tokens = dict.fromkeys(node.name for node in nodes if isinstance(node, Slot))
    names = dict.fromkeys(f"={node.name.casefold()}" for node in nodes if isinstance(node, Name))
    slots = (*tokens, *names)
    compiler = _Compiler({slot: index for index, slot in enumerate(slots)})
    return Program(slots, compiler.closure(tree, False), len(nodes))


def of_cells(node: Node) -> bool:
    """Whether the node hands on cells rather than a computed value."""
    return isinstance(node, Slot | Name | Range) or (isinstance(node, Call) and node.function == "INDEX")


class _Compiler:
    """Turns nodes into closures; `index` gives each slot's place in the list of values."""

    def __init__(self, index: dict[str, int]) -> None:
        self._index = index

    def closure(self, node: Node, array: bool) -> Closure:
        """The closure of a node; `array`: inside SUMPRODUCT."""
        match node:
            case Slot(name):
                return operator.itemgetter(self._index[name])
            case Name(name):
                return operator.itemgetter(self._index[f"={name.casefold()}"])
            case Number(value) | Text(value):
                return constant(value)
            case Binary():
                return self._binary(node, array)
            case Negative(operand):
                return self._scaled(operand, -1.0, array)
            case Percent(operand):
                return self._scaled(operand, 0.01, array)
            case Range():
                return self._range(node)
            case Call(function, arguments):
                return self._call(function, arguments, array)
            case ErrorLiteral(code):
                return constant(CellError(code))
            case Missing():
                return constant(None)
        raise FormulaError("formula", "a reference stands outside its slot", "a template")

    def _all(self, nodes: Sequence[Node], array: bool) -> list[Closure]:
        return [self.closure(node, array) for node in nodes]

    def _binary(self, node: Binary, array: bool) -> Closure:
        left, right = self.closure(node.left, array), self.closure(node.right, array)
        if array:
            return closures.lifted_binary(node.operator, left, right)
        if node.operator == "&":
            return closures.joined(left, right)
        if node.operator in COMPARISONS:
            match node.right:
                case Number(value):
                    return closures.compared_with_number(node.operator, left, value)
                case Text(value):
                    return closures.compared_with_text(node.operator, left, value)
            return closures.compared(node.operator, left, right)
        return closures.reckoned(node.operator, left, right)

    def _scaled(self, operand: Node, factor: float, array: bool) -> Closure:
        inner = self.closure(operand, array)
        if array:
            return closures.lifted_binary("*", inner, constant(factor))
        return closures.negated(inner) if factor < 0.0 else closures.reckoned("/", inner, constant(100.0))

    def _call(self, function: str, arguments: tuple[Node, ...], array: bool) -> Closure:
        chosen = _FORMS.get(function)
        if chosen is not None:
            least, most, form = chosen
            return form(self, arguments, array) if least <= len(arguments) <= most else constant(VALUE)
        single = functions.SINGLE.get(function)
        if single is not None:
            return self._single(single, arguments, array)
        whole = functions.WHOLE.get(function)
        if whole is None:
            return constant(NAME)
        return self._whole(whole, arguments, array or function == "SUMPRODUCT")

    def _single(self, single: Single, arguments: tuple[Node, ...], array: bool) -> Closure:
        if not single.least <= len(arguments) <= single.most:
            return constant(VALUE)
        if single in _KINDS and not array and isinstance(arguments[0], Slot):
            return closures.holds_kind(self._index[arguments[0].name], _KINDS[single])
        parts = self._all(arguments, array)
        return closures.lifted(single, parts) if array else closures.applied(single, parts)

    def _whole(self, whole: Whole, arguments: tuple[Node, ...], array: bool) -> Closure:
        if not whole.least <= len(arguments) <= whole.most:
            return constant(VALUE)
        kinds = [of_cells(node) for node in arguments]
        places = [self._index[one.name] for one in arguments if isinstance(one, Slot)]
        if whole is functions.WHOLE["COUNT"] and len(places) == len(arguments):
            return closures.counted(places)
        if whole is functions.WHOLE["COUNTBLANK"] and places:
            return closures.blank(places[0])
        return closures.gathered(whole, list(zip(self._all(arguments, array), kinds, strict=True)))

    def _range(self, node: Range) -> Closure:
        """INDEX(r,a):INDEX(r,b) over one range; other joins would need addresses that a template has not."""
        first, last = node.first, node.last
        if not (isinstance(first, Call) and isinstance(last, Call) and _indexes_one(first, last)):
            return constant(REF)
        source = self.closure(first.arguments[0], False)
        return closures.between(source, self._all(first.arguments[1:], False), self._all(last.arguments[1:], False))

    def if_(self, arguments: tuple[Node, ...], array: bool) -> Closure:
        parts = self._all(arguments, array)
        chosen: Closure = constant(False) if len(parts) < 3 else parts[2]
        return (
            closures.lifted_if_else(parts[0], parts[1], chosen)
            if array
            else closures.if_else(parts[0], parts[1], chosen)
        )

    def if_error(self, arguments: tuple[Node, ...], array: bool) -> Closure:
        tried, instead = self._all(arguments, array)
        if not array:
            return closures.if_error_else(tried, instead)
        caught = Single(2, 2, lambda a, b: b if isinstance(a, CellError) else a, open=True)
        return closures.lifted(caught, [tried, instead])

    def choose(self, arguments: tuple[Node, ...], array: bool) -> Closure:
        index, *options = self._all(arguments, False)
        return closures.chosen(index, options)

    def index(self, arguments: tuple[Node, ...], array: bool) -> Closure:
        source, row, *column = self._all(arguments, False)
        return closures.indexed(source, row, column[0] if column else None)

    def and_(self, arguments: tuple[Node, ...], array: bool) -> Closure:
        return self._logical(arguments, array, True)

    def or_(self, arguments: tuple[Node, ...], array: bool) -> Closure:
        return self._logical(arguments, array, False)

    def _logical(self, arguments: tuple[Node, ...], array: bool, all_of: bool) -> Closure:
        kinds = [of_cells(node) for node in arguments]
        return closures.all_or_any(list(zip(self._all(arguments, array), kinds, strict=True)), all_of)


_FORMS: dict[str, tuple[int, int, Callable[[_Compiler, tuple[Node, ...], bool], Closure]]] = {
    "IF": (2, 3, _Compiler.if_),
    "IFERROR": (2, 2, _Compiler.if_error),
    "CHOOSE": (2, 255, _Compiler.choose),
    "INDEX": (2, 3, _Compiler.index),
    "AND": (1, 255, _Compiler.and_),
    "OR": (1, 255, _Compiler.or_),
}
_KINDS: dict[Single, type] = {functions.SINGLE["ISNUMBER"]: float, functions.SINGLE["ISTEXT"]: str}


def arity(function: str) -> tuple[int, int] | None:
    """(least, most) number of arguments; None for an unknown function."""
    if function in _FORMS:
        return _FORMS[function][:2]
    known = functions.SINGLE.get(function) or functions.WHOLE.get(function)
    return None if known is None else (known.least, known.most)


def _indexes_one(first: Call, last: Call) -> bool:
    """Whether both calls are INDEX into the same range."""
    if first.function != "INDEX" or last.function != "INDEX":
        return False
    sizes = 2 <= len(first.arguments) <= 3 and 2 <= len(last.arguments) <= 3
    return sizes and first.arguments[0] == last.arguments[0]
