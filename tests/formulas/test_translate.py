"""A body becomes a guarded formula, and what no spreadsheet can say is refused with its line."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from typing import Any

import pytest

from sheetcal.cells import registry
from sheetcal.cells.grammar import Constant, read_body, read_need
from sheetcal.cells.primitives import count, is_blank, is_number, is_text, join, mean
from sheetcal.cells.registry import G_OR_BLANK, ONE, TEXT, TEXT_OR_BLANK, G, J, K, cell
from sheetcal.errors import BadInput
from sheetcal.formulas import spelling
from sheetcal.formulas.translate import fill, formula_template

FACTS: dict[str, Any] = {"equation": "x", "source": "y", "standing": "derived"}
BASE = Constant(2.0, "1", name="base_number", source="trial")


@pytest.fixture
def trial() -> Iterator[Callable[..., str]]:
    """Registers a function under TRIAL for one test and gives its template."""

    def template(function: Callable[..., Any], omitted: tuple[str, ...] = (), **options: Any) -> str:
        registry._functions.pop("TRIAL", None)
        formula_template.cache_clear()
        cell("TRIAL", **FACTS, **options)(function)
        return formula_template("TRIAL", omitted)

    yield template
    registry._functions.pop("TRIAL", None)
    formula_template.cache_clear()


def test_a_guarded_product() -> None:
    assert formula_template("HEAT_FROM_RISE") == (
        "IF(COUNT({mass},{specific_heat},{rise})=3,IF(AND({mass}>=0,{mass}<=1000000,{specific_heat}>=0,"
        '{specific_heat}<=20),{mass}*{specific_heat}*{rise},""),"")'
    )


def test_locals_go_in_place_with_the_brackets_they_need(trial: Callable[..., str]) -> None:
    def body(mass: G, rise: K) -> ONE:
        """Trial."""
        total = mass + rise
        power = -(total**2)
        return (mass - total) / (power * BASE)

    assert trial(body) == (
        'IF(COUNT({mass},{rise})=2,({mass}-({mass}+{rise}))/((-(({mass}+{rise})^2))*base_number),"")'
    )


def test_text_conditions_and_joined_words(trial: Callable[..., str]) -> None:
    def body(state: TEXT, mass: G) -> TEXT:
        """Trial."""
        quoted = 'a "quoted" word'
        return join("not ", state) if not (state == "valid" and mass > 0) or 1 < mass <= 2 else quoted

    assert trial(body) == (
        "IF(AND(COUNT({mass})=1,ISTEXT({state}),COUNTBLANK({state})=0),"
        'IF(OR(NOT(AND({state}="valid",{mass}>0)),AND(1<{mass},{mass}<=2)),"not "&{state},'
        '"a ""quoted"" word"),"")'
    )


def test_relations_that_may_fail_are_nested_in_their_order(trial: Callable[..., str]) -> None:
    def body(mass: G, rise: K) -> ONE:
        """Trial."""
        return mass / rise

    assert trial(body, needs=("rise != 0", "mass / rise > 1", "mass > 0 and rise < 9", "1 / rise > 0 or mass > 1")) == (
        "IF(COUNT({mass},{rise})=2,IF({rise}<>0,IF({mass}/{rise}>1,IF(AND({mass}>0,{rise}<9),"
        'IF(IF(1/{rise}>0,TRUE(),{mass}>1),{mass}/{rise},""),""),""),""),"")'
    )


def test_an_optional_argument_without_a_cell_is_settled(trial: Callable[..., str]) -> None:
    def body(mass: G, tare: G_OR_BLANK, lot: TEXT_OR_BLANK) -> G:
        """Trial."""
        net = mass - tare if is_number(tare) and mass > 1 else mass
        known = 1 if not is_blank(lot) or lot == "a" else 2
        kept = 3 if is_text(lot) or mass > 3 else known
        return net * kept if is_blank(tare) or mass > 2 else net

    needs = ("is_number(tare) or is_blank(tare)", "is_blank(lot) and mass > 0 and mass < 9", "is_blank(lot)")
    both = trial(body, ("lot", "tare"), needs=needs)
    assert both == 'IF(COUNT({mass})=1,IF(AND({mass}>0,{mass}<9),{mass}*IF({mass}>3,3,2),""),"")'
    whole = trial(body, needs=needs)
    assert "COUNT({mass},{tare})+COUNTBLANK({tare})=2,COUNTBLANK({lot})+ISTEXT({lot})>0" in whole
    with pytest.raises(BadInput, match=re.escape("['mass'] cannot be left out")):
        formula_template("TRIAL", ("mass",))


def test_ranges_of_optional_numbers_and_series_are_guarded(trial: Callable[..., str]) -> None:
    def body(values: registry.MASSES, tare: G_OR_BLANK) -> G:
        """Trial."""
        return mean(values) - (tare if is_number(tare) else 0)

    assert trial(body, valid={"values": (0, 5), "tare": (None, 3)}, needs=("count(values) > 1",)) == (
        "IF(AND(COUNT({tare})+COUNTBLANK({tare})=1,COUNT({values})>0),IF(AND(MIN({values})>=0,MAX({values})<=5,"
        'OR(COUNTBLANK({tare})=1,{tare}<=3),COUNT({values})>1),AVERAGE({values})-IF(ISNUMBER({tare}),{tare},0),""),"")'
    )


def test_references_are_filled_in() -> None:
    assert fill("{a}+{b.c}", {"a": "A1", "b.c": "Readings!B2"}) == "A1+Readings!B2"
    with pytest.raises(KeyError):
        fill("{a}", {})


def test_numbers_are_spelled_as_they_survive_saving() -> None:
    spelled = [spelling.number(value) for value in (44004.0, 1e-9, 0.1, 1e6, -2.5, 0.0, 8.31446261815324)]
    assert spelled == ["44004", "0.000000001", "0.1", "1000000", "-2.5", "0", "8.31446261815324"]
    assert (spelling.truth(True), spelling.truth(False)) == ("TRUE()", "FALSE()")
    assert spelling.text('say "no"') == '"say ""no"""'


