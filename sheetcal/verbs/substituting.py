"""What a cell function worked out, with numbers and units in place of its arguments."""

from __future__ import annotations

import ast
import copy
from collections.abc import Mapping
from typing import Any

from sheetcal.cells.grammar import Body
from sheetcal.cells.registry import CellFunction, Constant

LONGEST = 240  # signs; beyond that the arguments are listed instead
MISSING = "(missing)"


def substituted(function: CellFunction, values: Mapping[str, Any], shown: Mapping[str, str]) -> str:
    """The function's own expression, only the branches taken, each name replaced by what stands for it.

    values: by argument, as the function takes them. shown: the same as text with units. Where an argument is
    missing or the expression is long, the arguments are listed.
    """
    listed = "with " + ", ".join(f"{name} = {shown.get(name, MISSING)}" for name in values)
    if any(values[one.name] is None and not one.optional for one in function.args if one.name in values):
        return listed
    chosen = _Taken(function.tree, values).visit(copy.deepcopy(function.tree.expression))
    text = ast.unparse(_Named(shown, function.tree.constants).visit(chosen))
    text = text.replace("**", "^")
    return text if len(text) <= LONGEST else listed


class _Taken(ast.NodeTransformer):
    """Leaves of every conditional the branch that is taken."""

    def __init__(self, body: Body, values: Mapping[str, Any]) -> None:
        self.body, self.values = body, values

    def visit_IfExp(self, node: ast.IfExp) -> ast.AST:
        try:
            held = Body(node.test, self.body.constants, "explain").value(self.values)
        except (ArithmeticError, LookupError, TypeError, ValueError):
            return node  # a test on what is blank: both branches are shown
        return self.visit(node.body if held else node.orelse)  # type: ignore[no-any-return]


class _Named(ast.NodeTransformer):
    """Puts texts in place of names; the names of functions stay."""

    def __init__(self, shown: Mapping[str, str], constants: Mapping[str, Constant]) -> None:
        self.shown, self.constants = shown, constants

    def visit_Call(self, node: ast.Call) -> ast.AST:
        node.args = [self.visit(one) for one in node.args]
        return node

    def visit_Name(self, node: ast.Name) -> ast.AST:
        if node.id in self.shown:
            return ast.Name(self.shown[node.id], ast.Load())
        constant = self.constants.get(node.id)
        return node if constant is None else ast.Name(with_unit(float(constant), constant.unit), ast.Load())


def with_unit(value: Any, unit: str | None) -> str:
    """A value with its unit as a person writes it."""
    if value is None:
        return MISSING
    if isinstance(value, list):
        return f"[{sum(one is not None for one in value)} values]"
    text = f"{value:.10g}" if isinstance(value, float | int) else f"'{value}'"
    return text if unit in (None, "1") else f"{text} {unit}"
