"""Constants and look-up tables of a workbook, from profile and lab file, as they are in force at issue."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from datetime import date, datetime
from typing import TypeVar

from sheetcal import units
from sheetcal.archive.in_force import last
from sheetcal.cells import registry
from sheetcal.errors import Refused
from sheetcal.inputs.lab import IN_AIR, IN_VACUUM, Calibration, Certified, Cup, Lab, Lot, Person, Titrant, Vessel
from sheetcal.kinds.dates import FAR, NEVER
from sheetcal.model import Constant, SheetKind, Value
from sheetcal.profiles import Profile
from sheetcal.profiles.materials import materials

Row = Mapping[str, Value]
Named = TypeVar("Named", Lot, Cup)
NO_COUNT = 1_000_000.0  # firings left where nobody counts them


def constants(
    kind: SheetKind, profile: Profile, lab: Lab | None, extra: Mapping[str, Constant]
) -> tuple[Constant, ...]:
    """Every constant the kind's formulas name. Raises Refused for a limit that nobody gives."""
    own = registry.constants()
    found: list[Constant] = []
    for name in kind.constants:
        stated = profile.coefficients.get(name)
        if name in extra:
            found.append(extra[name])
        elif stated is not None:
            unit = kind.constant_units.get(name, stated.unit)
            value = stated.in_unit(unit)
            found.append(Constant(name, value, unit, stated.label, stated.source, stated.standing))
        elif name in own:
            one = own[name]
            found.append(Constant(name, float(one), one.unit, name.replace("_", " "), one.source, one.standing))
        else:
            where = lab.path if lab else f"profile {profile.name}"
            raise Refused(
                where,
                f"{name} is not known to profile {profile.name}",
                f'{name} = "VALUE UNIT" in [limits]',
                "Give it.",
            )
    return tuple(found)


def tables(
    kind: SheetKind, lab: Lab | None, calorimeter: str, moment: datetime, profile: Profile
) -> dict[str, tuple[Row, ...]]:
    """The rows of every look-up table the kind has; without a lab file only those of the books are filled."""
    if lab is None:
        return {name: _materials() if name == "material" else () for name in kind.tables}
    makers: dict[str, Callable[[], tuple[Row, ...]]] = {
        "vessel": lambda: tuple(
            _vessel(lab, one, moment) for one in lab.vessels_of(calorimeter) if in_service(one, moment)
        ),
        "wire": lambda: tuple(_wire(one) for one in _in_force(lab.lots("firing wire"), moment)),
        "thread": lambda: tuple(_thread(one) for one in _in_force(lab.lots("thread"), moment)),
        "aid": lambda: _aids(lab, moment, profile),
        "certified": lambda: _certified(lab, moment),
        "titrant": lambda: tuple(
            {
                "lot": one.lot,
                "strength": one.strength,
                "standardised": one.standardised.isoformat(),
                "valid_until": one.valid_until.isoformat(),
            }
            for one in _standardised(lab, moment)
        ),
        "balance": lambda: tuple(
            {
                "id": one.id,
                "check_mass": one.check_mass,
                "check_limit": one.check_limit,
                "calibrated_until": _day(one.calibrated_until),
            }
            for one in lab.balances
        ),
        "person": lambda: tuple(_person(kind, one) for one in lab.people),
        "cup": lambda: tuple(
            {
                "id": one.id,
                "what": one.what,
                "heat_capacity": one.heat_capacity,
                "uncertainty": one.U,
                "determined": None if one.valid_from is None else _moment(one.valid_from),
                "valid_until": _moment(one.valid_until),
            }
            for one in _in_force(lab.cups, moment)
        ),
        "material": _materials,
    }
    return {name: makers[name]() for name in kind.tables}


def _materials() -> tuple[Row, ...]:
    """Solids with a known specific heat, in the order of the book."""
    return tuple(
        {
            "place": float(place),
            "title": f"{one.name} ({one.grade})",
            "specific_heat": one.specific_heat,
            "slope": one.slope,
            "width": one.width,
            "density": one.density,
            "source": one.source,
        }
        for place, one in enumerate(materials(), start=1)
    )


def _person(kind: SheetKind, one: Person) -> Row:
    """One person: what they may do, and until when they may do this kind of sheet, and release it."""
    until = _day(one.valid_until)
    return {
        "id": one.id,
        "may": ", ".join(one.may),
        "valid_until": until,
        "entitled_until": until if kind.name in one.may else NEVER,
        "releases_until": until if "release" in one.may else NEVER,
    }


def _day(value: date | None) -> str:
    return FAR if value is None else value.isoformat()


def _moment(value: datetime | None) -> str:
    return FAR if value is None else value.isoformat(timespec="minutes")


def in_service(vessel: Vessel, moment: datetime) -> bool:
    """Whether a vessel may be fired: within its pressure test, and firings left when they were counted."""
    left = vessel.firings_left
    return (vessel.test_due is None or moment.date() <= vessel.test_due) and (left is None or left > 0)


def _in_force(blocks: Iterable[Named], moment: datetime) -> list[Named]:
    """Each lot or cup once: as in force at the moment, else as it will be stated first."""
    listed: dict[str, list[Named]] = {}
    for one in blocks:
        listed.setdefault(one.id, []).append(one)
    return [last(same, moment) or same[0] for same in listed.values()]


