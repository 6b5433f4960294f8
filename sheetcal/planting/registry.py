"""The register of slips: what each must be called, where it can happen, and what becomes of the workbook."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, TypeVar

from sheetcal.model import IssueRecord
from sheetcal.planting.package import Content, Parts
from sheetcal.planting.sheet import Sheet

Structure = Callable[[Parts], None]
EVERYWHERE = ("fuel", "calibration", "specific-heat", "vaporisation", "heat-balance")
One = TypeVar("One")
FIRED = ("fuel", "calibration")


@dataclass(frozen=True)
class Spot:
    """One way and place to make a slip: the change, and where it must be found.

    `at` is a field id, `Tab!A1`, a tab, or empty where the fault has no place. `readings` are typed and everything
    is computed anew; `cells` are changed in the file alone; `blank` names readings that then hold nothing a program
    could compute with; `structure` changes the package, `whole` the file; `issued` is another issue record, for what
    had run out when the sheet was used. `cause`: words of which one must stand in a cause named; none where the slip
    leaves no trace by which it is recognised.
    """

    at: str
    readings: Mapping[str, Any] = field(default_factory=dict)
    cells: Mapping[str, Content] = field(default_factory=dict)
    blank: tuple[str, ...] = ()
    style: Mapping[str, str] = field(default_factory=dict)
    structure: Structure | None = None
    whole: Callable[[bytes], bytes] | None = None
    issued: IssueRecord | None = None
    cause: tuple[str, ...] = ()


@dataclass(frozen=True)
class Slip:
    """A slip: its name, the code it must be found under, the kinds it happens in, and its places in a sheet."""

    name: str
    code: str
    kinds: tuple[str, ...]
    spots: Callable[[Sheet], Iterable[Spot]]
    also: tuple[str, ...] = ()

    def places(self, sheet: Sheet, most: int) -> list[Spot]:
        """At most so many places of it in a sheet, evenly spread."""
        return spread(self.spots(sheet), most)


Spots = Callable[[Sheet], Iterable[Spot]]
_LISTED: dict[str, Slip] = {}
_GENERATED: list[Callable[[Sheet], Iterable[Slip]]] = []


def slip(code: str, kinds: Sequence[str] = EVERYWHERE, also: tuple[str, ...] = ()) -> Callable[[Spots], Spots]:
    """Register a function that yields the places of a slip in a sheet; its name is the slip's.

    `also`: codes that say the same with more, where a place is of that sort.
    """

    def add(function: Spots) -> Spots:
        name = function.__name__.replace("_", " ").strip()
        if name in _LISTED:
            raise ValueError(f"two slips are called {name!r}")
        _LISTED[name] = Slip(name, code, tuple(kinds), function, also)
        return function

    return add


def generated(function: Callable[[Sheet], Iterable[Slip]]) -> Callable[[Sheet], Iterable[Slip]]:
    """Register a function that makes slips out of what the kind itself says."""
    _GENERATED.append(function)
    return function


def every(sheet: Sheet) -> Iterator[Slip]:
    """All slips that happen in a kind, those from its limits last."""
    for one in _LISTED.values():
        if sheet.kind in one.kinds:
            yield one
    for make in _GENERATED:
        yield from make(sheet)


def spread(spots: Iterable[One], most: int) -> list[One]:
    """At most so many of them, evenly spread from the first to the last."""
    listed = list(spots)
    if len(listed) <= most:
        return listed
    if most == 1:
        return [listed[len(listed) // 2]]
    return [listed[round(number * (len(listed) - 1) / (most - 1))] for number in range(most)]
