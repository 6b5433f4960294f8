"""What a person may type as an argument of an add-in function: it gives a value, #N/A or #VALUE!, never a crash."""

from __future__ import annotations

from typing import Any

import pytest
from calc_client import Calc, spelled

pytestmark = pytest.mark.office
COLUMNS = "ABCDEFGHIJ"
# A: numbers; B: an error, text, a formula's empty text, TRUE, a date, blanks; row 1 first.
NUMBERS = [0.0, 1.5, 3.0, 4.5, 6.0, 7.5, 9.0, 10.5, 12.0, 13.5]
ODD = ["=NA()", "=1/0", "abc", '=""', "=TRUE()", "=DATE(2024;5;1)", '="2.5"', "", ""]

CALLS: list[tuple[str, Any]] = [
    # values, typed, nested and from cells
    ("HEAT_FROM_RISE(180;4.18;5)", 3762.0),
    ("HEAT_FROM_RISE(A3;A2;A5)", 27.0),
    ("HEAT_FROM_RISE(TOTAL_OF(A1:A3);2;3)", 27.0),
    ("TOTAL_OF(A1:A3)+HEAT_FROM_RISE(1;1;1)", 5.5),
    # out of range, missing, left out
    ("HEAT_FROM_RISE(-1;4.18;5)", "#N/A"),
    ("HEAT_FROM_RISE(180;4.18)", "#N/A"),
    ("HEAT_FROM_RISE()", "#N/A"),
    ("HEAT_FROM_RISE(180;;5)", "#N/A"),
    ('HEAT_FROM_RISE("";4.18;5)', "#N/A"),
    ("HEAT_FROM_RISE(B4;4.18;5)", "#N/A"),
    ("HEAT_FROM_RISE(1E308;1E308;1E308)", "#N/A"),
    ("MASS_FROM_HEAT(100;4.18;0)", "#N/A"),
    # a relation that does not hold: the two temperatures are equal
    ("COOLING_CONSTANT(0.001;0.002;24;24)", "#N/A"),
    # wrong types
    ('HEAT_FROM_RISE("x";4.18;5)', "#VALUE!"),
    ('HEAT_FROM_RISE("2.5";4.18;5)', "#VALUE!"),
    ("HEAT_FROM_RISE(B3;4.18;5)", "#VALUE!"),
    ("HEAT_FROM_RISE(B7;4.18;5)", "#VALUE!"),
    ("HEAT_FROM_RISE(A1:A5;4.18;5)", "#VALUE!"),
    ("HEAT_FROM_RISE({1;2};4.18;5)", "#VALUE!"),
    ("HEAT_FROM_RISE(A:A;4.18;5)", "#VALUE!"),
    ("WAITING_FOR(5)", "#VALUE!"),
    ("FORM_WORDS(1)", "#VALUE!"),
    # truth values and dates are numbers to Calc; an error goes through
    ("HEAT_FROM_RISE(B5;4.18;5)", 20.9),
    ("HEAT_FROM_RISE(B6;1;1)", 45413.0),
    ("HEAT_FROM_RISE(B1;1;1)", "#N/A"),
    ("HEAT_FROM_RISE(B2;1;1)", "#DIV/0!"),
    # a blank cell: 0 as in Calc's own arithmetic, but a range shows the blank; for a text it is missing
    ("HEAT_FROM_RISE(J9;4.18;5)", 0.0),
    ("HEAT_FROM_RISE(J9:J9;4.18;5)", "#N/A"),
    ("HEAT_FROM_RISE(A3:A3;4.18;5)", 62.7),
    ("WAITING_FOR(J9)", "#N/A"),
    # ranges
    ("TOTAL_OF(A1:A10)", 67.5),
    ("TOTAL_OF(A4)", 4.5),
    ("TOTAL_OF(A1:A10!A2:A3)", 4.5),
    ("TOTAL_OF(OFFSET(A1;1;0;3;1))", 9.0),
    ("TOTAL_OF(INDEX(A1:A9;2):A4)", 9.0),
    ('TOTAL_OF(INDIRECT("A1:A4"))', 9.0),
    ("TOTAL_OF(Other.A1:C2)", 21.0),
    ("TOTAL_OF(J1:J9)", "#N/A"),
    ("TOTAL_OF(B3:B3)", "#N/A"),
    ("TOTAL_OF(A2:B2)", "#VALUE!"),
    ("TOTAL_OF(B1)", "#VALUE!"),
    ("TOTAL_OF(A2:A3~A5:A6)", "Err:504"),
    ("TOTAL_OF($Sheet1.A2:$Other.A3)", "#VALUE!"),
    ("TOTAL_OF($Sheet1.A2:$Sheet1.A3)", 4.5),
    ("TOTAL_OF($'odd. na-me'.A1:B2)", 10.0),
    ("TOTAL_OF(5)", "Err:504"),
    ("TOTAL_OF()", "Err:504"),
    ("TOTAL_OF(#REF!)", "#REF!"),
    ("SLOPE_OF(A1:A10;A1:A10)", 1.0),
    # whole columns, rows and the whole sheet
    ("TOTAL_OF(A:A)", 67.5),
    ("TOTAL_OF(A:B)", "#VALUE!"),
    ("TOTAL_OF(10:10)", 13.5),
    ("TOTAL_OF(A3:A1048576)", 66.0),
    ("TOTAL_OF(Other.A1:XFD1048576)", 21.0),
    ("TOTAL_OF(J:Z)", "#N/A"),
    ("SLOPE_OF(A:A;A:A)", 1.0),
    # optional arguments, left out at the end, in the middle, blank; text results are text, also an empty one
    ("VALUE_OR_ZERO()", 0.0),
    ("VALUE_OR_ZERO(J9:J9)", 0.0),
    ("VALUE_OR_ZERO(A3)", 3.0),
    ('WAITING_FOR("sample";1;1;1;1;1;1;1;1;1)', ""),
    ('WAITING_FOR("Sample";1;1;;1;1;1;1;1;J9:J9)', "ash; O; "),
    ('WAITING_FOR("sample";1;1;1;1;1;1;1;1)', "O; "),
    ('WAITING_FOR("control")', "#N/A"),
    ("SUM_OF_COMPOSITION(70;5;1;1;10;8)", 95.0),
    ("SUM_OF_COMPOSITION(70;5;1;1;10;8;0.5)", 95.5),
    # too many
    ("HEAT_FROM_RISE(1;1;1;1)", "Err:504"),
]  # fmt: skip


