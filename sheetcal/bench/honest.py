"""Honest sheets that look wrong: how people really work, case by case, and what each changes at the bench."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from sheetcal.errors import BadInput

FIRED = ("calibration", "fuel")

EVERYWHERE = ("calibration", "fuel", "specific-heat", "vaporisation", "heat-balance")


@dataclass(frozen=True, slots=True)
class Habits:
    """How the people at this bench work; each departure from the default is honest, however it looks.

    `material` names an entry of `materials.RARE` every sample is made of; `mass_step` is the last digit of a
    mass (g); `awaited` are quantities not analysed yet; `void` is why the first run of each does not count.
    """

    material: str = ""
    settings_equal: bool = False
    pre_cut: bool = False
    mass_step: float = 0.0001
    weekend: bool = False
    awaited: tuple[str, ...] = ()
    one_person: bool = False
    check_equal: bool = False
    void: str = ""
    third_run: bool = False
    two_days: bool = False
    unordered: bool = False
    client: bool = False
    below_limit: bool = False
    note: str = ""


@dataclass(frozen=True, slots=True)
class HonestCase:
    """One case: what it is, the kinds it can happen in, the fuel class it needs (empty: any), the habits."""

    description: str
    kinds: tuple[str, ...]
    habits: Habits
    fuel_class: str = ""


_FUEL = ("fuel",)

CASES: Mapping[str, HonestCase] = {
    "negative net": HonestCase(
        "a wet sludge whose net value as received is negative",
        _FUEL,
        Habits(material="sludge, pressed wet"),
        "sludge",
    ),
    "moisture below analysis": HonestCase(
        "total moisture below that of the analysis sample: dried, then moist again",
        _FUEL,
        Habits(material="pellets, moist again"),
        "biomass",
    ),
    "bone dry": HonestCase(
        "less than 1 % moisture in the analysis sample of a coke",
        _FUEL,
        Habits(material="coke, bone dry"),
        "coke",
    ),
    "negative gross": HonestCase(
        "a carbonate cake that takes up a little heat, burnt with an aid",
        _FUEL,
        Habits(material="carbonate cake"),
        "waste",
    ),
    "settings equal": HonestCase(
        "oxygen, vessel water and wire alike in every run", FIRED, Habits(settings_equal=True, pre_cut=True)
    ),
    "many digits": HonestCase(
        "masses with more digits than the balance shows: they come from its file",
        FIRED,
        Habits(mass_step=0.000001),
    ),
    "weekend": HonestCase("work done on a Saturday: a laboratory with shifts", EVERYWHERE, Habits(weekend=True)),
    "values awaited": HonestCase(
        "bench work done, sulfur and hydrogen still to come: incomplete, not a fault",
        _FUEL,
        Habits(awaited=("sulfur", "hydrogen")),
    ),
    "one person": HonestCase(
        "one person weighs, fires, checks and releases: a laboratory of one",
        EVERYWHERE,
        Habits(one_person=True),
    ),
    "check weight equal": HonestCase(
        "the check weight reads its nominal value to the last digit", EVERYWHERE, Habits(check_equal=True)
    ),
    "void run kept": HonestCase("a sooty run kept as void, its repeat in a reserve place", FIRED, Habits(void="soot")),
    "reserve empty": HonestCase("the reserve places stay empty", FIRED, Habits()),
    "wire pre-cut": HonestCase("wire from a lot cut beforehand, so every piece is alike", FIRED, Habits(pre_cut=True)),
    "own notes": HonestCase(
        "notes of the analyst's own in the remarks",
        EVERYWHERE,
        Habits(note="Hood 2 was noisy today; = 3 + 4 runs per rack. Ask J. about 12,5 and 0.1 g, see p. 7."),
    ),
    "misfire kept": HonestCase("a misfire kept as void: its rise is 0", FIRED, Habits(void="misfire")),
    "third run": HonestCase("a third run, in a reserve place", _FUEL, Habits(third_run=True)),
    "two days": HonestCase(
        "duplicates on two days and two vessels, each with its own moisture", FIRED, Habits(two_days=True)
    ),
    "not in time order": HonestCase("the runs were not fired in the order of the form", FIRED, Habits(unordered=True)),
    "client moisture": HonestCase(
        "total moisture from the client; net also at a moisture of the client's choice",
        _FUEL,
        Habits(client=True),
    ),
    "below limit": HonestCase("chlorine below its limit, marked <", _FUEL, Habits(below_limit=True)),
}

HONEST_CASES: Mapping[str, str] = {name: case.description for name, case in CASES.items()}


def habits_of(case: str | None, kind: str) -> Habits:
    """The habits of a case; the ordinary ones for None. Raises BadInput for a case the kind cannot show."""
    if case is None:
        return Habits()
    found = CASES.get(case)
    if found is None:
        raise BadInput(f"honest case '{case}'", "is not known", ", ".join(CASES))
    if kind not in found.kinds:
        raise BadInput(f"honest case '{case}'", f"does not happen in {kind}", ", ".join(found.kinds))
    return found.habits


def cases_of(kind: str) -> list[str]:
    """Names of the honest cases a kind can show, in their order."""
    return [name for name, case in CASES.items() if kind in case.kinds]


def class_of(case: str) -> str:
    """The fuel class a worklist must give for a case; empty where any will do."""
    return CASES[case].fuel_class
