"""Small workbooks whose true results are known, for the tests of the engine."""

from __future__ import annotations

import io
import os
import re
import zipfile
from collections.abc import Callable
from pathlib import Path

from openpyxl import Workbook

from sheetcal.office.jobs import Answer, Block, Open, Push, Template, Values

PREFIX = "sheetcal-office-"


def sums(number: float) -> Workbook:
    """Three inputs, and formulas over them on another tab."""
    book = Workbook()
    inputs = book.active
    inputs.title = "In"
    inputs.append([number, 0.1, "text"])
    out = book.create_sheet("Out")
    out.append(["=SUM(In!A1:B1)", "=In!A1/3", '=In!C1&"!"', "=1/In!Z1"])
    return book


def truth(number: float) -> tuple[float | str, ...]:
    """What the tab Out must show."""
    return (number + 0.1, number / 3, "text!", "#DIV/0!")


SPANS = (("Out", "A1:D1"),)


def saved(book: Workbook) -> bytes:
    """The bytes of a workbook."""
    target = io.BytesIO()
    book.save(target)
    return target.getvalue()


def write_sums(path: Path, number: float) -> Open:
    """The file, and the job that opens it."""
    path.write_bytes(saved(sums(number)))
    return Open(str(path), SPANS)


def slow_book(path: Path) -> Open:
    """A workbook that LibreOffice calculates for many seconds."""
    book = Workbook()
    book.active.title = "Out"
    for row in range(1, 400):
        book.active.cell(row, 1).value = f"=SUMPRODUCT(SIN(ROW($B$1:$B$300000)+{row}))"
    path.write_bytes(saved(book))
    return Open(str(path), (("Out", "A1:A1"),))


def push_sums(number: float, key: str = "sums") -> Push:
    """The same by way of a template."""
    return Push(Template(key, lambda: saved(sums(0.0))), (Block("In", "A1", ((number,),)),), SPANS)


def shown(answer: Answer) -> tuple[float | str | None, ...]:
    """The first row of the first span."""
    assert isinstance(answer, Values)
    return answer.blocks[0].rows[0]


def rewritten(source: bytes, change: Callable[[str, bytes], bytes]) -> bytes:
    """A package with every part passed through `change(name, content)`."""
    target = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(source)) as old, zipfile.ZipFile(target, "w", zipfile.ZIP_DEFLATED) as new:
        for name in old.namelist():
            new.writestr(name, change(name, old.read(name)))
    return target.getvalue()


def with_stored_values(source: bytes, stored: str) -> bytes:
    """Every formula's stored value replaced, and the program said to be one whose values LibreOffice believes."""

    def change(name: str, content: bytes) -> bytes:
        if name == "docProps/app.xml":
            return re.sub(rb"<Application>.*?</Application>", b"<Application>Microsoft Excel</Application>", content)
        return re.sub(rb"</f><v ?/>|</f><v></v>", b"</f><v>" + stored.encode() + b"</v>", content)

    return rewritten(source, change)


def processes(mark: str) -> list[int]:
    """Living processes whose command line holds `mark`; a dead one not yet collected has none."""
    found = []
    for one in Path("/proc").iterdir():
        try:
            if one.name.isdigit() and mark.encode() in (one / "cmdline").read_bytes() and int(one.name) != os.getpid():
                found.append(int(one.name))
        except OSError:
            continue
    return found


def litter(folder: Path, seen: set[str]) -> list[str]:
    """User folders in the folder for temporary files, and pipes named after one ever `seen` there."""
    folders = {one.name for one in folder.glob(PREFIX + "*")}
    seen |= folders
    pipes = {one.name for one in Path("/tmp").glob(f"OSL_PIPE_*_{PREFIX}*") if one.name.split("_", 3)[3] in seen}
    return sorted(folders | pipes)