@pytest.fixture(scope="module")
def shown(calc: Calc) -> list[Any]:
    """What Calc shows for each call."""
    calc.new(document="values")
    calc.put(document="values", tab="Sheet1", column=0, row=0, rows=[[one] for one in NUMBERS])
    calc.formulas(document="values", tab="Sheet1", column=1, row=0, texts=ODD)
    calc.put(document="values", tab="Other", column=0, row=0, rows=[[1.0, 2.0, 3.0], [4.0, 5.0, 6.0]])
    calc.put(document="values", tab="odd. na-me", column=0, row=0, rows=[[1.0, 2.0], [3.0, 4.0]])
    texts = ["=" + spelled(call) for call, _ in CALLS]
    calc.formulas(document="values", tab="Sheet1", column=50, row=100, texts=texts)
    calc.recalculate(document="values")
    found = calc.read(document="values", tab="Sheet1", cells=f"AY101:AY{100 + len(CALLS)}")
    calc.close(document="values")
    return [row[0] for row in found]


@pytest.mark.parametrize("index", range(len(CALLS)), ids=[call for call, _ in CALLS])
def test_each_call_shows_what_it_must(shown: list[Any], index: int) -> None:
    call, wanted = CALLS[index]
    found = shown[index]
    if isinstance(wanted, float):
        assert isinstance(found, float) and found == pytest.approx(wanted, rel=1e-14), call
    else:
        assert found == wanted, call


def test_what_a_function_rests_on_is_calculated_first_and_again(calc: Calc) -> None:
    """A chain of forty sums over the rows below, written from the top, and its change by one reading."""
    calc.new(document="chain")
    texts = ["=" + spelled(f"TOTAL_OF(A{row + 1}:A41)") for row in range(1, 41)]
    calc.formulas(document="chain", tab="Sheet1", column=0, row=0, texts=texts)
    for value in (1.0, 3.0):
        calc.put(document="chain", tab="Sheet1", column=0, row=40, rows=[[value]])
        assert calc.read(document="chain", tab="Sheet1", cells="A1") == [[value * 2.0**39]]
    calc.close(document="chain")


def test_a_circle_is_an_error_and_no_crash(calc: Calc) -> None:
    calc.new(document="circle")
    texts = ["=" + spelled("TOTAL_OF(A2:A3)"), "=" + spelled("TOTAL_OF(A1:A1)"), "=" + spelled("TOTAL_OF(A:A)")]
    calc.formulas(document="circle", tab="Sheet1", column=0, row=0, texts=texts)
    calc.recalculate(document="circle")
    shown = [row[0] for row in calc.read(document="circle", tab="Sheet1", cells="A1:A3")]
    assert all(isinstance(one, str) and one.startswith(("#", "Err")) for one in shown), shown
    assert calc.language() is not None
    calc.close(document="circle")
