"""What each spreadsheet function does to units: one rule for each function of functions.py."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction
from typing import TYPE_CHECKING

from sheetcal.check import weights
from sheetcal.check.measures import NEUTRAL, NUMBER, PURE, TEXT, Meaning, Measure, Neutral, Unit, Words
from sheetcal.check.tree import Call, Node, Number, Range, binary

if TYPE_CHECKING:
    from sheetcal.check.dimensions import Analysis

Rule = Callable[["Analysis", Call], Meaning]


def _every(analysis: Analysis, node: Call) -> list[Meaning]:
    """What each argument stands for."""
    return [analysis.meaning(one) for one in node.arguments]


def _known(rule: Rule) -> Rule:
    """The rule where every argument has a meaning; what is unknown stays unknown."""

    def guarded(analysis: Analysis, node: Call) -> Meaning:
        if any(isinstance(one, Neutral) for one in _every(analysis, node)):
            return NEUTRAL
        return rule(analysis, node)

    return guarded


def _counts(analysis: Analysis, node: Call) -> Meaning:
    """A pure number whatever the arguments are."""
    _every(analysis, node)
    return NUMBER


def _asked(analysis: Analysis, node: Call) -> Meaning:
    """A question about what a cell holds: the branches of an IF inside need not agree."""
    inside = node.arguments[0]
    if isinstance(inside, Call) and inside.function == "IF":
        _every(analysis, inside)
        return NUMBER
    return _counts(analysis, node)


def _words(analysis: Analysis, node: Call) -> Meaning:
    _every(analysis, node)
    return TEXT


def _pure(analysis: Analysis, node: Call) -> Meaning:
    for one in node.arguments:
        analysis.pure(one, f"takes {node.function} of")
    return NUMBER


def _first(analysis: Analysis, node: Call) -> Meaning:
    """The first argument, rounded or picked; the others are pure numbers."""
    for one in node.arguments[1:]:
        analysis.pure(one, f"gives {node.function} a place of")
    return analysis.meaning(node.arguments[0])


def _common(analysis: Analysis, node: Call) -> Meaning:
    """What all arguments have in common: AVERAGE, MIN, MAX, MEDIAN."""
    found = analysis.one_of(node, list(node.arguments), f"takes {node.function} of")
    if isinstance(found, Words):
        raise analysis.error(node, f"takes {node.function} of text")
    return found


def _spread(power: int) -> Rule:
    """A spread about the mean, which the zero of the scale does not move."""

    def rule(analysis: Analysis, node: Call) -> Meaning:
        found = _common(analysis, node)
        return Measure(PURE.times(found.unit, power)) if isinstance(found, Measure) else found

    return rule


def _powered(power: Fraction) -> Rule:
    def rule(analysis: Analysis, node: Call) -> Meaning:
        analysis.one_of(node, list(node.arguments), f"takes {node.function} of")
        found = [analysis.rise(one, f"takes {node.function} of") for one in node.arguments]
        return Measure(PURE.times(found[0].unit, power))

    return rule


def _sum(analysis: Analysis, node: Call) -> Meaning:
    """SUM: a range of temperatures weighs as many as it holds."""
    weight: Node = weights.NONE
    unit: Unit | None = None
    for one in node.arguments:
        found = analysis.number(one, "adds")
        if isinstance(analysis.meaning(one), Neutral):
            continue
        if unit is not None and not unit.same(found.unit):
            raise analysis.error(node, f"adds {Measure(unit).name} to {found.name}")
        unit = found.unit
        many = isinstance(one, Range) or analysis.is_series(one)
        counted = weights.times(found.weight, Call("COUNT", (one,), 2)) if many else found.weight
        weight = weights.plus(weight, counted)
    return NEUTRAL if unit is None else Measure(unit, weight)


def _sum_if(analysis: Analysis, node: Call) -> Meaning:
    _every(analysis, node)
    return Measure(analysis.rise(node.arguments[2 if len(node.arguments) > 2 else 0], "adds").unit)


def _average_if(analysis: Analysis, node: Call) -> Meaning:
    """AVERAGEIF: a mean of temperatures is a temperature."""
    _every(analysis, node)
    found = analysis.number(node.arguments[2 if len(node.arguments) > 2 else 0], "averages")
    return Measure(found.unit, found.weight)


def _product(analysis: Analysis, node: Call) -> Meaning:
    """PRODUCT: of a range only pure numbers, since nobody says how many there are."""
    unit = PURE
    for one in node.arguments:
        many = isinstance(one, Range) or analysis.is_series(one)
        found = analysis.pure(one, "multiplies a range of") if many else analysis.rise(one, "multiplies")
        unit = unit.times(found.unit)
    return Measure(unit)


def _product_sum(analysis: Analysis, node: Call) -> Meaning:
    """SUMPRODUCT: its arguments are multiplied, the rows added."""
    product = node.arguments[0]
    for one in node.arguments[1:]:
        product = binary("*", product, one)
    found = analysis.number(product, "adds")
    return Measure(found.unit, weights.summed(found.weight, product))


def _line(analysis: Analysis, node: Call) -> tuple[Measure, Measure]:
    """(y, x) of a fitted line; each must have one weight for all its points."""
    y, x = (analysis.number(one, "fits") for one in node.arguments[-2:])
    for one, found in zip(node.arguments[-2:], (y, x), strict=True):
        if not isinstance(found.weight, Number):
            raise analysis.error(one, "fits values that depend on where a scale has its zero")
    return y, x


def _slope(analysis: Analysis, node: Call) -> Meaning:
    y, x = _line(analysis, node)
    return Measure(y.unit.times(x.unit, -1))


def _intercept(analysis: Analysis, node: Call) -> Meaning:
    y, _ = _line(analysis, node)
    analysis.rise(node.arguments[1], "takes the intercept at the zero of")
    return Measure(y.unit, y.weight)


def _forecast(analysis: Analysis, node: Call) -> Meaning:
    if any(isinstance(analysis.meaning(one), Neutral) for one in node.arguments[1:]):
        return NEUTRAL  # at a literal 0 the line is as well known as anywhere
    y, _ = _line(analysis, node)
    analysis.one_of(node, [node.arguments[0], node.arguments[2]], "sets beside each other")
    return Measure(y.unit, y.weight)


def _scatter(analysis: Analysis, node: Call) -> Meaning:
    return Measure(_line(analysis, node)[0].unit)


def _correlated(analysis: Analysis, node: Call) -> Meaning:
    _line(analysis, node)
    return NUMBER


def _match(analysis: Analysis, node: Call) -> Meaning:
    analysis.one_of(node, list(node.arguments[:2]), "looks up")
    return NUMBER


def _if(analysis: Analysis, node: Call) -> Meaning:
    analysis.meaning(node.arguments[0])
    return analysis.one_of(node, list(node.arguments[1:]), "gives")


def _either(analysis: Analysis, node: Call) -> Meaning:
    return analysis.one_of(node, list(node.arguments), "gives")


def _choose(analysis: Analysis, node: Call) -> Meaning:
    analysis.pure(node.arguments[0], "chooses by")
    return analysis.one_of(node, list(node.arguments[1:]), "gives")


def _modulo(analysis: Analysis, node: Call) -> Meaning:
    _either(analysis, node)
    return Measure(analysis.rise(node.arguments[0], "takes MOD of").unit)


def _size(analysis: Analysis, node: Call) -> Meaning:
    return Measure(analysis.rise(node.arguments[0], "takes ABS of").unit)


def _sign(analysis: Analysis, node: Call) -> Meaning:
    analysis.rise(node.arguments[0], "takes SIGN of")
    return NUMBER


def _power(analysis: Analysis, node: Call) -> Meaning:
    return analysis.raised(node, *node.arguments)


_QUESTIONS = ("ISNUMBER", "ISTEXT", "ISNONTEXT", "ISLOGICAL", "ISBLANK", "ISERROR", "ISERR", "ISNA")
_COUNTS = (
    "COUNT", "COUNTA", "COUNTBLANK", "COUNTIF", "LEN", "EXACT", "ROWS", "COLUMNS", "AND", "OR", "NOT", "TRUE",
    "FALSE", "PI", "TIMEVALUE",
)  # fmt: skip
RULES: dict[str, Rule] = {
    **dict.fromkeys(_QUESTIONS, _asked),
    **dict.fromkeys(_COUNTS, _counts),
    **dict.fromkeys(["TRIM", "UPPER", "LOWER"], _words),
    **dict.fromkeys(["EXP", "LN", "LOG10", "LOG"], _pure),
    **dict.fromkeys(["INDEX", "ROUND", "ROUNDUP", "ROUNDDOWN", "TRUNC", "INT"], _first),
    **dict.fromkeys(["AVERAGE", "MIN", "MAX", "MEDIAN"], _common),
    **dict.fromkeys(["STDEV", "STDEV.S", "STDEVP", "STDEV.P"], _spread(1)),
    **dict.fromkeys(["VAR", "VAR.S", "DEVSQ"], _spread(2)),
    **dict.fromkeys(["CORREL", "RSQ"], _correlated),
    "SQRT": _known(_powered(Fraction(1, 2))),
    "SUMSQ": _known(_powered(Fraction(2))),
    "SUM": _sum,
    "SUMIF": _known(_sum_if),
    "AVERAGEIF": _known(_average_if),
    "PRODUCT": _known(_product),
    "SUMPRODUCT": _known(_product_sum),
    "SLOPE": _known(_slope),
    "INTERCEPT": _known(_intercept),
    "FORECAST": _forecast,
    "STEYX": _known(_scatter),
    "MATCH": _match,
    "IF": _if,
    "IFERROR": _either,
    "CHOOSE": _choose,
    "MOD": _known(_modulo),
    "ABS": _known(_size),
    "SIGN": _sign,
    "POWER": _known(_power),
    "NA": lambda analysis, node: NEUTRAL,
}
