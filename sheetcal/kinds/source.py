"""Read a kind as it is written: kinds/<kind>.toml with the parts it includes."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from importlib import resources
from itertools import groupby
from typing import Any

from sheetcal.errors import BadInput
from sheetcal.model import SCOPES, Block, Field, Rule, SheetKind, Step

KEYS = {
    "name", "label", "unit", "type", "block", "refuse", "warn", "resolution", "need", "when", "origin",
    "locked", "choices", "series", "beside", "hint", "cell", "args", "reported", "balance", "silent", "rules",
    "role", "repeat", "only",
}  # fmt: skip
RULE_KEYS = {"code", "scope", "if", "text", "place", "severity", "sort", "action", "live", "unless"}


def names() -> list[str]:
    """Kinds that have a source file, sorted."""
    folder = resources.files("sheetcal.kinds")
    return sorted(one.name[:-5] for one in folder.iterdir() if one.name.endswith(".toml"))


def read(name: str) -> SheetKind:
    """The kind as written, its steps still without formulas (`sheetcal.formulas.freeze` adds them)."""
    data = _toml(f"{name}.toml")
    mass = data.get("mass_field", "")
    parts = [_toml(f"parts/{part}.toml", mass) for part in data.get("include", [])]
    documents = [*parts, data]
    fields = [
        _field(scope, row, name) for scope in SCOPES for doc in documents for row in _repeated(doc.get(scope, []))
    ]
    rules = [_rule(row, name) for doc in documents for row in doc.get("rule", [])]
    blocks = [Block(**{**row, "shows": tuple(row.get("shows", ()))}) for row in data["block"]]
    for doc in documents:
        for block, listed in doc.get("order", {}).items():
            _sort(fields, block, listed, name)
    tables: dict[str, tuple[str, ...]] = {}
    for doc in documents:
        tables.update({key: tuple(columns) for key, columns in doc.get("tables", {}).items()})
    return SheetKind(
        name=name,
        version=data["version"],
        title=data["title"],
        purpose=data["purpose"],
        scopes=tuple(data["scopes"]),
        fields=tuple(fields),
        rules=tuple(rules),
        blocks=tuple(blocks),
        constants=(),
        tables=tables,
        cautions=tuple(text for doc in documents for text in doc.get("cautions", [])),
        runs_default=data.get("runs_default", 2),
        spare_default=data.get("spare_default", 1),
    )


def _sort(fields: list[Field], block: str, listed: list[str], kind: str) -> None:
    """Put a block's fields into the order listed, in place; those not listed follow. Raises BadInput for a stranger."""
    at = [number for number, one in enumerate(fields) if one.block == block]
    known = [fields[number] for number in at]
    strangers = set(listed) - {one.name for one in known}
    if strangers:
        raise BadInput(f"kinds/{kind}.toml, order of {block}", f"unknown field {min(strangers)}")
    turn = {name: number for number, name in enumerate(listed)}
    for number, one in zip(at, sorted(known, key=lambda one: turn.get(one.name, len(turn))), strict=True):
        fields[number] = one


def _repeated(rows: list[dict[str, Any]]) -> list[dict[str, Any]]:
    """Rows with `repeat = n` written n times, `#` replaced by 1..n; neighbours of one repeat interleave."""
    out: list[dict[str, Any]] = []
    for count, group in groupby(rows, key=lambda row: row.get("repeat", 0)):
        listed = list(group)
        for number in range(1, count + 1):
            out += [
                {
                    key: value.replace("#", str(number)) if isinstance(value, str) else value
                    for key, value in row.items()
                }
                for row in listed
            ]
        out += [] if count else listed
    return out


def _toml(path: str, mass: str = "") -> dict[str, Any]:
    """A data file; `MASS` in a part stands for the kind's own name of the mass that is burnt."""
    text = (resources.files("sheetcal.kinds") / path).read_text("utf-8")
    return tomllib.loads(text.replace("MASS", mass) if mass else text)


def _field(scope: str, row: Mapping[str, Any], kind: str) -> Field:
    unknown = set(row) - KEYS
    if unknown:
        raise BadInput(f"kinds/{kind}.toml, {scope}.{row.get('name')}", f"unknown key {sorted(unknown)[0]}")
    low, high = limits(row.get("refuse", ".."))
    warn_low, warn_high = limits(row.get("warn", ".."))
    computed = "cell" in row or "rules" in row
    choices = row.get("choices", ())
    return Field(
        scope=scope,
        name=row["name"],
        label=row["label"],
        unit=row.get("unit"),
        role=row.get("role", "result" if computed else "reading"),
        type=row.get("type", "choice" if choices else "number" if row.get("unit") else "text"),
        block=row.get("block", ""),
        low=low,
        high=high,
        warn_low=warn_low,
        warn_high=warn_high,
        resolution=row.get("resolution"),
        needed=_needed(row.get("need")),
        when=row.get("when", ""),
        origin="computed" if computed else row.get("origin", "person"),
        locked=computed or row.get("locked", False),
        choices=choices if isinstance(choices, str) else tuple(choices),
        series=row.get("series", False),
        beside=row.get("beside", ""),
        hint=row.get("hint", ""),
        only=_needed(row.get("only")),
        step=_step(row) if computed else None,
    )


def _step(row: Mapping[str, Any]) -> Step:
    """The step of a result line; `rules` lines show the first rule that holds."""
    if "rules" in row:
        return Step(cell="", args={str(i): code for i, code in enumerate(row["rules"])}, formula="")
    return Step(
        cell=row["cell"],
        args=dict(row["args"]),
        formula="",
        reported=row.get("reported", False),
        balance="speaks" if row.get("balance") else "silent",
        balance_reason=row.get("silent", ""),
    )


def _rule(row: Mapping[str, Any], kind: str) -> Rule:
    unknown = set(row) - RULE_KEYS
    if unknown:
        raise BadInput(f"kinds/{kind}.toml, rule {row.get('code')}", f"unknown key {sorted(unknown)[0]}")
    values = {("when" if key == "if" else key): value for key, value in row.items()}
    return Rule(formula="", **values)


def _needed(need: Any) -> dict[str, tuple[str, ...]] | None:
    if need is None:
        return None
    if need == "always":
        return {}
    return {key: tuple([value] if isinstance(value, str) else value) for key, value in need.items()}


def limits(text: str) -> tuple[float | None, float | None]:
    """`"2.8..3.2"` as two numbers; an open end is None."""
    low, _, high = text.partition("..")
    return (float(low) if low else None, float(high) if high else None)
