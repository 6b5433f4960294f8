"""One open document and what is going on with it: the four commands, a check that runs, its answer."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Iterator
from contextlib import AbstractContextManager, contextmanager, nullcontext
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import Any

from sheetcal.office.addin.inside import bar, listing, marks, outline, protection, reading
from sheetcal.office.addin.inside.asking import Check, Unanswered, checker
from sheetcal.office.addin.inside.slices import Later, Slices
from sheetcal.office.addin.inside.snapshot import workbook
from sheetcal.office.addin.inside.telling import Told, tell
from sheetcal.office.addin.inside.words import Words

INSTALL = ("no place", "not found")
LAST = 1.0  # seconds
TRIES = 3
COMMANDS = ("check", "remove", "next", "list")


@dataclass(frozen=True)
class Hands:
    """What only LibreOffice can do for a session.

    later: bring a call back to the main thread. button: of the bar, from label and command. accept: take what is just
    being typed into a cell, as the enter key does. go: put the cursor on a cell of the tab shown, without selecting it.
    """

    later: Later
    button: Callable[[str, str], Any]
    accept: Callable[[], None]
    go: Callable[[str], None]


class Session:
    """A document with its check; `root` is the folder of the extension."""

    def __init__(self, document: Any, words: Words, root: Path, hands: Hands) -> None:
        self.document, self._words, self._root, self._hands = document, words, root, hands
        self._check: Check | None = None
        self._thread: threading.Thread | None = None
        self._work: Slices | None = None
        self._told: Told | None = None
        self._remarks: list[str] = []
        self._place = ("", "")
        self._at_work = False
        self._changed = False  # by somebody else than us, since the copy was taken
        self._untouched = False  # as saved before our marks came, and nobody changed it since
        self._home = ""
        self.closed = False

    def run(self, command: str) -> None:
        """Do one of COMMANDS."""
        {"check": self.check, "remove": self.remove, "next": self.next, "list": self.show_list}[command]()

    def modified(self) -> None:
        """Somebody changed the document; our own changes do not count."""
        if not self._at_work:
            self._changed, self._untouched = True, False

    def close(self) -> None:
        """The document goes away: end what runs for it."""
        self.closed = True
        for one in (self._check, self._work):
            if one is not None:
                one.stop()
        if self._thread is not None:
            self._thread.join(LAST)  # until it has removed its files; LibreOffice itself may be ending

    # check

    def check(self) -> None:
        """Copy the cells and let the checker judge them in the background."""
        if self._check is not None or self._work is not None:
            self._say("already")
            return
        self._hands.accept()
        try:
            self._check = Check(checker(self._root))
        except Unanswered as error:
            self._unanswered(error)
            return
        self._say("checking")
        copy = reading.Copy()
        self._slices(self._copying(copy), nullcontext, partial(self._copied, copy))

    def _copying(self, copy: reading.Copy) -> Iterator[None]:
        """Take the copy; when somebody changes the document meanwhile, anew."""
        name = listing.find(self.document)
        for _ in range(TRIES):
            self._changed = False
            yield from reading.take(self.document, copy, (name,) if name else ())
            yield from outline.look(self.document, copy)
            if not self._changed:
                return

    def _copied(self, copy: reading.Copy) -> None:
        if self._check is not None:
            self._in_background(partial(self._ask, self._check, copy, time.strftime("%H:%M")))

    def _in_background(self, work: Callable[[], None]) -> None:
        self._thread = threading.Thread(target=work, daemon=True)
        self._thread.start()

    def _ask(self, check: Check, copy: reading.Copy, clock: str) -> None:
        """In a thread of its own: no call into the document from here."""
        try:
            told: Told | Unanswered = tell(check.answer(workbook(copy)), self._words, clock)
        except Unanswered as error:
            told = error
        except Exception as error:  # whatever it was, the user is told
            told = Unanswered("failed", f"{type(error).__name__}: {error}")
        if not self.closed:
            self._hands.later(lambda: self._arrived(told))

    def _arrived(self, told: Told | Unanswered) -> None:
        self._check = None
        if self.closed:
            return
        if isinstance(told, Unanswered):
            self._unanswered(told)
            return
        self._told, self._remarks, self._place = told, [], ("", "")
        if told.verdict == "unreadable":
            self._verdict(told)
        else:
            self._mark(told)

    def _unanswered(self, error: Unanswered) -> None:
        if error.why == "stopped":
            return
        advice = "install" if error.why in INSTALL else "again"
        first = self._words.say(error.why, detail=error.detail)
        bar.show(self._controller, first, self._words.say(advice), bar.WARNING)

    def _broken(self, error: Exception) -> None:
        """Something in LibreOffice did not go as it should."""
        large = isinstance(error, reading.TooLarge)
        self._unanswered(Unanswered("too large" if large else "failed", f"{type(error).__name__}: {error}"))

    def _verdict(self, told: Told) -> None:
        """The bar: the sentence first, then what else must be known."""
        changed = [self._words.say("changed")] if self._changed else []
        second = "" if told.verdict == "unreadable" else " ".join([told.stand, *changed, *self._remarks])
        bar.show(self._controller, told.sentence, second, self._sort(told), self._buttons())

    def _sort(self, told: Told) -> int:
        return bar.SORTS.get(told.verdict, bar.INFO)

    def _buttons(self) -> tuple[Any, ...]:
        if self._told is None or not self._told.lines or self._work is not None:
            return ()
        commands = ("list", "next", "remove") if listing.find(self.document) else ("next",)
        return tuple(self._hands.button(self._words.say(one), bar.COMMANDS + one) for one in commands)

    # marks

    def _mark(self, told: Told) -> None:
        """Put the marks and the list in."""
        had = self._has_marks()
        if self.document.isReadonly():
            self._remarks = [self._words.say("read-only")] if told.lines else []
            self._verdict(told)
        elif not told.lines and not had:
            self._verdict(told)
        else:
            bar.show(self._controller, told.sentence, self._words.say("marking"), self._sort(told))
            saved = not self.document.isModified()
            self._untouched = self._untouched and not saved if had else saved
            self._start("step put", self._marking(told), partial(self._verdict, told))

    def _marking(self, told: Told) -> Iterator[None]:
        """The steps of marking; LibreOffice is asked once, at the first, what a password keeps shut."""
        shut, free = protection.shut(self.document)
        yield from self._taking_off(free)
        if not told.lines:
            return
        self._remarks = self._not_done(shut, free)
        tab = listing.begin(self.document, told, self._words, self._remarks) if free else None
        if tab is not None:
            yield from listing.fill(self.document, tab, told, self._words)
        yield from marks.put(self.document, told.lines, shut, tab, self._words)
        if tab is not None:
            tab.protect("")

    def _not_done(self, shut: tuple[str, ...], free: bool) -> list[str]:
        remarks = [self._words.say("unmarked", tabs=", ".join(shut))] if shut else []
        return remarks if free else [*remarks, self._words.say("no list")]

    def _taking_off(self, free: bool) -> Iterator[None]:
        yield from marks.remove(self.document, listing.tab(self.document))
        if free:
            listing.remove(self.document)

    def _has_marks(self) -> bool:
        return marks.are_there(self.document) or listing.find(self.document) is not None

    def remove(self) -> None:
        """Take every mark away; the document counts as unchanged again if nothing else happened to it."""
        if self._check is not None:
            self._say("already")
            return
        if self._work is not None:
            self._work.stop()
            self._work = None
        if not self._has_marks():
            self._say("no marks")
            return
        if self.document.isReadonly():
            self._say("read-only")
            return
        untouched = self._untouched and self.document.isModified()
        on_list = self._controller.getActiveSheet().Name == listing.find(self.document)
        self._told = None
        self._start("step off", self._removing(), partial(self._removed, untouched, on_list))

    def _removing(self) -> Iterator[None]:
        _, free = protection.shut(self.document)
        yield from self._taking_off(free)

    def _removed(self, untouched: bool, on_list: bool) -> None:
        if on_list and self.document.Sheets.hasByName(self._home):
            self._controller.setActiveSheet(self.document.Sheets.getByName(self._home))
        if untouched and self._untouched:
            with self._working():
                self.document.setModified(False)
        self._say("removed")

    def _start(self, step: str, steps: Iterator[None], then: Callable[[], None]) -> None:
        """Work on the document, as a step that can be undone."""

        @contextmanager
        def around() -> Iterator[None]:
            with self._working(), protection.opened(self.document, self._words.say(step)):
                yield

        self._slices(steps, around, then)

    def _slices(
        self, steps: Iterator[None], around: Callable[[], AbstractContextManager[None]], then: Callable[[], None]
    ) -> None:
        def done(error: Exception | None) -> None:
            self._work = None
            if error is None:
                then()
            else:
                self._check = None
                self._broken(error)

        self._work = Slices(steps, around, self._hands.later, done)
        self._work.run()

    @contextmanager
    def _working(self) -> Iterator[None]:
        self._at_work = True
        try:
            yield
        finally:
            self._at_work = False

    # going to findings

    def next(self) -> None:
        """Select the cell of the next finding and say it in the bar."""
        places = self._places()
        if not places:
            self._say("no findings")
            return
        listed = [(tab, cell) for tab, cell, _ in places]
        number = (listed.index(self._place) + 1) % len(places) if self._place in listed else 0
        tab, cell, what = places[number]
        self._place = (tab, cell)
        self._go(tab, cell)
        where = self._words.say("of", n=number + 1, all=len(places), place=f"{tab} {cell}")
        bar.show(self._controller, where, what, bar.INFO, self._buttons())

    def _places(self) -> list[tuple[str, str, str]]:
        """From the list in the document, or, where none could be written, from what was told."""
        listed = listing.places(self.document)
        if listed or self._told is None:
            return listed
        found: dict[tuple[str, str], str] = {}
        for one in self._told.lines:
            if one.cell and listing.can_be_shown(self.document, one.tab):
                found.setdefault((one.tab, one.cell), one.what)
        return [(tab, cell, what) for (tab, cell), what in found.items()]

    def _go(self, tab: str, cell: str = "") -> None:
        """Go to a tab or cell; where the user was before the list is remembered."""
        active = self._controller.getActiveSheet().Name
        if active != listing.find(self.document):
            self._home = active
        sheet = self.document.Sheets.getByName(tab)
        self._controller.setActiveSheet(sheet)
        if cell:
            self._hands.go(cell.partition(":")[0])

    def show_list(self) -> None:
        """Go to the tab with the list."""
        name = listing.find(self.document)
        if name is None:
            self._say("no findings")
            return
        self._go(name)
        if self._told is not None:
            self._verdict(self._told)

    # saying

    @property
    def _controller(self) -> Any:
        return self.document.getCurrentController()

    def _say(self, key: str) -> None:
        bar.show(self._controller, self._words.say(key))
