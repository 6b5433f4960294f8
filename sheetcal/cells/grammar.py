"""What a cell function's body and a rule's expression may be made of, checked when they are registered.

A body is straight-line: each local assigned once, then one return. What cannot be written as a spreadsheet
formula is refused here, naming the line and the expression, so that no sheet meets it later.
"""

import ast
import copy
import inspect
import textwrap
from typing import Any, Callable, Dict, List, Mapping, Set

from sheetcal.cells.primitives import PRIMITIVES
from sheetcal.errors import BadInput

OPERATORS = (ast.Add, ast.Sub, ast.Mult, ast.Div, ast.Pow)
COMPARISONS = (ast.Lt, ast.LtE, ast.Gt, ast.GtE, ast.Eq, ast.NotEq)


class Constant(float):
    """A number with a unit: a cell with a defined name on the Constants tab, never a literal in a formula."""

    unit: str
    name: str
    source: str
    standing: str

    def __new__(cls, value: float, unit: str, name: str, source: str = "", standing: str = "published") -> "Constant":
        number = super().__new__(cls, value)
        number.unit, number.name, number.source, number.standing = unit, name, source, standing
        return number

    def __getnewargs__(self) -> Any:
        return float(self), self.unit, self.name, self.source, self.standing


class Body:
    """A checked body: one expression, its locals in place, and the constants it names.

    Python evaluates this expression too: like the formula, it never looks at a branch that is not taken.
    """

    def __init__(self, expression: ast.expr, constants: Dict[str, Constant], where: str) -> None:
        self.expression = expression
        self.constants = constants
        tree = ast.fix_missing_locations(ast.Expression(copy.deepcopy(expression)))
        self._code = compile(tree, where, "eval")
        self._scope = {"__builtins__": {}, **PRIMITIVES, **constants}

    def value(self, arguments: Mapping[str, Any]) -> Any:
        """The expression's value; arguments by name. Raises what its primitives raise."""
        # The code is our own and checked: names, primitives and operators only.
        return eval(self._code, {**self._scope, **arguments})


class _Inline(ast.NodeTransformer):
    """Puts a local's expression wherever its name stands."""

    def __init__(self, assigned: Mapping[str, ast.expr]) -> None:
        self.assigned = assigned

    def visit_Call(self, node: ast.Call) -> ast.AST:
        node.args = [self.visit(value) for value in node.args]  # the function's own name is no local
        return node

    def visit_Name(self, node: ast.Name) -> ast.AST:
        return copy.deepcopy(self.assigned[node.id]) if node.id in self.assigned else node


