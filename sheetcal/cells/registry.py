"""The register of cell functions: units, ranges, relations, sources, and the guarded call.

Units live in the annotations (`Annotated[float, "J/g"]`, aliases below), range and source in the decorator.
The guard is the same in Python and in the formula: a missing number, a value outside its range or a relation
that does not hold gives a blank, never an error value and never a wrong number.
"""

import difflib
import functools
import importlib
import math
import pkgutil
from dataclasses import dataclass
from typing import (
    Annotated,
    Any,
    Callable,
    Dict,
    List,
    Mapping,
    Optional,
    Sequence,
    Tuple,
    TypeVar,
    Union,
    get_args,
    get_type_hints,
)

import sheetcal.cells
from sheetcal.cells.grammar import Body, Constant, read_body, read_need
from sheetcal.cells.primitives import BLANK, Text, is_blank, is_number, is_text, numbers
from sheetcal.errors import BadInput, OutOfRange

__all__ = [
    "Argument",
    "CellFunction",
    "Constant",
    "all",
    "call",
    "cell",
    "constants",
    "describe",
    "evaluate",
    "get",
]

OPTIONAL = "optional"  # a blank is allowed, the body tests it
COLUMN = "column"  # a series that may be empty: a column of a look-up table
SAME = "same as "  # followed by an argument's name: its unit, whatever that is

ONE = Annotated[float, "1"]
PERCENT = Annotated[float, "%"]
G = Annotated[float, "g"]
J = Annotated[float, "J"]
KJ = Annotated[float, "kJ"]
K = Annotated[float, "K"]
DEGC = Annotated[float, "degC"]
MIN = Annotated[float, "min"]
S = Annotated[float, "s"]
ML = Annotated[float, "mL"]
CM = Annotated[float, "cm"]
MPA = Annotated[float, "MPa"]
KPA = Annotated[float, "kPa"]
W = Annotated[float, "W"]
J_PER_G = Annotated[float, "J/g"]
J_PER_K = Annotated[float, "J/K"]
J_PER_G_K = Annotated[float, "J/(g K)"]
J_PER_ML = Annotated[float, "J/mL"]
J_PER_MOL = Annotated[float, "J/mol"]
J_PER_MOL_K = Annotated[float, "J/(mol K)"]
KJ_PER_MOL = Annotated[float, "kJ/mol"]
K_PER_MIN = Annotated[float, "K/min"]
PER_MIN = Annotated[float, "1/min"]
MOL = Annotated[float, "mol"]
MOL_PER_L = Annotated[float, "mol/L"]
MG_PER_L = Annotated[float, "mg/L"]
G_PER_ML = Annotated[float, "g/mL"]
G_PER_MOL = Annotated[float, "g/mol"]
CM3_PER_G = Annotated[float, "cm3/g"]
CM3_PER_MOL = Annotated[float, "cm3/mol"]
MJ_PER_KG = Annotated[float, "MJ/kg"]
TEXT = Annotated[str, None]
ANY = Annotated[float, "any"]
SAME_AS_VALUE = Annotated[float, SAME + "value"]
SAME_AS_VALUES = Annotated[float, SAME + "values"]

ONE_OR_BLANK = Annotated[float, "1", OPTIONAL]
PERCENT_OR_BLANK = Annotated[float, "%", OPTIONAL]
G_OR_BLANK = Annotated[float, "g", OPTIONAL]
J_OR_BLANK = Annotated[float, "J", OPTIONAL]
K_OR_BLANK = Annotated[float, "K", OPTIONAL]
DEGC_OR_BLANK = Annotated[float, "degC", OPTIONAL]
MIN_OR_BLANK = Annotated[float, "min", OPTIONAL]
ML_OR_BLANK = Annotated[float, "mL", OPTIONAL]
CM_OR_BLANK = Annotated[float, "cm", OPTIONAL]
J_PER_G_OR_BLANK = Annotated[float, "J/g", OPTIONAL]
J_PER_G_K_OR_BLANK = Annotated[float, "J/(g K)", OPTIONAL]
K_PER_MIN_OR_BLANK = Annotated[float, "K/min", OPTIONAL]
MG_PER_L_OR_BLANK = Annotated[float, "mg/L", OPTIONAL]
G_PER_ML_OR_BLANK = Annotated[float, "g/mL", OPTIONAL]
TEXT_OR_BLANK = Annotated[str, None, OPTIONAL]

TIMES = Annotated[Sequence[Any], "min"]
TEMPERATURES = Annotated[Sequence[Any], "degC"]
HEATS = Annotated[Sequence[Any], "J"]
MASSES = Annotated[Sequence[Any], "g"]
SPECIFIC_HEATS = Annotated[Sequence[Any], "J/(g K)"]
VALUES = Annotated[Sequence[Any], "any"]
TEXTS = Annotated[Sequence[Any], None, COLUMN]

