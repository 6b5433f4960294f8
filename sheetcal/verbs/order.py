"""What was asked of `issue`."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime

from sheetcal.errors import BadInput
from sheetcal.inputs.lab import Lab
from sheetcal.inputs.worklist import Worklist, WorklistSample
from sheetcal.model import SheetKind, Value

MOST_SAMPLES = 60
MOST_PLACES = 20
MOST_RUNS = 150  # of one workbook: about 125 000 cells, well within what the gate lets through
PAPERS = ("A4", "Letter")


@dataclass(frozen=True)
class Order:
    """What the user asked of `issue`; `moment` is local time at the laboratory."""

    kind: str
    lab: Lab | None = None
    worklist: Worklist | None = None
    samples: int | None = None
    runs: int | None = None
    spare: int | None = None
    bodies: int | None = None
    calorimeter: str | None = None
    profile: str | None = None
    unit: str | None = None
    paper: str = "A4"
    job: str = ""
    moment: datetime | None = None
    values: Mapping[str, Value] = field(default_factory=dict)

    def where(self, sample: WorklistSample | None = None) -> str:
        """What a message about the worklist, or a line of it, names as its place."""
        if self.worklist is None:
            return f"issue {self.kind}"
        return self.worklist.source.where(sample.line if sample else None)


def refuse_bounds(order: Order) -> None:
    """Raise BadInput for options beyond their bounds."""
    if order.paper not in PAPERS:
        raise BadInput(f"--paper {order.paper}", "is not known", " or ".join(PAPERS), "Choose one.")
    bounds = {"--runs": (order.runs, 1, MOST_PLACES), "--spare": (order.spare, 0, MOST_PLACES)}
    bounds |= {"--samples": (order.samples, 1, MOST_SAMPLES), "--bodies": (order.bodies, 2, 8)}
    for option, (value, low, high) in bounds.items():
        if value is not None and not low <= value <= high:
            raise BadInput(option, f"{value}", f"{low} to {high}", "Choose a number in between.")


def refuse_foreign(order: Order, kind: SheetKind) -> None:
    """Raise BadInput for options that the kind does not have."""
    options = {"--samples": ("sample", order.samples), "--runs": ("run", order.runs)}
    options["--bodies"] = ("body", order.bodies)
    for option, (scope, value) in {**options, "--spare": ("run", order.spare)}.items():
        if value and scope not in kind.scopes:
            others = " ".join(name for name, (one, _) in options.items() if one in kind.scopes)
            raise BadInput(f"issue {kind.name}", f"takes no {option}", others, "Leave it out.")
    if order.worklist is not None and "sample" not in kind.scopes:
        raise BadInput(f"issue {kind.name}", "has no samples", "--runs", "Leave --worklist out.")
