"""Which constants of a workbook a new lab file restates: only those of the same identity.

A calibration is known by vessel and reference, a lot by its name, a coefficient by its profile. A later
calibration is another identity and never replaces an earlier one. Where a lab file states one identity several
times, dated, a run takes what was in force at its own date and time.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime

from sheetcal import units
from sheetcal.archive.in_force import cup_at, lot_at, second_control, titrant_at
from sheetcal.inputs.lab import IN_VACUUM, Lab, Lot
from sheetcal.model import IssueRecord, Value
from sheetcal.profiles import Profile

Row = Mapping[str, Value]
BENZOIC_DENSITY = 1.320  # g/cm3; what a workbook takes where a certificate gives none


@dataclass
class Changes:
    """New values of constants and table cells by id, and why each changed."""

    values: dict[str, Value] = field(default_factory=dict)
    causes: dict[str, str] = field(default_factory=dict)

    def put(self, one: str, old: Value, new: Value, cause: str) -> None:
        """Note a new value where it differs from the old."""
        if isinstance(old, int | float) and isinstance(new, int | float):
            differs = abs(new - old) > 1e-12 * abs(old)
        else:
            differs = isinstance(old, str) and isinstance(new, str) and old != new
        if differs:
            self.values[one] = new
            self.causes[one] = cause


@dataclass(frozen=True)
class Recomputed:
    """What was recomputed before: heat capacities by (calibration, vessel) and aid heats by (workbook, lot).

    Each comes with the cause of its change. `unsure` names the keys for which two workbooks disagree.
    """

    means: Mapping[tuple[str, str], tuple[float, str]] = field(default_factory=dict)
    unsure: frozenset[tuple[str, str]] = frozenset()


@dataclass(frozen=True)
class Ratio:
    """New over old value of a certificate, and its change in words."""

    value: float
    cause: str


def changes(record: IssueRecord, lab: Lab | None, chain: Recomputed, moment: datetime | None = None) -> Changes:
    """What changes for one workbook, by what was in force at `moment` (None: as stated last).

    Nothing changes without a lab file: nothing recomputed before can then have moved.
    """
    found = Changes()
    if lab is None:
        return found
    profile = lab.profile(record.profile)
    _coefficients(record, lab, profile, found)
    _certified(record, lab, moment, found)
    _lots(record, lab, moment, found)
    _titrants(record, lab, moment, found)
    _cups(record, lab, moment, found)
    ratios = _ratios(record, lab, moment, profile)
    _aids(record, lab, chain, ratios, moment, found)
    _vessels(record, lab, chain, ratios, found)
    return found


def _coefficients(record: IssueRecord, lab: Lab, profile: Profile, found: Changes) -> None:
    """A coefficient moves where the lab file states it; the profile's own figure stays as issued."""
    own = f"lab file {lab.source.path.name}"
    for one in record.constants:
        stated = profile.coefficients.get(one.name)
        if stated is not None and stated.source == own:
            new = units.convert(stated.value, stated.unit, one.unit)
            found.put(f"const.{one.name}", one.value, new, f"{one.name} {one.value:g} -> {new:g} {one.unit}")


def _certified(record: IssueRecord, lab: Lab, moment: datetime | None, found: Changes) -> None:
    for number, row in enumerate(record.tables.get("certified", ()), start=1):
        lot = str(row["lot"])
        stated = lab.certificate(lot, moment)
        second = second_control(lab, lot)
        place = f"table.certified.{{}}[{number}]".format
        if stated is not None:
            cause = f"certificate {lot} {_g(row['value'])} -> {stated.value:g} J/g"
            found.put(place("value"), row["value"], stated.value, cause)
            was, now = row.get("convention"), stated.mass
            found.put(place("convention"), was, now, f"certificate {lot}: mass {was} -> {now}")
            density = stated.density or BENZOIC_DENSITY
            cause = f"certificate {lot}: density {_g(row.get('density'))} -> {density:g} g/cm3"
            found.put(place("density"), row.get("density"), density, cause)
        elif second is not None:
            found.put(place("value"), row["value"], second, f"control {lot} {_g(row['value'])} -> {second:g} J/g")


def _lots(record: IssueRecord, lab: Lab, moment: datetime | None, found: Changes) -> None:
    for table, columns in {"wire": {"heat": "J/cm"}, "thread": {"piece_heat": "J", "heat": "J/g"}}.items():
        for number, row in enumerate(record.tables.get(table, ()), start=1):
            lot = lot_at(lab, str(row["lot"]), moment)
            for column, unit in columns.items():
                new = heat(lot, unit) if lot else None
                cause = f"lot {row['lot']} {_g(row.get(column))} -> {_g(new)} {unit}"
                found.put(f"table.{table}.{column}[{number}]", row.get(column), new, cause)


def _titrants(record: IssueRecord, lab: Lab, moment: datetime | None, found: Changes) -> None:
    for number, row in enumerate(record.tables.get("titrant", ()), start=1):
        new = titrant_at(lab, str(row["lot"]), moment)
        cause = f"titrant {row['lot']} {_g(row['strength'])} -> {_g(new)} mol/L"
        found.put(f"table.titrant.strength[{number}]", row["strength"], new, cause)


