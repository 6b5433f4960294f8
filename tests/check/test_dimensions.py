"""A formula whose units do not go together is found from the units of its cells alone, and no right one is."""

import time
from collections.abc import Callable

import pytest

from sheetcal.cells import registry
from sheetcal.check import dimensions, weights
from sheetcal.check.dimension_rules import RULES
from sheetcal.check.dimensions import NEUTRAL, TEXT, DimensionError, Measure, agrees, check_unit, formula_unit, meaning
from sheetcal.check.formula import parse, parse_template
from sheetcal.check.functions import SINGLE, WHOLE
from sheetcal.check.measures import Meaning, Unit
from sheetcal.check.tree import Area, Name, Node, Number, Reference, Slot, binary
from sheetcal.formulas.translate import formula_template
from sheetcal.kinds.frozen import load, names
from sheetcal.model import Field, SheetKind
from sheetcal.profiles import known

UNITS: dict[str, str | None] = {
    "mass": "g", "heat": "J", "heat_kj": "kJ", "rise": "K", "temperature": "degC", "start": "degC", "share": "%",
    "count": "1", "value": "J/g", "specific": "J/(g K)", "time": "min", "drift": "K/min", "state": None,
    "pressure": "MPa", "volume": "mL", "gas_constant": "J/(mol K)", "amount": "mol", "zero": "degC",
    "kilo": "J/kJ", "date": "date", "other_date": "date",
    "times": "min", "temperatures": "degC", "heats": "J", "masses": "g", "specifics": "J/(g K)", "states": None,
    "first": "1", "last": "1",
}  # fmt: skip
SERIES = {"times", "temperatures", "heats", "masses", "specifics", "states"}


Asker = Callable[[Reference | Area | Name | Slot], Meaning]


def ask(node: Reference | Area | Name | Slot) -> Meaning:
    """The meaning of a slot or name of this test's little sheet."""
    assert isinstance(node, Slot | Name)
    return NEUTRAL if node.name == "unknown" else meaning(UNITS[node.name], node.name in SERIES)


def unit(formula: str) -> str:
    """The unit of a formula's result, as a message would name it."""
    return formula_unit(parse_template(formula), ask).name


MEAN = (
    "SUMPRODUCT((INDEX({times},{first}+1):INDEX({times},{last})-INDEX({times},{first}):INDEX({times},{last}-1))"
    "*(INDEX({temperatures},{first}+1):INDEX({temperatures},{last})"
    "+INDEX({temperatures},{first}):INDEX({temperatures},{last}-1)))/2"
)


