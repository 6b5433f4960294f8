"""The UNO interface of the cell functions, written as .idl source from the registry."""

from __future__ import annotations

from sheetcal.cells.registry import Argument, CellFunction

RANGE = "com::sun::star::table::XCellRange"


def parameter(index: int) -> str:
    """Name of the parameter at a place; sorts as it stands, since the configuration sorts by name."""
    return f"a{index:02d}"


def idl(functions: list[CellFunction]) -> str:
    """One interface, one method a cell function; a series is a range, every other argument any value."""
    methods = "".join(f"  any {one.name}({_parameters(one.args)});\n" for one in functions)
    return f"module org {{ module sheetcal {{\n interface XFunctions {{\n{methods} }};\n}}; }};\n"


def _parameters(args: tuple[Argument, ...]) -> str:
    return ", ".join(f"[in] {RANGE if arg.series else 'any'} {parameter(i)}" for i, arg in enumerate(args))
