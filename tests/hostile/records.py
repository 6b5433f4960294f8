"""Attacks by the issue record: shapes without end, numbers without end, types exchanged, nesting without end.

Each is (name, what makes the file, words): the words must stand in what `check` says of the file.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator
from typing import Any

from spoiling import later, record_texts, with_record, with_record_rows

Attack = tuple[str, Callable[[], bytes], str]
ALTERED = "issue record"
STRANGE: tuple[Any, ...] = (
    None, True, -1, 0.5, 1e308, 10**30, "x", [], {}, [[]], {"a": {"b": []}}, "\u202e\x1b[31m"
)  # fmt: skip


def shape(**changes: Any) -> dict[str, Any]:
    """The shape of the record with some sizes changed."""
    return {**json.loads(record_texts()["shape"]), **changes}


def sizes() -> Iterator[tuple[str, dict[str, Any]]]:
    """Shapes that no workbook has."""
    for size in ("samples", "runs", "spare", "bodies", "record_rows"):
        for number in (10**9, -1, 1e6, "9", None, True, [4]):
            yield f"{size}-{number}", {"shape": shape(**{size: number})}
    yield "all-sizes", {"shape": shape(samples=99, runs=40, spare=40, bodies=20, record_rows=250)}
    fuel = shape(samples=99, runs=2, spare=0, bodies=0, record_rows=250)
    yield "largest-fuel", {"kind": "fuel", "shape": fuel}
    yield "many-runs", {"kind": "fuel", "shape": {**fuel, "runs": 40, "spare": 40}}
    yield "many-rows", {"shape": shape(table_rows=[["balance", 10**9], ["person", 4]])}
    yield "negative-rows", {"shape": shape(table_rows=[["balance", -5], ["person", 4]])}
    yield "rows-of-nothing", {"shape": shape(table_rows=[["nothing", 1]])}
    yield "rows-as-text", {"shape": shape(table_rows="ab")}
    yield "rows-nested", {"shape": shape(table_rows=[[["balance"], 2]])}
    yield "key-more", {"shape": shape(more=1)}
    yield "key-missing", {"shape": {"samples": 1}}


def entries() -> Iterator[tuple[str, dict[str, Any]]]:
    """Every entry of the record replaced by something of another type."""
    for key in record_texts():
        if key == "record_sha256":
            continue
        for number, value in enumerate(STRANGE):
            yield f"{key}-{number}", {key: value}


def texts() -> Iterator[tuple[str, dict[str, str]]]:
    """Entries whose JSON is a bomb, or no JSON."""
    for key in ("shape", "constants", "tables", "prefilled", "settings", "ranges"):
        yield f"{key}-deep", {key: "[" * 20_000 + "]" * 20_000}
        yield f"{key}-deep-keys", {key: '{"a":' * 20_000 + "1" + "}" * 20_000}
        yield f"{key}-digits", {key: "9" * 20_000}
        yield f"{key}-nan", {key: '{"a":NaN,"b":-Infinity}'}
        yield f"{key}-cut", {key: record_texts()[key][:-3]}
        yield f"{key}-empty", {key: ""}
        yield f"{key}-surrogate", {key: '{"\\ud800":"\\udfff\\u0000"}'}
    constants = json.loads(record_texts()["constants"])
    yield "constants-many", {"constants": json.dumps(constants * 5000)}
    for value in ("1e400", "NaN", "-0.0", "5e-324", "1e308", '"1"', "true", "null", "1" + "0" * 400):
        text = record_texts()["constants"].replace('"value":5.0', f'"value":{value}', 1)
        yield f"constant-{value[:6]}", {"constants": text}
    prefilled = json.loads(record_texts()["prefilled"])
    yield "prefilled-many", {"prefilled": json.dumps({**prefilled, **{f"sheet.x{n}": n for n in range(100_000)}})}
    yield "prefilled-long", {"prefilled": json.dumps({**prefilled, "sheet.job": "x" * 2_000_000})}
    yield "settings-long", {"settings": json.dumps({"unit": "J" * 100_000, "time_zone": "../../etc/passwd"})}
    yield "kind-path", {"kind": "../fuel"}
    yield "kind-control", {"kind": "\u202efuel\u200b"}
    yield "kind-long", {"kind": "k" * 100_000}
    yield "profile-path", {"profile": "../../../etc/passwd"}


def rows() -> Iterator[tuple[str, list[tuple[str, str]]]]:
    """Records whose rows are not those of a record."""
    good = list(record_texts().items())
    yield "doubled", good + good
    yield "one-row", good[:1]
    yield "reversed", good[::-1]
    yield "pieces", [(f"{key}/{n}", text[n : n + 1]) for key, text in good for n in range(min(len(text), 500))]
    yield "many", good + [(f"more{n}", "x") for n in range(40_000)]
    yield "no-hash", good[:-1]
    yield "empty-keys", [("", "")] * 1000


def attacks() -> Iterator[Attack]:
    """All of them."""
    for group in (sizes, entries, texts):
        for name, changes in group():
            yield f"record-{name}.xlsx".replace("/", "-"), later(with_record(changes)), ""
    for name, written in rows():
        yield f"record-rows-{name}.xlsx", later(with_record_rows(written)), ""
