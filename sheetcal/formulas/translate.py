"""Native spreadsheet formulas from cell functions and rule expressions.

A template holds `{argument}` or `{reference}` where the cell goes, and the defined names of the constants.
Brackets follow the spreadsheet's precedence: unary minus binds tighter than ^, and ^ is taken from the left.
"""

import ast
import copy
import functools
import re
from collections.abc import Collection, Mapping

from sheetcal.cells import registry
from sheetcal.cells.registry import Argument, CellFunction, Constant
from sheetcal.errors import BadInput
from sheetcal.formulas import spelling
from sheetcal.formulas.spelling import ATOM, COMPARISON, JOINED, POWER, PRODUCT, SUM

Spelled = tuple[str, int]

_BINARY = {ast.Add: ("+", SUM), ast.Sub: ("-", SUM), ast.Mult: ("*", PRODUCT), ast.Div: ("/", PRODUCT)}
_COMPARE = {ast.Lt: "<", ast.LtE: "<=", ast.Gt: ">", ast.GtE: ">=", ast.Eq: "=", ast.NotEq: "<>"}
_TESTS = ("is_number", "is_text", "is_blank")
_NEVER_FAILS = ("is_number", "is_text", "is_blank", "same_text", "count", "filled", "found", "pairs", "day_part")


class Speller:
    """Spells an expression; `constants` go in by their defined names, other names as `{name}`."""

    def __init__(self, constants: Mapping[str, Constant], fragile: Collection[str] = ()) -> None:
        self.constants = constants
        self.fragile = fragile  # names whose cell may be blank: arithmetic on them may fail

    def spell(self, node: ast.expr, at_least: int = 0) -> str:
        """The expression, in brackets where it binds less tightly than its place asks."""
        written, strength = getattr(self, f"spell_{type(node).__name__}")(node)
        return written if strength >= at_least else f"({written})"

    def spell_Name(self, node: ast.Name) -> Spelled:
        constant = self.constants.get(node.id)
        return (constant.name if constant is not None else f"{{{node.id}}}"), ATOM

    def spell_Constant(self, node: ast.Constant) -> Spelled:
        if isinstance(node.value, bool):
            return spelling.truth(node.value), ATOM
        if isinstance(node.value, str):
            return spelling.text(node.value), ATOM
        assert isinstance(node.value, (int, float))
        return spelling.number(node.value), ATOM

    def spell_BinOp(self, node: ast.BinOp) -> Spelled:
        if isinstance(node.op, ast.Pow):
            return f"{self.spell(node.left, ATOM)}^{self.spell(node.right, ATOM)}", POWER
        sign, strength = _BINARY[type(node.op)]
        return f"{self.spell(node.left, strength)}{sign}{self.spell(node.right, strength + 1)}", strength

    def spell_UnaryOp(self, node: ast.UnaryOp) -> Spelled:
        if isinstance(node.op, ast.Not):
            return f"NOT({self.spell(node.operand)})", ATOM
        return f"-{self.spell(node.operand, ATOM)}", SUM

    def spell_Compare(self, node: ast.Compare) -> Spelled:
        sides = [self.spell(side, JOINED) for side in (node.left, *node.comparators)]
        tests = [f"{a}{_COMPARE[type(op)]}{b}" for a, op, b in zip(sides, node.ops, sides[1:], strict=False)]
        return (tests[0], COMPARISON) if len(tests) == 1 else (f"AND({','.join(tests)})", ATOM)

    def spell_IfExp(self, node: ast.IfExp) -> Spelled:
        return f"IF({self.spell(node.test)},{self.spell(node.body)},{self.spell(node.orelse)})", ATOM

    def spell_BoolOp(self, node: ast.BoolOp) -> Spelled:
        """AND and OR look at every argument: where a later one may fail, nested IFs stop in time."""
        is_and = isinstance(node.op, ast.And)
        tests = [self.spell(value) for value in node.values]
        if all(self.never_fails(value) for value in node.values):
            return f"{'AND' if is_and else 'OR'}({','.join(tests)})", ATOM
        written = tests[-1]
        for test in reversed(tests[:-1]):
            written = f"IF({test},{written},FALSE())" if is_and else f"IF({test},TRUE(),{written})"
        return written, ATOM

    def spell_Call(self, node: ast.Call) -> Spelled:
        name = node.func.id  # type: ignore[attr-defined]  # the grammar admits plain names only
        if name == "join":
            return "&".join(self.spell(value, SUM) for value in node.args), JOINED
        values = [self.spell(value) for value in node.args]
        if name == "is_text" and isinstance(node.args[0], ast.Name):
            return f"AND({','.join(spelling.holds_text(values[0]))})", ATOM
        if name in spelling.LIST_SPELLING:
            return f"{spelling.LIST_SPELLING[name]}({','.join(values)})", ATOM
        if name in spelling.OPERATION_SPELLING:
            form, strength = spelling.OPERATION_SPELLING[name]
            return form.format(*values), strength
        return spelling.PRIMITIVE_SPELLING[name].format(*values), ATOM

    def never_fails(self, node: ast.expr) -> bool:
        """Whether the expression has a value whatever the cells hold, the required ones being numbers."""
        if isinstance(node, ast.Call):
            return node.func.id in _NEVER_FAILS  # type: ignore[attr-defined]  # plain names only
        if isinstance(node, ast.BinOp):
            safe = not isinstance(node.op, (ast.Div, ast.Pow))
            return safe and not (names(node) & set(self.fragile)) and self._sides_never_fail(node)
        return self._sides_never_fail(node)

    def _sides_never_fail(self, node: ast.expr) -> bool:
        return all(self.never_fails(side) for side in ast.iter_child_nodes(node) if isinstance(side, ast.expr))


