"""Every cell function, called in a real Calc as a function of the add-in, gives what it gives in Python."""

from __future__ import annotations

from typing import Any

import pytest
from addin_case import Cases
from calc_client import Calc
from cell_points import GOOD_POINTS, ErrorCell, edge_points, good_points

from sheetcal.cells import registry
from sheetcal.cells.registry import Argument, CellFunction
from sheetcal.errors import OutOfRange

pytestmark = pytest.mark.office
NOT_AVAILABLE, WRONG_TYPE = "#N/A", "#VALUE!"


def expected(function: CellFunction, point: dict[str, Any]) -> Any:
    """What the cell must show, told from Python's own guarded call and the types of the arguments."""
    for argument in function.args:
        if isinstance(point[argument.name], ErrorCell):
            return NOT_AVAILABLE  # NA() goes through
    if any(not argument.series and _wrong(argument, point[argument.name]) for argument in function.args):
        return WRONG_TYPE
    try:
        result = registry.call(function.name, **point)
    except (OutOfRange, ArithmeticError, LookupError, ValueError):
        return NOT_AVAILABLE
    if function.unit is None:
        return result or ""
    return NOT_AVAILABLE if result is None or result == "" or result != result else float(result)


def _wrong(argument: Argument, value: Any) -> bool:
    if value is None or value == "":
        return False
    return isinstance(value, str) != argument.text


def agrees(wanted: Any, found: Any, largest_term: float) -> bool:
    if isinstance(wanted, str) or isinstance(found, str):
        return bool(wanted == found)
    return bool(abs(wanted - found) <= 1e-12 * max(abs(wanted), largest_term))


def test_every_function_agrees_at_twenty_points_and_at_its_edges(calc: Calc) -> None:
    cases = Cases()
    asked: list[tuple[CellFunction, dict[str, Any]]] = []
    for function in registry.all():
        for point in good_points(function) + edge_points(function):
            cases.add(function, point)
            asked.append((function, point))
    found = cases.results(calc)
    wrong = []
    counted: dict[str, dict[Any, int]] = {}
    for (function, point), shown in zip(asked, found, strict=True):
        wanted = expected(function, point)
        kind = wanted if wanted in (NOT_AVAILABLE, WRONG_TYPE) else "result"
        kinds = counted.setdefault(function.name, {})
        kinds[kind] = kinds.get(kind, 0) + 1
        if not agrees(wanted, shown, 25.0 if function.name.endswith("_SCATTER") else 0.0):
            wrong.append((function.name, point, wanted, shown))
    assert not wrong, (len(wrong), wrong[:5])
    assert set(counted) == {function.name for function in registry.all()}
    assert min(kinds["result"] for kinds in counted.values()) >= GOOD_POINTS
    total = {kind: sum(kinds.get(kind, 0) for kinds in counted.values()) for kind in ("result", "#N/A", "#VALUE!")}
    print(f"\n{len(asked)} calls of {len(counted)} functions in a real Calc: {total}")
    assert total["#N/A"] > 500 and total["#VALUE!"] > 300