@pytest.mark.parametrize(
    ("formula", "expected"),
    [
        ("{mass}*{specific}*{rise}", "J"),
        ("{heat}/{mass}", "J/g"),
        ("{heat}/kilo", "kJ"),
        ("{heat}/kilo+{heat_kj}", "kJ"),
        ("{pressure}*{volume}", "J"),
        ("{value}*{share}/100", "J/g"),
        ("{value}*(1-{share}%)", "J/g"),
        ("{temperature}-{start}", "K"),
        ("{temperature}+{rise}", "degC"),
        ("{rise}+{temperature}", "degC"),
        ("{temperature}-{rise}", "degC"),
        ("({temperature}+{start})/2", "degC"),
        ("0.25*{temperature}+0.75*{start}", "degC"),
        ("-({start}-{temperature})", "K"),
        ("2*{temperature}-{start}", "degC"),
        ("{amount}*gas_constant*({temperature}-zero)", "J"),
        ("({mass}*{temperature}+{count}*{mass}*{start})/({mass}+{count}*{mass})", "degC"),
        ("{mass}*{specific}*{temperature}-{mass}*{specific}*{start}", "J"),
        ("SUMPRODUCT({masses},{specifics},{temperatures})/SUMPRODUCT({masses},{specifics})", "degC"),
        (f"{MEAN}/(INDEX({{times}},{{last}})-INDEX({{times}},{{first}}))", "degC"),
        ("AVERAGE({temperatures})", "degC"),
        ("SUM({temperatures})/COUNT({temperatures})", "degC"),
        ("SUM({temperature},{start})/2", "degC"),
        ("SUM({heat},0,{heat})", "J"),
        ("SUM(0)", "nothing"),
        ("MAX({temperatures})-MIN({temperatures})", "K"),
        ("STDEV({temperatures})", "K"),
        ("DEVSQ({temperatures})/{rise}", "K"),
        ("SQRT(SUMSQ({heats}))", "J"),
        ("SLOPE({temperatures},{times})", "K/min"),
        ("INTERCEPT({temperatures},{times})", "degC"),
        ("FORECAST({time},{temperatures},{times})", "degC"),
        ("STEYX({temperatures},{times})", "K"),
        ("CORREL({temperatures},{times})", "a pure number"),
        ("INDEX({temperatures},MATCH({time},{times},1))", "degC"),
        ("ROUND({heat}/{mass},1)", "J/g"),
        ("INT({temperature})", "degC"),
        ("MOD({time},{time})", "min"),
        ("ABS({temperature}-{start})", "K"),
        ("SIGN({rise})", "a pure number"),
        ("EXP({drift}*{time}/{rise})", "a pure number"),
        ("LN({heat}/{heat})", "a pure number"),
        ("{count}^{count}", "a pure number"),
        ("{rise}^2/{rise}", "K"),
        ("POWER({rise},-1+2)", "K"),
        ("SQRT({rise}*{rise})", "K"),
        ('IF({state}="void","",{heat})', "J"),
        ("IF({heat}>0,{heat},0)", "J"),
        ("IF({heat}>50,{heat},0)", "J"),
        ("IF(MAX({temperatures})<=200,{rise})", "K"),
        ("IF(INDEX({heats},2)>0.1,{rise},0)", "K"),
        ("IFERROR({heat}/{mass},\"\")", "J/g"),
        ("CHOOSE({count},{heat},{heat},0)", "J"),
        ("{heat}+IF({state}=\"\",0,{heat})", "J"),
        ("0-{heat}", "J"),
        ("{heat}+0", "J"),
        ("0*{heat}", "nothing"),
        ("{heat}*{unknown}", "nothing"),
        ("{unknown}^2+{heat}", "J"),
        ("ABS({unknown})+{heat}", "J"),
        ("SLOPE({unknown},{times})+{drift}", "K/min"),
        ("-\"\"", "nothing"),
        ("NA()", "nothing"),
        ("#REF!", "nothing"),
        ("{state}&{heat}", "text"),
        ("UPPER({state})", "text"),
        ('IF({heat}>0,"warm","cold")', "text"),
        ("COUNT({heats},{rise},{state})", "a pure number"),
        ("ISNUMBER(IF({count}>0,{heat},{value}))", "a pure number"),
        ("SUMIF({heats},\">0\")", "J"),
        ("SUMIF({states},\"valid\",{heats})", "J"),
        ('AVERAGEIF({states},"valid",{temperatures})', "degC"),
        ("PRODUCT({mass},{value})", "J"),
        ("SUM(INDEX({temperatures},{first}):INDEX({temperatures},{last}))"
         "/COUNT(INDEX({temperatures},{first}):INDEX({temperatures},{last}))", "degC"),
        ("{date}-{other_date}", "a pure number"),
        ("{date}+30", "date"),
        ("PI()*TRUE()", "a pure number"),
    ],
)  # fmt: skip
def test_a_right_formula_has_the_unit_of_its_physics(formula: str, expected: str) -> None:
    assert unit(formula) == expected