def _standardised(lab: Lab, moment: datetime) -> list[Titrant]:
    """Each titrant once: as standardised last by the day, else as it will be first."""
    listed: dict[str, list[Titrant]] = {}
    for one in sorted(lab.titrants(), key=lambda titrant: titrant.standardised):
        listed.setdefault(one.lot, []).append(one)
    order = dict.fromkeys(one.lot for one in lab.titrants())
    known = {lot: [one for one in same if one.standardised <= moment.date()] for lot, same in listed.items()}
    return [known[lot][-1] if known[lot] else listed[lot][0] for lot in order]


def _vessel(lab: Lab, vessel: Vessel, moment: datetime) -> Row:
    """One vessel with the calibration in force; its heat capacity is blank where there is none."""
    found = lab.calibration_at(vessel.id, moment)
    left = vessel.firings_left
    return {
        "id": vessel.id,
        **_calibration(found),
        "rated_energy": vessel.rated_energy,
        "rated_fill": 3.3 if vessel.rated_fill is None else vessel.rated_fill,
        "volume": vessel.volume,
        "firings_done": None if vessel.firings_at_start is None else float(vessel.firings_at_start),
        "firings_left": NO_COUNT if left is None else float(left),
        "test_due": _day(vessel.test_due),
    }


def _calibration(found: Calibration | None) -> dict[str, Value]:
    if found is None:
        return {
            "heat_capacity": None, "calibration": "", "valid_from": None, "valid_until": None, "rise_low": None,
            "rise_high": None, "energy_low": None, "energy_high": None, "certificate": "", "sensitivity": None,
        }  # fmt: skip
    rise = found.rise or (None, None)
    energy = found.energy or (None, None)
    return {
        "heat_capacity": found.value,
        "calibration": found.issue,
        "valid_from": _moment(found.valid_from),
        "valid_until": _moment(found.valid_until),
        "rise_low": rise[0],
        "rise_high": rise[1],
        "energy_low": energy[0],
        "energy_high": energy[1],
        "certificate": found.certificate,
        "sensitivity": found.sensitivity,
    }


def _heat(lot: Lot, unit: str) -> float | None:
    value, given = lot.heat
    return units.convert(value, given, unit) if units.dimensions(given) == units.dimensions(unit) else None


def _doubt(lot: Lot) -> float | None:
    """Standard uncertainty of a lot's heat in J/g."""
    if lot.u is None or units.dimensions(lot.u[1]) != units.dimensions("J/g"):
        return None
    return units.convert(lot.u[0], lot.u[1], "J/g")


def _wire(lot: Lot) -> Row:
    return {
        "lot": lot.id,
        "heat": _heat(lot, "J/cm"),
        "length": lot.length,
        "valid_until": _moment(lot.valid_until),
    }


def _thread(lot: Lot) -> Row:
    return {
        "lot": lot.id,
        "piece_heat": _heat(lot, "J"),
        "heat": _heat(lot, "J/g"),
        "valid_until": _moment(lot.valid_until),
    }


def _aids(lab: Lab, moment: datetime, profile: Profile) -> tuple[Row, ...]:
    """Aid lots, then certified lots that may be burnt along, these for a mass weighed as the laboratory weighs."""
    own: tuple[Row, ...] = tuple(
        {
            "lot": lot.id,
            "heat": _heat(lot, "J/g"),
            "uncertainty": _doubt(lot),
            "what": lot.what,
            "valid_until": _moment(lot.valid_until),
            "certificate": lot.certificate,
            "sensitivity": 0.0 if lot.sensitivity is None else lot.sensitivity,
        }
        for lot in _in_force(lab.aids(), moment)
    )
    certified: tuple[Row, ...] = tuple(
        {
            "lot": one.lot,
            "heat": value_as_weighed(one, lab, profile),
            "uncertainty": None if one.U is None else one.U / one.k,
            "what": one.substance,
            "valid_until": _moment(one.valid_until),
            "certificate": one.lot,
            "sensitivity": 1.0,
        }
        for one in _stated(lab, moment)
    )
    return own + certified


def value_as_weighed(one: Certified, lab: Lab, profile: Profile) -> float:
    """J/g of a certified lot for a mass weighed in the laboratory's own convention."""
    if one.mass == lab.laboratory.mass_convention:
        return one.value
    factor = float(
        registry.call(
            "MASS_CONVENTION_FACTOR",
            density=one.density or 1.320,
            air_density=profile.coefficients["air_density"].value,
            weight_density=profile.coefficients["weight_density"].in_unit("g/cm3"),
        )
    )
    return one.value * factor if one.mass == IN_VACUUM else one.value / factor


def _stated(lab: Lab, moment: datetime) -> list[Certified]:
    """Each certified lot as stated last before the moment."""
    lots = dict.fromkeys(one.lot for one in lab.certified)
    stated = [lab.certificate(lot, moment) for lot in lots]
    return [one for one in stated if one is not None]


def _certified(lab: Lab, moment: datetime) -> tuple[Row, ...]:
    rows: list[Row] = [
        {
            "lot": one.lot,
            "substance": one.substance,
            "value": one.value,
            "uncertainty": one.U,
            "coverage": one.k,
            "convention": one.mass,
            "basis": "as analysed",
            "conditions": one.conditions,
            "density": one.density or 1.320,
            "valid_until": _moment(one.valid_until),
        }
        for one in _stated(lab, moment)
    ]
    control = lab.control
    if control is not None and control.second and control.second_gross_dry is not None:
        rows.append(
            {
                "lot": control.second,
                "value": control.second_gross_dry,
                "uncertainty": control.second_U,
                "coverage": 2.0,
                "convention": IN_AIR,
                "basis": "dry",
                "conditions": "",
                "density": 1.320,
                "valid_until": FAR,
            }
        )
    return tuple(rows)