Value = Union[float, str, None]
Range = Tuple[Optional[float], Optional[float]]
F = TypeVar("F", bound=Callable[..., Any])

_functions: Dict[str, "CellFunction"] = {}


@dataclass(frozen=True)
class Argument:
    """One argument: `unit` None is text, "any" any unit, "same as NAME" the unit of another argument.

    `low` and `high` bound a number, or every number of a series, in the argument's own unit. `column` marks a
    series that may be empty. `choices` are the texts allowed.
    """

    name: str
    unit: Optional[str]
    low: Optional[float] = None
    high: Optional[float] = None
    series: bool = False
    optional: bool = False
    text: bool = False
    column: bool = False
    choices: Tuple[str, ...] = ()


@dataclass(frozen=True)
class Need:
    """A relation between arguments that must hold: its text and its checked expression."""

    text: str
    body: Body


@dataclass(frozen=True)
class CellFunction:
    """A registered cell function; `body` is the plain, unguarded Python function."""

    name: str
    args: Tuple[Argument, ...]
    unit: Optional[str]
    equation: str
    source: str
    standing: str
    needs: Tuple[Need, ...]
    body: Callable[..., Any]
    doc: str
    tree: Body
    constants: Tuple[Constant, ...]

    def argument(self, name: str) -> Argument:
        """The argument of that name. Raises KeyError."""
        return {argument.name: argument for argument in self.args}[name]


def cell(
    name: str,
    *,
    equation: str,
    source: str,
    standing: str = "published",
    valid: Optional[Mapping[str, Range]] = None,
    choices: Optional[Mapping[str, Sequence[str]]] = None,
    needs: Sequence[str] = (),
) -> Callable[[F], F]:
    """Register a cell function and return the guarded call. Raises BadInput for what cannot be a formula."""

    def register(function: F) -> F:
        args, unit = _signature(function, valid or {}, choices or {})
        names = [argument.name for argument in args]
        tree = read_body(function, names)
        relations = tuple(Need(text, read_need(text, name, names, function.__globals__)) for text in needs)
        _refuse_double(name, standing)
        constants = {c.name: c for body in (tree, *(need.body for need in relations)) for c in body.constants.values()}
        doc = (function.__doc__ or "").strip()
        _functions[name] = CellFunction(
            name,
            args,
            unit,
            equation,
            source,
            standing,
            relations,
            function,
            doc,
            tree,
            tuple(constants.values()),
        )

        @functools.wraps(function)
        def guarded(*values: Any, **named: Any) -> Any:
            return call(name, **dict(zip(names, values)), **named)

        return guarded  # type: ignore[return-value]  # same signature, kept by functools.wraps

    return register


def _refuse_double(name: str, standing: str) -> None:
    if name in _functions:
        raise BadInput(name, "two cell functions have this name", "one name, one function", "Rename one.")
    if standing not in ("derived", "published", "memory"):
        raise BadInput(name, f"standing `{standing}`", "derived, published or memory", "Correct it.")


def _signature(
    function: Callable[..., Any], valid: Mapping[str, Range], choices: Mapping[str, Sequence[str]]
) -> Tuple[Tuple[Argument, ...], Optional[str]]:
    hints = get_type_hints(function, include_extras=True)
    result = get_args(hints.pop("return"))
    args = tuple(_argument(name, get_args(hint), valid, choices) for name, hint in hints.items())
    strangers = (set(valid) | set(choices)) - {argument.name for argument in args}
    if strangers:
        raise BadInput(function.__name__, f"range for unknown argument {sorted(strangers)}", "its own arguments")
    return args, result[1]


def _argument(
    name: str, parts: Tuple[Any, ...], valid: Mapping[str, Range], choices: Mapping[str, Sequence[str]]
) -> Argument:
    kind, unit, marks = parts[0], parts[1], parts[2:]
    low, high = valid.get(name, (None, None))
    series = kind not in (float, str)
    return Argument(
        name,
        unit,
        low,
        high,
        series,
        OPTIONAL in marks,
        unit is None,
        COLUMN in marks,
        tuple(choices.get(name, ())),
    )


@functools.lru_cache(maxsize=None)  # looking for files at every call took nine tenths of computing a workbook
def _load() -> None:
    for module in pkgutil.iter_modules(sheetcal.cells.__path__):
        importlib.import_module(f"sheetcal.cells.{module.name}")


def all() -> List[CellFunction]:  # the registry's own word, always used with its module
    """Every cell function, by name."""
    _load()
    return [_functions[name] for name in sorted(_functions)]


