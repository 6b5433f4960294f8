"""The table that shows each sample (or the sheet) at a glance: lines that stand elsewhere, shown again on one row.

Its cells are no results: each repeats one, by a formula that follows from the layout. The writer puts them
there, and the checker knows what must stand in them.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from itertools import groupby

from sheetcal.kinds.layout import Skeleton, column_letter
from sheetcal.model import Place, Value

FIRST_COLUMN = 3  # C: beside number and name of the sample
WARNINGS = "warnings"
STOP, WARNING = "STOP", "warning"


@dataclass(frozen=True)
class Glance:
    """One cell of the table: where it stands, which places it shows, and the formula that must stand there.

    With `warns` it says whether any of its places, all lines of warning, holds a text; a void run is passed over.
    """

    tab: str
    row: int
    column: int
    places: tuple[Place, ...]
    formula: str
    warns: bool

    @property
    def cell(self) -> str:
        """Its address on the tab."""
        return f"{column_letter(self.column)}{self.row}"

    def value(self, known: Mapping[str, Value]) -> Value:
        """What the formula gives. known: results, and states of the runs, by id; a blank one may be absent."""
        if not self.warns:
            return known.get(self.places[0].id)
        counted = [one for one in self.places if known.get(state_of(one)) != "void"]
        values = [known.get(one.id) for one in counted]
        texts = [str(one) for one in values if one not in (None, "")]
        return (STOP if any(one.startswith(STOP) for one in texts) else WARNING) if texts else None


def state_of(place: Place) -> str:
    """The id under which the state of a place's run stands, where it has one."""
    return f"{place.id.partition('.')[0]}.state"


def glances(skeleton: Skeleton) -> list[Glance]:
    """Every cell of the table, row by row; none where the kind has no such block."""
    return list(_glances(skeleton))


def heads(shows: tuple[str, ...]) -> list[str]:
    """The heads of the columns, as the block states them."""
    return [one.partition(": ")[2] or one for one in shows]


def _glances(skeleton: Skeleton) -> Iterator[Glance]:
    warnings = _warnings(skeleton)
    for block in skeleton.blocks:
        if block.block.columns != "glance":
            continue
        for offset in range(block.last_row - block.first_row + 1):
            owner = f"sample{offset + 1}" if block.block.scope == "sample" else "sheet"
            for column, shown in enumerate(block.block.shows, start=FIRST_COLUMN):
                name = shown.partition(": ")[0]
                row = block.first_row + offset
                if name == WARNINGS:
                    places = tuple(warnings.get(owner, ()))
                    yield Glance(block.tab, row, column, places, _warning(skeleton, block.tab, places), True)
                else:
                    place = skeleton.places[f"{owner}.{name}"]
                    where = _on(block.tab, place, place.cell)
                    yield Glance(block.tab, row, column, (place,), f'=IF({where}="","",{where})', False)


def _warnings(skeleton: Skeleton) -> dict[str, list[Place]]:
    """The lines of warning of each sample and its runs, and of the whole sheet."""
    found: dict[str, list[Place]] = {}
    for place in skeleton.places.values():
        if place.field.step and not place.field.step.cell:
            found.setdefault("sheet", []).append(place)
            if place.sample:
                found.setdefault(place.sample, []).append(place)
    return found


def _warning(skeleton: Skeleton, tab: str, places: tuple[Place, ...]) -> str:
    """`STOP` where any line begins so, `warning` where any holds a text, else blank; void runs are passed over."""
    stop, some = [], []
    for _, group in groupby(places, key=lambda one: (one.tab, one.row)):
        row = list(group)
        where = _span(tab, row)
        states = [skeleton.places.get(state_of(one)) for one in row]
        kept = "1" if None in states else f'({_span(tab, [one for one in states if one])}<>"void")'
        stop.append(f'SUMPRODUCT((LEFT({where},4)="STOP")*{kept})')
        some.append(f"SUMPRODUCT((LEN({where})>0)*{kept})")
    return f'=IF({"+".join(stop)}>0,"{STOP}",IF({"+".join(some)}>0,"{WARNING}",""))'


def _span(tab: str, row: list[Place]) -> str:
    """Neighbours in a row as one range."""
    return _on(tab, row[0], row[0].cell if len(row) == 1 else f"{row[0].cell}:{row[-1].cell}")


def _on(tab: str, place: Place, span: str) -> str:
    return span if place.tab == tab else f"{place.tab}!{span}"
