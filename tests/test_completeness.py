"""Nothing is half there: every kind, cell function, coefficient and formula has all that belongs to it."""

from __future__ import annotations

import importlib
import re
import tomllib
from collections.abc import Callable, Iterator
from functools import cache
from pathlib import Path

import pytest

from sheetcal import profiles, units
from sheetcal.cells import registry
from sheetcal.check.dimensions import DimensionError, check_unit, meaning
from sheetcal.check.formula import parse_template
from sheetcal.check.measures import Meaning
from sheetcal.check.tree import Area, Name, Reference, Slot
from sheetcal.formulas.freeze import freeze, text
from sheetcal.kinds import frozen, load, names, source
from sheetcal.model import Field, Rule, SheetKind
from sheetcal.verbs import check

ROOT = Path(__file__).parent.parent
WORKBOOKS = ROOT / "workbooks"
FROZEN = ROOT / "sheetcal" / "kinds" / "frozen"
MANY = {"runs": "run", "samples": "sample", "bodies": "body"}
TOKEN = re.compile(r"\{([a-z_][a-z_0-9.]*)\}")
RELATIVE = re.compile(r"same as \w+|y / x|any|date")  # units that follow the arguments
Ask = Callable[[Reference | Area | Name | Slot], Meaning]
KINDS = sorted(source.names())


# --- kinds -----------------------------------------------------------------------------------------------


def test_every_kind_is_frozen_and_nothing_else_is() -> None:
    """Each TOML has a frozen file, and each frozen file a TOML."""
    assert len(KINDS) >= 5
    assert names() == KINDS
    assert sorted({name for name, _ in frozen.versions()}) == KINDS


@pytest.mark.parametrize("name", KINDS)
def test_a_draft_is_frozen_as_it_would_be_today(name: str) -> None:
    """The frozen file of a draft equals what freezing gives now; a released one is never rewritten."""
    kind = freeze(name)
    path = FROZEN / f"{name}-{kind.version}.json"
    assert not load(name).draft or path.read_text("utf-8") == text(kind), "run python -m sheetcal.formulas.freeze"


@pytest.mark.parametrize("name", KINDS)
def test_every_kind_has_its_balance(name: str) -> None:
    """sheetcal/check/balance holds a module of the kind's name, with one function `walk`."""
    module = importlib.import_module(f"sheetcal.check.balance.{name.replace('-', '_')}")
    assert callable(module.walk)


@pytest.mark.parametrize("name", KINDS)
def test_every_kind_has_a_published_case(name: str) -> None:
    """tests/published/examples.toml uses at least one example for it."""
    rows = tomllib.loads((ROOT / "tests" / "published" / "examples.toml").read_text("utf-8"))["example"]
    assert any(name in row.get("kinds", ()) for row in rows), f"no published case for {name}"


@pytest.mark.parametrize("name", KINDS)
def test_every_kind_has_its_workbooks(name: str) -> None:
    """workbooks/ holds a blank and a filled example that still open: incomplete the one, sound the other."""
    files = {"incomplete": WORKBOOKS / f"{name}-blank.xlsx", "sound": WORKBOOKS / f"{name}-filled.xlsx"}
    missing = [str(path.relative_to(ROOT)) for path in files.values() if not path.exists()]
    assert not missing, f"missing: {', '.join(missing)}; run python tests/make_workbooks.py"
    for verdict, path in files.items():
        said = "\n".join(check([str(path)]).lines)
        assert said.startswith(verdict), said


@pytest.mark.parametrize("name", KINDS)
def test_steps_stand_on_readings_in_the_end(name: str) -> None:
    """The frozen steps form no circle: removing those whose inputs are known leaves none."""
    kind = load(name)
    steps = [one for one in kind.fields if one.step and one.step.cell]
    feeds = {one.key: set(_inputs(kind, one)) for one in steps}
    known = {one.key for one in kind.fields} - set(feeds)
    while ready := {key for key, inputs in feeds.items() if key not in known and inputs <= known}:
        known |= ready
    assert known >= set(feeds), f"in a circle: {sorted(set(feeds) - known)}"
    assert len(steps) >= 20


def _inputs(kind: SheetKind, one: Field) -> Iterator[str]:
    assert one.step is not None
    for reference in one.step.args.values():
        if not reference.startswith(("const.", "table.")):
            yield _field(kind, one.scope, reference).key


def _field(kind: SheetKind, scope: str, reference: str) -> Field:
    prefix, _, name = reference.rpartition(".")
    return kind.field(f"{MANY.get(prefix, prefix or scope)}.{name}")


