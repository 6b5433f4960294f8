"""The look of a cell: its style and every format laid on it by hand, carried from one cell to another."""

from __future__ import annotations

from typing import Any

NOT_LOOKS = frozenset(
    (
        "AbsoluteName", "CellStyle", "ChartColumnAsLabel", "ChartRowAsLabel", "ConditionalFormat",
        "ConditionalFormatLocal", "ConditionalFormatXML", "FormulaLocal", "FormulaResultType",
        "FormulaResultType2", "NumberingRules", "Position", "Size", "UserDefinedAttributes", "Validation",
        "ValidationLocal", "ValidationXML",
        # the same again in an older form that cannot say everything
        "BottomBorder", "DiagonalBLTR", "DiagonalTLBR", "LeftBorder", "RightBorder", "TableBorder", "TableBorder2",
        "TopBorder",
    )
)  # fmt: skip
DIRECT = "DIRECT_VALUE"  # com.sun.star.beans.PropertyState
READ_ONLY = 16  # com.sun.star.beans.PropertyAttribute.READONLY


def names(cell: Any) -> tuple[str, ...]:
    """The properties that make the look of a cell."""
    listed = cell.getPropertySetInfo().getProperties()
    return tuple(one.Name for one in listed if one.Name not in NOT_LOOKS and not one.Attributes & READ_ONLY)


def carry(source: Any, target: Any, properties: tuple[str, ...]) -> None:
    """Give the target the source's style and exactly its formats laid on by hand.

    Giving a style wipes out what the style itself states, so the formats come after it.
    """
    target.CellStyle = source.CellStyle
    direct = _direct(source, properties)
    for name in _direct(target, properties):
        if name not in direct:
            target.setPropertyToDefault(name)
    if direct:
        target.setPropertyValues(direct, source.getPropertyValues(direct))


def _direct(cell: Any, properties: tuple[str, ...]) -> tuple[str, ...]:
    states = cell.getPropertyStates(properties)
    return tuple(name for name, state in zip(properties, states) if state.value == DIRECT)