def get(name: str) -> CellFunction:
    """The cell function of that name. Raises KeyError naming the three nearest."""
    _load()
    if name not in _functions:
        raise KeyError(f"{name}; nearest: {', '.join(nearest(name))}")
    return _functions[name]


def nearest(name: str) -> List[str]:
    """The three names most like an unknown one."""
    _load()
    return difflib.get_close_matches(name.upper(), sorted(_functions), n=3, cutoff=0.0)


def constants() -> Dict[str, Constant]:
    """Every constant that a cell function uses, by its defined name. Raises BadInput when two disagree."""
    found: Dict[str, Constant] = {}
    for function in all():
        for constant in function.constants:
            known = found.setdefault(constant.name, constant)
            if (float(known), known.unit) != (float(constant), constant.unit):
                raise BadInput(function.name, f"constant {constant.name} has two values", "one value", "Share it.")
    return found


def describe(name: str) -> Dict[str, Any]:
    """What `sheetcal cells NAME --json` shows, without the formula. Raises KeyError."""
    function = get(name)
    keys = ("name", "unit", "low", "high", "series")
    args = [{key: getattr(argument, key) for key in keys} for argument in function.args]
    return {
        "name": name,
        "result": function.doc.splitlines()[0],
        "unit": function.unit,
        "args": args,
        "equation": function.equation,
        "source": function.source,
        "standing": function.standing,
    }


def _clean(argument: Argument, value: Any) -> Any:
    """A cell's content as the body sees it: blank as BLANK or None, text without case, numbers as float."""
    if argument.series:
        return list(value)
    if is_blank(value):
        return None if argument.text else BLANK
    if argument.text and is_text(value):
        return Text(value)
    return float(value) if is_number(value) else value


def _fault(argument: Argument, value: Any) -> str:
    """What is wrong with one cleaned value; an empty text when nothing is."""
    if argument.series:
        present = argument.column or bool(numbers(value))
        return _range_fault(argument, numbers(value)) if present else "holds no number"
    if is_blank(value):
        return "" if argument.optional else "is missing"
    if argument.text:
        return _text_fault(argument, value)
    return _range_fault(argument, [value]) if is_number(value) else "is not a number"


def _text_fault(argument: Argument, value: Any) -> str:
    if not is_text(value):
        return "is not text"
    known = not argument.choices or value in argument.choices
    return "" if known else f"{value!r} is not one of {', '.join(argument.choices)}"


def _range_fault(argument: Argument, values: List[float]) -> str:
    low = -math.inf if argument.low is None else argument.low
    high = math.inf if argument.high is None else argument.high
    outside = [value for value in values if not low <= value <= high]
    return f"{outside[0]:g} lies outside {low:g} to {high:g}" if outside else ""


def _values(function: CellFunction, args: Mapping[str, Any]) -> Dict[str, Any]:
    empty: Dict[str, Any] = {argument.name: [] if argument.series else None for argument in function.args}
    return {a.name: _clean(a, args.get(a.name, empty[a.name])) for a in function.args}


def evaluate(name: str, args: Mapping[str, Any]) -> Value:
    """The result as the sheet shows it; None where the guard leaves the cell blank. Raises KeyError (name).

    args: cell contents by argument name; what is not named is blank.
    """
    function = get(name)
    values = _values(function, args)
    if any(_fault(argument, values[argument.name]) for argument in function.args):
        return None
    try:
        result: Value = function.tree.value(values) if _all_hold(function, values) else None
    except (ArithmeticError, LookupError, ValueError):
        return None  # a guard has a gap: blank all the same, and the comparison with LibreOffice shows it
    return None if is_blank(result) else str(result) if isinstance(result, str) else result


def _all_hold(function: CellFunction, values: Mapping[str, Any]) -> bool:
    # In order, and no further than the first that fails: a later one may rest on an earlier one.
    return not any(not need.body.value(values) for need in function.needs)


def call(name: str, **args: Any) -> Any:
    """The result for good arguments. Raises KeyError (name), TypeError (arguments), OutOfRange (values)."""
    function = get(name)
    unknown = set(args) - {argument.name for argument in function.args}
    missing = {a.name for a in function.args if not (a.optional or a.column)} - set(args)
    if unknown or missing:
        raise TypeError(f"{name}: unknown arguments {sorted(unknown)}, missing arguments {sorted(missing)}")
    values = _values(function, args)
    for argument in function.args:
        fault = _fault(argument, values[argument.name])
        if fault:
            unit = f" ({argument.unit})" if argument.unit else ""
            raise OutOfRange(f"{name}, {argument.name}{unit}", fault, "a value in its range", "Correct it.")
    for need in function.needs:
        if not need.body.value(values):
            raise OutOfRange(name, "the arguments do not go together", need.text, "Correct them.")
    return function.tree.value(values)
