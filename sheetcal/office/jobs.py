"""What is asked of LibreOffice and what it answers, and how both travel as lines of JSON.

Read by the client and by the worker, which may be an older Python: 3.9 syntax, standard library only.
"""

from __future__ import annotations

import base64
import os
from collections.abc import Callable
from dataclasses import asdict, dataclass
from typing import Any, Union

# None is blank, an error its text ("#DIV/0!"), a date its serial number, TRUE 1.0. Union, as Python 3.9 evaluates this.
Content = Union[float, str, None]  # noqa: UP007
Span = tuple[str, str]  # tab, "A1:BZ400"
Sizes = tuple[str, tuple[int, ...], tuple[tuple[int, int], ...]]  # tab, widths of columns, heights by row number


@dataclass(frozen=True)
class Block:
    """Contents of cells side by side: the tab, the cell at the top left, the rows.

    In an answer blank rows and columns at the end may be left out; a tab that is not there has no rows.
    """

    tab: str
    cell: str
    rows: tuple[tuple[Content, ...], ...]


@dataclass(frozen=True)
class Template:
    """A trusted workbook that is kept open: `make` gives its .xlsx bytes, once per pool and key."""

    key: str
    make: Callable[[], bytes]


@dataclass(frozen=True)
class Push:
    """Fill a template, recalculate everything, read."""

    template: Template
    writes: tuple[Block, ...]
    reads: tuple[Span, ...]


@dataclass(frozen=True)
class Open:
    """Open a file that nobody vouches for, recalculate everything, read."""

    path: str
    reads: tuple[Span, ...]


@dataclass(frozen=True)
class Header:
    """What stands at the head and foot of every printed page, and what is printed.

    `center` is followed by the name of the tab. `foot` stands left of the middle at the foot, `note` in its middle.
    `sign`: the three who sign on the first tab, or nobody. `areas`: what to print of each tab ("" all that is
    filled), shown even where the file hides it; other visible tabs are printed whole. `sizes`: the least width of
    each column from A, and the least height of rows by number, in hundredths of a millimetre.
    """

    left: str
    right: str
    center: str = ""
    foot: str = ""
    note: str = ""
    sign: tuple[str, ...] = ()
    areas: tuple[Span, ...] = ()
    sizes: tuple[Sizes, ...] = ()


@dataclass(frozen=True)
class Convert:
    """Open, recalculate everything, store as `form`: "xlsx", "ods" or "pdf" (there with a header)."""

    path: str
    out: str
    form: str
    header: Header | None = None


Job = Union[Push, Open, Convert]  # noqa: UP007


@dataclass(frozen=True)
class Values:
    """The ranges that were asked for, in that order."""

    blocks: tuple[Block, ...]


@dataclass(frozen=True)
class Done:
    """A file was written."""


Answer = Union[Values, Done]  # noqa: UP007


def subject(job: Job) -> str:
    """What a message about this job is about: the file, or the template."""
    return job.template.key if isinstance(job, Push) else job.path


def job_document(job: Job, template: bytes | None = None) -> dict[str, Any]:
    """A job as JSON takes it; the bytes of its template go along when the worker has not got it open."""
    if isinstance(job, Push):
        document = {"do": "push", "key": job.template.key, "writes": _blocks(job.writes), "reads": job.reads}
        return document if template is None else {**document, "template": base64.b64encode(template).decode("ascii")}
    if isinstance(job, Open):
        return {"do": "open", "path": os.path.abspath(job.path), "reads": job.reads}
    header = None if job.header is None else asdict(job.header)
    path, out = os.path.abspath(job.path), os.path.abspath(job.out)
    return {"do": "convert", "path": path, "out": out, "form": job.form, "header": header}


def job_of(document: dict[str, Any]) -> Job:
    """The job a line of JSON means."""
    do = document["do"]
    if do == "convert":
        header = None if document["header"] is None else _header(document["header"])
        return Convert(document["path"], document["out"], document["form"], header)
    reads = tuple((tab, area) for tab, area in document["reads"])
    if do == "open":
        return Open(document["path"], reads)
    return Push(Template(document["key"], _carried(document.get("template"))), blocks_of(document["writes"]), reads)


def _header(document: dict[str, Any]) -> Header:
    texts = {name: document[name] for name in ("left", "right", "center", "foot", "note")}
    areas = tuple((tab, area) for tab, area in document["areas"])
    sizes = tuple((tab, tuple(widths), tuple(map(tuple, heights))) for tab, widths, heights in document["sizes"])
    return Header(sign=tuple(document["sign"]), areas=areas, sizes=sizes, **texts)


def _carried(text: str | None) -> Callable[[], bytes]:
    return lambda: base64.b64decode(text or "")


def answer_document(answer: Answer) -> dict[str, Any]:
    """An answer as JSON takes it."""
    return {"blocks": _blocks(answer.blocks)} if isinstance(answer, Values) else {"done": True}


def answer_of(document: dict[str, Any]) -> Answer:
    """The answer a line of JSON means."""
    return Values(blocks_of(document["blocks"])) if "blocks" in document else Done()


def _blocks(blocks: tuple[Block, ...]) -> list[Any]:
    return [[one.tab, one.cell, one.rows] for one in blocks]


def blocks_of(documents: Any) -> tuple[Block, ...]:
    """Blocks from their JSON."""
    return tuple(Block(tab, cell, tuple(map(tuple, rows))) for tab, cell, rows in documents)
