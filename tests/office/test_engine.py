"""LibreOffice recalculates what it is given, and every number comes back as it is."""

from __future__ import annotations

import random
import time
from pathlib import Path

import pytest
from office_books import SPANS, push_sums, saved, shown, sums, truth, with_stored_values, write_sums
from openpyxl import Workbook, load_workbook
from openpyxl.styles import Protection

from sheetcal.office.jobs import Block, Convert, Done, Open, Push, Template, Values
from sheetcal.office.pool import Limits, OfficeUnreadable, Pool

ODD = ("plain.xlsx", "two words.xlsx", "50%41 #1?.xlsx", "Größe ü.xlsx", "it's (1) & more;.xlsx", "-dash.xlsx")


def grid(answer: object, span: int = 0) -> tuple[tuple[float | str | None, ...], ...]:
    """The rows of one span."""
    assert isinstance(answer, Values)
    return answer.blocks[span].rows


def test_stored_values_are_never_believed(pool: Pool, tmp_path: Path) -> None:
    """A file whose stored values are all 999 shows the values of its formulas."""
    path = tmp_path / "stale.xlsx"
    path.write_bytes(with_stored_values(saved(sums(2.5)), "999"))
    stored = load_workbook(path, data_only=True)["Out"]["A1"].value
    assert stored == 999
    assert shown(pool.run(Open(str(path), SPANS))) == truth(2.5)


def test_a_filled_template_and_the_opened_file_show_the_same(pool: Pool, tmp_path: Path) -> None:
    """Both ways in give the truth, for numbers of all sizes."""
    numbers = [round(random.Random(5).uniform(-1, 1) * 10**power, 7) for power in range(7)]
    for number in numbers:
        assert shown(pool.run(push_sums(number))) == truth(number)
        assert shown(pool.run(write_sums(tmp_path / "one.xlsx", number))) == truth(number)
    assert len(numbers) == 7


def test_numbers_travel_at_full_precision(pool: Pool) -> None:
    """1000 numbers with 17 digits come back bit by bit."""
    chance = random.Random(7)
    rows = tuple(
        tuple(chance.uniform(-1, 1) * 10.0 ** chance.randint(-300, 300) for _ in range(10)) for _ in range(100)
    )
    answer = pool.run(Push(push_sums(0).template, (Block("In", "A5", rows),), (("In", "A5:J104"),)))
    assert grid(answer) == rows


def test_errors_are_texts(pool: Pool, tmp_path: Path) -> None:
    """Each error has the name a spreadsheet shows."""
    book = Workbook()
    book.active.title = "Out"
    book.active.append(
        ["=1/0", "=NA()", '=1+"a"', '=INDIRECT("no")', "=NOSUCHTHING(1)", "=10^400", "=SQRT(-1)",
         '=""', "=1=1", "=DATE(2024,5,1)"]
    )  # fmt: skip
    (tmp_path / "errors.xlsx").write_bytes(saved(book))
    shown_now = shown(pool.run(Open(str(tmp_path / "errors.xlsx"), (("Out", "A1:J1"),))))
    assert shown_now[:7] == ("#DIV/0!", "#N/A", "#VALUE!", "#REF!", "#NAME?", "#NUM!", "#ERR:502")
    assert shown_now[7:] == (None, 1.0, 45413.0)


def test_a_push_leaves_nothing_for_the_next(pool: Pool) -> None:
    """What one job wrote and the next does not is again as the template had it; None empties a cell."""
    template = push_sums(0).template
    pool.run(Push(template, (Block("In", "A1", ((1.0, 2.0, "own"),)), Block("In", "E9", (("left",),))), SPANS))
    assert shown(pool.run(Push(template, (), (("In", "A1:C1"),)))) == (0.0, 0.1, "text")
    assert grid(pool.run(Push(template, (), (("In", "E9:E9"),))))[0] in ((), (None,))
    cleared = pool.run(Push(template, (Block("In", "A1", ((None, None, None),)),), SPANS))
    assert shown(cleared) == (0.0, 0.0, "!", "#DIV/0!")


def test_texts_stay_texts(pool: Pool) -> None:
    """A text that looks like a formula, a number or a date is no such thing; half a character pair does no harm."""
    texts = ("=1+1", "5", "1/2", "TRUE", "'quoted", "dé·→😀", " ", "half \ud800")
    answer = pool.run(Push(push_sums(0).template, (Block("In", "A7", (texts,)),), (("In", "A7:H7"),)))
    assert shown(answer) == (*texts[:-1], "half ?")


def test_locked_cells_of_a_protected_template_are_filled(pool: Pool) -> None:
    """The template is ours: its protection guards people's typing, not the engine's."""
    book = sums(0.0)
    for sheet in book:
        sheet.protection.enable()
    book["In"]["A1"].protection = Protection(locked=True)
    template = Template("locked", lambda: saved(book))
    assert shown(pool.run(Push(template, (Block("In", "A1", ((4.0,),)),), SPANS))) == truth(4.0)


