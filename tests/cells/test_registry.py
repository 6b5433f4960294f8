"""The registry describes every function in full, guards it, and refuses what it cannot register."""

from __future__ import annotations

import ast
import inspect
import math
import re
import sys
from pathlib import Path
from typing import Annotated, Any

import pytest

import sheetcal.cells
from sheetcal.cells import primitives, registry
from sheetcal.cells.grammar import Constant
from sheetcal.cells.primitives import Text, is_number
from sheetcal.cells.registry import G, J, K, cell
from sheetcal.errors import BadInput, OutOfRange

FOLDER = Path(sheetcal.cells.__file__).parent
FUNCTIONS = registry.all()
VOLT = Annotated[float, "V"]
FACTS: dict[str, Any] = {"equation": "x", "source": "y", "standing": "derived"}


def test_every_function_says_all_that_its_page_needs() -> None:
    for function in FUNCTIONS:
        page = registry.describe(function.name)
        keys = ["name", "result", "unit", "args", "equation", "source", "standing"]
        assert list(page) == keys and all(page[key] for key in keys if key != "unit")
        assert re.fullmatch(r"[A-Z][A-Z0-9]*(_[A-Z0-9]+)*", function.name)
        assert page["result"].endswith("."), function.name
        assert all(list(one) == ["name", "unit", "low", "high", "series"] for one in page["args"])
    assert len(FUNCTIONS) >= 110


def test_every_body_has_at_most_eight_lines() -> None:
    long: list[tuple[str, int]] = []
    for function in FUNCTIONS:
        definition = ast.parse(inspect.getsource(function.body)).body[0]
        assert isinstance(definition, ast.FunctionDef)
        lines = len(definition.body) - 1  # each statement is one line of thought, however the formatter wraps it
        if lines > 8:
            long.append((function.name, lines))
    assert not long


def test_every_unit_is_one_our_registry_reads() -> None:
    from sheetcal import units

    special = ("any", "y / x", "date")
    named = {c.unit for c in registry.constants().values()}
    for function in FUNCTIONS:
        named |= {function.unit, *(argument.unit for argument in function.args)}
    plain = {unit for unit in named if unit and unit not in special and not unit.startswith(registry.SAME)}
    assert len(plain) > 25
    for unit in plain:
        units.parse(unit)


def test_units_of_unknown_quantities_name_an_argument() -> None:
    for function in FUNCTIONS:
        names = [argument.name for argument in function.args]
        for unit in (function.unit, *(argument.unit for argument in function.args)):
            assert not (unit or "").startswith(registry.SAME) or (unit or "")[len(registry.SAME) :] in names


def test_cells_need_the_standard_library_only_and_python_3_9() -> None:
    files = sorted(FOLDER.glob("*.py"))
    assert len(files) >= 14
    for path in files:
        tree = ast.parse(path.read_text("utf-8"), feature_version=(3, 9))
        for node in ast.walk(tree):
            modules = [alias.name for alias in node.names] if isinstance(node, ast.Import) else []
            modules += [node.module or ""] if isinstance(node, ast.ImportFrom) else []
            for module in modules:
                allowed = module.split(".")[0] in sys.stdlib_module_names
                assert allowed or module.startswith(("sheetcal.cells", "sheetcal.errors")), (path, module)


def test_constants_have_one_value_each_and_carry_their_facts() -> None:
    constants = registry.constants()
    assert len(constants) > 30
    for name, constant in constants.items():
        assert re.fullmatch(r"[a-z]+(_[a-z0-9]+)+", name), "a defined name that looks like no cell"
        assert constant.unit and constant.source and constant.standing in ("derived", "published", "memory")
    gas = constants["gas_constant"]
    copy = Constant(*gas.__getnewargs__())
    assert (copy, copy.unit, copy.name, copy.source) == (gas, gas.unit, gas.name, gas.source)


def test_two_values_of_one_constant_are_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    function = registry.get("GAS_TERM")
    other = Constant(8.3, "J/(mol K)", name="gas_constant")
    altered = type(function)(**{**vars(function), "constants": (other,)})
    monkeypatch.setattr(registry, "all", lambda: [function, altered])
    with pytest.raises(BadInput, match="gas_constant has two values"):
        registry.constants()


def test_call_names_what_is_wrong() -> None:
    good = {"mass": 180, "specific_heat": 4.18, "rise": 12.5}
    assert registry.call("HEAT_FROM_RISE", **good) == pytest.approx(9405)
    with pytest.raises(KeyError, match="nearest: HEAT_FROM_RISE"):
        registry.call("HEAT_FORM_RISE", **good)
    with pytest.raises(TypeError, match=r"unknown arguments \['masse'\], missing arguments \['mass'\]"):
        registry.call("HEAT_FROM_RISE", masse=180, specific_heat=4.18, rise=12.5)
    for odd, words in ((-1, "lies outside 0 to 1e+06"), ("x", "is not a number"), (None, "is missing")):
        with pytest.raises(OutOfRange, match=re.escape(words)):
            registry.call("HEAT_FROM_RISE", **{**good, "mass": odd})
    with pytest.raises(OutOfRange, match="do not go together; expected rise != 0"):
        registry.call("MASS_FROM_HEAT", heat=1, specific_heat=1, rise=0)
    with pytest.raises(OutOfRange, match="holds no number"):
        registry.call("MEAN_OF", values=[None, "x"])
    with pytest.raises(OutOfRange, match="'steam' is not one of"):
        registry.call("GAS_CHANGE_OF_COMBUSTION", hydrogen=4, oxygen=0, nitrogen=0, phase="steam")
    with pytest.raises(OutOfRange, match="is not text"):
        registry.call("GAS_CHANGE_OF_COMBUSTION", hydrogen=4, oxygen=0, nitrogen=0, phase=3)


