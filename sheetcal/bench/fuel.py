"""A fuel workbook at the bench: from what the samples are to what was read of them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from sheetcal.bench import analysis, combustion, firing
from sheetcal.bench.combustion import Charge
from sheetcal.bench.draw import Dice, stepped
from sheetcal.bench.facts import Facts, Readings, Row, amount
from sheetcal.bench.firing import Rig, Turn
from sheetcal.bench.front import front_readings, station_readings
from sheetcal.bench.honest import Habits
from sheetcal.bench.materials import RARE, Composition, Truth, of_class, varied
from sheetcal.errors import BadInput

BENZOIC = Composition(68.85, 4.95, 0.0, 0.0, 0.0, 0.0)
USUAL_R = 120.0  # J/g, where the workbook prints none
SMALLEST_AID = 1000.0  # J: nobody weighs in less
HYGROSCOPIC = 0.1  # %, by how much a closed analysis sample takes up or loses water overnight


@dataclass(frozen=True, slots=True)
class Batch:
    """One sample of a workbook: what it is, its role, the runs it gets and why some do not count."""

    number: int
    truth: Truth
    role: str
    runs: tuple[int, ...]
    void: dict[int, str]

    @property
    def id(self) -> str:
        """`sample3`: the scope of its ids."""
        return f"sample{self.number}"


@dataclass(frozen=True, slots=True)
class Portion:
    """What is to be weighed for one run: sample g, aids by table row and g, their heat J."""

    mass: float
    aids: tuple[tuple[Row, float], ...]

    @property
    def aid_heat(self) -> float:
        """J from all aids together."""
        return sum(amount(row, "heat") * mass for row, mass in self.aids)


def readings(facts: Facts, habits: Habits, dice: Dice, truths: Sequence[Truth] | None = None) -> Readings:
    """Every reading of a fuel workbook by id; `truths` are what its samples are, else they are invented."""
    rig = Rig(facts, habits, dice)
    batches = [_batch(facts, habits, dice, number, truths) for number in range(1, facts.record.shape.samples + 1)]
    controls_first = sorted(batches, key=lambda one: one.role != "control")
    runs = [run for one in controls_first for run in one.runs]
    later = {one.runs[-1]: 1 for one in batches if habits.two_days and len(one.runs) > 1}
    turns = rig.turns(runs, dice.child("turns"), later)
    found = front_readings(facts, facts.first_day(habits.weekend), habits, dice.child("front"))
    found.update(station_readings(facts, dice.child("station")))
    style = dice.choice(("all", "all", "gross", "net"))
    for batch in batches:
        found.update(_sample(rig, batch, turns, style))
    found.update(_cited_controls(batches, turns))
    return found


def _cited_controls(batches: Sequence[Batch], turns: dict[int, Turn]) -> Readings:
    """Where the control of a run's vessel and day stands, for runs that this workbook's controls do not cover."""
    covered = {
        (turns[run].vessel, turns[run].day) for batch in batches if batch.role == "control" for run in batch.runs
    }
    cited: Readings = {}
    for run in (run for batch in batches if batch.role != "control" for run in batch.runs):
        vessel, day = turns[run].vessel, turns[run].day
        if (vessel, day) not in covered:
            cited[f"run{run}.control_ref"] = f"control of {vessel}, {day.isoformat()}, in a workbook of its own"
    return cited


def _batch(facts: Facts, habits: Habits, dice: Dice, number: int, truths: Sequence[Truth] | None) -> Batch:
    sample = f"sample{number}"
    role = facts.word(f"{sample}.role", "sample")
    truth = _truth(facts, habits, dice.child(sample), sample, role, truths)
    places = facts.record.shape.places
    first = (number - 1) * places + 1
    wanted = int(facts.number(f"{sample}.runs_required", facts.record.shape.runs or 2))
    extra = int(bool(habits.void)) + int(habits.third_run) if role == "sample" else 0
    if wanted + extra > places:
        raise BadInput(f"{sample}, {places} places", f"{wanted + extra} runs", "a reserve place", "Issue with --spare.")
    void = {first: habits.void} if habits.void and role == "sample" else {}
    return Batch(number, truth, role, tuple(range(first, first + wanted + extra)), void)


def _truth(facts: Facts, habits: Habits, dice: Dice, sample: str, role: str, truths: Sequence[Truth] | None) -> Truth:
    """What a sample really is: as certified, as told, the case's material, or a lot of its class."""
    if role == "control":
        return certified(facts, facts.word(f"{sample}.control_lot"))
    if role == "aid-blank":
        return _aid_lot(facts, facts.word(f"{sample}.sample_id"))
    if truths is not None:
        number = int(sample.removeprefix("sample"))
        return analysis.with_printed(truths[(number - 1) % len(truths)], facts, sample)
    if habits.material:
        return analysis.with_printed(RARE[habits.material], facts, sample)
    chosen = dice.choice(of_class(facts.word(f"{sample}.fuel_class", "coal")))
    return analysis.with_printed(varied(chosen, dice), facts, sample)


