"""The few shapes everything else speaks in: a kind's fields, a workbook's places, findings and verdicts."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

Value = float | int | str | bool | None
Series = list[Value]

SCOPES = ("sheet", "sample", "run", "body")
TABS = ("Front", "Readings", "Records", "Results", "Constants", "How computed", "Issue record")


@dataclass(frozen=True, slots=True)
class Field:
    """One quantity of a kind: a label, a reading, a constant or a result.

    `low`/`high` are refused outside, `warn_low`/`warn_high` are marked outside. `needed` says in which
    cases a reading is required: `{}` always, `None` never, `{"rise_source": ("record",)}` where that
    field of the same block holds one of the values (`"*"` = anything). `only` says in the same way where
    an optional line applies at all.
    """

    scope: str
    name: str
    label: str
    unit: str | None
    role: str
    type: str = "number"
    block: str = ""
    low: float | None = None
    high: float | None = None
    warn_low: float | None = None
    warn_high: float | None = None
    resolution: float | None = None
    needed: Mapping[str, tuple[str, ...]] | None = None
    when: str = ""
    origin: str = "person"
    locked: bool = False
    choices: tuple[str, ...] | str = ()
    series: bool = False
    beside: str = ""
    hint: str = ""
    only: Mapping[str, tuple[str, ...]] | None = None
    step: Step | None = None

    @property
    def key(self) -> str:
        """`scope.name`: how ranges and rules refer to the field."""
        return f"{self.scope}.{self.name}"


@dataclass(frozen=True, slots=True)
class Step:
    """How a result comes about: the cell function by name, its arguments by reference, its formula.

    `formula` is the template text without `=`, its references in braces: `{crucible_gross}-{crucible_tare}`.
    """

    cell: str
    args: Mapping[str, str]
    formula: str
    equation: str = ""
    source: str = ""
    reported: bool = False
    balance: str = "silent"
    balance_reason: str = ""


@dataclass(frozen=True, slots=True)
class Rule:
    """A limit the sheet shows while it is filled and the checker judges afterwards: one text, two renderings."""

    code: str
    scope: str
    when: str
    formula: str
    text: str
    place: str
    severity: str = "warning"
    sort: str = "fault"
    action: str = "hold"
    live: bool = True
    unless: str = ""


@dataclass(frozen=True, slots=True)
class Block:
    """A group of lines on a tab; `columns` is `list` (one value column), `places` (one per run or body) or `record`.

    With `glance` it is a table that shows lines of other blocks again, one row per sample (or one row):
    `shows` holds `name: head`, and `warnings` for all warnings of that sample.
    """

    id: str
    tab: str
    scope: str
    title: str
    columns: str = "list"
    note: str = ""
    shows: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)  # compared by identity: kinds are loaded once
class SheetKind:
    """A kind of worksheet as data; `constants` are the coefficients its formulas name, each in its unit."""

    name: str
    version: int
    title: str
    purpose: str
    scopes: tuple[str, ...]
    fields: tuple[Field, ...]
    rules: tuple[Rule, ...]
    blocks: tuple[Block, ...]
    constants: tuple[str, ...]
    tables: Mapping[str, tuple[str, ...]]
    constant_units: Mapping[str, str] = field(default_factory=dict)
    cautions: tuple[str, ...] = ()
    runs_default: int = 2
    spare_default: int = 1
    draft: bool = True

    def field(self, key: str) -> Field:
        """The field called `scope.name`; KeyError when the kind has none."""
        return self.by_key()[key]

    def by_key(self) -> dict[str, Field]:
        """All fields by `scope.name`."""
        return {one.key: one for one in self.fields}


@dataclass(frozen=True, slots=True)
class Shape:
    """How large a workbook is: numbers of samples, places, bodies, record rows and table rows."""

    samples: int = 0
    runs: int = 0
    spare: int = 0
    bodies: int = 0
    record_rows: int = 0
    table_rows: tuple[tuple[str, int], ...] = ()
    constants: tuple[str, ...] = ()

    @property
    def places(self) -> int:
        """Run places per sample (or in all, for a kind without samples)."""
        return self.runs + self.spare


@dataclass(frozen=True, slots=True)
class Place:
    """One field in one workbook: its id, where it stands, and the formula that must stand there."""

    id: str
    field: Field
    tab: str
    cell: str
    row: int
    column: int
    formula: str | None = None
    sample: str | None = None
    inputs: tuple[tuple[str, tuple[str, ...]], ...] = ()

    @property
    def where(self) -> str:
        """`Tab!A1`."""
        return f"{self.tab}!{self.cell}"


@dataclass(frozen=True, slots=True)
class Constant:
    """A constant printed in a workbook, with what an assessor asks of it."""

    name: str
    value: float
    unit: str
    label: str
    source: str
    standing: str
    valid_until: str = ""


@dataclass(frozen=True)
class IssueRecord:
    """What was issued, enough to rebuild the workbook: everything but the readings.

    `prefilled` holds labels and readings the worklist or the lab file gave, by id; those in `locked`
    cannot be typed. `ranges` are limits that profile, class or lab file set in place of the kind's.
    """

    issue_id: str
    kind: str
    kind_version: int
    profile: str
    profile_version: int
    issued_at: str
    tool: str
    lab_name: str
    lab_sha256: str
    shape: Shape
    constants: tuple[Constant, ...]
    tables: Mapping[str, tuple[Mapping[str, Value], ...]]
    prefilled: Mapping[str, Value]
    locked: tuple[str, ...]
    ranges: Mapping[str, Mapping[str, float]] = field(default_factory=dict)
    settings: Mapping[str, str] = field(default_factory=dict)
    cites: Mapping[str, str] = field(default_factory=dict)
    skeleton_sha256: str = ""


@dataclass(frozen=True)
class Finding:
    """One thing to say about one file; keys and order are those of the JSON contract."""

    code: str
    sort: str
    severity: str
    message: str
    sheet: str | None = None
    cell: str | None = None
    field: str | None = None
    found: Value = None
    expected: Value = None
    likely_cause: str | None = None
    certain: bool = True
    action: str = "hold"
    effect: Mapping[str, Any] | None = None
    false_alarm: float | None = None
    causes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Heard:
    """What LibreOffice said of one workbook: every result by id (blank None), or None where it was silent.

    `note` says how it spoke (`template`, `opened`) or why it did not (`silent: ...`); `failed`: it should have.
    """

    values: Mapping[str, Value] | None
    note: str
    failed: bool = False


@dataclass(frozen=True)
class ResultLine:
    """One result of one file as each witness sees it."""

    id: str
    label: str
    unit: str | None
    cell: str
    typed: Value
    formula: Value
    balance: Value
    office: Value
    agrees: bool | None
    reported: bool
    tolerance: float | None


@dataclass(frozen=True)
class Verdict:
    """What the checker says of one file."""

    file: str
    verdict: str
    sha256: str | None = None
    kind: str | None = None
    kind_version: int | None = None
    complete: bool | None = None
    issue_id: str | None = None
    profile: str | None = None
    profile_version: int | None = None
    stage: str | None = None
    constants_checked_against: tuple[str, ...] = ()
    missing: tuple[str, ...] = ()
    witnesses: tuple[str, ...] = ()
    witness_notes: Mapping[str, str] = field(default_factory=dict)
    results: tuple[ResultLine, ...] = ()
    findings: tuple[Finding, ...] = ()
    not_checked: tuple[str, ...] = ()
    readings_sha256: str | None = None

    @property
    def sound(self) -> bool:
        """True exactly for the verdict `sound`."""
        return self.verdict == "sound"
