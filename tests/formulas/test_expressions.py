"""A rule's expression is true only where its cells hold what it compares, formula and Python alike."""

from __future__ import annotations

from typing import Any

import pytest

from sheetcal.errors import BadInput
from sheetcal.formulas.expressions import expression_template, expression_value


def test_numbers_are_counted_and_text_is_tested() -> None:
    assert expression_template("oxygen_pressure > const.fill_limit") == (
        "IF(COUNT({const.fill_limit},{oxygen_pressure})=2,{oxygen_pressure}>{const.fill_limit},FALSE())"
    )
    assert expression_template('state == "valid" and sample.chlorine > const.chlorine_limit') == (
        "IF(AND(COUNT({const.chlorine_limit},{sample.chlorine})=2,ISTEXT({state}),COUNTBLANK({state})=0),"
        'AND({state}="valid",{sample.chlorine}>{const.chlorine_limit}),FALSE())'
    )


def test_a_reference_the_rule_tests_itself_is_not_guarded() -> None:
    assert expression_template("is_blank(void_reason)") == "COUNTBLANK({void_reason})=1"
    assert expression_template("is_number(a) and a > 3") == "AND(ISNUMBER({a}),IF(ISNUMBER({a}),{a}>3,FALSE()))"
    assert expression_template("is_number(a) and is_number(b) and a != b").endswith(
        "IF(AND(ISNUMBER({a}),ISNUMBER({b})),{a}<>{b},TRUE()))"
    )


def test_what_may_fail_is_caught() -> None:
    assert expression_template("a / b > 3") == "IF(COUNT({a},{b})=2,IFERROR({a}/{b}>3,FALSE()),FALSE())"
    assert expression_template("largest(runs.x) > 3") == (
        "IF(COUNT({runs.x})>0,IFERROR(MAX({runs.x})>3,FALSE()),FALSE())"
    )


@pytest.mark.parametrize(
    ("text", "cells", "holds"),
    [
        ("a > b", {"a": 2, "b": 1}, True),
        ("a > b", {"a": 2, "b": None}, False),
        ("a > b", {"a": "2,5", "b": 1}, False),
        ('state == "valid"', {"state": "VALID"}, True),
        ('state != "valid"', {"state": ""}, False),
        ("a / b > 1", {"a": 1, "b": 0}, False),
        ("abs(a / b - 1) > 0.3", {"a": 3, "b": 2}, True),
        ("count(runs.x) < 2", {"runs.x": 4.0}, True),
        ("count(runs.x) < 2", {"runs.x": [4.0, 5.0]}, False),
        ("largest(runs.x) - smallest(runs.x) > 3", {"runs.x": [4.0, None, 8.0]}, True),
        ("largest(runs.x) > 3", {"runs.x": [None, "x"]}, False),
        ("is_blank(a) or a > 1", {"a": "x"}, False),
        ("is_blank(a) or a > 1", {"a": ""}, True),
        ("not found(lot, table.lot.id)", {"lot": "B", "table.lot.id": ["a", "b"]}, False),
        ("not found(lot, table.lot.id)", {"lot": "c", "table.lot.id": ["a", "b"]}, True),
        ("not found(lot, table.lot.id)", {"lot": None, "table.lot.id": ["a", "b"]}, False),
        ('is_number(look_up(lot, ids, values))', {"lot": "b", "ids": ["a", "b"], "values": [1, 2]}, True),
        ("(a if is_number(a) else b) > 1", {"a": None, "b": 2}, True),
    ],
)  # fmt: skip
def test_values(text: str, cells: dict[str, Any], holds: bool) -> None:
    assert expression_value(text, cells.get) is holds


def test_a_rule_that_is_no_formula_is_refused() -> None:
    with pytest.raises(BadInput, match="is no expression"):
        expression_value("a >", {}.get)
    with pytest.raises(BadInput, match="`a % 2`"):
        expression_template("a % 2 > 1")
    with pytest.raises(BadInput, match="not among the primitives"):
        expression_template("open(a) > 1")
