"""Frozen kinds: kinds/frozen/<kind>-<version>.json, what the checker and the writer both stand on."""

from __future__ import annotations

import json
from dataclasses import asdict
from functools import lru_cache
from importlib import resources
from typing import Any

from sheetcal.errors import BadInput
from sheetcal.model import Block, Field, Rule, SheetKind, Step


def versions() -> list[tuple[str, int]]:
    """Every (kind, version) that is frozen, sorted."""
    folder = resources.files("sheetcal.kinds") / "frozen"
    stems = [one.name[:-5] for one in folder.iterdir() if one.name.endswith(".json")]
    return sorted((stem.rpartition("-")[0], int(stem.rpartition("-")[2])) for stem in stems)


def names() -> list[str]:
    """The kinds there are, sorted."""
    return sorted({name for name, _ in versions()})


@lru_cache(maxsize=32)
def load(name: str, version: int | None = None) -> SheetKind:
    """A kind in one version (the newest by default); BadInput when there is none."""
    known = [number for kind, number in versions() if kind == name]
    if not known:
        raise BadInput(f"kind {name}", "unknown kind", ", ".join(names()), "Choose one of these.")
    wanted = max(known) if version is None else version
    if wanted not in known:
        raise BadInput(f"kind {name}", f"version {wanted} is not known here", f"{known}", "Update sheetcal.")
    path = resources.files("sheetcal.kinds") / "frozen" / f"{name}-{wanted}.json"
    return from_json(json.loads(path.read_text("utf-8")))


def from_json(data: dict[str, Any]) -> SheetKind:
    """A kind from its frozen form."""
    parts = {
        "fields": tuple(_field(row) for row in data["fields"]),
        "rules": tuple(Rule(**row) for row in data["rules"]),
        "blocks": tuple(Block(**{**row, "shows": tuple(row.get("shows", ()))}) for row in data["blocks"]),
        "tables": {key: tuple(columns) for key, columns in data["tables"].items()},
    }
    plain = {key: tuple(data[key]) for key in ("scopes", "constants", "cautions")}
    return SheetKind(**{**data, **parts, **plain})


def to_json(kind: SheetKind) -> dict[str, Any]:
    """The frozen form of a kind; keys that hold their default are left out."""
    data = asdict(kind)
    data["fields"] = [_lean(row, Field) for row in data["fields"]]
    data["rules"] = [_lean(row, Rule) for row in data["rules"]]
    data["blocks"] = [_lean(row, Block) for row in data["blocks"]]
    return data


def _field(row: dict[str, Any]) -> Field:
    values = dict(row)
    if values.get("step"):
        values["step"] = Step(**values["step"])
    if isinstance(values.get("choices"), list):
        values["choices"] = tuple(values["choices"])
    for name in ("needed", "only"):
        if values.get(name):
            values[name] = {key: tuple(options) for key, options in values[name].items()}
    return Field(**values)


def _lean(row: dict[str, Any], shape: type) -> dict[str, Any]:
    defaults = {name: one.default for name, one in shape.__dataclass_fields__.items()}  # type: ignore[attr-defined]
    lean = {key: value for key, value in row.items() if key not in defaults or value != defaults[key]}
    if lean.get("step"):
        lean["step"] = _lean(lean["step"], Step)
    return lean
