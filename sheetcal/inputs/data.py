"""Data for `fill`: values by field id, from CSV or JSON, or an analysis file."""

import json
import math
import os
import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from sheetcal import units
from sheetcal.errors import BadInput
from sheetcal.inputs.analysis import AnalysisValue, parse_analysis
from sheetcal.inputs.table import NOT_DETERMINED, number, parse_table
from sheetcal.inputs.text import Faults, TextFile, read_text

COLUMNS = ("field", "value", "unit")
FIELD_ID = re.compile(r"(?:sheet|(?:sample|run|body)[1-9]\d*)\.[a-z][a-z0-9_]*(?:\[[1-9]\d*\])?")
Plain = float | int | str | bool | None


@dataclass(frozen=True, slots=True)
class DataValue:
    """What a data file says of one field: text as written, a number, a list of those, or None.

    `unit` is empty where the file leaves it to the field.
    """

    id: str
    value: Plain | list[Plain]
    unit: str
    where: str

    def number(self, unit: str) -> float:
        """The value as a number in the field's unit. Raises BadInput, naming file and line."""
        if isinstance(self.value, list):
            raise BadInput(self.where, f"{self.id}: a list", "one number", "Give one value.")
        return self._number(self.value, unit)

    def numbers(self, unit: str) -> list[float | None]:
        """The values of a series in the field's unit; None for an element without value. Raises BadInput."""
        values = self.value if isinstance(self.value, list) else [self.value]
        return [None if one is None else self._number(one, unit) for one in values]

    def _number(self, value: Plain, unit: str) -> float:
        try:
            if isinstance(value, str):
                return self._text(value.strip(), unit)
            if isinstance(value, bool) or value is None:
                raise BadInput(str(value).lower(), "is not a number", "a number", "Correct it.")
            return units.convert(float(value), self.unit or unit, unit)
        except BadInput as error:
            what = f"{self.id}: {error.where} {error.what}"
            raise BadInput(self.where, what, error.expected, error.do) from error

    def _text(self, value: str, unit: str) -> float:
        """Text is a plain number in the unit column's unit, or carries its own."""
        if value.lower() in NOT_DETERMINED:
            number(value)
        amount, own = units.split(value)
        if own is None:
            return units.convert(amount, self.unit or unit, unit)
        if self.unit:
            raise BadInput(f"'{value}'", f"has a unit beside the column's {self.unit}", "one unit", "Leave one out.")
        return units.quantity(value, unit)


@dataclass(frozen=True, slots=True)
class DataFile:
    """A data file as read: `values` by field id in file order, or the rows of an analysis file."""

    source: TextFile
    values: Mapping[str, DataValue] = field(default_factory=dict)
    analysis: tuple[AnalysisValue, ...] = ()


def read_data(path: str | os.PathLike[str]) -> DataFile:
    """The values of a data file. Raises BadInput or BadInputs with file and line.

    `.json` is an object of values by field id; `.csv` has the header `field,value,unit`, or is an
    analysis file. An id with an empty value leaves its reading as it is and is left out.
    """
    source = read_text(path)
    suffix = Path(path).suffix.lower()
    if suffix == ".json":
        return DataFile(source, _from_json(source))
    if suffix != ".csv":
        raise BadInput(source.where(), f"ends in '{suffix}'", ".csv or .json", "Rename or convert it.")
    if _looks_like_analysis(source):
        return DataFile(source, analysis=parse_analysis(source))
    return DataFile(source, _from_table(source))


def _looks_like_analysis(source: TextFile) -> bool:
    """True where the header has the columns of the analysis bench."""
    header = next((t for t in source.text.splitlines() if t.strip() and not t.startswith("#")), "")
    cells = {cell.strip() for cell in header.split(",")}
    return "quantity" in cells or ("sample" in cells and "field" not in cells)


def _from_table(source: TextFile) -> dict[str, DataValue]:
    table = parse_table(source, COLUMNS, ("field", "value"))
    faults = Faults(source)
    values: dict[str, DataValue] = {}
    for row in table.rows:
        _check_id(row["field"], row.line, values, faults)
        _check_unit(row["unit"], row.line, faults)
        value = row["value"]
        values.setdefault(row["field"], DataValue(row["field"], value or None, row["unit"], source.where(row.line)))
    if not table.rows:
        faults.add(None, "has a header and no rows", "a value a line", "Give the right file.")
    faults.close()
    return {name: one for name, one in values.items() if one.value is not None}


def _check_id(name: str, line: int, seen: Mapping[str, DataValue], faults: Faults) -> None:
    if not FIELD_ID.fullmatch(name):
        expected = "an id such as run1.crucible_gross"
        faults.add(line, f"'{name[:60]}' is not a field id", expected, "See `sheetcal fields FILE`.")
    elif name in seen:
        faults.add(line, f"{name} stands twice", "each field once", "Remove one.")


def _check_unit(unit: str, line: int, faults: Faults) -> None:
    if not unit:
        return
    try:
        units.parse(unit)
    except BadInput as error:
        faults.add_error(line, "unit", error)


def _from_json(source: TextFile) -> dict[str, DataValue]:
    try:
        document = json.loads(source.text, object_pairs_hook=_pairs, parse_constant=_no_constant)
    except json.JSONDecodeError as fault:
        do = "Correct the file."
        raise BadInput(source.where(fault.lineno), f"is not JSON ({fault.msg.lower()})", "", do) from fault
    except (ValueError, RecursionError) as fault:
        raise BadInput(source.where(), f"is not taken: {fault}", "finite numbers", "Correct the file.") from fault
    if not isinstance(document, _Object):
        raise BadInput(source.where(1), "holds no object", 'an object {"run1.crucible_gross": 11.8}', "Correct it.")
    return _json_values(source, document)


class _Object(list[tuple[str, Any]]):
    """The pairs of a JSON object, kept so that a repeated name is seen."""


def _pairs(pairs: list[tuple[str, Any]]) -> _Object:
    return _Object(pairs)


def _no_constant(text: str) -> None:
    raise ValueError(f"{text} is no number")


def _json_values(source: TextFile, pairs: _Object) -> dict[str, DataValue]:
    faults = Faults(source)
    values: dict[str, DataValue] = {}
    for name, value in pairs:
        line = _line_of(source.text, name)
        _check_id(name, line, values, faults)
        if not _plain(value):
            expected = "a number, a text, null, or a list of those"
            faults.add(
                line,
                f"{name[:60]} holds an object, a nested list or an infinite number",
                expected,
                "Correct it.",
            )
            continue
        values.setdefault(name, DataValue(name, value, "", source.where(line)))
    faults.close()
    return {name: one for name, one in values.items() if one.value is not None}


def _plain(value: Any) -> bool:
    """True for a value a field can hold."""
    if isinstance(value, _Object):
        return False
    if isinstance(value, list):
        return all(not isinstance(one, list) and _plain(one) for one in value)
    return not isinstance(value, float) or math.isfinite(value)


def _line_of(text: str, name: str) -> int:
    """The line on which a JSON name first stands; 1 where it is spelled with escapes."""
    found = text.find(json.dumps(name))
    return text.count("\n", 0, max(found, 0)) + 1
