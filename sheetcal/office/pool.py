"""The pool: jobs in, answers out; how many LibreOffices run, who takes which job, who is given a second try."""

from __future__ import annotations

import atexit
import os
import threading
import weakref
from collections import OrderedDict, deque
from collections.abc import Callable
from concurrent.futures import Future
from dataclasses import dataclass, field
from pathlib import Path
from types import TracebackType

from sheetcal.errors import SheetcalError
from sheetcal.office import userfolder
from sheetcal.office.failures import (
    OfficeFailed,
    OfficeMissing,
    OfficeUnreadable,
    disk_is_full,
    find_place,
    start_failure,
)
from sheetcal.office.jobs import Answer, Convert, Job, Push, answer_of, job_document, subject
from sheetcal.office.link import Limits, Link, Lost

ATTEMPTS = 2  # of one job
STARTS = 3  # of a LibreOffice for one job
REMEMBERED = 32  # templates, a few hundred kilobytes each
GIVE_UP = 6  # starts that failed in a row, on all seats


@dataclass(eq=False)
class _Task:
    """A job waiting or in hand."""

    job: Job
    future: Future[Answer] = field(default_factory=Future)

    @property
    def key(self) -> str | None:
        return self.job.template.key if isinstance(self.job, Push) else None


class Pool:
    """Several LibreOffices that share one queue. Starts each when there is work for it; safe from several threads."""

    def __init__(self, size: int | None = None, limits: Limits = Limits()) -> None:  # noqa: B008 - it is frozen
        self.place = find_place()
        self.size = size or default_size(limits)
        self.limits = limits
        self._owner = os.getpid()
        self._queue: deque[_Task] = deque()
        self._change = threading.Condition()
        self._seats: list[_Seat] = []
        self._idle = 0
        self._closed = False
        self._bytes: OrderedDict[str, bytes] = OrderedDict()
        self._making = threading.Lock()
        self.failed_starts = 0
        userfolder.sweep()
        _POOLS.add(self)

    def submit(self, job: Job) -> Future[Answer]:
        """Put a job in the queue; the future gives its answer or a SheetcalError."""
        task = _Task(job)
        with self._change:
            if self._closed or os.getpid() != self._owner:
                raise OfficeFailed(subject(job), "the pool of LibreOffices is closed", "", "Open another.")
            self._queue.append(task)
            if self._idle < len(self._queue) and len(self._seats) < self.size:
                self._seats.append(_Seat(self))
            self._change.notify_all()
        return task.future

    def run(self, job: Job) -> Answer:
        """The answer. Raises OfficeFailed after two failures, OfficeUnreadable for a file that is no workbook."""
        return self.submit(job).result()

    def close(self) -> None:
        """End every LibreOffice; jobs not answered yet are cancelled."""
        if os.getpid() != self._owner:
            return
        with self._change:
            self._closed = True
            for task in self._queue:
                task.future.cancel()
            self._queue.clear()
            self._change.notify_all()
        for seat in self._seats:
            seat.end()

    def __enter__(self) -> Pool:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def engine_pids(self) -> list[int]:
        """The LibreOffices that run now."""
        return [one.engine for one in self._links() if one.engine]

    def resident(self) -> int:
        """Bytes of memory that all of them hold now."""
        return sum(one.resident() for one in self._links())

    def is_cut_off(self) -> bool:
        """Whether every LibreOffice that runs is without a network."""
        links = self._links()
        return bool(links) and all(one.cut_off for one in links)

    def _links(self) -> list[Link]:
        return [seat.link for seat in list(self._seats) if seat.link is not None]

    def take(self, opened: Callable[[], tuple[str, ...]], seconds: float) -> _Task | None:
        """The next job for a seat, one of its open templates first; None when closed or nothing came in time."""
        with self._change:
            self._idle += 1
            self._change.wait_for(lambda: self._queue or self._closed, seconds)
            self._idle -= 1
            if not self._queue:
                return None
            known = opened()
            best = next((task for task in self._queue if task.key in known), self._queue[0])
            self._queue.remove(best)
            return best

    def template_bytes(self, job: Push) -> bytes:
        """The template's workbook, made once for all seats; an archive of many shapes does not pile them up."""
        key = job.template.key
        with self._making:
            if key not in self._bytes:
                self._bytes[key] = job.template.make()
                while len(self._bytes) > REMEMBERED:
                    self._bytes.popitem(last=False)
            self._bytes.move_to_end(key)
            return self._bytes[key]

    @property
    def is_closed(self) -> bool:
        """Whether `close` was called."""
        return self._closed


