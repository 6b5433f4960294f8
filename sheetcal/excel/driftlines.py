"""The lines drawn on a record's chart, both drifts extrapolated and the two moments, and what is left over from them.

Each point is a plain formula with its value. While the record cannot be read all points fall on the first
reading, so that no chart shows a line from nowhere.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from statistics import fmean

from sheetcal.model import Place, Value

Known = Mapping[str, "Value | list[Value]"]
NEEDED = ("record_time", "record_temperature", "record_length", "fore_end", "main_end", "fore_drift", "after_drift")


Point = tuple[tuple[str, float], tuple[str, float]]  # x and y, each a formula with its value
DIGITS = 6  # of a residual in mK: far below any thermometer, and the same in every program


@dataclass(frozen=True)
class Drawn:
    """The test that all is there, then x (min) and y (degC) of eight points, two a line: (formula, value)."""

    test: str
    ready: int
    points: tuple[Point, ...]


def named(places: Mapping[str, Place]) -> dict[str, Place] | None:
    """The places the lines need: those of NEEDED, and `first` and `second`, the moments the periods end at.

    places: of one record, by field name. None where the kind's record has no such periods.
    """
    if any(name not in places for name in NEEDED):
        return None
    found = {name: places[name] for name in NEEDED}
    for role, end in (("first", "fore_end"), ("second", "main_end")):
        step = places[end].field.step
        moment = step.args.get("moment", "") if step else ""
        if moment not in places:
            return None
        found[role] = places[moment]
    return found


def titles(places: Mapping[str, Place]) -> list[str]:
    """What the four lines are called, as the sheet calls the quantities. places: from `named`."""
    return [places[name].field.label for name in ("fore_drift", "after_drift", "first", "second")]


def drift_lines(cells: Mapping[str, str], known: Known, gate: str) -> Drawn:
    """The points of the four lines.

    cells: by the names of `named`, `A6:A65` for a series; known: their contents; gate: the cell of the test.
    """
    scalars = [name for name in cells if name not in NEEDED[:2]]
    ready = all(_is_number(known[name]) for name in scalars)
    starts = [f"IF(ISNUMBER({first}),{first},0)" for first in (cells[name].partition(":")[0] for name in NEEDED[:2])]
    resting = [_first(known[name]) for name in NEEDED[:2]]
    values = _values(known) if ready else [(resting[0], resting[1])] * 8
    points = []
    for pair, (x, y) in zip(_formulas(cells), values, strict=True):
        at_x, at_y = (f"=IF({gate}=1,{text},{start})" for text, start in zip(pair, starts, strict=True))
        points.append(((at_x, x), (at_y, y)))
    test = f"=IF(COUNT({','.join(cells[name] for name in scalars)})={len(scalars)},1,0)"
    return Drawn(test, int(ready), tuple(points))


def residuals(cells: Mapping[str, str], known: Known, gate: str, drawn: Drawn, row: int, size: int) -> list[Point]:
    """Time (min) and residual (mK) of each reading of fore- and after-period against its drift line.

    gate: the cell of the test; row: of the first of the eight points, in columns I and J; size: rows of the
    series. A reading outside both periods repeats the first point, so that nothing is drawn for it.
    """
    (times, top), temperatures = _start(cells["record_time"]), _start(cells["record_temperature"])[0]
    fore_end, main_end, length = cells["fore_end"], cells["main_end"], cells["record_length"]
    found = []
    for position, (x, y) in enumerate(_left_over(known, drawn, size), start=1):
        at = top + position - 1
        inside = f"AND({position}>={main_end},{position}<={length})"
        on_after = f"{temperatures}{at}-J${row + 2}-{cells['after_drift']}*({times}{at}-I${row + 2})"
        reading = f"IF({position}<={fore_end},{temperatures}{at},{temperatures}${top})"
        on_fore = f"{reading}-J${row}-{cells['fore_drift']}*(K{at}-I${row})"
        at_x = f"=IF({gate}=1,IF(OR({position}<={fore_end},{inside}),{times}{at},{times}${top}),0)"
        found.append(((at_x, x), (f"=IF({gate}=1,ROUND(1000*IF({inside},{on_after},{on_fore}),{DIGITS}),0)", y)))
    return found


def _left_over(known: Known, drawn: Drawn, size: int) -> list[tuple[float, float]]:
    if not drawn.ready:
        return [(0.0, 0.0)] * size
    times, temperatures = _listed(known["record_time"], size), _listed(known["record_temperature"], size)
    fore_end, main_end, length = (_number(known[name]) for name in ("fore_end", "main_end", "record_length"))
    fore, after = drawn.points[0], drawn.points[2]

    def left(position: int, line: Point, drift: str) -> tuple[float, float]:
        x, y = _number(times[position - 1]), _number(temperatures[position - 1])
        return x, round(1000 * (y - line[1][1] - _number(known[drift]) * (x - line[0][1])), DIGITS)

    return [
        left(one, after, "after_drift")
        if main_end <= one <= length
        else left(one if one <= fore_end else 1, fore, "fore_drift")
        for one in range(1, size + 1)
    ]


def _listed(values: Value | list[Value], size: int) -> list[Value]:
    listed = values if isinstance(values, list) else [values]
    return [*listed, *[None] * (size - len(listed))]


def _start(cells: str) -> tuple[str, int]:
    """Column and first row of `A6:A65`."""
    first = cells.partition(":")[0]
    letters = first.rstrip("0123456789")
    return letters, int(first[len(letters) :])


def _formulas(cells: Mapping[str, str]) -> list[tuple[str, str]]:
    times, temperatures = cells["record_time"], cells["record_temperature"]
    fore_end, main_end, length = cells["fore_end"], cells["main_end"], cells["record_length"]
    first, second, begin = cells["first"], cells["second"], times.partition(":")[0]
    end = f"INDEX({times},{length})"

    def fore(series: str) -> str:
        return f"AVERAGE({series.partition(':')[0]}:INDEX({series},{fore_end}))"

    def after(series: str) -> str:
        return f"AVERAGE(INDEX({series},{main_end}):INDEX({series},{length}))"

    def on_fore(x: str) -> str:
        return f"{fore(temperatures)}+{cells['fore_drift']}*({x}-{fore(times)})"

    def on_after(x: str) -> str:
        return f"{after(temperatures)}+{cells['after_drift']}*({x}-{after(times)})"

    low, high = f"MIN({temperatures})", f"MAX({temperatures})"
    return [
        (begin, on_fore(begin)), (second, on_fore(second)),
        (first, on_after(first)), (end, on_after(end)),
        (first, low), (first, high),
        (second, low), (second, high),
    ]  # fmt: skip


def _values(known: Known) -> list[tuple[float, float]]:
    """The same eight points in numbers."""
    times, temperatures = _numbers(known["record_time"]), _numbers(known["record_temperature"])
    fore = slice(0, int(_number(known["fore_end"])))
    after = slice(int(_number(known["main_end"])) - 1, int(_number(known["record_length"])))
    first, second = _number(known["first"]), _number(known["second"])

    def line(part: slice, drift: str, x: float) -> tuple[float, float]:
        return x, fmean(temperatures[part]) + _number(known[drift]) * (x - fmean(times[part]))

    low, high = min(temperatures), max(temperatures)
    return [
        line(fore, "fore_drift", times[0]), line(fore, "fore_drift", second),
        line(after, "after_drift", first), line(after, "after_drift", times[after.stop - 1]),
        (first, low), (first, high),
        (second, low), (second, high),
    ]  # fmt: skip


def _first(values: Value | list[Value]) -> float:
    value = values[0] if isinstance(values, list) and values else None
    return _number(value) if _is_number(value) else 0.0


def _numbers(values: Value | list[Value]) -> list[float]:
    return [_number(one) for one in values if _is_number(one)] if isinstance(values, list) else []


def _number(value: object) -> float:
    return float(value)  # type: ignore[arg-type]  # asked of numbers only


def _is_number(value: object) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool)