@pytest.mark.parametrize(
    ("formula", "fault"),
    [
        ("{heat}+{rise}", "adds J to K"),
        ("{heat}-{rise}", "takes away K from J"),
        ("{heat}+{heat_kj}", "adds J to kJ"),
        ("{heat}+1", "adds J to a pure number"),
        ("{temperature}+{start}", "adds degC to degC: the result depends on where its scale has its zero"),
        ("{temperature}+273.15", "adds degC to a pure number"),
        ("{temperature}*{rise}", "multiplies degC by K"),
        ("{rise}*{temperature}", "multiplies K by degC"),
        ("{heat}/{temperature}", "divides by a point on a scale"),
        ("{temperature}/{rise}", "divides degC by K"),
        ("{temperature}*{start}", "multiplies two points"),
        ("{amount}*gas_constant*{temperature}", "by degC"),
        ("{mass}*{specific}*{temperature}", "by degC"),
        (f"{MEAN}/(INDEX({{times}},{{last}})-INDEX({{times}},1))", "zero"),
        (f"{MEAN}", "zero"),
        ("SUM({temperatures})", "from temperatures"),
        ("SUM({temperatures})/2", "from temperatures"),
        ("-{temperature}", "from temperatures"),
        ("{rise}-{temperature}", "zero"),
        ("EXP({heat})", "takes EXP of J, no pure number"),
        ("LN({temperature}/{rise})", "takes LN of a point on a scale"),
        ("LN({heat}/{heat_kj})", "no pure number"),
        ("SQRT({temperature})", "takes SQRT of a point"),
        ("ABS({temperature})", "takes ABS of a point"),
        ("SIGN({temperature})", "takes SIGN of a point"),
        ("{temperature}^2", "raises a point"),
        ("{heat}^{count}", "raises J, no pure number"),
        ("{count}^{heat}", "raises to J, no pure number"),
        ("{heat}^50", "raises to the power 50"),
        ("{state}+1", "adds text"),
        ("{state}*2", "reckons with text"),
        ("-{state}", "reckons with text"),
        ("AVERAGE({states})", "takes AVERAGE of text"),
        ("AVERAGE({heat},{mass})", "takes AVERAGE of J and g"),
        ("SUM({heat},{mass})", "adds J to g"),
        ("MAX({temperature},{rise})", "takes MAX of degC and K"),
        ("IF({state}=\"void\",{heat},{mass})", "gives J and g"),
        ("IF({state}=\"void\",{temperature},{rise})", "gives degC and K"),
        ("IF({state}=\"void\",\"void\",{mass})", "gives text and g"),
        ("{temperature}>{rise}", "compares degC and K"),
        ("{heat}>{mass}", "compares J and g"),
        ("{heat}*2>100", "compares J and a pure number"),
        ("{state}=5", "compares text and a pure number"),
        ("INDEX({heats},{mass})", "gives INDEX a place of g"),
        ("MATCH({heat},{times},1)", "looks up J and min"),
        ("ROUND({heat},{mass})", "gives ROUND a place of g"),
        ("CHOOSE({mass},1,2)", "chooses by g"),
        ("FORECAST({heat},{temperatures},{times})", "sets beside each other J and min"),
        ("INTERCEPT({heats},{temperatures})", "takes the intercept at the zero of a point"),
        ("SLOPE({temperatures}*{times},{times})", "fits values that depend"),
        ("INDEX({times},1):INDEX({heats},2)", "joins min and J"),
        ("FANCY({heat})", "has the unknown function FANCY"),
        ("ROUND()", "gives ROUND 0 arguments"),
        ("MOD({heat},{mass})", "gives J and g"),
        ("SUMIF({temperatures},\">0\")", "adds a point"),
        ("{date}+{other_date}", "zero"),
        ("{date}*2", "zero"),
        ("PRODUCT({heats})", "multiplies a range of J"),
        ("SUMPRODUCT({temperatures}" + "+{rise}" * 126 + ")", "is too complex"),
        ("SUMPRODUCT({temperatures}" + "+{rise}" * 124 + ")", "is too complex"),
        ("MAX(" + "{temperature}" + "*{count}" * 126 + ",{temperature})", "takes MAX of"),
    ],
)  # fmt: skip
def test_a_wrong_formula_is_refused_and_the_part_is_named(formula: str, fault: str) -> None:
    with pytest.raises(DimensionError) as caught:
        formula_unit(parse_template(formula), ask)
    assert fault in str(caught.value)
    assert str(caught.value).endswith("Correct the formula.")


def test_the_smallest_wrong_part_is_what_the_message_points_at() -> None:
    text = 'IF(COUNT({heat},{mass})=2,IF({heat}>0,({heat}+{rise})/{mass},""),"")'
    with pytest.raises(DimensionError) as caught:
        formula_unit(parse_template(text), ask)
    assert caught.value.where == "{heat}+{rise}"
    long = "+".join(["{heat}"] * 20 + ["{rise}"])
    with pytest.raises(DimensionError) as caught:
        formula_unit(parse_template(long), ask)
    assert len(caught.value.where) == 80


def test_a_result_must_be_in_the_unit_of_its_cell() -> None:
    tree = parse_template("{heat}/{mass}")
    check_unit(tree, ask, "J/g")
    check_unit(tree, ask, "kJ/kg")
    check_unit(parse_template('""'), ask, "J/g")
    check_unit(parse_template("{state}"), ask, None)
    for wrong in ("J", "MJ/kg", "%", None):
        with pytest.raises(DimensionError, match="gives J/g"):
            check_unit(tree, ask, wrong)
    with pytest.raises(DimensionError, match="gives degC; expected K"):
        check_unit(parse_template("{temperature}"), ask, "K")
    assert agrees(NEUTRAL, TEXT)
    assert not agrees(TEXT, meaning("J"))


