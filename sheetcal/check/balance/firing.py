"""One firing in a combustion vessel: what the balances of calibration and fuel share."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from sheetcal.check.balance.book import Book
from sheetcal.check.balance.measure import LARGEST_SHARE, Measure
from sheetcal.check.balance.rise import Record, Rise, read_record, rises

LEAST_RISE = 0.001  # K, below which no two roads to a rise need agree
PLAUSIBLE_EXCHANGE = 0.2  # K; a rise differs no more from end less start than the jacket can explain
TENTH_MOLAR = 0.1  # mol/L
LEAST_HEAT = 5000.0  # J of a firing, where its rise is not known yet


def corrected_rises(book: Book, runs: Iterable[int]) -> Mapping[int, Measure]:
    """The rise of every run that has one, K; all records of the workbook in one solution."""
    found: dict[int, Measure] = {}
    records: dict[int, Record] = {}
    for run in runs:
        source = book.text(f"run{run}.rise_source")
        if source == "record":
            record = _record(book, f"run{run}.")
            if record is not None:
                records[run] = record
        elif source is not None:
            measure = _rise_by_hand(book, f"run{run}.", source)
            if measure is not None:
                found[run] = measure
    resolution = book.kind.by_key()["run.record_temperature"].resolution or 0.0
    for run, rise in zip(records, rises(list(records.values()), resolution), strict=True):
        found[run] = _as_measure(rise)
    return found


def _record(book: Book, run: str) -> Record | None:
    fired, ended = book.number(run + "firing_time"), book.number(run + "end_of_main")
    if fired is None or ended is None:
        return None
    cooling = book.number("sheet.own_cooling_constant") or 0.0
    times, temperatures = book.series(run + "record_time"), book.series(run + "record_temperature")
    return read_record(times, temperatures, fired, ended, cooling)


def _as_measure(rise: Rise) -> Measure:
    """Two roads may differ by the tolerance of their integrals, capped at 1 mK or 0.1 %."""
    cap = max(LARGEST_SHARE * abs(rise.theta), LEAST_RISE)
    return Measure(rise.theta, min(rise.tolerance, cap), absolute=LEAST_RISE)


def _rise_by_hand(book: Book, run: str, source: str) -> Measure | None:
    if source == "three readings":
        return _three_readings(book, run)
    if source == "adiabatic":
        return _adiabatic(book, run)
    return _instrument(book, run) if source == "instrument" else None


def _three_readings(book: Book, run: str) -> Measure | None:
    """Fore line and after line, each carried on to the middle time; the rise is the step between them."""
    names = ("time_a", "temperature_a", "time_b", "time_c", "temperature_c", "drift_before", "drift_after")
    values = [book.number(f"{run}three_{name}") for name in names]
    if any(value is None for value in values):
        return None
    t_a, T_a, t_b, t_c, T_c, before, after = (value for value in values if value is not None)
    fore_line = T_a + before * (t_b - t_a)
    after_line = T_c - after * (t_c - t_b)
    return Measure(after_line - fore_line)


def _adiabatic(book: Book, run: str) -> Measure | None:
    """Step less what a drift that goes over evenly from one rate to the other brings in the time between."""
    start, end = book.number(run + "adiabatic_start"), book.number(run + "adiabatic_end")
    if start is None or end is None:
        return None
    drifts = [book.number(f"{run}adiabatic_drift_{name}") for name in ("before", "after")]
    known = [drift for drift in drifts if drift is not None]
    minutes = book.number(run + "adiabatic_duration") or 0.0
    brought = minutes * sum(known) / len(known) if known else 0.0
    return Measure(end - start - brought)


def _instrument(book: Book, run: str) -> Measure | None:
    """The instrument's own rise; where start and end contradict it, what they say."""
    shown = book.number(run + "instrument_rise")
    start, end = book.number(run + "instrument_start"), book.number(run + "instrument_end")
    if shown is None:
        return None
    if start is not None and end is not None and abs(end - start - shown) > PLAUSIBLE_EXCHANGE:
        return Measure(end - start)
    return Measure(shown)


def weighed_mass(book: Book, run: str, net_name: str) -> Measure | None:
    """Mass burnt, g: the net as the balance showed it, else what the crucible gained."""
    net = book.number(run + net_name)
    if net is not None:
        return Measure(net)
    gross, tare = book.number(run + "crucible_gross"), book.number(run + "crucible_tare")
    return None if gross is None or tare is None else Measure(gross - tare, largest=gross)


def wire_heat(book: Book, run: str) -> Measure | None:
    """Heat of the wire, J: that of the whole piece less that of the piece left; none where none was used."""
    lot = book.text(run + "fuse_lot")
    start, left = book.number(run + "wire_start"), book.number(run + "wire_left")
    if lot is None:
        return Measure(0.0) if start is None and left is None else None
    per_cm = book.looked_up("wire", "lot", lot, "heat")
    if per_cm is None or start is None or left is None or left > start:
        return None
    return Measure(per_cm * start - per_cm * left, largest=per_cm * start)


def thread_heat(book: Book, run: str) -> Measure | None:
    """Heat of the thread, J: by mass where it was weighed, else that of one piece of the lot."""
    lot, mass = book.text(run + "thread_lot"), book.number(run + "thread_mass")
    if lot is None:
        return Measure(0.0) if mass is None else None
    heat = book.looked_up("thread", "lot", lot, "piece_heat" if mass is None else "heat")
    return None if heat is None else Measure(heat * (1.0 if mass is None else mass))


def ignition_heat(book: Book, run: str) -> float:
    """Electrical heat of firing, J; not typed is none."""
    return book.number(run + "ignition_energy") or 0.0


def acid_volume(book: Book, run: str) -> Measure | None:
    """The wash's acid as mL of 0.1 mol/L, by the moles of base let in; a titrant without a lot is 0.1 mol/L."""
    start, end = book.number(run + "burette_start"), book.number(run + "burette_end")
    lot = book.text(run + "titrant_lot")
    strength = TENTH_MOLAR if lot is None else book.looked_up("titrant", "lot", lot, "strength")
    if start is None or end is None or strength is None:
        return None
    millimoles = strength * end - strength * start
    return Measure(millimoles / TENTH_MOLAR, largest=strength * end / TENTH_MOLAR)


def heat_capacity(book: Book, run: str, vessel: float) -> Measure:
    """Effective heat capacity with the water of this run, J/K: the dry parts and the water that is there."""
    water, reference = book.number(run + "calorimeter_water"), book.number("sheet.water_reference")
    if water is None or reference is None:
        return Measure(vessel)
    specific_heat = book.constant("water_specific_heat", 4.18)
    dry_parts = vessel - reference * specific_heat
    return Measure(dry_parts + water * specific_heat)