KNOWN_FUNCTIONS = {
    *(
        "IF",
        "AND",
        "OR",
        "NOT",
        "TRUE",
        "FALSE",
        "COUNT",
        "COUNTA",
        "MEDIAN",
        "TIMEVALUE",
        "IFERROR",
        "COUNTBLANK",
        "ISNUMBER",
        "ISTEXT",
        "INDEX",
    ),
    *("MATCH", "SUM", "SUMIF", "AVERAGE", "MIN", "MAX", "STDEV", "SLOPE", "STEYX", "FORECAST", "SUMPRODUCT"),
    *("ABS", "INT", "ROUND", "SQRT", "EXP", "LN", "LOG10", "CHOOSE"),
}


def test_formulas_use_only_functions_every_program_knows_and_stay_short() -> None:
    templates = [formula_template(function.name) for function in registry.all()]
    used = {name for template in templates for name in re.findall(r"([A-Z][A-Z0-9.]*)\(", template)}
    assert used <= KNOWN_FUNCTIONS, used - KNOWN_FUNCTIONS
    assert max(map(len, templates)) < 8192 / 4  # a quarter of what a cell may hold
    assert not [template for template in templates if re.search(r"\d[eE][+-]?\d", template)]


# One refused body each: what it holds, and the expression that the refusal must name.
def loop(mass: G) -> G:
    for _ in range(3):
        mass = mass + 1
    return mass


def twice(mass: G) -> G:
    double = mass * 2
    double = double * 2
    return double


def no_return(mass: G) -> None:
    double = mass * 2  # noqa: F841  # the point of the test


def argument_again(mass: G) -> G:
    mass = mass * 2
    return mass


def unpacked(mass: G) -> G:
    one, two = mass, mass
    return one + two


def remainder(mass: G) -> G:
    return mass % 2


def plus_text(state: TEXT) -> TEXT:
    return state + "x"


def positive(mass: G) -> G:
    return +mass


def member(mass: G) -> bool:
    return mass in (1, 2)


def none(mass: G) -> None:
    return None


def braces(mass: G) -> TEXT:
    return "{mass}"


def stranger(mass: G) -> G:
    return mass * FACTS  # type: ignore[operator,return-value]


def called(mass: G) -> float:
    return round(mass)


def keyword(mass: G) -> float:
    return count(series=mass)  # type: ignore[arg-type]


def too_many(mass: G) -> float:
    return count(mass, mass)  # type: ignore[call-arg,arg-type]


def comprehension(mass: G) -> J:
    return sum([mass for _ in (1, 2)])


REFUSED = [
    (loop, "for _ in range(3):"),
    (twice, "`double` is assigned a second time"),
    (no_return, "a body ends with one return"),
    (argument_again, "`mass` is assigned a second time"),
    (unpacked, "only a plain name may be assigned"),
    (remainder, "`mass % 2`: the operator Mod"),
    (plus_text, "`state + 'x'`: text is joined with `join`"),
    (positive, "`+mass`: the operator UAdd"),
    (member, "`mass in (1, 2)`: only < <= > >= == !="),
    (none, "`None`: only numbers"),
    (braces, "text may hold no braces"),
    (stranger, "`FACTS`: is neither an argument"),
    (called, "`round(mass)`: `round` is not among the primitives"),
    (keyword, "a primitive takes plain arguments in order"),
    (too_many, "`count(mass, mass)`: too many positional arguments"),
    (comprehension, "`sum([mass for _ in (1, 2)])`: `sum` is not among the primitives"),
]


@pytest.mark.parametrize(("function", "words"), REFUSED)
def test_a_body_that_is_no_formula_is_refused_with_its_line(function: Callable[..., Any], words: str) -> None:
    with pytest.raises(BadInput) as refusal:
        read_body(function, list(function.__annotations__)[:-1])
    assert words in str(refusal.value)
    first = function.__code__.co_firstlineno
    line = int(re.search(r"line (\d+)", refusal.value.where)[1])  # type: ignore[index]
    assert refusal.value.where.startswith(__file__) and first <= line <= first + 3


def test_other_syntax_is_refused_by_its_name() -> None:
    with pytest.raises(BadInput, match="ListComp cannot be written as a formula"):
        read_need("count([x for x in (1, 2)]) > 1", "TRIAL", ["x"], {})
    with pytest.raises(BadInput, match="is no expression"):
        read_need("mass >", "TRIAL", ["mass"], {})
