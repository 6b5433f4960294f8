"""One open document and what is going on with it: the four commands, a check that runs, its answer."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from sheetcal.office.addin.inside import bar, listing, marks, protection, reading
from sheetcal.office.addin.inside.asking import Check, Unanswered, checker
from sheetcal.office.addin.inside.snapshot import workbook
from sheetcal.office.addin.inside.telling import Told, tell
from sheetcal.office.addin.inside.words import Words

INSTALL = ("no place", "not found")
COMMANDS = ("check", "remove", "next", "list")


class Session:
    """`later` brings a call back to the main thread; `pair` makes a button of the bar from label and command."""

    def __init__(self, document: Any, words: Words, root: Path, later: Callable[[Callable[[], None]], None],
                 pair: Callable[[str, str], Any]) -> None:  # fmt: skip
        self.document, self._words, self._root = document, words, root
        self._later, self._pair = later, pair
        self._check: Check | None = None
        self._told: Told | None = None
        self._remarks: list[str] = []
        self._step = -1
        self._at_work = False
        self._changed = False  # by somebody else than us, since the copy was taken
        self._clean = False  # the document was as saved before our marks came
        self._home: Any = None
        self.closed = False

    def run(self, command: str) -> None:
        """Do one of COMMANDS."""
        {"check": self.check, "remove": self.remove, "next": self.next, "list": self.show_list}[command]()

    def modified(self) -> None:
        """Somebody changed the document; our own changes do not count."""
        self._changed = self._changed or not self._at_work

    def close(self) -> None:
        """The document goes away: end what runs for it."""
        self.closed = True
        if self._check is not None:
            self._check.stop()

    # check

    def check(self) -> None:
        """Copy the cells and let the checker judge them in the background."""
        if self._check is not None:
            self._say("already")
            return
        try:
            where = checker(self._root)
            tab = listing.find(self.document)
            copy = reading.take(self.document, (tab,) if tab else ())
        except Unanswered as error:
            self._unanswered(error)
            return
        except reading.TooLarge:
            self._say("too large")
            return
        self._changed = False
        self._check = Check(where)
        self._say("checking")
        clock = time.strftime("%H:%M")
        threading.Thread(target=self._ask, args=(self._check, copy, clock), daemon=True).start()

    def _ask(self, check: Check, copy: reading.Copy, clock: str) -> None:
        """In a thread of its own: no call into the document from here."""
        try:
            told: Told | Unanswered = tell(check.answer(workbook(copy)), self._words, clock)
        except Unanswered as error:
            told = error
        except Exception as error:  # whatever it was, the user is told
            told = Unanswered("failed", f"{type(error).__name__}: {error}")
        if not self.closed:
            self._later(lambda: self._arrived(told))

    def _arrived(self, told: Told | Unanswered) -> None:
        self._check = None
        if self.closed:
            return
        if isinstance(told, Unanswered):
            self._unanswered(told)
            return
        self._told, self._step = told, -1
        self._remarks = [] if told.verdict == "unreadable" else self._mark(told)
        self._verdict(told)

    def _unanswered(self, error: Unanswered) -> None:
        if error.why == "stopped":
            return
        advice = "install" if error.why in INSTALL else "again"
        first = self._words.say(error.why, detail=error.detail)
        bar.show(self._controller, first, self._words.say(advice), bar.WARNING)

    def _verdict(self, told: Told) -> None:
        """The bar: the sentence first, then what else must be known."""
        changed = [self._words.say("changed")] if self._changed else []
        remarks = [*changed, *self._remarks]
        second = "" if told.verdict == "unreadable" else " ".join([told.stand, *remarks])
        bar.show(self._controller, told.sentence, second, bar.SORTS.get(told.verdict, bar.INFO), self._buttons())

    def _buttons(self) -> tuple[Any, ...]:
        if self._told is None or not self._told.lines:
            return ()
        commands = ["list"] if listing.find(self.document) else []
        return tuple(self._button(one) for one in [*commands, "next", *(["remove"] if commands else [])])

    def _button(self, command: str) -> Any:
        return self._pair(self._words.say(command), bar.COMMANDS + command)

    # marks

    def _mark(self, told: Told) -> list[str]:
        """Put the marks and the list in; what could not be done comes back as remarks."""
        if self.document.isReadonly():
            return [self._words.say("read-only")] if told.lines else []
        had = self._has_marks()
        if not told.lines and not had:
            return []
        saved = not self.document.isModified()
        with self._working(), protection.opened(self.document, self._words.say("step put")) as (shut, free):
            self._take_off(free)
            remarks = self._not_done(shut, free) if told.lines else []
            if told.lines:
                self._put(told, shut, free, remarks)
        self._clean = self._clean and not saved if had else saved
        return remarks

    def _put(self, told: Told, shut: tuple[str, ...], free: bool, remarks: list[str]) -> None:
        tab = listing.write(self.document, told, self._words, remarks) if free else None
        marks.put(self.document, told.lines, shut, tab, self._words)
        if tab is not None:
            tab.protect("")

    def _not_done(self, shut: tuple[str, ...], free: bool) -> list[str]:
        remarks = [self._words.say("unmarked", tabs=", ".join(shut))] if shut else []
        return remarks if free else [*remarks, self._words.say("no list")]

    def _has_marks(self) -> bool:
        return marks.are_there(self.document) or listing.find(self.document) is not None

    def _take_off(self, free: bool) -> None:
        marks.remove(self.document, listing.tab(self.document))
        if free:
            listing.remove(self.document)

    def remove(self) -> None:
        """Take every mark away; the document counts as unchanged again if nothing else happened to it."""
        if not self._has_marks() or self.document.isReadonly():
            self._say("no marks")
            return
        untouched = self._clean and self.document.isModified() and not self._changed
        step = self._words.say("step off")
        with self._working(), self._same_view(), protection.opened(self.document, step) as (_, free):
            self._take_off(free)
            self._told = None
        if untouched:
            with self._working():
                self.document.setModified(False)
        self._say("removed")

    @contextmanager
    def _working(self) -> Iterator[None]:
        self._at_work = True
        try:
            yield
        finally:
            self._at_work = False

    @contextmanager
    def _same_view(self) -> Iterator[None]:
        """Leave the user where they are; from our own tab they come back to where they were."""
        name = listing.find(self.document)
        active = self._controller.getActiveSheet().Name
        yield
        if name == active and self._home and self.document.Sheets.hasByName(self._home):
            self._controller.setActiveSheet(self.document.Sheets.getByName(self._home))

    # going to findings

    def next(self) -> None:
        """Select the cell of the next finding and say it in the bar."""
        places = self._places()
        if not places:
            self._say("no findings")
            return
        self._step = (self._step + 1) % len(places)
        tab, cell, what = places[self._step]
        self._go(tab, cell)
        where = self._words.say("of", n=self._step + 1, all=len(places), place=f"{tab} {cell}")
        bar.show(self._controller, where, what, bar.INFO, self._buttons() or (self._button("next"),))

    def _places(self) -> list[tuple[str, str, str]]:
        """From the list in the document, or, where none could be written, from what was told."""
        listed = listing.places(self.document)
        if listed or self._told is None:
            return listed
        found = {(one.tab, one.cell): one.what for one in reversed(self._told.lines) if one.cell}
        return [(tab, cell, what) for (tab, cell), what in reversed(list(found.items())) if self._is_visible(tab)]

    def _is_visible(self, tab: str) -> bool:
        return bool(self.document.Sheets.hasByName(tab) and self.document.Sheets.getByName(tab).IsVisible)

    def _go(self, tab: str, cell: str) -> None:
        self._leave()
        sheet = self.document.Sheets.getByName(tab)
        self._controller.setActiveSheet(sheet)
        self._controller.select(sheet.getCellRangeByName(cell))

    def _leave(self) -> None:
        """Remember where the user was before the list came."""
        active = self._controller.getActiveSheet().Name
        if active != listing.find(self.document):
            self._home = active

    def show_list(self) -> None:
        """Go to the tab with the list."""
        name = listing.find(self.document)
        if name is None:
            self._say("no findings")
            return
        self._leave()
        self._controller.setActiveSheet(self.document.Sheets.getByName(name))
        if self._told is not None:
            self._verdict(self._told)

    # saying

    @property
    def _controller(self) -> Any:
        return self.document.getCurrentController()

    def _say(self, key: str) -> None:
        bar.show(self._controller, self._words.say(key))