def test_formulas_of_a_file_are_judged_by_the_units_of_their_cells() -> None:
    column = {1: "min", 2: "degC", 3: "J"}

    def of_column(node: Reference | Area | Name | Slot) -> Meaning:
        assert isinstance(node, Reference | Area)
        return meaning(column[node.column if isinstance(node, Reference) else node.left])

    mean = MEAN.replace("{times}", "A1:A20").replace("{temperatures}", "B1:B20")
    for positions in ("5,9", "2,20"):
        first, last = positions.split(",")
        text = mean.replace("{first}", first).replace("{last}", last)
        good = f"{text}/(INDEX(A1:A20,{last})-INDEX(A1:A20,{first}))"
        assert formula_unit(parse(good), of_column).name == "degC" if last != "20" else True
    assert formula_unit(parse("SUM(B1:B9)/COUNT(B1:B9)"), of_column).name == "degC"
    with pytest.raises(DimensionError):
        formula_unit(parse("SUM(B1:B9)/COUNT(C1:C3)*1.5"), of_column)


def test_ranges_are_told_from_cells_by_their_use_where_nobody_says() -> None:
    def silent(node: Reference | Area | Name | Slot) -> Meaning:
        assert isinstance(node, Slot)
        return meaning(UNITS[node.name])

    for formula in (
        "SUM({temperatures})/COUNT({temperatures})",
        f"{MEAN}/(INDEX({{times}},{{last}})-INDEX({{times}},{{first}}))",
    ):
        assert formula_unit(parse_template(formula), silent).name == "degC"
    assert formula_unit(parse_template("SUM({temperature},{start})/2"), silent).name == "degC"


# --- against the cell functions --------------------------------------------------------------------------

RATIO = "y / x"  # the one unit a cell function names by its arguments


def concrete(function: registry.CellFunction, text: str | None) -> str | None:
    """A unit for each argument: any unit is J/g here, `same as x` is that of x."""
    if text == "any":
        return "J/g"
    if text is not None and text.startswith(registry.SAME):
        return concrete(function, function.argument(text.removeprefix(registry.SAME)).unit)
    return text


def asker(function: registry.CellFunction) -> Asker:
    constants = registry.constants()

    def find(node: Reference | Area | Name | Slot) -> Meaning:
        if isinstance(node, Slot):
            argument = function.argument(node.name)
            return meaning(concrete(function, argument.unit), argument.series)
        assert isinstance(node, Name)
        return meaning(constants[node.name].unit, series=False)

    return find


def expected_of(function: registry.CellFunction) -> Meaning:
    if function.unit != RATIO:
        return meaning(concrete(function, function.unit))
    y, x = (meaning(concrete(function, function.argument(name).unit)) for name in ("y", "x"))
    assert isinstance(y, Measure)
    assert isinstance(x, Measure)
    return Measure(y.unit.times(x.unit, -1))


def test_the_formula_of_every_cell_function_has_the_unit_it_declares() -> None:
    functions = registry.all()
    assert len(functions) >= 100
    for function in functions:
        found = formula_unit(parse_template(formula_template(function.name)), asker(function))
        assert agrees(found, expected_of(function)), function.name


def slipped(right: Asker, name: str) -> Asker:
    """The same meanings, one argument a thousand times larger in its unit."""

    def find(node: Reference | Area | Name | Slot) -> Meaning:
        found = right(node)
        if isinstance(node, Slot) and node.name == name and isinstance(found, Measure):
            return Measure(Unit(found.unit.powers, found.unit.scale * 1000.0), found.weight, found.series)
        return found

    return find


def holds(function: registry.CellFunction, ask_unit: Asker) -> bool:
    try:
        found = formula_unit(parse_template(formula_template(function.name)), ask_unit)
    except DimensionError:
        return False
    return agrees(found, expected_of(function))


def test_a_unit_slip_in_any_argument_is_seen_wherever_it_changes_the_result() -> None:
    seen, unseen = [], []
    for function in registry.all():
        for argument in function.args:
            if concrete(function, argument.unit) not in (None, "1", "%", "date"):
                missed = holds(function, slipped(asker(function), argument.name))
                (unseen if missed else seen).append(f"{function.name}.{argument.name}")
    assert len(seen) >= 200
    # Only the ratios, the number or the places of these count, so their unit cannot show.
    assert len(unseen) < 0.1 * len(seen), unseen
    assert "GROSS_VALUE.mass" in seen
    assert "TIME_MEAN_TEMPERATURE.time" in unseen  # a mean over time is the same in seconds