def test_the_decorated_function_is_the_guarded_call() -> None:
    from sheetcal.cells.heat import heat_from_rise

    assert heat_from_rise(180, 4.18, rise=12.5) == pytest.approx(9405)
    with pytest.raises(OutOfRange):
        heat_from_rise(-180, 4.18, 12.5)


def test_evaluate_gives_a_blank_where_the_sheet_does() -> None:
    assert registry.evaluate("HEAT_FROM_RISE", {"mass": 180, "specific_heat": 4.18}) is None
    assert registry.evaluate("HEAT_FROM_RISE", {"mass": True, "specific_heat": 4.18, "rise": 1}) is None
    assert registry.evaluate("RISE_BY_SOURCE", {"source": "Instrument", "from_instrument": 2.5}) == 2.5
    assert registry.evaluate("RISE_BY_SOURCE", {"source": "record", "from_instrument": 2.5}) is None
    text = registry.evaluate("RECORD_STATE", {"time": [None], "temperature": []})
    assert text == "empty" and type(text) is str
    # A position beyond the range: the formula's error becomes a blank here.
    beyond = {"time": [0, 1, 2], "temperature": [20, 21, 22], "fore_end": 1, "main_end": 9}
    assert registry.evaluate("TIME_MEAN_TEMPERATURE", beyond) is None


def test_registration_refuses_double_names_standings_and_strange_ranges() -> None:
    with pytest.raises(BadInput, match="two cell functions have this name"):

        @cell("HEAT_FROM_RISE", **FACTS)
        def again(mass: G, rise: K) -> J:
            """Twice."""
            return mass * rise

    with pytest.raises(BadInput, match="standing `guessed`"):

        @cell("GUESSED", equation="x", source="y", standing="guessed")
        def guessed(mass: G, rise: K) -> J:
            """Guessed."""
            return mass * rise

    with pytest.raises(BadInput, match=r"unknown argument \['masse'\]"):

        @cell("STRANGE", valid={"masse": (0, 1)}, **FACTS)
        def strange(mass: G, rise: K) -> J:
            """Strange."""
            return mass * rise

    assert not {"GUESSED", "STRANGE"} & {function.name for function in registry.all()}


def test_arguments_are_found_by_name() -> None:
    function = registry.get("AID_HEAT")
    assert function.argument("mass").optional and function.argument("lots").column
    with pytest.raises(KeyError):
        function.argument("nothing")


def test_text_compares_without_case_and_hashes_so() -> None:
    assert Text("Record") == "record" and Text("a") != "b" and Text("x") != 3
    assert len({Text("A"), Text("a")}) == 1


def test_primitives_treat_blanks_and_text_as_a_spreadsheet_does() -> None:
    series = [1.0, None, "x", "", 3.0, True]
    assert primitives.count(series) == 2 and primitives.filled(series) == 5
    assert primitives.total(series) == 4 and primitives.mean(series) == 2
    assert (primitives.smallest([]), primitives.largest([])) == (0, 0)
    assert primitives.position(2.5, [1.0, 2.0, None, 3.0, 2.4]) == 2 and primitives.position(0.5, [1.0]) == 0
    assert primitives.position(9.0, [1.0, 2.0]) == 2
    assert primitives.look_up("b", ["A", "B"], [1.0, "Two"]) == "two"
    assert math.isnan(primitives.look_up("c", ["A"], [1.0])) and math.isnan(primitives.look_up("a", ["A"], [None]))
    assert primitives.look_up(2.0, [1.0, 2.0], [5.0, 6.0]) == 6.0
    assert primitives.join("a", "b") == "ab" and primitives.exp(0) == 1 and primitives.log(1) == 0
    assert primitives.pairs([1.0, None, 2.0], [1.0, 2.0, "x"]) == 1
    assert math.isnan(primitives.look_up(7, ["a"], [1.0])) and not primitives.found("c", ["a"])
    assert primitives.least(2, 1) == 1 and primitives.greatest(2, 1) == 2 and primitives.size(-1) == 1


def test_a_unit_alias_is_what_the_registry_reads() -> None:
    try:

        @cell("TRIAL_POWER", valid={"voltage": (0, 10)}, needs=("voltage > 1",), **FACTS)
        def trial(voltage: VOLT, current: Annotated[float, "A", registry.OPTIONAL]) -> Annotated[float, "W"]:
            """Trial."""
            return voltage * current if is_number(current) else 0

        function = registry.get("TRIAL_POWER")
        assert [(a.name, a.unit, a.low, a.high, a.optional) for a in function.args] == [
            ("voltage", "V", 0, 10, False),
            ("current", "A", None, None, True),
        ]
        assert function.unit == "W" and [need.text for need in function.needs] == ["voltage > 1"]
    finally:
        registry._functions.pop("TRIAL_POWER", None)
