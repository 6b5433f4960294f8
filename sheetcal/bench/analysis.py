"""What the analysis bench reports of a sample: moistures, ash, elements, with its bases and marks."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import date, timedelta

from sheetcal.bench.draw import Dice, stepped
from sheetcal.bench.facts import Facts, Readings
from sheetcal.bench.honest import Habits
from sheetcal.bench.materials import ELEMENTS, WATER_PER_HYDROGEN, Truth

BASES = ("dry", "as analysed", "as received", "dry ash-free")
SCATTER = {
    "carbon": 0.10,
    "hydrogen": 0.03,
    "nitrogen": 0.02,
    "sulfur": 0.008,
    "chlorine": 0.004,
    "ash": 0.04,
}
SMALLEST = 0.02  # %, what these determinations can still tell from nothing
TOO_WET = 25.0  # %: beyond this nobody states elements with the water in them
DAY_BEFORE = timedelta(days=1)


@dataclass(frozen=True, slots=True)
class Moistures:
    """Mass-% of water, as reported, that turn a dry value into another basis."""

    total: float
    analysed: float


def from_dry(value: float, basis: str, moistures: Moistures, ash: float) -> float:
    """A dry mass-% on another basis; ash is the dry mass-%."""
    shares = {
        "dry": 1.0,
        "as analysed": 1.0 - moistures.analysed / 100.0,
        "as received": 1.0 - moistures.total / 100.0,
        "dry ash-free": 100.0 / (100.0 - ash),
    }
    return value * shares[basis]


def with_printed(truth: Truth, facts: Facts, sample: str) -> Truth:
    """The truth brought in line with what the worklist has printed of it already."""
    found = {name: facts.printed(f"{sample}.{name}") for name in (*ELEMENTS, "ash")}
    given = {
        name: float(value)
        for name, value in found.items()
        if isinstance(value, int | float) and facts.word(f"{sample}.{name}_basis", "dry") == "dry"
    }
    return replace(
        truth,
        composition=replace(truth.composition, **given),
        total_moisture=facts.number(f"{sample}.total_moisture", truth.total_moisture),
        analysis_moisture=facts.number(f"{sample}.analysis_moisture", truth.analysis_moisture),
    )


def readings(truth: Truth, facts: Facts, sample: str, day: date, habits: Habits, dice: Dice) -> Readings:
    """The analysis block of one sample by id; quantities still awaited are left out."""
    wet = _moistures(truth, dice.child("moistures"))
    found = _moisture_readings(wet, day, habits, dice)
    dry = {name: _determined(name, _true(truth, name), dice) for name in SCATTER}
    for name, value in dry.items():
        if name not in habits.awaited:
            basis = facts.word(f"{sample}.{name}_basis") or _basis(name, wet, dice)
            if not _usual(facts, f"{sample}.{name}", _on_basis(name, value, basis, wet, dry["ash"])):
                basis = "dry"
            found.update(_reported(name, value, basis, wet, dry["ash"], habits))
            found[f"{name}_determined"] = f"{day.isoformat()}T{'14:00' if name == 'ash' else '08:00'}"
    if not set(habits.awaited) & set(dry):
        found.update(_oxygen(truth, dry, day, dice))
    if "hydrogen" in found:
        wetter = found["hydrogen_basis"] in ("as analysed", "as received")
        found["hydrogen_includes"] = "total" if wetter else "without moisture"
    return {f"{sample}.{name}": value for name, value in found.items()}


def _determined(name: str, true: float, dice: Dice) -> float:
    """A dry mass-% as determined: scatter grows with the amount up to what is usual for the quantity."""
    return max(0.0, dice.normal(min(SCATTER[name], 0.01 * true + 0.005), true))


def _true(truth: Truth, name: str) -> float:
    return float(getattr(truth.composition, name))


def _moistures(truth: Truth, dice: Dice) -> Moistures:
    """Moistures as reported: a drying oven is good for a few hundredths."""
    total = max(0.0, truth.total_moisture + dice.normal(0.05))
    analysed = max(0.0, truth.analysis_moisture + dice.normal(0.02))
    return Moistures(stepped(total, 0.1), stepped(analysed, 0.01))


def _moisture_readings(wet: Moistures, day: date, habits: Habits, dice: Dice) -> Readings:
    found: Readings = {
        "total_moisture": wet.total,
        "total_moisture_basis": "as received",
        "total_moisture_source": "client" if habits.client else "measured",
        "total_moisture_determined": f"{(day - DAY_BEFORE).isoformat()}T15:00",
        "analysis_moisture": wet.analysed,
        "analysis_moisture_basis": "as analysed",
        "analysis_moisture_source": "measured",
        "analysis_moisture_determined": f"{day.isoformat()}T07:30",
    }
    if habits.client:
        found["client_moisture"] = stepped(max(0.0, wet.total * dice.uniform(0.9, 1.1)), 0.1)
    return found


def _basis(name: str, wet: Moistures, dice: Dice) -> str:
    """Mostly dry, as most benches report; ash never ash-free, a wet sample never as received."""
    if dice.chance(0.7):
        return "dry"
    unfit = {"dry ash-free" if name == "ash" else "", "as received" if wet.total > TOO_WET else ""}
    return dice.choice([one for one in BASES if one not in unfit])


def _on_basis(name: str, dry: float, basis: str, wet: Moistures, ash: float) -> float:
    """A quantity on a basis; hydrogen of a moist basis counts with that of the moisture."""
    value = from_dry(dry, basis, wet, ash)
    moisture = {"as analysed": wet.analysed, "as received": wet.total}.get(basis, 0.0)
    return value + moisture / WATER_PER_HYDROGEN if name == "hydrogen" else value


def _usual(facts: Facts, one: str, value: float) -> bool:
    """Whether a value lies in the range that its class usually has, whatever its basis."""
    return facts.limit(one, "warn_low", 0.0) <= value <= facts.limit(one, "warn_high", 100.0)


def _reported(name: str, dry: float, basis: str, wet: Moistures, ash: float, habits: Habits) -> Readings:
    """One quantity as it comes from the bench: value, basis, source and, below what can be told, the mark."""
    value = _on_basis(name, dry, basis, wet, ash)
    found: Readings = {f"{name}_basis": basis, f"{name}_source": "measured"}
    if dry < SMALLEST or (habits.below_limit and name == "chlorine"):
        limit = max(SMALLEST, 1.5 * value)
        return {**found, name: stepped(limit, 0.01), f"{name}_mark": "<"}
    return {**found, name: stepped(value, 0.01)}


def _oxygen(truth: Truth, dry: dict[str, float], day: date, dice: Dice) -> Readings:
    """Oxygen, on most benches as what is left to 100."""
    if dice.chance(0.15):
        value, source = truth.composition.oxygen + dice.normal(0.15), "measured"
    else:
        value, source = 100.0 - sum(dry.values()), "difference"
    return {
        "oxygen": stepped(max(0.0, value), 0.01),
        "oxygen_basis": "dry",
        "oxygen_source": source,
        "oxygen_determined": f"{day.isoformat()}T08:00",
    }
