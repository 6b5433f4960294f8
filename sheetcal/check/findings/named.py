"""The defined names of the constants: gone, without cells, pointing elsewhere, or there a second time for one tab."""

from __future__ import annotations

from sheetcal.check.case import Case, is_number
from sheetcal.check.formula import parse, same_formula
from sheetcal.check.tree import Area, FormulaError, Reference
from sheetcal.kinds.layout import column_letter
from sheetcal.kinds.record import constant_cells
from sheetcal.model import Finding, Value


def look(case: Case) -> None:
    """A finding for each name that no longer means what was issued; formulas that use it take another number."""
    ids = {cell: one for one, cell, _, _ in constant_cells(case.parts.kind, case.parts.record)}
    found = {name.casefold(): text for name, text in case.names.items() if "!" not in name}
    issued = {name.casefold(): name for name in case.parts.skeleton.names}
    for name, where in case.parts.skeleton.names.items():
        text = found.get(name.casefold())
        if text is None or not (text == where or same_formula(text, where)):
            _say(case, name, where, text, ids)
    for key, text in case.names.items():
        tab, mark, name = key.rpartition("!")
        if mark and name.casefold() in issued:
            _doubled(case, issued[name.casefold()], tab, text, ids)


def _cell(where: str) -> str:
    return where.partition("!")[2].partition(":")[0].replace("$", "")


def _say(case: Case, name: str, where: str, text: str | None, ids: dict[str, str]) -> None:
    if text is None:
        what, cause = "is gone: formulas that use it show an error", "deleted from the list of names"
    elif "#REF!" in text.upper():
        what, cause = "lost its cells (#REF!)", "the cells it named, or their tab, were deleted"
    else:
        what, cause = f"points elsewhere{_holding(case, text)}", "somebody edited the list of names"
    _add(case, name, f"the name {name} {what}", where, text, cause, ids)


def _doubled(case: Case, name: str, tab: str, text: str, ids: dict[str, str]) -> None:
    """A name of one tab alone hides the one of the workbook there."""
    where = case.parts.skeleton.names[name]
    cause = "a tab was copied, or a name was made for one tab only"
    message = f"the name {name} is there a second time, for the tab {tab} alone"
    if text == where or same_formula(text, where):
        same = f"{message}; it means the same"
        cell = _cell(where)
        case.found.append(
            Finding(
                "constant-altered", "note", "note", same, "Constants", cell, None, text, where, cause, action="note"
            )
        )
        return
    _add(case, name, f"{message}: formulas there take another value{_holding(case, text)}", where, text, cause, ids)


def _holding(case: Case, text: str) -> str:
    """What stands where a name points."""
    value = _value(case, text)
    return "" if value is None else f" ({text.replace('$', '')} holds {value:.10g})"


def _value(case: Case, text: str) -> float | None:
    try:
        target = parse(text)
    except FormulaError:
        return None
    if isinstance(target, Area) or not isinstance(target, Reference) or target.tab is None:
        return None
    cell = case.cells.get(target.tab, {}).get(f"{column_letter(target.column)}{target.row}")
    return float(cell[1]) if cell is not None and is_number(cell[1]) else None


def _add(
    case: Case, name: str, message: str, where: str, text: str | None, cause: str, ids: dict[str, str]
) -> None:  # fmt: skip
    one = ids.get(_cell(where))
    root = one.partition("[")[0] if one else f"const.{name}"
    case.altered.add(root)
    value: Value = _value(case, text) if text else None
    effect = case.effect(root, wrong={root: value}) if value is not None and one == root else None
    case.found.append(
        Finding(
            "constant-altered", "fault", "error", message, "Constants", _cell(where), None, text, where, cause,
            action="reject", causes=(cause,), effect=effect,
        )
    )  # fmt: skip
