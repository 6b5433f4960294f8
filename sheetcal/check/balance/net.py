"""Gross value on every basis, net values by element balance and first law, and what is reported of them."""

from __future__ import annotations

from typing import NamedTuple

from sheetcal.check.balance import atoms
from sheetcal.check.balance.atoms import Moles, moles_per_gram
from sheetcal.check.balance.book import Book, Road
from sheetcal.check.balance.composition import Dry, counted, estimate
from sheetcal.check.balance.measure import Measure
from sheetcal.check.balance.reporting import report

JOULES_PER_STEP = 10.0  # 0.01 MJ/kg
WATER_PER_PERCENT = 0.01 / atoms.WATER  # mol of water in 1 g with 1 % moisture


class HeatPerGram(NamedTuple):
    """Mean total heat per gram of sample, J/g: as analysed and dry; 0 where it is not known."""

    analysed: float
    dry: float

    def at(self, moisture: float) -> float:
        """Per gram of fuel with that moisture, %."""
        return self.dry * (100.0 - moisture) / 100.0


def values(book: Book, road: Road, head: str, dry: Dry, heat: HeatPerGram) -> None:
    """Note every value of a sample that stands on its dry gross value and its composition."""
    gross = road.before(head + "gross_dry")
    moisture = counted(book, head, "total_moisture")
    estimated = road.note(head + "composition_estimate", estimate(dry))
    _terms(road, head, dry)
    if gross is None:
        return
    _deviation(road, head, gross, estimated, heat.dry)
    step = book.constant("reporting_step", JOULES_PER_STEP)
    report(road, head + "gross_dry_reported", gross, step, heat.dry)
    ash = dry.get("ash")
    if ash is not None and ash.value < 100.0:
        burnable = (100.0 - ash.value) / 100.0
        road.put(head + "gross_daf", gross.times(1.0 / burnable, heat.dry / burnable))
    if moisture is not None:
        own = gross.times((100.0 - moisture) / 100.0, heat.at(moisture))
        received = road.note(head + "gross_as_received", own)
        report(road, head + "gross_as_received_reported", received, step, heat.at(moisture))
    _constant_pressure(book, road, head, dry, gross, heat)
    _constant_volume(book, road, head, dry, gross, heat)


def _terms(road: Road, head: str, dry: Dry) -> None:
    """Work of the gases and vaporisation of the water formed, J per gram of dry fuel."""
    if "hydrogen" not in dry:
        return
    water = atoms.water_made(moles_per_gram(dry["hydrogen"].value))
    road.put(
        head + "vaporisation",
        dry["hydrogen"].times(0.005 * atoms.VAPORISATION / atoms.H)._replace(value=atoms.VAPORISATION * water),
    )
    fuel = _fuel(dry)
    if fuel is not None:
        gas = -atoms.RT * atoms.gas_change(fuel)
        largest = atoms.RT * max(fuel.hydrogen / 4, fuel.oxygen / 2, fuel.nitrogen / 2)
        road.put(
            head + "gas_term",
            Measure(gas, 0.01 * atoms.RT * dry["hydrogen"].tolerance / (4 * atoms.H), largest),
        )


def _fuel(dry: Dry, chlorine: float = 0.0) -> Moles | None:
    """Moles per gram of dry fuel, None where hydrogen, oxygen or nitrogen is not known."""
    if any(name not in dry for name in ("hydrogen", "oxygen", "nitrogen")):
        return None
    return moles_per_gram(dry["hydrogen"].value, dry["oxygen"].value, dry["nitrogen"].value, chlorine)


def _deviation(road: Road, head: str, gross: Measure, estimated: Measure | None, heat: float) -> None:
    if estimated is not None and gross.value != 0.0:
        off = 100.0 * (estimated.value - gross.value) / gross.value
        doubt = 100.0 * (estimated.tolerance + gross.tolerance * abs(estimated.value / gross.value))
        road.put(head + "composition_deviation", Measure(off, doubt / abs(gross.value), 100.0))


def _off(book: Book, name: str, exact: float, percent: float) -> float:
    """What a rounded coefficient of the profile may move a value by, J/g."""
    return abs(book.constant(name, exact) - exact) * abs(percent)


