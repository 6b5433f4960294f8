"""Rule expressions over references: the guarded formula, and the same judgement in Python.

`oxygen_pressure > const.fill_limit` is true only where every cell it rests on holds what it must: a number
where it is compared or reckoned with, text where it is compared with text, a number at least in a range. A
reference that the expression itself tests (is_number, is_blank, count and the like) is not guarded.
"""

import ast
import copy
import functools
import inspect
from collections.abc import Callable, Collection, Iterator
from dataclasses import dataclass
from typing import Any

from sheetcal.cells.grammar import Checker
from sheetcal.cells.primitives import BLANK, PRIMITIVES, Series, Text, count, is_blank, is_number, is_text
from sheetcal.errors import BadInput
from sheetcal.formulas import spelling
from sheetcal.formulas.translate import Speller, joined, names

_UNGUARDED = ("is_number", "is_text", "is_blank", "same_text", "count", "filled", "total", "pairs", "total_size")
_LOOK_UPS = ("found", "look_up")


class _Dotted(ast.NodeTransformer):
    """Turns `sample.ash` into one name."""

    def visit_Attribute(self, node: ast.Attribute) -> ast.AST:
        return ast.copy_location(ast.Name(ast.unparse(node), ast.Load()), node)


@dataclass(frozen=True)
class Expression:
    """A checked rule expression and what its references must hold; `series` are read as ranges."""

    tree: ast.expr
    numbers: tuple[str, ...]
    texts: tuple[str, ...]
    filled: tuple[str, ...]
    series: tuple[str, ...]
    references: tuple[str, ...]


@functools.cache
def read(text: str) -> Expression:
    """The checked expression. Raises BadInput naming what cannot be a formula."""
    try:
        tree = _Dotted().visit(ast.parse(text.strip(), mode="eval").body)
    except SyntaxError:
        raise BadInput(f"rule `{text}`", "is no expression", "a Python expression", "Correct it.") from None
    references = names(tree)
    Checker(f"rule `{text}`", set(references), {}).check(tree)
    calls = list(_arguments(tree))
    keys = {name for name, called, place, _ in calls if called in _LOOK_UPS and place == 0}
    tables = {name for name, called, place, _ in calls if called in _LOOK_UPS and place > 0}
    tested = {name for name, called, _, _ in calls if called in _UNGUARDED} | tables
    series = {name for name, _, _, is_series in calls if is_series}
    words = _compared_with_text(tree) | keys
    texts = words - tested - series
    tree = _Tested(tested - series - words).visit(tree)
    needed = (references - tested - series - texts, texts, series - tested, series, references)
    return Expression(tree, *(tuple(sorted(group)) for group in needed))


class _Tested(ast.NodeTransformer):
    """Lets a comparison speak only where a reference that the expression tests itself holds a number."""

    def __init__(self, loose: Collection[str]) -> None:
        self.loose = loose

    def visit_Compare(self, node: ast.Compare) -> ast.AST:
        loose = sorted(_used(node) & set(self.loose))
        if not loose:
            return node
        tests: list[ast.expr] = [_is_number(name) for name in loose]
        test = tests[0] if len(tests) == 1 else ast.BoolOp(ast.And(), tests)
        return ast.IfExp(test, node, ast.Constant(isinstance(node.ops[0], ast.NotEq)))


def _is_number(reference: str) -> ast.expr:
    return ast.Call(ast.Name("is_number", ast.Load()), [ast.Name(reference, ast.Load())], [])


def _used(node: ast.AST) -> set[str]:
    """References whose number an expression needs: not those it only tests or takes under a condition."""
    if isinstance(node, ast.Name):
        return {node.id}
    if isinstance(node, ast.IfExp):
        return set()
    if isinstance(node, ast.Call):
        return set() if names(node.func) & set(_UNGUARDED) else set().union(*map(_used, node.args))
    return set().union(*map(_used, ast.iter_child_nodes(node)))