def names(node: ast.AST) -> set[str]:
    """Every name in an expression that is not a primitive being called."""
    called = {id(call.func) for call in ast.walk(node) if isinstance(call, ast.Call)}
    return {part.id for part in ast.walk(node) if isinstance(part, ast.Name) and id(part) not in called}


class _Settle(ast.NodeTransformer):
    """Settles the tests on arguments that have no cell (`omitted`)."""

    def __init__(self, omitted: Collection[str]) -> None:
        self.omitted = omitted

    def visit_Call(self, node: ast.Call) -> ast.AST:
        node.args = [self.visit(value) for value in node.args]
        called = node.func.id  # type: ignore[attr-defined]  # the grammar admits plain names only
        if called in _TESTS and names(node) & set(self.omitted):
            return ast.Constant(called == "is_blank")
        return node

    def visit_Compare(self, node: ast.Compare) -> ast.AST:
        self.generic_visit(node)
        return ast.Constant(False) if names(node) & set(self.omitted) else node

    def visit_IfExp(self, node: ast.IfExp) -> ast.AST:
        test = self.visit(node.test)
        if isinstance(test, ast.Constant):
            chosen: ast.AST = self.visit(node.body if test.value else node.orelse)
            return chosen
        return ast.IfExp(test, self.visit(node.body), self.visit(node.orelse))

    def visit_BoolOp(self, node: ast.BoolOp) -> ast.AST:
        is_and = isinstance(node.op, ast.And)
        values = [self.visit(value) for value in node.values]
        if any(isinstance(value, ast.Constant) and bool(value.value) is not is_and for value in values):
            return ast.Constant(not is_and)
        left = [value for value in values if not isinstance(value, ast.Constant)]
        if len(left) < 2:
            return left[0] if left else ast.Constant(is_and)
        return ast.BoolOp(node.op, left)

    def visit_UnaryOp(self, node: ast.UnaryOp) -> ast.AST:
        self.generic_visit(node)
        settled = isinstance(node.op, ast.Not) and isinstance(node.operand, ast.Constant)
        return ast.Constant(not node.operand.value) if settled else node  # type: ignore[attr-defined]


def _settled(node: ast.expr, omitted: Collection[str]) -> ast.expr:
    result: ast.expr = _Settle(omitted).visit(copy.deepcopy(node))
    return result


