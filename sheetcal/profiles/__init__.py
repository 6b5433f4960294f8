"""Method profiles: every coefficient and limit of a method, with unit, source and standing.

A profile is one TOML file in this folder; `parts/` holds what several share. A limit that is not known
is absent, and whoever needs it asks the lab file.
"""

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from difflib import get_close_matches
from functools import cache
from importlib import resources
from types import MappingProxyType
from typing import Any

from sheetcal import units
from sheetcal.errors import BadInput

STANDINGS = ("derived", "published", "memory", "laboratory")
COEFFICIENT_KEYS = {"value", "unit", "label", "source", "standing", "note"}
PROFILE_KEYS = {"version", "title", "parts", "kinds", "texts", "coefficient"}
Range = tuple[float, float]


@dataclass(frozen=True, slots=True)
class Coefficient:
    """One number of a method; `name` is its defined name in a workbook."""

    name: str
    value: float
    unit: str
    source: str
    standing: str
    label: str
    note: str = ""

    def in_unit(self, unit: str) -> float:
        """The value in another unit. Raises BadInput where the units do not fit."""
        return units.convert(self.value, self.unit, unit)


@dataclass(frozen=True, slots=True)
class Profile:
    """A named set of coefficients and texts; `kinds` are the sheet kinds it serves. Not to be altered."""

    name: str
    version: int
    title: str
    kinds: tuple[str, ...]
    coefficients: Mapping[str, Coefficient]
    texts: Mapping[str, str] = field(default_factory=dict)

    def value(self, name: str, unit: str) -> float | None:
        """The coefficient in `unit`, or None where the profile does not know it."""
        found = self.coefficients.get(name)
        return None if found is None else found.in_unit(unit)

    def restated(self, values: Mapping[str, float], source: str) -> "Profile":
        """The profile with a laboratory's own values (in the coefficients' units) in place of its own.

        A coefficient the profile lacks takes unit and label from a profile that has it.
        Raises BadInput for a name no profile has.
        """
        merged = dict(self.coefficients)
        for name, value in values.items():
            pattern = merged.get(name) or known(name)
            merged[name] = replace(pattern, value=value, source=source, standing="laboratory", note="")
        return replace(self, coefficients=merged)


def names() -> list[str]:
    """All profiles, sorted: every TOML file of this folder."""
    return sorted(one.name[:-5] for one in _folder().iterdir() if one.name.endswith(".toml"))


def load(name: str) -> Profile:
    """The profile called `name`. Raises BadInput, naming the nearest, where there is none."""
    if name not in names():
        near = get_close_matches(name, names(), 1, 0.3)
        expected = f"'{near[0]}'" if near else f"one of {', '.join(names())}"
        raise BadInput(f"profile '{name}'", "is not known", expected, "Correct the name.")
    return _load(name)


@cache
def _load(name: str) -> Profile:
    data = _toml(f"{name}.toml")
    where = f"profiles/{name}.toml"
    _refuse_unknown(data, PROFILE_KEYS, where)
    rows: dict[str, Coefficient] = {}
    for part in data["parts"]:
        rows.update(_coefficients(_toml(f"parts/{part}.toml"), f"profiles/parts/{part}.toml"))
    rows.update(_coefficients(data, where))
    return Profile(
        name=name,
        version=data["version"],
        title=data["title"],
        kinds=tuple(data["kinds"]),
        coefficients=rows,
        texts=dict(data["texts"]),
    )


def _coefficients(data: Mapping[str, Any], where: str) -> dict[str, Coefficient]:
    """The [coefficient] table of one file. Raises BadInput for a row that is not whole."""
    rows = {}
    for name, row in data["coefficient"].items():
        _refuse_unknown(row, COEFFICIENT_KEYS, f"{where}, {name}")
        missing = COEFFICIENT_KEYS - {"note"} - set(row)
        if missing:
            raise BadInput(f"{where}, {name}", f"has no {min(missing)}", "every number with all of them")
        if row["standing"] not in STANDINGS:
            raise BadInput(f"{where}, {name}", f"standing '{row['standing']}'", " or ".join(STANDINGS))
        units.parse(row["unit"])
        rows[name] = Coefficient(name=name, **{**row, "value": float(row["value"])})
    return rows


def _refuse_unknown(row: Mapping[str, Any], allowed: set[str], where: str) -> None:
    unknown = set(row) - allowed
    if unknown:
        raise BadInput(where, f"unknown key '{min(unknown)}'", f"one of {', '.join(sorted(allowed))}")


@cache
def all_names() -> frozenset[str]:
    """Every coefficient name that some profile has."""
    return frozenset(name for one in names() for name in _load(one).coefficients)


def known(name: str) -> Coefficient:
    """The coefficient as the first profile that has it states it. Raises BadInput, naming the nearest."""
    for one in names():
        found = _load(one).coefficients.get(name)
        if found is not None:
            return found
    near = get_close_matches(name, sorted(all_names()), 1, 0.3)
    expected = f"'{near[0]}'" if near else "a coefficient of a profile"
    raise BadInput(f"coefficient '{name}'", "is not known", expected, "Correct the name.")


@cache
def class_ranges(fuel_class: str) -> Mapping[str, Range]:
    """Usual ranges (low, high) in mass per cent by quantity for a fuel class: common practice, no source.

    A class that is not listed has the ranges every class has.
    """
    data = _toml("parts/classes.toml")
    rows = {**data["all"], **data.get(fuel_class, {})}
    return MappingProxyType({name: (float(low), float(high)) for name, (low, high) in rows.items()})


@cache
def class_gross(fuel_class: str) -> Range | None:
    """Usual gross values of a fuel class as analysed, J/g (low, high): common practice; None for a class not listed."""
    found = _toml("parts/classes.toml")["gross"].get(fuel_class)
    return None if found is None else (float(found[0]), float(found[1]))


def _folder() -> Any:
    return resources.files("sheetcal.profiles")


def _toml(path: str) -> dict[str, Any]:
    return tomllib.loads((_folder() / path).read_text("utf-8"))