def certified(facts: Facts, lot: str) -> Truth:
    """A certified lot: J/g for a mass as this laboratory weighs it."""
    row = next((row for row in facts.table("certified") if row["lot"] == lot), None)
    if row is None:
        raise BadInput(
            f"control {lot or 'without a lot'}",
            "is not in the table certified",
            "a certified lot",
            "Name it.",
        )
    value = amount(row, "value") * convention_factor(facts, row)
    if row.get("basis") == "dry":
        coal = of_class("coal")[0]
        return replace(coal, name=lot, gross_dry=value, analysis_moisture=1.9, total_moisture=0.0, scatter=8.0)
    return Truth(lot, "", BENZOIC, value, scatter=0.0, steady=True)


def convention_factor(facts: Facts, row: Row) -> float:
    """J/g for a mass as weighed here over J/g as the certificate counts the mass."""
    of_lot = "vacuum" in str(row.get("convention") or "in air")
    of_laboratory = "vacuum" in facts.setting("mass_convention")
    factor = combustion.buoyancy(amount(row, "density", combustion.BENZOIC_DENSITY))
    return factor ** (int(of_lot) - int(of_laboratory))


def _aid_lot(facts: Facts, lot: str) -> Truth:
    row = next((row for row in facts.table("aid") if row["lot"] == lot), None)
    heat = amount(row, "heat") if row else 46_060.0
    return Truth(lot, "liquid", Composition(86.0, 14.0, 0.0, 0.0, 0.0, 0.0), heat, scatter=0.0, steady=True)


def _sample(rig: Rig, batch: Batch, turns: dict[int, Turn], style: str) -> Readings:
    """Everything read of one sample and its runs."""
    dice = rig.dice.child(batch.id, "readings")
    first = min(turns[run].day for run in batch.runs)
    found: Readings = {}
    if batch.role == "sample" or not batch.truth.steady:
        found.update(analysis.readings(batch.truth, rig.facts, batch.id, first, rig.habits, dice))
    elif batch.role == "aid-blank":
        found.update(_nothing_to_analyse(batch.id))
    if batch.role == "control":  # a control is never received moist: only what a dry value needs
        found = {one: value for one, value in found.items() if ".total_moisture" not in one}
    portion = _portion(rig, batch, turns[batch.runs[0]])
    found.update(_head(rig, batch, portion))
    for run in batch.runs:
        found.update(firing.placed(run, _run(rig, batch, turns[run], turns[run].day == first, portion, style)))
    return found


def _nothing_to_analyse(sample: str) -> Readings:
    zero: Readings = {f"{sample}.analysis_moisture": 0.0}
    for name in ("sulfur", "chlorine"):
        zero.update({f"{sample}.{name}": 0.0, f"{sample}.{name}_basis": "dry", f"{sample}.{name}_source": "typical"})
    return zero


def _head(rig: Rig, batch: Batch, portion: Portion) -> Readings:
    """What is settled for a sample before anything is weighed."""
    found: Readings = {}
    if portion.aids:
        found[f"{batch.id}.aid_planned"] = stepped(portion.aid_heat * 1.06, 1)
    if rig.facts.word(f"{batch.id}.needs_approval") == "yes":
        found[f"{batch.id}.approval"] = "laboratory head, on the day of issue"
    if rig.facts.printed(f"{batch.id}.expected_gross") is None:
        found[f"{batch.id}.expected_gross"] = stepped(max(3000.0, batch.truth.gross_analysed() * 1.03), 100)
    return found


