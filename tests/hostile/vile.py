"""Texts that would do something where they are shown, and workbooks that hold them wherever a text can stand."""

from __future__ import annotations

from collections.abc import Iterator
from xml.sax.saxutils import escape, quoteattr

from spoiling import (
    BOOK,
    Parts,
    base,
    part_of,
    replaced,
    with_cell,
    with_formula,
    with_record,
    with_rows,
    with_text,
)

from sheetcal.errors import printable

TEXTS = {
    "escape": "_x001B_[31mred_x001B_]0;title_x0007_",
    "c1": "\u009b31m\u0085\u009d0;t\u009c",
    "bidi": "gross \u202e41.7\u2066x\u2069\u200f\u061c",
    "zero-width": "so\u200bund\ufeff\u00ad\u2060\u180e",
    "invisible": "\u3164\u2800\uffa0\u034f\ufe0f",
    "tags": "\U000e0001\U000e0041\U000e007f",
    "lines": "one\ntwo\r\nthree\u2028four\u2029five\tsix",
    "backspace": "_x0008__x0008__x0008__x007F_back",
    "formula": "=cmd|'/c calc'!A0",
    "plus": "+1+1",
    "at": "@SUM(1)",
    "wide": "\uff1d1+1",
    "markup": "<script>alert(1)</script>&amp;\"'",
    "json": '"}],"sound":true,"x":["',
    "long": "x" * 30_000,
    "surrogate": "_xD800_half_xDFFF_",
    "percent": "%s%n{0}{__class__}\\x1b\\u202e",
}


def acts(text: str) -> list[str]:
    """What in an output is neither printable nor a line's end."""
    return [one for one in text if one != "\n" and printable(one) != one]


def books() -> Iterator[tuple[str, Parts]]:
    """Every text at every kind of place."""
    for name, text in TEXTS.items():
        yield f"reading-{name}", with_text("Front", "E34", text)
        yield f"choice-{name}", with_text("Front", "E23", text)
        yield f"number-{name}", with_text("Readings", "E17", text)
        yield f"label-{name}", with_text("Readings", "B17", text)
        yield f"printed-{name}", with_text("Front", "E6", text)
        yield f"result-{name}", with_text("Results", "E6", text)
        yield f"stranger-{name}", with_rows("Front", "<row r='900'/>", with_text("Front", "A1", text))
        yield f"formula-{name}", with_formula(f'"{text[:5000]}"&1')
        tab = quoteattr(text[:200])
        yield f"tab-{name}", replaced(BOOK, 'name="How computed"', f"name={tab}")
        yield f"tab-{name}-gone", replaced(BOOK, 'name="Results"', f"name={tab}")
        yield f"name-{name}", replaced(BOOK, 'name="closure_limit"', f"name={tab}")
        yield f"record-{name}", with_record({"issue_id": text[:9000], "lab_name": text[:9000]})
        yield (
            f"record-settings-{name}",
            with_record({"settings": {"unit": text, "time_zone": text, "calorimeter": text}}),
        )
        yield f"record-kind-{name}", with_record({"kind": text})
        custom = base()["docProps/custom.xml"].decode().replace("78ctk", escape(text))
        yield f"property-{name}", {**base(), "docProps/custom.xml": custom.encode()}
        yield f"link-{name}", _linked(text[:3000])
        yield f"error-{name}", with_cell("Readings", "E17", f"<v>#{escape(text[:500])}</v>", "e")
        yield f"type-{name}", _typed(text[:200])


def _linked(text: str) -> Parts:
    """A link to outside with the text as its address."""
    relation = f"<Relationship Id='x' Type='a/externalLinkPath' TargetMode='External' Target={quoteattr(text)}/>"
    whole = f"<Relationships xmlns='http://schemas.openxmlformats.org/package/2006/relationships'>{relation}"
    return {**base(), "xl/externalLinks/_rels/externalLink1.xml.rels": f"{whole}</Relationships>".encode()}


def _typed(text: str) -> Parts:
    """A cell whose type is the text."""
    parts = base()
    sheet = parts[part_of("Readings")].decode()
    return {**parts, part_of("Readings"): sheet.replace('t="inlineStr"', f"t={quoteattr(text)}", 1).encode()}
