"""Labels and units as the printed form shows them: degC in files is °C on paper, and counts have no unit.

The writer prints them, and the checker knows what must stand there.
"""

from __future__ import annotations

from sheetcal.model import Field, IssueRecord

_SIGNS = (("**2", "²"), ("m3", "m³"), ("degC", "°C"))


def printed_label(field: Field) -> str:
    """The label beside a line."""
    return shown(field.label)


def printed_unit(record: IssueRecord, field: Field) -> str | None:
    """The unit beside a line, None for none; that of a result in the unit asked for stands in the record."""
    asked = record.settings.get("unit") if field.name.endswith("_other") else None
    return shown_unit(asked or field.unit)


def shown_unit(unit: str | None) -> str | None:
    """`J/K**2` as `J/K²`; None for a number without unit."""
    return None if unit in (None, "", "1") else shown(str(unit))


def shown(text: str) -> str:
    """A printed text with its units as people write them."""
    for spelled, sign in _SIGNS:
        text = text.replace(spelled, sign)
    return text
