"""CalcAddIns.xcu: what the function wizard shows of each cell function, in every language that has words."""

from __future__ import annotations

from xml.sax.saxutils import escape, quoteattr

from sheetcal.cells.registry import CellFunction
from sheetcal.office.addin.interface import parameter
from sheetcal.office.addin.manifest import HEAD

SERVICE = "org.sheetcal.Functions"
SPACES = (
    'xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema" '
    'oor:name="CalcAddIns" oor:package="org.openoffice.Office"'
)


def _prop(name: str, texts: dict[str, str]) -> str:
    values = "".join(f'<value xml:lang="{lang}">{escape(text)}</value>' for lang, text in texts.items())
    return f"<prop oor:name={quoteattr(name)}>{values}</prop>"


def xcu(functions: list[CellFunction]) -> str:
    """The configuration of all functions."""
    nodes = "".join(map(_function, functions))
    return (
        f'{HEAD}<oor:component-data {SPACES}>\n<node oor:name="AddInInfo">\n'
        f'<node oor:name="{SERVICE}" oor:op="replace">\n<node oor:name="AddInFunctions">\n{nodes}'
        "</node>\n</node>\n</node>\n</oor:component-data>\n"
    )


def _function(one: CellFunction) -> str:
    parts = [
        _prop("DisplayName", {"en": one.name}),
        _prop("Description", {"en": one.doc.splitlines()[0]}),
        '<prop oor:name="Category"><value>sheetcal</value></prop>',
        _prop("CompatibilityName", {"en": one.name}),
    ]
    args = "".join(
        f'<node oor:name="{parameter(i)}" oor:op="replace">{_prop("DisplayName", {"en": arg.name})}'
        f"{_prop('Description', {'en': arg.unit or 'text'})}</node>"
        for i, arg in enumerate(one.args)
    )
    inside = f'{"".join(parts)}<node oor:name="Parameters">{args}</node>'
    return f'<node oor:name="{one.name}" oor:op="replace">{inside}</node>\n'