def _portion(rig: Rig, batch: Batch, turn: Turn) -> Portion:
    """How much to weigh: near the target, below the largest mass, for a rise inside the calibrated range."""
    gross = batch.truth.gross_analysed()
    low, high = heat_window(rig, turn.vessel)
    mass = _allowed(rig, batch, rig.facts.number(f"{batch.id}.first_mass", 1.0 if gross < 32_000 else 0.7))
    mass = min(mass, high * 0.95 / gross) if gross > 0.0 else min(mass, 0.5)
    wrap = _wrapping(rig, batch, turn)
    heat = mass * gross + sum(amount(row, "heat") * grams for row, grams in wrap)
    alone = batch.role != "sample" or rig.facts.printed(f"{batch.id}.first_limit") is not None
    rest = () if heat > low or alone else _aid(rig, turn, min(low * 1.08 - heat, _room(rig, batch)))
    portion = Portion(mass, wrap + rest)
    return replace(portion, mass=_allowed(rig, batch, mass, portion.aid_heat * 1.06))


def heat_window(rig: Rig, vessel: str) -> tuple[float, float]:
    """J that give a rise inside the range the vessel's heat capacity was calibrated for."""
    row = rig.vessels[vessel]
    capacity = rig.heat_capacity(vessel)
    rated = amount(row, "rated_energy", 30.0) * 1000.0
    low, high = amount(row, "rise_low", 1.4), amount(row, "rise_high", 3.1)
    return low * capacity * 1.03, min(high * capacity * 0.97, 0.9 * rated)


def _allowed(rig: Rig, batch: Batch, mass: float, aid_heat: float = 0.0) -> float:
    """A mass that is never above the largest one the sheet prints."""
    largest = (_planned(rig) - aid_heat) / _expected(rig, batch)
    largest = min(largest, rig.facts.number(f"{batch.id}.first_limit", largest))
    return min(mass, largest * 0.975)


def _planned(rig: Rig) -> float:
    """J that a charge is planned for: a share of the smallest rating."""
    rated = min(amount(row, "rated_energy", 30.0) for row in rig.vessels.values()) * 1000.0
    return rig.facts.constants.get("rated_share", 0.9) * rated


def _expected(rig: Rig, batch: Batch) -> float:
    """J/g that the sheet expects of the sample before anything is burnt."""
    return rig.facts.number(f"{batch.id}.expected_gross", max(3000.0, batch.truth.gross_analysed() * 1.03))


def _room(rig: Rig, batch: Batch) -> float:
    """J that aids may give while three quarters of the target mass still fit."""
    least = 0.77 * rig.facts.number(f"{batch.id}.first_mass", 0.0)
    return max(0.0, (_planned(rig) - least / 0.975 * _expected(rig, batch)) / 1.06)


def _wrapping(rig: Rig, batch: Batch, turn: Turn) -> tuple[tuple[Row, float], ...]:
    """A bag or capsule round what will not lie still: liquids and fluff."""
    wanted = {"liquid": ("bag", "capsule"), "recovered": ("capsule", "bag")}.get(batch.truth.fuel_class, ())
    rows = rig.facts.usable("aid", turn.day)
    for what in wanted if batch.role == "sample" else ():
        for row in rows:
            if row.get("what") == what:
                return ((row, 0.06 if what == "bag" else 0.12),)
    return ()


def _aid(rig: Rig, turn: Turn, heat: float) -> tuple[tuple[Row, float], ...]:
    """An aid that gives so many J: certified acid first, then oil."""
    rows = [row for row in rig.facts.usable("aid", turn.day) if row.get("what") not in ("bag", "capsule", "tape")]
    rows.sort(key=lambda row: str(row.get("what")) != "benzoic acid")
    return ((rows[0], heat / amount(rows[0], "heat")),) if rows and heat > SMALLEST_AID else ()