# --- cell functions and profiles -------------------------------------------------------------------------


def test_every_cell_function_says_what_it_is() -> None:
    """Equation, source, standing, a first line of help, and units that our registry reads."""
    functions = registry.all()
    assert len(functions) >= 100
    for one in functions:
        assert one.equation and len(one.source) > 3 and one.doc, one.name
        assert one.doc.splitlines()[0].endswith((".", ";")) or "." in one.doc, one.name
        assert one.standing in ("derived", "published", "memory"), one.name
        for unit in (one.unit, *(argument.unit for argument in one.args)):
            if unit is not None and not RELATIVE.fullmatch(unit):
                units.parse(unit)
    for constant in registry.constants().values():
        assert constant.source and constant.standing in ("derived", "published", "memory"), constant.name
        units.parse(constant.unit)


def test_every_cell_function_follows_the_grammar_of_names() -> None:
    """Capitals, and underscores between words; whatever is from memory says so in the page the user reads."""
    for one in registry.all():
        assert re.fullmatch(r"[A-Z]+(_[A-Z]+)*", one.name), one.name
        assert registry.describe(one.name)["standing"] == one.standing


def test_every_number_of_every_profile_says_where_it_comes_from() -> None:
    """Unit, label, source and standing, with the ones from memory among them."""
    rows = [(name, one) for name in profiles.names() for one in profiles.load(name).coefficients.values()]
    assert len(rows) > 270
    for name, one in rows:
        units.parse(one.unit)
        assert one.label and one.source and one.standing in profiles.STANDINGS, f"{name}: {one.name}"
    assert {one.standing for _, one in rows} >= {"derived", "published", "memory"}


@pytest.mark.parametrize("name", KINDS)
def test_every_constant_of_a_kind_comes_from_a_profile_or_a_cell_function(name: str) -> None:
    """No formula names a number that nobody states."""
    for one in load(name).constants:
        assert one in registry.constants() or one in profiles.all_names() or one in ISSUE_CONSTANTS, one


# --- units of formulas -----------------------------------------------------------------------------------

ISSUE_CONSTANTS = {
    "other_unit": "J/g",  # the unit chosen at issue
}


def field_unit(one: Field) -> str | None:
    """The unit a field's numbers are in; None for text, "date" for days."""
    if one.type in ("date", "datetime"):
        return "date"
    return one.unit if one.type in ("number", "integer") else None


def reference_unit(kind: SheetKind, scope: str, reference: str) -> tuple[str | None, bool]:
    """(unit, whether it is a range) of what a frozen formula's token means."""
    prefix, _, name = reference.rpartition(".")
    if prefix == "const":
        return kind.constant_units.get(name) or ISSUE_CONSTANTS.get(name) or profiles.known(name).unit, False
    if prefix.startswith("table."):
        column = dict(one.split(":") for one in kind.tables[prefix.removeprefix("table.")])[name]
        return None if column == "text" else column, True
    one = _field(kind, scope, reference)
    return field_unit(one), prefix in MANY or one.series


def asker(kind: SheetKind, scope: str) -> Ask:
    """What each token of a formula stands for."""

    def ask(node: Reference | Area | Name | Slot) -> Meaning:
        assert isinstance(node, Slot | Name)
        name = f"const.{node.name}" if isinstance(node, Name) else node.name
        unit, series = reference_unit(kind, scope, name)
        return meaning(unit, series)

    return ask


@cache
def computed(name: str) -> tuple[tuple[Field, str], ...]:
    """(field, formula) of every result of a kind, the lines that show a mark among them."""
    return tuple((one, one.step.formula) for one in load(name).fields if one.step is not None)


@pytest.mark.parametrize("name", KINDS)
def test_the_units_of_every_formula_go_together(name: str) -> None:
    """Every step gives the unit of its cell, every rule a truth value; numbers in formulas are pure."""
    kind = load(name)
    faults = []
    for one, formula in computed(name):
        faults += fault(kind, one.scope, formula, field_unit(one), one.key)
    for rule in kind.rules:
        faults += fault(kind, rule.scope, rule.formula, "1", f"rule {rule.code}")
    assert not faults, "\n".join(faults)
    assert len(computed(name)) >= 20 and len(kind.rules) >= 5


def fault(kind: SheetKind, scope: str, formula: str, unit: str | None, where: str) -> list[str]:
    try:
        check_unit(parse_template(formula), asker(kind, scope), unit)
    except DimensionError as found:
        return [f"{kind.name}, {where}: {found}"]
    return []


