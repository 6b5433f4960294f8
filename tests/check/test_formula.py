"""Formula text is read with the spreadsheet's grammar, written in one spelling, and compared by meaning."""

import time
from contextlib import suppress

import pytest
from formula_expressions import EXPRESSIONS
from hypothesis import given, settings
from hypothesis import strategies as st

from sheetcal.check.formula import (
    _abstract_slowly,
    abstract,
    address,
    canonical,
    parse,
    parse_template,
    reference,
    same_formula,
    tokens,
    write,
)
from sheetcal.check.tree import (
    DEEPEST,
    Area,
    Binary,
    Call,
    ErrorLiteral,
    FormulaError,
    Missing,
    Name,
    Negative,
    Node,
    Number,
    Percent,
    Range,
    Reference,
    Slot,
    Text,
    TooComplex,
    binary,
    call,
    children,
    depth,
    joined,
    negative,
    percent,
    replace_leaves,
    walk,
)

COLUMN = Area(None, 1, 1, 1, 3)


def one(value: float) -> Number:
    return Number(value)


@pytest.mark.parametrize(
    ("text", "tree"),
    [
        ("-2^2", binary("^", negative(one(2)), one(2))),
        ("2^3^2", binary("^", binary("^", one(2), one(3)), one(2))),
        ("2^-2", binary("^", one(2), negative(one(2)))),
        ("1-2-3", binary("-", binary("-", one(1), one(2)), one(3))),
        ("1+2*3", binary("+", one(1), binary("*", one(2), one(3)))),
        ("1&2+3", binary("&", one(1), binary("+", one(2), one(3)))),
        ("1&2=3", binary("=", binary("&", one(1), one(2)), one(3))),
        ("-5%", percent(negative(one(5)))),
        ("+5", one(5)),
        ("1E-3", one(0.001)),
        (".5", one(0.5)),
        ('"a""b"', Text('a"b')),
        ("TRUE", call("TRUE")),
        ("true()", call("TRUE")),
        ("$D$9", Reference(None, 4, 9)),
        ("Readings!D9", Reference("Readings", 4, 9)),
        ("'Issue record'!$D9", Reference("Issue record", 4, 9)),
        ("'it''s'!A1", Reference("it's", 1, 1)),
        ("B9:A2", Area(None, 1, 2, 2, 9)),
        ("T!A1:T!B2", Area("T", 1, 1, 2, 2)),
        ("gas_constant", Name("gas_constant")),
        ("const.x2", Name("const.x2")),
        ("_xlfn.STDEV.S(A1)", call("STDEV.S", Reference(None, 1, 1))),
        ("LOG10(1)", call("LOG10", one(1))),
        ("IF(a;;1)", call("IF", Name("a"), Missing(), one(1))),
        ("#DIV/0!", ErrorLiteral("#DIV/0!")),
        (
            "INDEX(A1:A3,1):INDEX(A1:A3,2)",
            joined(call("INDEX", Area(None, 1, 1, 1, 3), one(1)), call("INDEX", Area(None, 1, 1, 1, 3), one(2))),
        ),
    ],
)
def test_text_becomes_the_tree_that_a_spreadsheet_means(text: str, tree: Node) -> None:
    assert parse(f"={text}") == tree


@pytest.mark.parametrize(
    "text",
    ["", "1+", "(1", "1)", "IF(1,2", "A1 B2", "1 2", "{a}", "A1:2", "'x'", '"x', "[1]S!A1", "XFE1",
     "A1:XFE1", "A1048577", "a!A1:b!A2", "{1,2}", "1..2", "=1", "A1#", "*1", "\x00"],
)  # fmt: skip
def test_what_does_not_follow_the_grammar_is_refused(text: str) -> None:
    with pytest.raises(FormulaError) as caught:
        parse(text if text == "" else f"={text}")
    assert "expected" in str(caught.value)


@pytest.mark.parametrize(
    "text",
    ["(" * 4000 + "1", "ABS(" * 500 + "1" + ")" * 500, "+".join("1" * 3000), "-" * 3000 + "1", "1" * 9000,
     "1" + "%" * 3000, "^".join("2" * 2000)],
)  # fmt: skip
def test_hostile_nesting_and_length_are_refused_at_once(text: str) -> None:
    started = time.perf_counter()
    for read in (parse, parse_template, canonical):
        with pytest.raises(TooComplex):
            read(text)
    assert time.perf_counter() - started < 1.0


