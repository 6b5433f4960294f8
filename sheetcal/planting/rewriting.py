"""More slips in formulas: another function, another run's formula, errors hidden, a constant typed in."""

from __future__ import annotations

import re
from collections.abc import Iterator

from sheetcal.model import Place
from sheetcal.planting.formulas import rewritten
from sheetcal.planting.registry import Spot, slip
from sheetcal.planting.sheet import Sheet


@slip("formula-altered")
def errors_hidden(sheet: Sheet) -> Iterator[Spot]:
    """IFERROR around everything, so that no error shows."""
    yield from rewritten(sheet, lambda written, _: f"=IFERROR({written[1:]},0)", "hidden")


@slip("formula-altered", kinds=("calibration", "specific-heat"))
def deviation_of_a_population(sheet: Sheet) -> Iterator[Spot]:
    """STDEVP for STDEV."""
    yield from rewritten(sheet, lambda written, _: written.replace("STDEV(", "STDEVP("), "STDEVP")


@slip("formula-altered", also=("formula-dimension",), kinds=("fuel", "calibration"))
def look_up_made_approximate(sheet: Sheet) -> Iterator[Spot]:
    """The last argument of a look-up left out."""
    yield from rewritten(sheet, lambda written, _: re.sub(r"(MATCH\([^()]*),0\)", r"\1)", written), "approximate")


@slip("formula-altered", kinds=("fuel", "calibration", "specific-heat", "vaporisation"))
def formula_of_another_run(sheet: Sheet) -> Iterator[Spot]:
    """The text of the first run's formula pasted into another run."""

    def of_the_first(_: str, place: Place) -> str | None:
        if not place.id.startswith("run"):
            return None
        return sheet.plan.places[f"run1.{place.field.name}"].formula

    yield from rewritten(sheet, of_the_first, "copied")


@slip("formula-altered")
def constant_typed_into_a_formula(sheet: Sheet) -> Iterator[Spot]:
    """The value of a constant in place of its name: equal today."""
    values = {one.name: one.value for one in sheet.record.constants}
    pattern = re.compile(r"(?<![\w.])(" + "|".join(map(re.escape, values)) + r")(?![\w.(])")

    def typed(written: str, _: Place) -> str | None:
        return pattern.sub(lambda found: repr(values[found[1]]), written)

    if values:
        yield from rewritten(sheet, typed, "typed into the formula")