@functools.cache
def formula_template(name: str, omitted: tuple[str, ...] = ()) -> str:
    """The guarded formula of a cell function, with `{argument}` placeholders and without the leading "=".

    omitted: optional arguments that this use has no cell for. Raises KeyError (name), BadInput (omitted).
    """
    function = registry.get(name)
    _check_omitted(function, omitted)
    args = [argument for argument in function.args if argument.name not in omitted]
    fragile = [argument.name for argument in args if argument.optional or argument.series]
    speller = Speller(_by_symbol(function), fragile)
    formula = speller.spell(_settled(function.tree.expression, omitted))
    for test in reversed(_guards(function, args, speller, omitted)):
        formula = f'IF({test},{formula},"")'
    return formula


def _by_symbol(function: CellFunction) -> dict[str, Constant]:
    symbols = dict(function.tree.constants)
    for need in function.needs:
        symbols.update(need.body.constants)
    return symbols


def _check_omitted(function: CellFunction, omitted: Collection[str]) -> None:
    optional = {argument.name for argument in function.args if argument.optional}
    if set(omitted) - optional:
        raise BadInput(
            function.name,
            f"{sorted(set(omitted) - optional)} cannot be left out",
            f"of {sorted(optional)}",
            "Name its cell.",
        )


def _guards(function: CellFunction, args: list[Argument], speller: Speller, omitted: Collection[str]) -> list[str]:
    """The tests in nesting order: presence, ranges and simple relations, then relations that may fail."""
    guards = [joined(_presence(args))]
    ranges = [test for argument in args for test in _range(argument)]
    for need in function.needs:
        node = _settled(need.body.expression, omitted)
        if isinstance(node, ast.Constant) and node.value is True:
            continue
        if speller.never_fails(node):
            is_and = isinstance(node, ast.BoolOp) and isinstance(node.op, ast.And)
            ranges += [speller.spell(part) for part in (node.values if is_and else [node])]  # type: ignore[attr-defined]
            continue
        guards += [joined(ranges), speller.spell(node)]
        ranges = []
    return [guard for guard in [*guards, joined(ranges)] if guard]


def joined(tests: list[str]) -> str:
    """Several tests as one; an empty text for none."""
    return tests[0] if len(tests) == 1 else f"AND({','.join(tests)})" if tests else ""


def _presence(args: list[Argument]) -> list[str]:
    """Tests that no blank, text or error value can upset: numbers are numbers and text is text."""
    numeric = [a for a in args if not a.series and not a.text]
    tests = []
    if numeric:
        blanks = "".join(f"+COUNTBLANK({{{a.name}}})" for a in numeric if a.optional)
        tests.append(f"COUNT({','.join(f'{{{a.name}}}' for a in numeric)}){blanks}={len(numeric)}")
    tests += [f"COUNT({{{a.name}}})>0" for a in args if a.series and not a.column]
    texts = [argument for argument in args if argument.text and not argument.series]
    return tests + [test for argument in texts for test in _text_presence(argument)]


def _text_presence(argument: Argument) -> list[str]:
    cell = f"{{{argument.name}}}"
    if argument.optional:
        return [f"COUNTBLANK({cell})+ISTEXT({cell})>0"]
    return [f"ISTEXT({cell})"] if argument.choices else spelling.holds_text(cell)


def _range(argument: Argument) -> list[str]:
    cell = f"{{{argument.name}}}"
    lowest, highest = (f"MIN({cell})", f"MAX({cell})") if argument.series else (cell, cell)
    tests = [f"{cell}={spelling.text(choice)}" for choice in argument.choices]
    if tests:
        tests = [f"OR({','.join(tests)})"] if len(tests) > 1 else tests
    if argument.low is not None:
        tests.append(f"{lowest}>={spelling.number(argument.low)}")
    if argument.high is not None:
        tests.append(f"{highest}<={spelling.number(argument.high)}")
    return [f"OR(COUNTBLANK({cell})=1,{joined(tests)})"] if argument.optional and tests else tests


def fill(template: str, references: Mapping[str, str]) -> str:
    """The template with each `{name}` replaced by its cell. Raises KeyError naming a missing reference."""
    return re.sub(r"\{([^{}]+)\}", lambda match: references[match.group(1)], template)