@pytest.mark.parametrize("text", ["'" * 8000, '"' * 8001, "'a" * 4000, "A1!" * 2700, "$" * 8000, "#" * 8000])
def test_text_made_to_slow_the_patterns_down_does_not(text: str) -> None:
    started = time.perf_counter()
    with pytest.raises(FormulaError):
        parse(text)
    with suppress(FormulaError):
        abstract(text)
    assert time.perf_counter() - started < 1.0


@pytest.mark.parametrize(
    ("one_text", "other"),
    [
        ("='Const'!B2*2", "=Const!B2*2"),
        ("=IF(TRUE,1,0)", "=IF(TRUE(),1,0)"),
        ("=1.0E-3*A1", "=0.001*A1"),
        ("= A1 + B1 ", "=A1+B1"),
        ("=_xlfn.STDEV.S(A1:A3)", "=STDEV.S(A1:A3)"),
        ("=$A$1+A$2", "=A1+A2"),
        ("=sum(a1:a3)", "=SUM(A1:A3)"),
        ("=IF(A1;2;3)", "=IF(A1,2,3)"),
        ("=((A1))+(B1*C1)", "=A1+B1*C1"),
        ("=+A1", "=A1"),
        ("=Gas_Constant*2", "=gas_constant*2"),
        ("=RESULTS!A1", "=Results!A1"),
        ("=Results!A1", "=A1"),
        ("=0.33333333333333331", "=0.333333333333333"),
        ("=A1<>B1", "=(A1)<>(B1)"),
        ("=garbage(", "=garbage("),
    ],
)
def test_what_programs_rewrite_in_saving_is_the_same_formula(one_text: str, other: str) -> None:
    assert same_formula(one_text, other, tab="Results")


@pytest.mark.parametrize(
    ("one_text", "other"),
    [
        ("=A1+B1", "=B1+A1"),
        ("=A1-B1-C1", "=A1-(B1-C1)"),
        ("=A1/B1*C1", "=A1/(B1*C1)"),
        ("=-A1^2", "=-(A1^2)"),
        ("=SUM(A1:A3)", "=SUM(A1:A4)"),
        ("=STDEV(A1:A3)", "=STDEVP(A1:A3)"),
        ("=LN(A1)", "=LOG(A1)"),
        ("=MATCH(A1,B1:B9,0)", "=MATCH(A1,B1:B9,1)"),
        ("=A1", "=$A$2"),
        ("=A1*1.0001", "=A1"),
        ("=Data!A1", "=A1"),
        ('="a"', '="A"'),
        ("=IF(A1,2,)", "=IF(A1,2)"),
        ("=A1", "A1("),
        ("=A1", "=A1%"),
    ],
)
def test_what_changes_the_meaning_is_another_formula(one_text: str, other: str) -> None:
    assert not same_formula(one_text, other, tab="Results")


@pytest.mark.parametrize(
    ("text", "spelling"),
    [
        ("=( A1+ 2 )*3", "(A1+2)*3"),
        ("-(2^2)", "-(2^2)"),
        ("(-2)^2", "-2^2"),
        ("2^(3^2)", "2^(3^2)"),
        ("(1+2)%", "(1+2)%"),
        ("'My tab'!A1:B2", "'my tab'!A1:B2"),
        ("'it''s'!A1", "'it''s'!A1"),
        ("INDEX(A1:A3,1):INDEX(A1:A3,2)", "INDEX(A1:A3,1):INDEX(A1:A3,2)"),
        ('"say ""x"""&#N/A', '"say ""x"""&#N/A'),
        ("if(a1>=1e10,,5%)", "IF(A1>=10000000000,,5%)"),
        ("1E300", "1E+300"),
    ],
)
def test_there_is_one_spelling(text: str, spelling: str) -> None:
    assert canonical(text) == spelling
    assert canonical(spelling) == spelling


def test_different_references_become_slots_and_names_texts_and_numbers_stay() -> None:
    text = "=IF(Readings!$D9=\"A1\",$B$2:$B$9+1E3,'My tab'!A1)-Readings!$D9+gas_1*LOG10(A1)"
    template, references = abstract(text)
    assert template == 'IF({0}="A1",{1}+1E3,{2})-{0}+gas_1*LOG10({3})'
    assert references == ("Readings!$D9", "$B$2:$B$9", "'My tab'!A1", "A1")
    slots: dict[Node, Node] = {Slot(str(index)): reference(one) for index, one in enumerate(references)}
    assert replace_leaves(parse_template(template), slots) == parse(text)


