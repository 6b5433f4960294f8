"""How each primitive, number and text is spelled in a spreadsheet formula.

Only functions that every spreadsheet program of the last ten years knows, in the form that LibreOffice keeps
when it saves: TRUE(), 0.001 rather than 1E-3. {0}, {1} stand for the primitive's arguments.
"""

from decimal import Decimal

# How tightly what is spelled binds; unary minus binds tighter than ^ in a spreadsheet, so it is bracketed.
COMPARISON, JOINED, SUM, PRODUCT, POWER, ATOM = 1, 2, 3, 4, 5, 9

_STEPS = "INDEX({0},2):INDEX({0},{1})", "INDEX({0},1):INDEX({0},{1}-1)"

PRIMITIVE_SPELLING = {
    "is_number": "ISNUMBER({0})",
    "is_text": "ISTEXT({0})",
    "count": "COUNT({0})",
    "filled": "COUNTA({0})",
    "part": "INDEX({0},{1}):INDEX({0},{2})",
    "at": "INDEX({0},{1})",
    "position": "MATCH({0},{1},1)",
    "look_up": "INDEX({2},MATCH({0},{1},0))",
    "same_text": 'IF(ISTEXT({0}),IF(ISTEXT({1}),IF({0}="",FALSE(),{0}={1}),FALSE()),FALSE())',
    "found": "ISNUMBER(MATCH({0},{1},0))",
    "total": "SUM({0})",
    "mean": "AVERAGE({0})",
    "smallest": "MIN({0})",
    "largest": "MAX({0})",
    "deviation": "STDEV({0})",
    "pairs": "SUMPRODUCT(ISNUMBER({0})*ISNUMBER({1}))",
    "slope": "SLOPE({0},{1})",
    "scatter": "STEYX({0},{1})",
    "interpolate": "FORECAST({0},{1},{2})",
    "not_rising": f"SUMPRODUCT(({_STEPS[0]}<={_STEPS[1]})*1)",
    "jumps": f"SUMPRODUCT((ABS({_STEPS[0]}-{_STEPS[1]})>{{2}})*1)",
    "not_above_line": "SUMPRODUCT((INDEX({0},1):INDEX({0},{2})-({3})*INDEX({1},1):INDEX({1},{2})<={4})*1)",
    "stuck": (
        "SUMPRODUCT((INDEX({0},{1}):INDEX({0},{2}-3)=INDEX({0},{1}+1):INDEX({0},{2}-2))"
        "*(INDEX({0},{1}+1):INDEX({0},{2}-2)=INDEX({0},{1}+2):INDEX({0},{2}-1))"
        "*(INDEX({0},{1}+2):INDEX({0},{2}-1)=INDEX({0},{1}+3):INDEX({0},{2}))"
        "*(ABS(INDEX({0},{1}):INDEX({0},{2}-3)-INDEX({0},{2}))>{3}))"
    ),
    "count_alike": "SUMPRODUCT((ABS({0}+{1}*({2})-{3})<={4}+{5})*1)",
    "next_alike": (
        "SUMPRODUCT(MAX((1000-{0}+1000*(ABS({7}-{8})<={9}*{8}))*(ABS({1}+{2}*({3})-{4})<={5}+{6})"
        "*(1000-{0}+1000*(ABS({7}-{8})<={9}*{8})<{10})))"
    ),
    "median": "MEDIAN({0})",
    "sqrt": "SQRT({0})",
    "exp": "EXP({0})",
    "log": "LN({0})",
    "log10": "LOG10({0})",
    "floor": "INT({0})",
    "abs": "ABS({0})",
    "day_part": "IFERROR(TIMEVALUE({0}),0)",
    "round_to_places": "ROUND({0},{1})",
}

# Primitives of any number of arguments, and those whose spelling is an operation that may need brackets.
LIST_SPELLING = {"min": "MIN", "max": "MAX", "weighted": "SUMPRODUCT", "choose": "CHOOSE"}
OPERATION_SPELLING = {
    "is_blank": ("COUNTBLANK({0})=1", COMPARISON),
    "total_size": ('SUMIF({0},">0")-SUMIF({0},"<0")', SUM),
    "trapezoid": (
        "SUMPRODUCT((INDEX({0},{2}+1):INDEX({0},{3})-INDEX({0},{2}):INDEX({0},{3}-1))"
        "*(INDEX({1},{2}+1):INDEX({1},{3})+INDEX({1},{2}):INDEX({1},{3}-1)))/2",
        PRODUCT,
    ),
}


def number(value: float) -> str:
    """A number without exponent and without a needless decimal point."""
    text = format(Decimal(repr(float(value))), "f")
    return text.rstrip("0").rstrip(".") if "." in text else text


def text(value: str) -> str:
    """A text literal, quotes doubled."""
    return '"' + value.replace('"', '""') + '"'


def holds_text(cell: str) -> list[str]:
    """The tests that a cell holds text, and not the empty text of a blank result."""
    return [f"ISTEXT({cell})", f"COUNTBLANK({cell})=0"]


def truth(value: bool) -> str:
    """A truth value in the form that survives saving."""
    return "TRUE()" if value else "FALSE()"