class _Seat:
    """One thread, and the LibreOffice it keeps."""

    def __init__(self, pool: Pool) -> None:
        self.pool = pool
        self.link: Link | None = None
        self._lock = threading.Lock()
        self._thread = threading.Thread(target=self._work, name="sheetcal-office", daemon=True)
        self._thread.start()

    def _work(self) -> None:
        while not self.pool.is_closed:
            task = self.pool.take(self._opened, self.pool.limits.idle)
            if task is None:
                self._drop()
            elif task.future.set_running_or_notify_cancel():
                self._answer(task)
        self._drop()

    def _opened(self) -> tuple[str, ...]:
        return self.link.opened if self.link is not None else ()

    def _answer(self, task: _Task) -> None:
        try:
            task.future.set_result(self._attempts(task.job))
        except SheetcalError as error:
            task.future.set_exception(error)
        except BaseException as error:  # whatever it is, somebody waits for it
            self._drop()
            task.future.set_exception(error)

    def _attempts(self, job: Job) -> Answer:
        """Try twice, the second time on a fresh LibreOffice; one found dead before the job began is not counted."""
        failures = 0
        while True:
            link = self._ready()
            try:
                return self._ask(link, job)
            except Lost as lost:
                self._drop()
                failures += not lost.innocent
                if failures == ATTEMPTS or self.pool.is_closed:
                    if disk_is_full():
                        raise start_failure(lost) from lost
                    raise OfficeFailed(subject(job), f"office failed twice ({lost})") from lost

    def _ask(self, link: Link, job: Job) -> Answer:
        template = None
        if isinstance(job, Push) and job.template.key not in link.opened:
            template = self.pool.template_bytes(job)
        link.documents += not isinstance(job, Push) or template is not None
        answer = link.ask(job_document(job, template))
        if "unreadable" in answer:
            raise OfficeUnreadable(subject(job), answer["unreadable"], "a workbook")
        if "unwritable" in answer:
            raise OfficeFailed(
                job.out if isinstance(job, Convert) else "", f"cannot be written ({answer['unwritable']})"
            )
        return answer_of(answer)

    def _ready(self) -> Link:
        """The running LibreOffice, or a fresh one where there is none or it is worn. Raises OfficeMissing."""
        if self.link is not None and self.link.is_worn():
            self._drop()
        if self.link is not None:
            return self.link
        for attempt in range(1, STARTS + 1):
            try:
                return self._start()
            except (Lost, OSError) as error:
                self._drop()
                self.pool.failed_starts += 1
                if attempt == STARTS or self.pool.failed_starts >= GIVE_UP:
                    raise start_failure(error) from error
        raise AssertionError("a start succeeds or fails")

    def _start(self) -> Link:
        with self._lock:
            if self.pool.is_closed:
                raise OfficeFailed("LibreOffice", "the pool is closed")
            self.link = link = Link(self.pool.place, self.pool.limits)
        link.await_ready()
        self.pool.failed_starts = 0
        return link

    def _drop(self) -> None:
        with self._lock:
            link, self.link = self.link, None
            if link is not None:
                link.kill()

    def end(self) -> None:
        """Kill what runs, so that the thread comes back from whatever it waits for."""
        self._drop()
        self._thread.join(5)


def default_size(limits: Limits) -> int:
    """One LibreOffice a core, as far as half the free memory carries them."""
    cores = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
    return max(1, min(cores, _free_memory() // 2 // limits.memory))


def _free_memory() -> int:
    """Bytes; a generous guess where the system does not say."""
    try:
        lines = Path("/proc/meminfo").read_text("ascii").splitlines()
        return next(int(line.split()[1]) * 1024 for line in lines if line.startswith("MemAvailable"))
    except (OSError, StopIteration):
        return 4 << 30


_POOLS: weakref.WeakSet[Pool] = weakref.WeakSet()


def _close_all() -> None:
    for pool in list(_POOLS):
        pool.close()


atexit.register(_close_all)
__all__ = ["Limits", "OfficeFailed", "OfficeMissing", "OfficeUnreadable", "Pool", "SheetcalError"]
