"""Random damage: to the bytes of a file, to its parts, to the values in its cells, to its issue record."""

from __future__ import annotations

import re
from random import Random

from spoiling import (
    Parts,
    base,
    filled,
    ods_parts,
    packed,
    part_of,
    record_texts,
    with_record,
)

PIECES = (
    b"", b"<", b">", b'"', b"&", b"\0", b"\xff", b"9" * 12, b"]]>", b"<![CDATA[", b"&#x202e;", b"</c>", b"<c/>",
    b"PK\x03\x04", b"\xef\xbb\xbf", b"-->", b' t="e"', b' r="A1"', b"1E999", b"=A1",
)  # fmt: skip
VALUES = (
    "NaN", "inf", "-INF", "1E308", "-1E308", "5E-324", "-0", "0", "1" * 400, "0x10", "1e999999999", "1,5", "", " ",
    "-1", "2958465", "2958466", "-693594", "1e15", "60", "0.1", "1e-300", "٣", "1_000", "+1", ".5", "5.", "1e", "TRUE",
)  # fmt: skip
KINDS = ("", "s", "str", "inlineStr", "b", "e", "d", "n", "zz")
FORMULAS = ("A1", "1/0", "NA()", "SUM(A1:ZZ999)", "", "(", '""', "-E6", "TRUE", "#REF!", "E6:E9", "1;2")
SCALARS = ("null", "true", "-1", "1e308", '""', "[]", "{}", "1e-320", "9" * 30, '"x"', "NaN", "0", '"\\u202e"')
_VALUE = re.compile(rb"<v>([^<]*)</v>")
_FORMULA = re.compile(rb"<f>([^<]*)</f>")
_CELL = re.compile(rb'<c r="[A-Z]+[0-9]+"( s="[0-9]+")?( t="[a-zA-Z]+")?')
_SCALAR = re.compile(r'"[^"]*"|-?[0-9][0-9.eE+-]*|true|false|null')
SMALL = ("heat-balance", "heat-balance", "vaporisation", "specific-heat")
TABS = ("Front", "Readings", "Records", "Results", "Constants")
SORTS = ("zip", "part", "cells", "record", "ods-zip", "ods-part", "ods-values", "formulas")


def mutated(sort: str, chance: Random) -> tuple[str, bytes]:
    """A file's ending and content after damage of a sort."""
    if sort.startswith("ods"):
        return ".ods", _ods(sort, chance)
    if sort == "zip":
        return ".xlsx", damaged(filled(chance.choice(SMALL)).read_bytes(), chance)
    if sort == "record":
        return ".xlsx", packed(_record(chance))
    parts = base(chance.choice(SMALL))
    name = chance.choice(sorted(parts)) if sort == "part" else part_of(chance.choice(TABS))
    change = {"part": damaged, "cells": _cells, "formulas": _formulas}[sort]
    parts[name] = change(parts[name], chance)
    return ".xlsx", packed(parts)


def damaged(data: bytes, chance: Random) -> bytes:
    """The bytes with one to four places changed, cut out, doubled or exchanged."""
    for _ in range(chance.randint(1, 4)):
        at, length = chance.randrange(len(data) + 1), chance.choice((0, 1, 2, 5, 40, 400))
        piece = data[at : at + length]
        far = chance.randrange(len(data) + 1)
        new = chance.choice((piece * 2, piece[::-1], data[far : far + length], bytes([chance.randrange(256)]),
                             chance.choice(PIECES), chance.choice(PIECES)))  # fmt: skip
        data = data[:at] + new + data[at + length :]
    return data


def _some(pattern: re.Pattern[bytes], data: bytes, chance: Random, most: int = 3) -> list[re.Match[bytes]]:
    """A few of the places a pattern fits, the last one first."""
    found = list(pattern.finditer(data))
    return sorted(chance.sample(found, min(len(found), chance.randint(1, most))), key=lambda one: -one.start())


def _cells(data: bytes, chance: Random) -> bytes:
    """Values and types of cells exchanged."""
    for one in _some(_VALUE, data, chance):
        data = data[: one.start(1)] + chance.choice(VALUES).encode() + data[one.end(1) :]
    for one in _some(_CELL, data, chance, 2) if chance.random() < 0.5 else ():
        kind = chance.choice(KINDS)
        sort = f' t="{kind}"'.encode() if kind else b""
        data = data[: one.start()] + one[0].partition(b" t=")[0] + sort + data[one.end() :]
    return data


def _formulas(data: bytes, chance: Random) -> bytes:
    """Formulas replaced, cut or joined to others."""
    for one in _some(_FORMULA, data, chance):
        text = one[1]
        cut = chance.randrange(len(text) + 1)
        new = chance.choice((text[:cut], text[cut:], text[:cut] + b"(" + text[cut:], text + b"*1.01",
                             text.replace(b",", b";"), chance.choice(FORMULAS).encode()))  # fmt: skip
        data = data[: one.start(1)] + new.replace(b"&am", b"") + data[one.end(1) :]
    return data


def _record(chance: Random) -> Parts:
    """Numbers, texts and lists of the issue record exchanged, or its bytes changed."""
    texts = record_texts()
    key = chance.choice(sorted(texts))
    text = texts[key]
    found = list(_SCALAR.finditer(text))
    if found and chance.random() < 0.7:
        for one in sorted(chance.sample(found, min(len(found), 2)), key=lambda one: -one.start()):
            text = text[: one.start()] + chance.choice(SCALARS) + text[one.end() :]
    else:
        raw = damaged(text.encode(), chance).decode("utf-8", "ignore")
        text = "".join(c for c in raw if c >= " " and c not in "\ufffe\uffff")
    return with_record({key: text})


def _ods(sort: str, chance: Random) -> bytes:
    parts = ods_parts()
    if sort == "ods-zip":
        return damaged(packed(parts), chance)
    data = parts["content.xml"]
    if sort == "ods-part":
        data = damaged(data, chance)
    else:
        for one in _some(re.compile(rb'"([^"<>]*)"'), data, chance, 4):
            new = chance.choice((*VALUES, *KINDS, "date", "time", "PT1H", "2026-02-30", "of:=[.A1]", "1048577"))
            data = data[: one.start(1)] + new.encode() + data[one.end(1) :]
    return packed({**parts, "content.xml": data})
