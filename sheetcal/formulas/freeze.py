"""Write the frozen kinds: each step's formula template, translated once, for writer and checker alike.

`python -m sheetcal.formulas.freeze` rewrites the drafts in kinds/frozen/; a released version is never rewritten.
"""

from __future__ import annotations

import json
import re
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

from sheetcal.cells import registry
from sheetcal.errors import BadInput
from sheetcal.formulas import spelling
from sheetcal.formulas.expressions import expression_template
from sheetcal.formulas.translate import fill, formula_template
from sheetcal.kinds import frozen, source
from sheetcal.model import Field, Rule, SheetKind, Step

FOLDER = Path(frozen.__file__).with_name("frozen")
CONST = re.compile(r"const\.([a-z_0-9]+)")


def freeze(name: str) -> SheetKind:
    """A kind with the formulas of all its steps and rules. Raises BadInput naming a step that does not fit."""
    draft = source.read(name)
    rules = {rule.code: replace(rule, formula=expression_template(rule.when)) for rule in draft.rules}
    fields = tuple(_with_formula(draft, one, rules) for one in draft.fields)
    kind = replace(draft, fields=fields, rules=tuple(rules.values()))
    return replace(kind, constants=tuple(dict.fromkeys(_constants(kind))), constant_units=_constant_units(kind))


def _with_formula(kind: SheetKind, one: Field, rules: dict[str, Rule]) -> Field:
    if one.step is None:
        return one
    if one.step.cell:
        return replace(one, step=_translated(f"kinds/{kind.name}.toml, {one.key}", one.step))
    formula = '""'
    for code in reversed(list(one.step.args.values())):
        if code not in rules:
            raise BadInput(f"kinds/{kind.name}.toml, {one.key}", f"unknown rule {code}", ", ".join(rules))
        formula = f"IF({rules[code].formula},{spelling.text(rules[code].text)},{formula})"
    return replace(one, step=replace(one.step, formula=formula))


def _translated(where: str, step: Step) -> Step:
    """The step with formula, equation and source; every argument must be mapped or be left out on purpose."""
    try:
        function = registry.get(step.cell)
    except KeyError as unknown:
        raise BadInput(where, f"unknown cell function {unknown.args[0]}") from None
    known = {argument.name for argument in function.args}
    strangers = set(step.args) - known
    needed = {a.name for a in function.args if not a.optional} - set(step.args)
    if strangers or needed:
        raise BadInput(where, f"{step.cell}: unknown {sorted(strangers)}, missing {sorted(needed)}", f"{sorted(known)}")
    omitted = tuple(sorted(known - set(step.args)))
    template = formula_template(step.cell, omitted)
    formula = fill(template, {name: f"{{{reference}}}" for name, reference in step.args.items()})
    return replace(step, formula=formula, equation=function.equation, source=function.source)


def _constants(kind: SheetKind) -> Iterator[str]:
    """Names of every constant that steps, rules or the cell functions behind them use, in order of use."""
    for one in kind.fields:
        if one.step is None:
            continue
        yield from (ref[6:] for ref in one.step.args.values() if ref.startswith("const."))
        if one.step.cell:
            yield from (constant.name for constant in registry.get(one.step.cell).constants)
    for rule in kind.rules:
        yield from CONST.findall(rule.when)


def _constant_units(kind: SheetKind) -> dict[str, str]:
    """The unit in which formulas take each constant; those that only rules name keep the profile's own."""
    found: dict[str, str] = {}
    for one in kind.fields:
        if one.step is None or not one.step.cell:
            continue
        function = registry.get(one.step.cell)
        found.update({constant.name: constant.unit for constant in function.constants})
        for name, reference in one.step.args.items():
            unit = function.argument(name).unit
            if reference.startswith("const.") and unit and unit != "any" and not unit.startswith(registry.SAME):
                found[reference[6:]] = unit
    return dict(sorted(found.items()))


def text(kind: SheetKind) -> str:
    """The file a frozen kind is kept in."""
    return json.dumps(frozen.to_json(kind), ensure_ascii=False, indent=1) + "\n"


def main() -> None:
    """Freeze every kind that is still a draft."""
    FOLDER.mkdir(exist_ok=True)
    for name in source.names():
        kind = freeze(name)
        path = FOLDER / f"{name}-{kind.version}.json"
        if path.exists() and not json.loads(path.read_text("utf-8"))["draft"]:
            continue
        path.write_text(text(kind), "utf-8")


if __name__ == "__main__":
    main()