class Checker:
    """Walks an expression and refuses what a formula cannot say."""

    def __init__(self, where: str, names: Set[str], constants: Mapping[str, Any]) -> None:
        self.where = where
        self.names = names
        self.known = constants
        self.used: Dict[str, Constant] = {}

    def refuse(self, node: ast.AST, what: str, do: str = "Write it with the primitives.") -> BadInput:
        line = getattr(node, "lineno", 1)
        text = ast.unparse(node).splitlines()[0]
        return BadInput(f"{self.where}, line {line}", f"`{text}`: {what}", "what a formula can say", do)

    def check(self, node: ast.AST) -> None:
        method = getattr(self, f"check_{type(node).__name__}", None)
        if method is None:
            raise self.refuse(node, f"{type(node).__name__} cannot be written as a formula")
        method(node)

    def check_all(self, nodes: List[ast.expr]) -> None:
        for node in nodes:
            self.check(node)

    def check_BinOp(self, node: ast.BinOp) -> None:
        if not isinstance(node.op, OPERATORS):
            raise self.refuse(node, f"the operator {type(node.op).__name__} has no spreadsheet form")
        if any(isinstance(side, ast.Constant) and isinstance(side.value, str) for side in (node.left, node.right)):
            raise self.refuse(node, "text is joined with `join`, never with an operator")
        self.check_all([node.left, node.right])

    def check_UnaryOp(self, node: ast.UnaryOp) -> None:
        if not isinstance(node.op, (ast.USub, ast.Not)):
            raise self.refuse(node, f"the operator {type(node.op).__name__} has no spreadsheet form")
        self.check(node.operand)

    def check_BoolOp(self, node: ast.BoolOp) -> None:
        self.check_all(node.values)

    def check_Compare(self, node: ast.Compare) -> None:
        if not all(isinstance(operator, COMPARISONS) for operator in node.ops):
            raise self.refuse(node, "only < <= > >= == != have a spreadsheet form")
        self.check_all([node.left, *node.comparators])

    def check_IfExp(self, node: ast.IfExp) -> None:
        self.check_all([node.test, node.body, node.orelse])

    def check_Constant(self, node: ast.Constant) -> None:
        if not isinstance(node.value, (bool, int, float, str)):
            raise self.refuse(node, "only numbers, truth values and text may stand in a formula")
        if isinstance(node.value, str) and set(node.value) & set("{}"):
            raise self.refuse(node, "text may hold no braces", "Write it without.")

    def check_Name(self, node: ast.Name) -> None:
        value = self.known.get(node.id)
        if node.id in self.names:
            return
        if not isinstance(value, Constant):
            raise self.refuse(node, "is neither an argument, a local assigned before nor a Constant")
        self.used[node.id] = value

    def check_Call(self, node: ast.Call) -> None:
        name = ast.unparse(node.func)
        if name not in PRIMITIVES:
            raise self.refuse(node, f"`{name}` is not among the primitives")
        if node.keywords or any(isinstance(argument, ast.Starred) for argument in node.args):
            raise self.refuse(node, "a primitive takes plain arguments in order")
        try:
            inspect.signature(PRIMITIVES[name]).bind(*node.args)
        except TypeError as error:
            raise self.refuse(node, str(error)) from None
        self.check_all(node.args)


def _body_statements(definition: ast.FunctionDef) -> List[ast.stmt]:
    first = definition.body[0]
    is_doc = isinstance(first, ast.Expr) and isinstance(first.value, ast.Constant)
    return definition.body[1:] if is_doc else definition.body


def read_body(function: Callable[..., Any], arguments: List[str]) -> Body:
    """The checked body of a cell function. Raises BadInput naming line and expression."""
    code = function.__code__
    definition = ast.parse(textwrap.dedent(inspect.getsource(function))).body[0]
    assert isinstance(definition, ast.FunctionDef)
    ast.increment_lineno(definition, code.co_firstlineno - 1)  # so that a traceback points into the file
    checker = Checker(code.co_filename, set(arguments), function.__globals__)
    statements = _body_statements(definition)
    if not statements or not isinstance(statements[-1], ast.Return) or statements[-1].value is None:
        raise checker.refuse(definition, "a body ends with one return", "End it with `return EXPRESSION`.")
    assigned: Dict[str, ast.expr] = {}
    for statement in statements[:-1]:
        name, value = _assignment(statement, checker)
        checker.check(value)
        checker.names.add(name)
        assigned[name] = _Inline(assigned).visit(value)
    checker.check(statements[-1].value)
    return Body(_Inline(assigned).visit(statements[-1].value), checker.used, code.co_filename)


def _assignment(statement: ast.stmt, checker: Checker) -> Any:
    if not (isinstance(statement, ast.Assign) and len(statement.targets) == 1):
        raise checker.refuse(statement, "a body holds only `name = expression` before its return")
    target = statement.targets[0]
    if not isinstance(target, ast.Name):
        raise checker.refuse(statement, "only a plain name may be assigned")
    if target.id in checker.names:
        raise checker.refuse(statement, f"`{target.id}` is assigned a second time")
    return target.id, statement.value


def read_need(text: str, where: str, arguments: List[str], constants: Mapping[str, Any]) -> Body:
    """The checked expression of one `needs` entry. Raises BadInput naming the expression."""
    checker = Checker(where, set(arguments), constants)
    try:
        expression = ast.parse(text, mode="eval").body
    except SyntaxError:
        raise BadInput(where, f"`{text}` is no expression", "a Python expression", "Correct it.") from None
    checker.check(expression)
    return Body(expression, checker.used, where)