def test_what_is_read_is_no_more_than_what_was_asked_and_is_there(pool: Pool, tmp_path: Path) -> None:
    """A lone cell in the last corner costs nothing; a tab that is not there has no rows."""
    book = sums(1.0)
    book["Out"]["XFD1048576"] = 7
    (tmp_path / "far.xlsx").write_bytes(saved(book))
    started = time.monotonic()
    answer = pool.run(Open(str(tmp_path / "far.xlsx"), (("Out", "B1:C1"), ("Gone", "A1:B2"), ("In", "A1:ZZ5000"))))
    assert time.monotonic() - started < 15
    assert grid(answer, 0) == ((1 / 3, "text!"),)
    assert grid(answer, 1) == ()
    assert grid(answer, 2) == ((1.0, 0.1, "text"),)


@pytest.mark.parametrize("name", ODD)
def test_odd_file_names_are_opened(pool: Pool, tmp_path: Path, name: str) -> None:
    """No name is read as an address or an option, and nothing is left beside the file."""
    assert shown(pool.run(write_sums(tmp_path / name, 3.0))) == truth(3.0)
    assert [one.name for one in tmp_path.iterdir()] == [name]


def test_a_template_is_made_once_however_many_take_turns() -> None:
    """Six templates through a LibreOffice that keeps two open: right answers, each made once."""
    made = []

    def template(key: str) -> Template:
        return Template(key, lambda: made.append(key) or saved(sums(0.0)))  # type: ignore[func-returns-value]

    with Pool(1, Limits(templates=2)) as pool:
        for turn in range(3):
            for key in "abcdef":
                number = turn + ord(key)
                job = Push(template(key), (Block("In", "A1", ((number,),)),), SPANS)
                assert shown(pool.run(job)) == truth(number)
    assert sorted(made) == list("abcdef")


@pytest.mark.parametrize("form", ["xlsx", "ods"])
def test_conversion_recalculates_and_both_forms_open(pool: Pool, tmp_path: Path, form: str) -> None:
    """A stale file is stored with the true values, and the format is told by the content, not by the name."""
    (tmp_path / "stale.xlsx").write_bytes(with_stored_values(saved(sums(2.5)), "999"))
    out = tmp_path / f"new.{form}"
    assert pool.run(Convert(str(tmp_path / "stale.xlsx"), str(out), form)) == Done()
    lying = out.rename(tmp_path / "lying.xls")
    assert shown(pool.run(Open(str(lying), SPANS))) == pytest.approx(truth(2.5)[:2] + truth(2.5)[2:], abs=1e-12)
    assert sorted(one.name for one in tmp_path.iterdir()) == ["lying.xls", "stale.xlsx"]


def test_a_stored_file_keeps_frozen_panes_and_zoom(pool: Pool, tmp_path: Path) -> None:
    """Through .ods and back the view is still there: the document had one."""
    book = sums(1.0)
    book["Out"].freeze_panes = "B2"
    book["Out"].sheet_view.zoomScale = 70
    (tmp_path / "a.xlsx").write_bytes(saved(book))
    pool.run(Convert(str(tmp_path / "a.xlsx"), str(tmp_path / "b.ods"), "ods"))
    pool.run(Convert(str(tmp_path / "b.ods"), str(tmp_path / "c.xlsx"), "xlsx"))
    back = load_workbook(tmp_path / "c.xlsx")["Out"]
    assert back.freeze_panes == "B2"
    assert back.sheet_view.zoomScale == 70


@pytest.mark.parametrize(
    ("name", "content"),
    [
        ("empty.xlsx", b""),
        ("text.xlsx", b"a;b;c\n1;2;3\n"),
        ("page.ods", b"<html><table><tr><td>1</td></tr></table></html>"),
        ("cut.xlsx", saved(sums(1.0))[:2000]),
        ("ole.xls", b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + b"\0" * 4096),
    ],
)
def test_what_is_no_workbook_is_said_to_be_none(pool: Pool, tmp_path: Path, name: str, content: bytes) -> None:
    """One line that names the file; LibreOffice goes on."""
    (tmp_path / name).write_bytes(content)
    with pytest.raises(OfficeUnreadable, match=name) as caught:
        pool.run(Open(str(tmp_path / name), SPANS))
    assert "\n" not in str(caught.value)
    assert shown(pool.run(push_sums(1.0))) == truth(1.0)


def test_a_missing_file_is_named(pool: Pool, tmp_path: Path) -> None:
    """The reason is the system's own."""
    with pytest.raises(OfficeUnreadable, match=r"gone\.xlsx: No such file or directory"):
        pool.run(Open(str(tmp_path / "gone.xlsx"), SPANS))
