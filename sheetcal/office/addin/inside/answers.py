"""From what Calc hands over to a cell function's arguments, and from its result to what a cell shows.

Nothing of LibreOffice is imported here, so that the rules can be read and tested by themselves:

- an argument left out, an empty text or a blank is missing; Calc hands over an empty single cell as the number 0,
  as its own arithmetic does, and only a range (B2:B2) shows that it is empty;
- a value missing, out of its range or breaking a relation gives #N/A, which Calc writes for None;
- text where a number is due, a number where text is due, a range where one value is due gives #VALUE!, which Calc
  writes for whatever is raised here;
- an error value in a range gives #VALUE! too: a mean that quietly passes over an error would be a wrong number.
"""

from __future__ import annotations

from typing import Any, List, Sequence, Union

from sheetcal.cells.primitives import is_number, is_text
from sheetcal.cells.registry import Argument, CellFunction, call
from sheetcal.errors import OutOfRange

Content = Union[float, str, None]
ERROR = None  # what LibreOffice puts into a data array where a cell shows an error


def answer(function: CellFunction, given: Sequence[Any]) -> Content:
    """The result of a cell function; None where it has none. Raises TypeError for a wrong type.

    given: the arguments in order; a series as rows of cell contents, None for what is left out.
    """
    padded = list(given) + [None] * (len(function.args) - len(given))
    values = {
        one.name: _series(one, value) if one.series else _single(one, value)
        for one, value in zip(function.args, padded)
    }
    try:
        result = call(function.name, **values)
    except (OutOfRange, ArithmeticError, LookupError, ValueError):
        return None
    return _shown(function, result)


def _shown(function: CellFunction, result: Any) -> Content:
    if function.unit is None:
        return str(result) if isinstance(result, str) else "" if result is None else None
    return float(result) if is_number(result) else None


def _series(argument: Argument, rows: Any) -> List[Content]:
    """The cells of a range, row by row; a blank is None."""
    if rows is None:
        return []
    cells = [cell for row in rows for cell in row]
    if ERROR in cells:
        raise TypeError(argument.name + " holds an error value")
    return [None if cell == "" else cell for cell in cells]


def _single(argument: Argument, value: Any) -> Content:
    """One value, checked for its type. Raises TypeError."""
    if isinstance(value, tuple):
        value = _one_cell(argument, value)
    if value is None or value == "":
        return None
    if argument.text:
        return _text(argument, value)
    if not is_number(value):
        raise TypeError(argument.name + " is not a number")
    return float(value)


def _one_cell(argument: Argument, rows: Any) -> Any:
    if len(rows) != 1 or len(rows[0]) != 1:
        raise TypeError(argument.name + " is one value, not a range")
    return rows[0][0]


def _text(argument: Argument, value: Any) -> Content:
    if value == 0.0:  # so Calc hands over an empty cell; no text of ours is the number 0
        return None
    if not is_text(value):
        raise TypeError(argument.name + " is not text")
    return str(value)