def _run(rig: Rig, batch: Batch, turn: Turn, same_day: bool, portion: Portion, style: str) -> Readings:
    """One run, from its charge to its wash."""
    dice = rig.dice.child("run", turn.run)
    void = batch.void.get(turn.run, "")
    mass = portion.mass * dice.uniform(0.96, 1.02)
    weighed = rig.weigh(mass, "net" if portion.aids else style, "sample_mass", dice)
    moisture, wetter = _moisture_of_run(batch, same_day, dice)
    aid_readings, aid_heat = _aids(portion, dice)
    fuse_readings, fuse_heat = rig.fuse(turn.run, turn.day, dice)
    water_readings, water_off = rig.water(dice)
    charge = _charge(rig, batch, weighed.mass, moisture, dice, aid_heat, fuse_heat)
    theta = charge.rise(rig.heat_capacity(turn.vessel), water_off) * firing.BURNT.get(void, 1.0)
    route = _route(rig, batch, turn)
    found: Readings = {**firing.head(turn, "void" if void else "valid", void), "vessel": turn.vessel}
    found.update(weighed.readings)
    for block in (wetter, aid_readings, fuse_readings, water_readings):
        found.update(_of_turn(block, turn))
    found.update(rig.fill(dice))
    found.update(rig.rise(turn, theta, dice, "misfire" if void == "misfire" else ""))
    if void != "misfire":
        found.update(rig.wash(route, charge.acids, turn.day, dice))
        found.update(_residue(batch, weighed.mass, moisture, dice))
    else:
        found["wash_route"] = route
    found["remarks"] = rig.habits.note
    return found


def _of_turn(block: Readings, turn: Turn) -> Readings:
    """A block as it is, a moisture dated to the morning of its run."""
    dated = {f"{name}_determined": f"{turn.day.isoformat()}T07:30" for name in block if name == "analysis_moisture"}
    return {**block, **dated}


def _moisture_of_run(batch: Batch, same_day: bool, dice: Dice) -> tuple[float, Readings]:
    """True moisture of the portion; a portion of another day has its own, determined that day."""
    moisture = batch.truth.analysis_moisture
    if same_day or batch.truth.steady:
        return moisture, {}
    moisture = max(0.0, moisture + dice.uniform(-HYGROSCOPIC, HYGROSCOPIC) * min(1.0, moisture))
    return moisture, {"analysis_moisture": stepped(moisture, 0.01)}


def _aids(portion: Portion, dice: Dice) -> tuple[Readings, float]:
    """Lots and masses of the aids as weighed, and the heat they really give."""
    found: Readings = {}
    heat = 0.0
    for number, (row, planned) in enumerate(portion.aids, start=1):
        mass = planned * dice.uniform(0.96, 1.04)
        found[f"aid{number}_lot"] = row["lot"]
        found[f"aid{number}_mass"] = stepped(mass + dice.normal(0.00003), 0.0001)
        heat += mass * amount(row, "heat")
    return found, heat


def _charge(
    rig: Rig, batch: Batch, mass: float, moisture: float, dice: Dice, aid_heat: float, fuse_heat: float
) -> Charge:
    """What one firing really sets free."""
    truth = batch.truth
    share = 1.0 - moisture / 100.0
    gross = truth.gross_dry + dice.normal(_scatter(rig, batch))
    acid = combustion.acids(
        mass, truth.composition.sulfur * share, truth.composition.chlorine * share, dice.uniform(32.0, 52.0)
    )
    return Charge(mass * gross * share, aid_heat, fuse_heat, 0.0, acid)


def _scatter(rig: Rig, batch: Batch) -> float:
    """Standard deviation from portion to portion: with weighing and reading it stays below r/7."""
    if batch.truth.scatter is not None:
        return batch.truth.scatter
    return rig.facts.number(f"{batch.id}.repeatability_limit", USUAL_R) / 9.0


def _route(rig: Rig, batch: Batch, turn: Turn) -> str:
    """How the acids are told apart: as printed, or as the laboratory does it for this fuel."""
    printed = rig.facts.word(f"run{turn.run}.wash_route")
    if printed:
        return printed
    if batch.role == "sample" and batch.truth.composition.chlorine > 0.3:
        return "ions"
    return rig.dice.child(batch.id, "route").choice(("total acid", "total acid", "total acid", "barium"))


def _residue(batch: Batch, mass: float, moisture: float, dice: Dice) -> Readings:
    """The crucible weighed back where there is ash to see."""
    ash = batch.truth.composition.ash * (1.0 - moisture / 100.0) / 100.0 * mass
    return {"residue_mass": stepped(ash * dice.uniform(0.97, 1.01), 0.0001)} if ash > 0.01 else {}