def _cups(record: IssueRecord, lab: Lab, moment: datetime | None, found: Changes) -> None:
    for number, row in enumerate(record.tables.get("cup", ()), start=1):
        new = cup_at(lab, str(row["id"]), moment)
        cause = f"cup {row['id']} {_g(row['heat_capacity'])} -> {_g(new)} J/K"
        found.put(f"table.cup.heat_capacity[{number}]", row["heat_capacity"], new, cause)


def _aids(
    record: IssueRecord,
    lab: Lab,
    chain: Recomputed,
    ratios: Mapping[str, Ratio],
    moment: datetime | None,
    found: Changes,
) -> None:
    """An aid moves where its lot is restated, where the workbook that found it moved, or with its certificate."""
    for number, row in enumerate(record.tables.get("aid", ()), start=1):
        old = row["heat"]
        if isinstance(old, int | float):
            new, cause = _aid(row, float(old), lot_at(lab, str(row["lot"]), moment), chain, ratios)
            found.put(f"table.aid.heat[{number}]", old, new, cause)


def _aid(row: Row, old: float, lot: Lot | None, chain: Recomputed, ratios: Mapping[str, Ratio]) -> tuple[float, str]:
    """(new heat, cause) of one aid; the old heat where nothing moves it."""
    name, certificate = str(row["lot"]), str(row.get("certificate") or "")
    restated = heat(lot, "J/g") if lot else None
    if restated is not None and restated != old:
        return restated, f"aid {name} {_g(old)} -> {restated:g} J/g"
    key = (lot.issue if lot else "", name)
    if key in chain.means:
        mean, cause = chain.means[key]
        return mean, f"{cause} -> workbook {key[0]} -> aid {name}"
    ratio, sensitivity = ratios.get(certificate), row.get("sensitivity")
    if ratio is None or not isinstance(sensitivity, int | float):
        return old, ""
    return old * (1.0 + sensitivity * (ratio.value - 1.0)), f"{ratio.cause} -> aid {name}"


def _vessels(record: IssueRecord, lab: Lab, chain: Recomputed, ratios: Mapping[str, Ratio], found: Changes) -> None:
    for number, row in enumerate(record.tables.get("vessel", ()), start=1):
        old = row["heat_capacity"]
        if isinstance(old, int | float):
            new, cause = _heat_capacity(row, float(old), lab, chain, ratios)
            found.put(f"table.vessel.heat_capacity[{number}]", old, new, cause)


def _heat_capacity(row: Row, old: float, lab: Lab, chain: Recomputed, ratios: Mapping[str, Ratio]) -> tuple[float, str]:
    """(new value, cause): restated by the lab file, recomputed from its workbook, or by its sensitivity."""
    vessel, issue = str(row["id"]), str(row["calibration"])
    restated = _restated(lab, vessel, issue)
    if restated is not None and abs(restated - old) > 1e-9 * old:
        return restated, f"calibration {issue} of {vessel} restated {_g(old)} -> {restated:g} J/K"
    if (issue, vessel) in chain.means:
        mean, cause = chain.means[issue, vessel]
        return mean, f"{cause} -> calibration {issue} -> vessel {vessel}"
    certificate = str(row.get("certificate") or "")
    ratio, sensitivity = ratios.get(certificate), row.get("sensitivity")
    if ratio is None or not isinstance(sensitivity, int | float):
        return old, ""
    why = "its workbooks disagree" if (issue, vessel) in chain.unsure else "calibration workbook not found"
    new = old * (1.0 + sensitivity * (ratio.value - 1.0))
    return new, f"{ratio.cause} -> vessel {vessel} by recorded sensitivity ({why})"


def _restated(lab: Lab, vessel: str, issue: str) -> float | None:
    values = [one.value for one in lab.calibrations if one.vessel == vessel and one.issue == issue]
    return values[-1] if values else None


def _ratios(record: IssueRecord, lab: Lab, moment: datetime | None, profile: Profile) -> dict[str, Ratio]:
    """New over old certified value by lot, both for a mass weighed in air, where both are known."""
    found = {}
    for row in record.tables.get("certified", ()):
        lot, old = str(row["lot"]), row["value"]
        stated = lab.certificate(lot, moment)
        if stated is not None and isinstance(old, int | float):
            was, now = row.get("density"), stated.density or BENZOIC_DENSITY
            density = float(was) if isinstance(was, int | float) else BENZOIC_DENSITY
            before = float(old) * _air_factor(str(row.get("convention")), density, profile)
            after = stated.value * _air_factor(stated.mass, now, profile)
            found[lot] = Ratio(after / before, f"certificate {lot} {_g(old)} -> {stated.value:g} J/g")
    return found


def _air_factor(convention: str, density: float, profile: Profile) -> float:
    """J/g of mass weighed in air over J/g of `convention`: buoyancy of the substance against the weights."""
    air, weights = (profile.coefficients.get(name) for name in ("air_density", "weight_density"))
    if convention != IN_VACUUM or air is None or weights is None:
        return 1.0
    rho = air.in_unit("g/cm3")
    return (1.0 - rho / weights.in_unit("g/cm3")) / (1.0 - rho / density)


def heat(lot: Lot, unit: str) -> float | None:
    """The heat of a lot in a unit, or None where it is stated per something else."""
    value, given = lot.heat
    return units.convert(value, given, unit) if units.dimensions(given) == units.dimensions(unit) else None


def _g(value: Value) -> str:
    return f"{value:.10g}" if isinstance(value, int | float) else "-"