def test_formulas_spoiled_by_one_term_are_refused() -> None:
    """A reference with something of another unit added, or a bare number added to it, in every step of every kind."""
    refused = 0
    for name in KINDS:
        kind = load(name)
        for one, formula in computed(name):
            for token in dimensional(kind, one, formula):
                spoiled = formula.replace(f"{{{token}}}", f"({{{token}}}+1)")
                assert fault(kind, one.scope, spoiled, field_unit(one), one.key), f"{name}, {one.key}: {spoiled}"
                refused += 1
    assert refused >= 500


def dimensional(kind: SheetKind, one: Field, formula: str) -> list[str]:
    """The tokens of a formula that stand for one number with a unit."""
    tokens = dict.fromkeys(TOKEN.findall(formula))
    known = {token: reference_unit(kind, one.scope, token) for token in tokens}
    return [token for token, (unit, series) in known.items() if unit not in (None, "1", "%", "date") and not series]


def test_formulas_that_read_a_cell_of_another_unit_are_refused() -> None:
    """Each reference of every step replaced by a mass, a temperature and a heat: all seen but the pure ratios."""
    others = {"g": "kg", "degC": "K", "J": "kJ", "K": "degC", "J/g": "J/K", "min": "s"}
    seen, unseen = 0, []
    for name in KINDS:
        kind = load(name)
        for one, formula in computed(name):
            for token in dimensional(kind, one, formula):
                unit = reference_unit(kind, one.scope, token)[0]
                wrong = others.get(str(unit), "W")
                if refuses(kind, one, formula, token, wrong):
                    seen += 1
                else:
                    unseen.append(f"{name}, {one.key}: {token} in {wrong}")
    assert seen >= 500
    # A ratio of two references to the same line, or a line that only asks whether it is filled, cannot show it.
    assert len(unseen) < 0.08 * seen, "\n".join(unseen)


def refuses(kind: SheetKind, one: Field, formula: str, token: str, unit: str) -> bool:
    right = asker(kind, one.scope)

    def ask(node: Reference | Area | Name | Slot) -> Meaning:
        return meaning(unit, series=False) if isinstance(node, Slot) and node.name == token else right(node)

    try:
        check_unit(parse_template(formula), ask, field_unit(one))
    except DimensionError:
        return True
    return False


WRONG: list[tuple[str, str, str, str]] = [
    ("fuel", "run.gross_run", "{total_heat}*{mass}", "gives"),
    ("fuel", "run.gross_run", "{total_heat}/{mass}/1000", ""),
    ("fuel", "run.total_heat", "{effective_heat_capacity}*{mean_temperature}", "J/K by degC"),
    ("fuel", "run.corrected_rise", "{rise_from_record}+273.15", "pure number"),
    ("fuel", "run.cooling_constant", "({fore_drift}-{after_drift})/{after_temperature}", "point"),
    ("calibration", "run.effective_heat_capacity", "{pellet_heat}/({corrected_rise}+{mean_temperature})", ""),
    ("calibration", "sheet.effective_heat_capacity", "SUM({runs.heat_capacity_counted},{counted_runs})", "adds"),
    ("specific-heat", "run.rise", "{final_temperature}+{start_temperature}", "zero"),
    ("vaporisation", "sheet.energy", "{enthalpy}-{enthalpy_molar}", "takes away"),
    ("vaporisation", "sheet.work_ideal", "gas_constant*{boiling_temperature}/{molar_mass}", "degC"),
    ("heat-balance", "body.gained", "{mass}*{specific_heat}*{end}", "degC"),
]  # fmt: skip


@pytest.mark.parametrize(("name", "key", "formula", "said"), WRONG)
def test_slips_known_from_the_bench_are_refused(name: str, key: str, formula: str, said: str) -> None:
    """A forgotten kelvin, a rise for a temperature, grams multiplied in place of divided: refused, the part named."""
    kind = load(name)
    one = kind.field(key)
    found = fault(kind, one.scope, formula, field_unit(one), key)
    if formula.endswith("/1000"):  # a bare power of ten is pure: the value shows it, its unit cannot
        assert not found
        return
    assert found and said in found[0], found


def test_rules_are_all_named_once() -> None:
    """A code means one thing within a kind."""
    for name in KINDS:
        codes = [rule.code for rule in load(name).rules]
        assert len(codes) == len(set(codes)) >= 5
        assert all(isinstance(rule, Rule) for rule in load(name).rules)