@pytest.mark.parametrize(
    "text",
    ["=A1:INDEX(A1:A9,2)", "=INDEX(A1:A9,2):A9", "=INDEX(A1:A9,1):INDEX(A1:A9,2)", '="a ""A1"" b"&A1&""',
     "=LOG10(A1)*LOG10",
     "=1E3+E3", "='It''s'!A1+A1", "=\"'\"&A1", '="{"&A1', "=R!A1:R!B2*$C$3", "=x.A1+A1", "=#REF!+A1", "=A1=\"\"",
     *(f"={one}" for one in EXPRESSIONS)],
)  # fmt: skip
def test_the_quick_way_to_a_template_is_the_thorough_one(text: str) -> None:
    assert abstract(text) == _abstract_slowly(text)


def test_a_slot_is_read_in_templates_only() -> None:
    assert parse_template("{sample.ash}*{x_1}") == binary("*", Slot("sample.ash"), Slot("x_1"))
    assert write(parse_template("{a}")) == "{a}"
    for read in (parse, abstract):
        with pytest.raises(FormulaError):
            read("={a}")


def test_addresses_count_columns_as_the_sheet_does() -> None:
    assert [address(number, 7) for number in (1, 26, 27, 702, 703, 16384)] == [
        "A7", "Z7", "AA7", "ZZ7", "AAA7", "XFD7",
    ]  # fmt: skip
    assert reference("XFD1048576") == Reference(None, 16384, 1048576)
    assert Area(None, 1, 2, 3, 4).size == 9
    with pytest.raises(FormulaError):
        reference("no cell")


def test_tokens_carry_their_kind() -> None:
    assert list(tokens('A1 >= "x"')) == [("reference", "A1"), ("operator", ">="), ("text", '"x"')]


def test_walks_go_through_every_kind_of_node() -> None:
    tree = parse("IF(-A1%>2,INDEX(B1:B9,1):INDEX(B1:B9,2),x)")
    kinds = {type(node) for node in walk(tree)}
    assert kinds == {Call, Binary, Negative, Percent, Reference, Number, Range, Area, Name}
    assert children(Number(1.0)) == ()
    assert depth(tree) == 5
    moved = replace_leaves(tree, {Reference(None, 1, 1): Reference(None, 3, 3), Name("x"): Number(9.0)})
    assert write(moved) == "IF(-C3%>2,INDEX(B1:B9,1):INDEX(B1:B9,2),9)"


def test_builders_refuse_what_the_parser_would_refuse() -> None:
    node: Node = Number(1.0)
    for _ in range(DEEPEST - 1):
        node = negative(node)
    with pytest.raises(TooComplex):
        negative(node)
    with pytest.raises(FormulaError):
        joined(Number(1.0), Number(2.0))


leaves = st.one_of(
    st.integers(0, 10**6).map(lambda n: Number(n / 64)),
    st.sampled_from([Text(""), Text('a "b"'), Reference(None, 4, 9), Reference("my tab", 1, 1), Name("name_1"),
                     Area("t", 1, 2, 3, 4), ErrorLiteral("#N/A")]),
)  # fmt: skip


def above(inner: st.SearchStrategy[Node]) -> st.SearchStrategy[Node]:
    operators = st.sampled_from(["+", "-", "*", "/", "^", "&", "=", "<>", "<", "<=", ">", ">="])
    return st.one_of(
        inner.map(negative),
        inner.map(percent),
        st.builds(binary, operators, inner, inner),
        st.lists(inner, max_size=3).map(lambda parts: call("SUM", *parts)),
    )


trees = st.recursive(leaves, above, max_leaves=20)


@settings(max_examples=150, deadline=None)
@given(trees)
def test_whatever_is_written_reads_back_with_the_same_spelling(tree: Node) -> None:
    text = write(tree)
    assert write(parse(text)) == text
    assert same_formula(f"={text}", f"= {text} ")
    template, references = abstract(text)
    slots: dict[Node, Node] = {Slot(str(index)): reference(one) for index, one in enumerate(references)}
    assert write(replace_leaves(parse_template(template), slots)) == text
