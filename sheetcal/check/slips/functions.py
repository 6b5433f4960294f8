"""Functions that people put for others or round a part of a formula, and what each does to the value."""

from __future__ import annotations

from sheetcal.check.program import arity
from sheetcal.check.tree import Call, Node, Number, Text, walk

Told = tuple[str, str]  # what the formula does now; how that came about

CLOCK = {"NOW", "TODAY"}
CHANCE = {"RAND", "RANDBETWEEN", "RANDARRAY"}
PASSING = ("SUBTOTAL", "AGGREGATE")
LOOK_UPS = {"VLOOKUP", "HLOOKUP", "LOOKUP", "XLOOKUP"}
ROUNDING = {
    "ROUND", "ROUNDUP", "ROUNDDOWN", "INT", "TRUNC", "MROUND", "CEILING", "FLOOR", "EVEN", "ODD", "FIXED", "TEXT",
    "CEILING.MATH", "FLOOR.MATH", "VALUE",
}  # fmt: skip
# Functions of the common programs that this interpreter does not reckon with; any other name is unknown to it.
OTHERS = CLOCK | CHANCE | LOOK_UPS | ROUNDING | {
    *PASSING, "INDIRECT", "OFFSET", "CELL", "INFO", "ADDRESS", "SUMIFS", "AVERAGEIFS", "COUNTIFS", "AVERAGEA", "STDEVA",
    "STDEVPA", "VARP", "VAR.P", "TRIMMEAN", "GEOMEAN", "HARMEAN", "LARGE", "SMALL", "RANK", "PERCENTILE", "QUARTILE",
    "MODE", "LINEST", "TREND", "GROWTH", "LOGEST", "N", "T", "VALUE", "CONCATENATE", "LEFT", "RIGHT", "MID", "DATE",
    "TIME", "DAY", "MONTH", "YEAR", "HOUR", "MINUTE", "SECOND", "DATEVALUE", "MINA", "MAXA", "QUOTIENT", "IFNA",
    "ISERROR", "SIN", "COS", "TAN", "DEGREES", "RADIANS", "CONVERT", "SUBSTITUTE", "FIND", "SEARCH", "XOR",
    "REPT", "CHAR", "CLEAN", "PROPER",
}  # fmt: skip
NEAREST: Told = (
    "looks for the nearest entry below instead of the one named, in a table that is not sorted",
    "the look-up was made approximate: its last argument 0 is gone",
)
_SAME = {"STDEV.S": "STDEV", "STDEV.P": "STDEVP", "VAR.S": "VAR", "VAR.P": "VARP", "LOG10": "LOG"}
_SWAPS: dict[tuple[str, str], Told] = {
    ("STDEV", "STDEVP"): ("divides by n instead of n - 1: the deviation comes out too small", "STDEVP for STDEV"),
    ("VAR", "VARP"): ("divides by n instead of n - 1: the variance comes out too small", "VARP for VAR"),
    ("AVERAGE", "MEDIAN"): ("takes the median instead of the mean", "MEDIAN for AVERAGE"),
    ("AVERAGE", "SUM"): ("takes the sum instead of the mean", "SUM for AVERAGE"),
    ("AVERAGE", "AVERAGEA"): ("counts text and truth values into the mean", "AVERAGEA for AVERAGE"),
    ("AVERAGE", "MAX"): ("takes the greatest value instead of the mean", "MAX for AVERAGE"),
    ("AVERAGE", "MIN"): ("takes the least value instead of the mean", "MIN for AVERAGE"),
    ("SUM", "AVERAGE"): ("takes the mean instead of the sum", "AVERAGE for SUM"),
    ("LN", "LOG"): ("takes the logarithm to base 10 instead of the natural one: 2.3026 times too small", "LOG for LN"),
    ("LOG", "LN"): ("takes the natural logarithm instead of the one to base 10: 2.3026 times too large", "LN for LOG"),
    ("MIN", "MAX"): ("takes the greatest value instead of the least", "MAX for MIN"),
    ("MAX", "MIN"): ("takes the least value instead of the greatest", "MIN for MAX"),
    ("COUNT", "COUNTA"): ("counts text as if it were numbers", "COUNTA for COUNT"),
    ("SLOPE", "INTERCEPT"): ("takes the intercept instead of the slope", "INTERCEPT for SLOPE"),
}  # fmt: skip


def swapped(expected: str, found: str) -> Told | None:
    """What a function in place of another does; None where nothing is known of the pair."""
    pair = _SAME.get(expected, expected), _SAME.get(found, found)
    if pair in _SWAPS:
        return _SWAPS[pair]
    if pair[1] in PASSING:
        return f"passes over rows that a filter hides, and over other subtotals ({found})", f"a {found} was put in"
    if pair[1] in LOOK_UPS:
        return f"looks up by {found}, which may take the nearest entry, not the one named", "the look-up was rewritten"
    if pair[1] in ROUNDING and pair[0] in ROUNDING:
        return f"rounds by {found} instead of {expected}", f"{found} for {expected}"
    return None


def wrapper(found: Call, named: str) -> Told:
    """What a function put round a part does. named: the part in words with a blank before, or nothing."""
    name = found.function
    if name in ROUNDING:
        return f"rounds{named or ' a part'}{_places(found)} ({name}): the error travels on", "rounded in mid-chain"
    if name in ("IFERROR", "IFNA", "IF"):
        return f"hides{named or ' a part'} where it is an error or a condition fails ({name})", "errors were hidden"
    if name == "ABS":
        return f"drops the sign of{named or ' a part'}", "ABS was put round it"
    if name in ("N", "VALUE", "T"):
        return f"turns{named or ' a part'} into another type ({name})", f"{name} was put round it"
    return f"puts {name} round{named or ' a part'}", f"{name} was put round it"


def _places(found: Call) -> str:
    """` to 2 decimals` where the call says so."""
    if found.function in ("ROUND", "ROUNDUP", "ROUNDDOWN", "TRUNC", "FIXED") and len(found.arguments) == 2:
        digits = found.arguments[1]
        if isinstance(digits, Number) and digits.value == int(digits.value) >= 0:
            return f" to {int(digits.value)} decimals"
    if found.function == "TEXT" and len(found.arguments) == 2 and isinstance(found.arguments[1], Text):
        return f" to what '{found.arguments[1].value[:20]}' shows"
    return " to whole numbers" if found.function in ("INT", "ROUND", "TRUNC") else ""


def hides(tree: Node) -> int:
    """How often a formula puts something else where an error would show."""
    return sum(isinstance(node, Call) and node.function in ("IFERROR", "IFNA", "ISERROR") for node in walk(tree))


def called_in(tree: Node) -> set[str]:
    """Every function a formula calls."""
    return {node.function for node in walk(tree) if isinstance(node, Call)}


def unreckoned(tree: Node) -> bool:
    """Whether this interpreter cannot say what the formula gives, though a spreadsheet may."""
    return any(arity(name) is None and name in OTHERS for name in called_in(tree))


def unknown(tree: Node) -> list[str]:
    """Functions that no common program knows under this name."""
    return sorted(name for name in called_in(tree) if arity(name) is None and name not in OTHERS)