def kind_asker(kind: SheetKind, scope: str) -> Asker:
    """The meanings of a frozen formula's tokens: fields of its own block, of others, constants, table columns."""
    fields, constants = kind.by_key(), registry.constants()
    columns = {f"{table}.{one.partition(':')[0]}": one for table, ones in kind.tables.items() for one in ones}
    scopes = {"": scope, "runs": "run", "bodies": "body", "samples": "sample", "sample": "sample", "sheet": "sheet"}

    def find(node: Reference | Area | Name | Slot) -> Meaning:
        assert isinstance(node, Slot | Name)
        where, _, name = node.name.rpartition(".")
        if isinstance(node, Name) or where == "const":
            if name == "other_unit":  # the unit chosen at issue, stated in J/g
                return meaning("J/g", series=False)
            return meaning(constants[name].unit if name in constants else known(name).unit, series=False)
        if where.startswith("table."):
            unit_text = columns[f"{where.removeprefix('table.')}.{name}"].partition(":")[2]
            return meaning(None if unit_text == "text" else unit_text, series=True)
        found = fields[f"{scopes[where]}.{name}"]
        return meaning(field_unit(found), found.series or where in ("runs", "bodies", "samples"))

    return find


def field_unit(found: Field) -> str | None:
    if found.type in ("date", "datetime"):
        return "date"
    return found.unit if found.type in ("number", "integer") else None


def test_every_step_of_every_kind_hands_its_cell_function_the_right_units() -> None:
    steps = [(kind, one) for kind in map(load, names()) for one in kind.fields if one.step is not None]
    assert len(steps) >= 200
    wrong = []
    for kind, one in steps:
        assert one.step is not None
        if one.step.cell:  # a look, written as a rule, compares with numbers in the unit of its cells
            try:
                check_unit(parse_template(one.step.formula), kind_asker(kind, one.scope), field_unit(one))
            except DimensionError as fault:
                wrong.append(f"{kind.name} {one.key}: {fault}")
    assert not wrong, "\n".join(wrong)


def test_every_function_the_interpreter_knows_has_a_rule_for_units() -> None:
    forms = {"IF", "IFERROR", "CHOOSE", "INDEX", "AND", "OR"}
    assert len(RULES) > 60
    assert set(RULES) == {*SINGLE, *WHOLE, *forms}


# --- weights ---------------------------------------------------------------------------------------------


def never(node: Node) -> bool:
    return False


def test_weights_fold_to_numbers_where_they_can() -> None:
    x = Slot("x")
    assert weights.plus(Number(1.0), Number(2.0), "-") == Number(-1.0)
    assert weights.plus(x, weights.NONE) == x
    assert weights.plus(weights.NONE, x) == x
    assert weights.times(weights.ONE, x) == x
    assert weights.times(weights.NONE, x) == weights.NONE
    assert weights.over(Number(3.0), Number(2.0)) == Number(1.5)
    assert weights.over(weights.NONE, x) == weights.NONE
    assert weights.over(Number(1.0), Number(0.0)) == binary("/", Number(1.0), Number(0.0))
    assert weights.summed(weights.NONE, x) == weights.NONE


def test_weights_that_do_not_fold_are_compared_by_trying() -> None:
    x, y = Slot("x"), Slot("y")
    total = binary("+", x, y)
    assert weights.same(binary("/", total, total), weights.ONE, never)
    assert not weights.same(binary("/", x, total), weights.ONE, never)
    assert not weights.same(binary("/", x, weights.NONE), weights.ONE, never)
    assert not weights.same(weights.plus(weights.NONE, x, "-"), x, never)


def test_hostile_formulas_are_judged_or_refused_quickly() -> None:
    started = time.perf_counter()
    nested = "{temperature}"
    for _ in range(60):
        nested = f"({nested}*{{count}}/{{count}})"
    assert unit(nested) == "degC"
    for formula in (
        "*".join(["({temperature}*{count})"] * 60),
        "+".join([f"MAX({{temperature}}*{{count}},{n}*{{temperature}}*{{count}}/{n})" for n in range(1, 100)]),
        "+".join(["{temperature}"] * 127),
        "SUMPRODUCT(" * 70 + "{temperatures}" + ")" * 70,
    ):
        with pytest.raises(DimensionError):
            unit(formula)
    assert time.perf_counter() - started < 5.0


def test_units_are_named_by_their_usual_spelling_or_by_their_dimensions() -> None:
    assert str(dimensions.unit_of("J").times(dimensions.unit_of("g"), -1)) == "J/g"
    assert str(Unit((), 1.0)) == "1"
    odd = Measure(dimensions.unit_of("J/g").times(dimensions.unit_of("K"), 3))
    assert odd.name == "length^2 temperature^3 time^-2 x 1000"
