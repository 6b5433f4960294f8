"""Long work on a document in short slices, so that Calc answers the user between them."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Iterator
from contextlib import AbstractContextManager
from typing import Optional

SLICE = 0.1  # seconds of work before Calc gets its turn
PAUSE = 0.03
Later = Callable[[Callable[[], None]], None]


class Slices:
    """Steps of work, done on the main thread a slice at a time; the next slice waits behind what the user does.

    `around` is entered for each slice; `done` is called after the last, or with what went wrong. `stop` leaves the
    rest undone.
    """

    def __init__(
        self, steps: Iterator[None], around: Callable[[], AbstractContextManager[object]], later: Later,
        done: Callable[[Optional[Exception]], None],
    ) -> None:  # fmt: skip
        self._steps, self._around, self._later, self._done = steps, around, later, done
        self._stopped = False

    def run(self) -> None:
        """One slice, and the next one when the main thread is free again."""
        if self._stopped:
            return
        try:
            with self._around():
                ended = self._slice()
        except Exception as error:  # whatever it was, the user is told
            self._done(error)
            return
        if ended:
            self._done(None)
        else:
            self._wait()

    def _slice(self) -> bool:
        until = time.monotonic() + SLICE
        return all(time.monotonic() <= until for _ in self._steps)

    def _wait(self) -> None:
        """LibreOffice serves its own queue before the keyboard: without a pause the user would have to wait."""
        timer = threading.Timer(PAUSE, self._later, (self.run,))
        timer.daemon = True
        timer.start()

    def stop(self) -> None:
        """Do no further slice."""
        self._stopped = True
