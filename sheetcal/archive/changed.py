"""Which constants of a workbook a new lab file restates: only those of the same identity.

A calibration is known by vessel and reference, a lot by its name, a coefficient by its profile. A later
calibration is another identity and never replaces an earlier one.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from sheetcal import units
from sheetcal.inputs.lab import Lab, Lot
from sheetcal.model import IssueRecord, Value

Row = Mapping[str, Value]


@dataclass
class Changes:
    """New values of constants and table cells by id, and why each changed."""

    values: dict[str, Value] = field(default_factory=dict)
    causes: dict[str, str] = field(default_factory=dict)

    def put(self, one: str, old: Value, new: Value, cause: str) -> None:
        """Note a new value where it differs from the old."""
        if isinstance(old, int | float) and isinstance(new, int | float) and abs(new - old) > 1e-12 * abs(old):
            self.values[one] = new
            self.causes[one] = cause


@dataclass(frozen=True)
class Recomputed:
    """New heat capacities by calibration issue id and vessel, from calibration workbooks found on the way."""

    means: Mapping[tuple[str, str], tuple[float, str]] = field(default_factory=dict)


def changes(record: IssueRecord, lab: Lab | None, chain: Recomputed) -> Changes:
    """What changes for one workbook; nothing without a lab file and without recomputed calibrations."""
    found = Changes()
    if lab is not None:
        _coefficients(record, lab, found)
        _certified(record, lab, found)
        _lots(record, lab, found)
        _titrants(record, lab, found)
        _aids(record, lab, found)
    _vessels(record, lab, chain, found)
    return found


def _coefficients(record: IssueRecord, lab: Lab, found: Changes) -> None:
    """A coefficient moves where the lab file states it; the profile's own figure stays as issued."""
    own = {**lab.overrides, **lab.profile_overrides.get(record.profile, {})}
    stated = lab.profile(record.profile).coefficients
    for one in record.constants:
        if one.name in own and one.name in stated:
            new = units.convert(stated[one.name].value, stated[one.name].unit, one.unit)
            found.put(f"const.{one.name}", one.value, new, f"{one.name} {one.value:g} -> {new:g} {one.unit}")


def _certified(record: IssueRecord, lab: Lab, found: Changes) -> None:
    for number, row in enumerate(record.tables.get("certified", ()), start=1):
        stated = lab.certificate(str(row["lot"]))
        if stated is not None:
            cause = f"certificate {row['lot']} {_g(row['value'])} -> {stated.value:g} J/g"
            found.put(f"table.certified.value[{number}]", row["value"], stated.value, cause)
        control = lab.control
        if stated is None and control and row["lot"] == control.second and control.second_gross_dry:
            cause = f"control {row['lot']} {_g(row['value'])} -> {control.second_gross_dry:g} J/g"
            found.put(f"table.certified.value[{number}]", row["value"], control.second_gross_dry, cause)


def _lots(record: IssueRecord, lab: Lab, found: Changes) -> None:
    lots = {one.id: one for one in lab.all_lots}
    for table, columns in {"wire": {"heat": "J/cm"}, "thread": {"piece_heat": "J", "heat": "J/g"}}.items():
        for number, row in enumerate(record.tables.get(table, ()), start=1):
            lot = lots.get(str(row["lot"]))
            for column, unit in columns.items():
                new = _heat(lot, unit) if lot else None
                cause = f"lot {row['lot']} {_g(row.get(column))} -> {_g(new)} {unit}"
                found.put(f"table.{table}.{column}[{number}]", row.get(column), new, cause)


def _titrants(record: IssueRecord, lab: Lab, found: Changes) -> None:
    strengths = {one.lot: one.strength for one in lab.titrants()}
    for number, row in enumerate(record.tables.get("titrant", ()), start=1):
        new = strengths.get(str(row["lot"]))
        cause = f"titrant {row['lot']} {_g(row['strength'])} -> {_g(new)} mol/L"
        found.put(f"table.titrant.strength[{number}]", row["strength"], new, cause)


def _aids(record: IssueRecord, lab: Lab, found: Changes) -> None:
    """An aid moves where its lot is restated, or by its sensitivity with the certificate it stands on."""
    lots = {one.id: one for one in lab.aids()}
    for number, row in enumerate(record.tables.get("aid", ()), start=1):
        old = row["heat"]
        lot = lots.get(str(row["lot"]))
        restated = _heat(lot, "J/g") if lot else None
        one = f"table.aid.heat[{number}]"
        if isinstance(restated, float) and isinstance(old, int | float) and restated != old:
            found.put(one, old, restated, f"aid {row['lot']} {_g(old)} -> {restated:g} J/g")
            continue
        ratio = certificate_ratio(record, lab, str(row.get("certificate") or ""))
        sensitivity = row.get("sensitivity")
        if ratio is not None and isinstance(old, int | float) and isinstance(sensitivity, int | float):
            new = old * (1.0 + sensitivity * (ratio - 1.0))
            found.put(one, old, new, f"certificate {row['certificate']} -> aid {row['lot']}")


def certificate_ratio(record: IssueRecord, lab: Lab, lot: str) -> float | None:
    """New over old value of a certificate the workbook knows, or None where nothing is known of it."""
    stated = lab.certificate(lot) if lot else None
    rows = [row for row in record.tables.get("certified", ()) if row["lot"] == lot]
    if stated is None or not rows or not isinstance(rows[0]["value"], int | float):
        return None
    return stated.value / float(rows[0]["value"])


def _vessels(record: IssueRecord, lab: Lab | None, chain: Recomputed, found: Changes) -> None:
    for number, row in enumerate(record.tables.get("vessel", ()), start=1):
        old = row["heat_capacity"]
        if not isinstance(old, int | float):
            continue
        new, cause = _heat_capacity(record, row, float(old), lab, chain)
        found.put(f"table.vessel.heat_capacity[{number}]", old, new, cause)


def _heat_capacity(record: IssueRecord, row: Row, old: float, lab: Lab | None, chain: Recomputed) -> tuple[float, str]:
    """(new value, cause): restated by the lab file, recomputed from its workbook, or by its sensitivity."""
    vessel, issue = str(row["id"]), str(row["calibration"])
    restated = _restated(lab, vessel, issue)
    if restated is not None and abs(restated - old) > 1e-9 * old:
        return restated, f"calibration {issue} of {vessel} restated"
    if (issue, vessel) in chain.means:
        mean, cause = chain.means[issue, vessel]
        return mean, f"{cause} -> calibration {issue} -> vessel {vessel}"
    certificate = str(row.get("certificate") or "")
    ratio = certificate_ratio(record, lab, certificate) if lab else None
    sensitivity = row.get("sensitivity")
    if ratio is None or not isinstance(sensitivity, int | float):
        return old, ""
    new = old * (1.0 + sensitivity * (ratio - 1.0))
    return (
        new,
        f"certificate {certificate} -> vessel {vessel} by recorded sensitivity (calibration workbook not found)",
    )


def _restated(lab: Lab | None, vessel: str, issue: str) -> float | None:
    if lab is None:
        return None
    values = [one.value for one in lab.calibrations if one.vessel == vessel and one.issue == issue]
    return values[-1] if values else None


def _heat(lot: Lot | None, unit: str) -> float | None:
    if lot is None or units.dimensions(lot.heat[1]) != units.dimensions(unit):
        return None
    return units.convert(lot.heat[0], lot.heat[1], unit)


def _g(value: Value) -> str:
    return f"{value:g}" if isinstance(value, int | float) else "-"