def _constant_pressure(book: Book, road: Road, head: str, dry: Dry, gross: Measure, heat: HeatPerGram) -> None:
    """First law at constant pressure: the gases do work, the water leaves as vapour."""
    fuel = _fuel(dry)
    own = None
    if fuel is not None:
        h, o, n = (0.01 * atoms.RT / (count * weight) for count, weight in ((4, atoms.H), (2, atoms.O), (2, atoms.N)))
        vapour = 0.005 * atoms.VAPORISATION / atoms.H
        doubt = (
            _off(book, "net_p_hydrogen", vapour - h, dry["hydrogen"].value)
            + _off(book, "net_p_oxygen", o, dry["oxygen"].value)
            + _off(book, "net_p_nitrogen", n, dry["nitrogen"].value)
            + (vapour - h) * dry["hydrogen"].tolerance
        )
        own = Measure(gross.value + atoms.release_at_constant_pressure(fuel), gross.tolerance + doubt, heat.dry)
    plain = road.note(head + "net_p_dry_plain", own)
    net = None if plain is None else _with_chlorine(book, road, head, dry, plain, heat)
    if net is None:
        return
    for name, typed in (("net_p_as_received", "total_moisture"), ("net_p_client", "client_moisture")):
        moisture = counted(book, head, typed)
        if moisture is not None:
            road.note(head + name, _wetted(book, net, moisture, "net_p_moisture", atoms.VAPORISATION, heat))
    _report_net(book, road, head, heat)


def _wetted(book: Book, net: Measure, moisture: float, coefficient: str, per_mole: float, heat: HeatPerGram) -> Measure:
    """Net value of one gram of moist fuel: its dry part's, less what its moisture takes to leave as vapour."""
    exact = WATER_PER_PERCENT * per_mole
    value = net.value * (100.0 - moisture) / 100.0 - exact * moisture
    doubt = net.tolerance * (100.0 - moisture) / 100.0 + _off(book, coefficient, exact, moisture)
    return Measure(value, doubt, max(heat.at(moisture), exact * moisture))


def _report_net(book: Book, road: Road, head: str, heat: HeatPerGram) -> None:
    received = road.before(head + "net_p_as_received")
    moisture = counted(book, head, "total_moisture")
    if received is None or moisture is None:
        return
    largest = max(heat.at(moisture), WATER_PER_PERCENT * atoms.VAPORISATION * moisture)
    step = book.constant("reporting_step", JOULES_PER_STEP)
    report(road, head + "net_p_as_received_reported", received, step, largest)
    reported = road.before(head + "net_p_as_received_reported")
    if reported is not None:
        road.put(head + "net_p_as_received_reported_mj", reported.times(0.001, 0.001 * largest))


def _with_chlorine(book: Book, road: Road, head: str, dry: Dry, net: Measure, heat: HeatPerGram) -> Measure | None:
    """The net value by the profile: where hydrogen chloride leaves as gas, chlorine keeps hydrogen from making water.

    A profile whose chlorine terms are 0 does not count it: then the plain value stands.
    """
    bound, term = book.constant("chlorine_hydrogen", 0.0), book.constant("chlorine_net", 0.0)
    if bound == 0.0 and term == 0.0:
        return road.note(head + "net_p_dry", net._replace(largest=heat.dry))
    if "chlorine" not in dry:
        return road.note(head + "net_p_dry", None)
    chlorine = dry["chlorine"].value
    share = 0.01 * chlorine / atoms.CL
    with_it = atoms.release_at_constant_pressure(Moles(share, chlorine=share))
    without = atoms.release_at_constant_pressure(Moles(share))
    per_hydrogen = book.constant("net_p_hydrogen", 0.0)
    printed = (per_hydrogen * bound - term) * chlorine
    shift = with_it - without
    own = Measure(net.value + shift, net.tolerance + abs(printed - shift), heat.dry)
    return road.note(head + "net_p_dry", own)


def _constant_volume(book: Book, road: Road, head: str, dry: Dry, gross: Measure, heat: HeatPerGram) -> None:
    """First law at constant volume: no work, the water takes its energy of vaporisation."""
    own = None
    per_mole = atoms.VAPORISATION - atoms.RT
    if "hydrogen" in dry:
        hydrogen = dry["hydrogen"]
        exact = 0.005 * per_mole / atoms.H
        taken = atoms.release_at_constant_volume(moles_per_gram(hydrogen.value))
        doubt = _off(book, "net_v_hydrogen", exact, hydrogen.value) + exact * hydrogen.tolerance
        own = Measure(gross.value + taken, gross.tolerance + doubt, heat.dry)
    net = road.note(head + "net_v_dry", own)
    moisture = counted(book, head, "total_moisture")
    if net is not None and moisture is not None:
        road.put(head + "net_v_as_received", _wetted(book, net, moisture, "net_v_moisture", per_mole, heat))