def _arguments(tree: ast.expr) -> Iterator[tuple[str, str, int, bool]]:
    """Each reference handed to a primitive: name, primitive, place, and whether a range goes there."""
    for call in (node for node in ast.walk(tree) if isinstance(node, ast.Call)):
        called = call.func.id  # type: ignore[attr-defined]  # the checker admits plain names only
        parameters = list(inspect.signature(PRIMITIVES[called]).parameters.values())
        for place, value in enumerate(call.args):
            if isinstance(value, ast.Name):
                parameter = parameters[min(place, len(parameters) - 1)]
                yield value.id, called, place, parameter.annotation == Series


def _compared_with_text(tree: ast.expr) -> set[str]:
    found: set[str] = set()
    for node in ast.walk(tree):
        if isinstance(node, ast.Compare):
            sides = [node.left, *node.comparators]
            if any(isinstance(side, ast.Constant) and is_text(side.value) for side in sides):
                found |= {side.id for side in sides if isinstance(side, ast.Name)}
    return found


@functools.cache
def expression_template(text: str) -> str:
    """The guarded formula of a rule expression, `{reference}` where a cell goes; FALSE where a cell is blank.

    Raises BadInput for what cannot be a formula.
    """
    expression = read(text)
    speller = Speller({}, set(expression.series))
    formula = speller.spell(expression.tree)
    if not speller.never_fails(expression.tree):
        formula = f"IFERROR({formula},FALSE())"
    guards = _guards(expression)
    if not guards:
        return formula
    return f"IF({joined(guards)},{formula},FALSE())"


def _guards(expression: Expression) -> list[str]:
    guards = []
    if expression.numbers:
        cells = ",".join(f"{{{name}}}" for name in expression.numbers)
        guards.append(f"COUNT({cells})={len(expression.numbers)}")
    guards += [test for name in expression.texts for test in spelling.holds_text(f"{{{name}}}")]
    return guards + [f"COUNT({{{name}}})>0" for name in expression.filled]


class _Plain(ast.NodeTransformer):
    """Puts plain identifiers in place of references."""

    def __init__(self, plain: dict[str, str]) -> None:
        self.plain = plain

    def visit_Name(self, node: ast.Name) -> ast.AST:
        return ast.Name(self.plain[node.id], ast.Load())

    def visit_Call(self, node: ast.Call) -> ast.AST:
        return ast.Call(node.func, [self.visit(value) for value in node.args], [])


@functools.cache
def _compiled(text: str) -> tuple[Any, dict[str, str]]:
    """The compiled expression, and the plain identifier that stands for each reference."""
    expression = read(text)
    plain = {reference: f"cell_{index}" for index, reference in enumerate(expression.references)}
    tree = ast.Expression(_Plain(plain).visit(copy.deepcopy(expression.tree)))
    return compile(ast.fix_missing_locations(tree), f"rule `{text}`", "eval"), plain


def expression_value(text: str, lookup: Callable[[str], Any]) -> bool:
    """Whether a rule's expression holds; `lookup` gives a reference's cell content (a list for a range).

    Raises BadInput for what cannot be a formula.
    """
    expression = read(text)
    held = {name: _content(lookup(name), name in expression.series) for name in expression.references}
    if not _present(expression, held):
        return False
    code, plain = _compiled(text)
    scope = {plain[name]: value for name, value in held.items()}
    try:
        # The text was checked by `read`: references, primitives and operators only.
        return bool(eval(code, {"__builtins__": {}, **PRIMITIVES, **scope}))
    except (ArithmeticError, LookupError, TypeError, ValueError):
        return False  # what the formula's IFERROR answers


def _content(value: Any, is_series: bool) -> Any:
    """A cell's content as the primitives see it; a range of one cell is a series all the same."""
    if is_series:
        return value if isinstance(value, list) else [value]
    return BLANK if is_blank(value) else Text(value) if isinstance(value, str) else value


def _present(expression: Expression, held: dict[str, Any]) -> bool:
    return (
        all(is_number(held[name]) for name in expression.numbers)
        and all(is_text(held[name]) for name in expression.texts)
        and all(count(held[name]) > 0 for name in expression.filled)
    )
