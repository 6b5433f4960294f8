"""What a lab file states of one identity at one moment, and between which moments nothing changes."""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Iterable
from datetime import datetime, time, timedelta
from typing import Protocol, TypeVar

from sheetcal.inputs.lab import Lab, Lot
from sheetcal.kinds.dates import EPOCH


class Dated(Protocol):
    """A block of the lab file that may say from when it holds."""

    @property
    def line(self) -> int: ...
    @property
    def valid_from(self) -> datetime | None: ...


Block = TypeVar("Block", bound=Dated)


def last(blocks: Iterable[Block], moment: datetime | None) -> Block | None:
    """The block stated last that holds from `moment` or before; None where none does."""
    held = [one for one in blocks if moment is None or one.valid_from is None or one.valid_from <= moment]
    return max(held, key=lambda one: (one.valid_from or datetime.min, one.line), default=None)


def lot_at(lab: Lab, name: str, moment: datetime | None) -> Lot | None:
    """What burns along, as in force at a moment."""
    return last((one for one in lab.all_lots if one.id == name), moment)


def titrant_at(lab: Lab, name: str, moment: datetime | None) -> float | None:
    """The strength of a titrant (mol/L), as standardised last by the day of `moment`."""
    listed = [one for one in lab.titrants() if one.lot == name]
    known = [one for one in listed if moment is None or one.standardised <= moment.date()]
    return max(known, key=lambda one: (one.standardised, one.line)).strength if known else None


def cup_at(lab: Lab, name: str, moment: datetime | None) -> float | None:
    """The heat capacity of a cup (J/K), as in force at a moment."""
    found = last((one for one in lab.cups if one.id == name), moment)
    return found.heat_capacity if found else None


def second_control(lab: Lab, name: str) -> float | None:
    """The gross value (J/g, dry) of the laboratory's second control material, if it is called `name`."""
    return lab.control.second_gross_dry if lab.control and lab.control.second == name else None


def boundaries(lab: Lab) -> tuple[datetime, ...]:
    """Moments, in order, at which anything dated in the lab file begins to hold."""
    blocks: list[Dated] = [*lab.certified, *lab.all_lots, *lab.cups]
    moments = {one.valid_from for one in blocks if one.valid_from is not None}
    moments |= {datetime.combine(one.standardised, time()) for one in lab.titrants()}
    return tuple(sorted(moments))


def era(bounds: tuple[datetime, ...], moment: datetime) -> int:
    """The number of boundaries passed: two moments of one era find the same constants in force."""
    return bisect_right(bounds, moment)


def moment_of(day: object, start: object) -> datetime | None:
    """A run's date (serial number) and start ("08:05", noon where it says nothing) as a moment."""
    if isinstance(day, bool) or not isinstance(day, int | float) or not 0 < day < 2_000_000:
        return None
    whole = EPOCH + timedelta(days=int(day))
    try:
        clock = datetime.strptime(str(start), "%H:%M").time()
    except ValueError:
        clock = time(12)
    return datetime.combine(whole.date(), clock)
