"""Attacks by formulas: too deep, too long, too much to evaluate, in circles, reaching outside.

Each is (name, what makes the file, words): the words must stand in what `check` says of the file.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

from spoiling import RESULT, base, later, ods_parts, ods_tables, part_of, with_cell, with_formula

Attack = tuple[str, Callable[[], bytes], str]
ALTERED = f"Results!{RESULT}"
NAMED = '<definedName name="%s">%s</definedName>'


def grid(first: int, last: int, cell: str, columns: int = 20) -> str:
    """Rows of cells A to T; `cell` is what stands in each, with {c} and {r} for its address."""
    return "".join(
        f'<row r="{row}">'
        + "".join(cell.replace("{c}", chr(65 + at)).replace("{r}", str(row)) for at in range(columns))
        + "</row>"
        for row in range(first, last + 1)
    )


NUMBERS = grid(5000, 5999, '<c r="{c}{r}"><v>{r}.5</v></c>')
TEXTS = grid(5000, 5999, '<c r="{c}{r}" t="str"><v>some text {r}</v></c>')
LONG_TEXTS = grid(5000, 5499, f'<c r="{{c}}{{r}}" t="str"><v>{"x" * 700}</v></c>')


def written() -> Iterator[tuple[str, str]]:
    """Formulas that hurt by what is written."""
    yield "brackets", "(" * 10_000 + "1" + ")" * 10_000
    yield "brackets-open", "(" * 10_000
    yield "calls", "IF(" * 3000 + "1" + ",1,1)" * 3000
    yield "signs", "-" * 8000 + "1"
    yield "percents", "1" + "%" * 8000
    yield "plus-long", "1" + "+1" * 4000
    yield "plus-too-long", "1" + "+1" * 200_000
    yield "powers", "2" + "^2" * 4000
    yield "text-open", '"' + "a" * 8000
    yield "text-quotes", '"' * 8001
    yield "tab-quotes", "'" * 8001
    yield "arguments", "SUM(" + ",".join(["1"] * 4000) + ")"
    yield "commas", "SUM(" + "," * 8000 + ")"
    yield "references", "SUM(" + ",".join(f"A{n}" for n in range(1, 1300)) + ")"
    yield "colons", "A1" + ":A1" * 2600
    yield "index-colons", "INDEX(A1:A9,1)" + ":INDEX(A1:A9,2)" * 500
    yield "far", "XFE1048577+ZZZ9999999+A0"
    yield "digits", "1" * 8000
    yield "digits-name", "a" * 8000
    yield "exponents", "1E308*1E308+1E-400+1E999999999"
    yield "braces", "{1,2;3,4}" * 200
    yield "slots", "{0}+{1}+{sample.ash}"
    yield "external", "[1]Sheet1!A1+'[other.xlsx]S'!A1"
    yield "webservice", '_xlfn.WEBSERVICE("http://127.0.0.1/")'
    yield "dde", "cmd|'/c calc'!A0"
    yield "indirect", 'INDIRECT("A1")+HYPERLINK("http://127.0.0.1/","x")+CALL("kernel32","Beep","J")'
    yield "rept", 'REPT("x",2147483647)&REPT(REPT("x",30000),30000)'
    yield "control", "1+\u200b1+\u202e1"
    yield "unicode", "SUM(\u0661,\u0662)+\uff21\uff11+\u00b2"
    yield "array", "{=SUM(A1:A2)}"
    yield "lambda", "_xlfn.LAMBDA(x,x(x))(_xlfn.LAMBDA(x,x(x)))"
    yield "nothing", " "
    yield "own-cell", RESULT
    yield "own-range", "SUM(A1:ZZ99999)"


def evaluated() -> Iterator[tuple[str, str, str, str]]:
    """(name, formula, rows, names) of formulas that hurt when they are evaluated."""
    yield "all-columns", "SUMPRODUCT((A1:XFD1048576)*(A1:XFD1048576))", "", ""
    yield "whole-column", "SUM(A:A)*SUM(1:1)", "", ""
    yield "many-columns", "+".join(f"SUM(A{n}:T{n + 900})" for n in range(5000, 5300)), NUMBERS, ""
    product = "*".join(["(A5000:T5999)"] * 300)
    yield "product", f"SUMPRODUCT({product})", NUMBERS, ""
    yield "product-of-texts", f"SUMPRODUCT({product})", TEXTS, ""
    nested = "A5000:T5999"
    for _ in range(60):
        nested = f"SUMPRODUCT(--({nested}>1),{nested})" if len(nested) < 2500 else nested
    yield "nested-products", nested, NUMBERS, ""
    yield "compared-texts", "SUMPRODUCT(" + "+".join(["(A5000:T5999=A5000:T5999)"] * 200) + ")", TEXTS, ""
    yield "joined", "SUMPRODUCT(LEN(" + "&".join(["A5000:T5999"] * 500) + "))", TEXTS, ""
    yield "joined-long", "SUMPRODUCT(LEN(" + "&".join(["A5000:T5499"] * 500) + "))", LONG_TEXTS, ""
    yield "upper", "SUMPRODUCT(LEN(" + "UPPER(" * 70 + "A5000:T5499" + ")" * 70 + "))", LONG_TEXTS, ""
    yield "countif", "SUMPRODUCT(COUNTIF(A5000:T5999,A5000:T5999))", TEXTS, ""
    stars = "*a" * 2000
    yield "wildcards", f'COUNTIF(A5000:T5499,"{stars}")+MATCH("{stars}",A5000:A5499,0)', LONG_TEXTS, ""
    yield "question-marks", f'COUNTIF(A5000:T5499,"{"?*" * 100}y")', LONG_TEXTS, ""
    yield "match", "+".join([f"MATCH({n},A5000:A5999,0)" for n in range(300)]), NUMBERS, ""
    yield "power", "9^9^9^9^9^9+1E308^1E308+(-8)^(1/3)+0^-1+EXP(1E9)+LN(0)+LOG(-1)+SQRT(-1)", "", ""
    yield "rounding", "ROUND(1.5,1E308)+ROUNDUP(1,400)+ROUNDDOWN(1,-400)+TRUNC(1,1E9)+INT(1E308)", "", ""
    yield "remainder", "MOD(1E308,1E-308)+MOD(1,0)+MOD(-1,1E308)", "", ""
    yield "index", "INDEX(A1:B2,1E300)+INDEX(A1:B2,-1)+CHOOSE(1E300,1)+INDEX(A1:B2,0,0)", "", ""
    yield (
        "median",
        "MEDIAN(A5000:T5999)+STDEV(A5000:T5999)+DEVSQ(A5000:T5999)+SLOPE(A5000:A5999,B5000:B5999)",
        NUMBERS,
        "",
    )
    yield "not-plain", 'SUMPRODUCT((A5000:T5999="x")*(B5000:U5999))', TEXTS, ""
    chain = '<row r="5000"><c r="A5000"><v>1</v></c></row>' + "".join(
        f'<row r="{n}"><c r="A{n}"><f>A{n - 1}+A{n - 1}</f><v>1</v></c></row>' for n in range(5001, 6200)
    )
    yield "doubling", "A6199", chain, ""
    texts = '<row r="5000"><c r="A5000" t="str"><v>xxxxxxxxxx</v></c></row>' + "".join(
        f'<row r="{n}"><c r="A{n}"><f>A{n - 1}&amp;A{n - 1}</f><v>1</v></c></row>' for n in range(5001, 5100)
    )
    yield "doubling-text", "LEN(A5099)", texts, ""
    grown = '<row r="4999"><c r="A4999" t="str"><v>' + "x" * 16_000 + "</v></c></row>"
    yield (
        "text-everywhere",
        "COUNTA(A5000:T5999)",
        grown + grid(5000, 5999, '<c r="{c}{r}"><f>$A$4999&amp;{r}</f></c>'),
        "",
    )
    down = "".join(f'<row r="{n}"><c r="A{n}"><f>A{n + 1}+1</f></c></row>' for n in range(5000, 60_000))
    yield "long-chain", "A5000", down, ""
    circle = grid(5000, 5000, '<c r="{c}{r}"><f>SUM(A5000:T5000)</f></c>')
    yield "circle", "A5000", circle, ""
    ring = "".join(f'<row r="{n}"><c r="A{n}"><f>A{5000 + (n - 4999) % 3000}</f></c></row>' for n in range(5000, 8000))
    yield "ring", "A5000", ring, ""
    web = grid(5000, 5199, '<c r="{c}{r}"><f>SUM(A5000:T5199)</f></c>')
    yield "web", "A5000", web, ""
    slanted = "".join(f'<row r="{n}"><c r="A{n}"><f>SUM(A{n + 1}:A{n + 2000})</f></c></row>' for n in range(5000, 7000))
    yield "slanted-ranges", "A5000", slanted, ""
    many = "".join(
        f'<row r="{n}"><c r="A{n}"><f>{"+".join(f"B{n + k}*{k}.{n}" for k in range(300))}</f></c></row>'
        for n in range(5000, 7500)
    )
    yield "different-formulas", "SUM(A5000:A7499)", many, ""
    yield "name-of-itself", "loop+1", "", NAMED % ("loop", "loop+1")
    yield "names-in-a-ring", "ring0", "", "".join(NAMED % (f"ring{n}", f"ring{(n + 1) % 500}+1") for n in range(500))
    yield "names-doubling", "dbl99", "", NAMED % ("dbl0", "1") + "".join(
        NAMED % (f"dbl{n}", f"dbl{n - 1}+dbl{n - 1}") for n in range(1, 100)
    )  # fmt: skip
    yield "name-long", "big", "", NAMED % ("big", "1" + "+1" * 100_000)
    yield "name-deep", "deep", "", NAMED % ("deep", "(" * 5000 + "1" + ")" * 5000)
    yield "name-of-cell", "through", "", NAMED % ("through", f"Results!${RESULT[0]}${RESULT[1:]}")
    yield (
        "name-taken",
        "closure_limit*1",
        "",
        NAMED % ("closure_limit", "Results!$A$1") + NAMED % ("CLOSURE_LIMIT", "1"),
    )
    yield "name-outside", "gone", "", NAMED % ("gone", "[7]Other!$A$1")


def everywhere() -> Iterator[Attack]:
    """Every formula of a tab made long, and all of them different."""
    text = base()[part_of("Results")].decode()
    pieces = text.split("<f>")
    longer = pieces[0] + "".join(
        f"<f>{'+'.join(f'{n}.{k}' for k in range(700))}+" + one for n, one in enumerate(pieces[1:])
    )
    yield "all-formulas-long.xlsx", later({**base(), part_of("Results"): longer.encode()}), "Results"
    deep = pieces[0] + "".join(f"<f>{'(' * 70}{n}{')' * 70}+" + one for n, one in enumerate(pieces[1:]))
    yield "all-formulas-deep.xlsx", later({**base(), part_of("Results"): deep.encode()}), "Results"
    none = pieces[0] + "".join("<f>" + one[one.index("</f>") :] for one in pieces[1:])
    yield "all-formulas-empty.xlsx", later({**base(), part_of("Results"): none.encode()}), "Results"
    array = text.replace("<f>", '<f t="array" ref="A1:XFD1048576">')
    yield "all-formulas-arrays.xlsx", later({**base(), part_of("Results"): array.encode()}), ""
    table = text.replace("<f>", '<f t="dataTable" ref="A1:B2" dt2D="1" dtr="1" r1="A1" r2="B1">')
    yield "all-formulas-tables.xlsx", later({**base(), part_of("Results"): table.encode()}), ""
    event = ods_tables().replace("of:=", "msoxl:=")
    yield "another-grammar.ods", later(ods_parts(event)), ""


def attacks() -> Iterator[Attack]:
    """All of them."""
    for name, formula in written():
        yield f"formula-{name}.xlsx", later(with_formula(formula)), ALTERED if formula.strip() else "Results"
    for name, formula, rows, names in evaluated():
        yield f"evaluated-{name}.xlsx", later(with_formula(formula, rows, names)), ALTERED
    circle = with_cell("Readings", "E17", "<f>Results!E6</f><v>1</v>")
    yield "evaluated-through-a-reading.xlsx", later(circle), "Readings!E17"
    yield from everywhere()
