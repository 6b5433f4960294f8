"""However LibreOffice, worker or client ends: answers are true or said to be missing, and nothing is left behind."""

from __future__ import annotations

import os
import random
import signal
import subprocess
import sys
import tempfile
import threading
import time
from collections.abc import Callable, Iterator
from concurrent.futures import Future
from itertools import islice
from pathlib import Path
from typing import Any

import pytest
from office_books import PREFIX, litter, processes, push_sums, shown, slow_book, sums, truth, write_sums

from sheetcal.office import userfolder
from sheetcal.office.failures import find_place
from sheetcal.office.jobs import Answer, Convert
from sheetcal.office.pool import Limits, OfficeFailed, Pool, default_size

HERE = Path(__file__).parent
SOON = 8.0  # seconds for the processes of a killed client to be gone, on a busy machine


class Temporary:
    """A folder for temporary files of one test alone, and what of LibreOffice is there or runs from it."""

    def __init__(self, path: Path) -> None:
        self.path = path
        self.seen: set[str] = set()

    def litter(self) -> list[str]:
        """User folders, and their pipes."""
        return litter(self.path, self.seen)

    def processes(self) -> list[int]:
        """Workers and LibreOffices."""
        return processes(str(self.path))


@pytest.fixture
def temporary(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Temporary]:
    """At the end of the test nothing of LibreOffice may be left."""
    folder = Temporary(tmp_path / "temporary")
    folder.path.mkdir()
    monkeypatch.setattr(tempfile, "tempdir", str(folder.path))
    monkeypatch.setenv("TMPDIR", str(folder.path))
    made = userfolder.make

    def make(program: Path) -> tuple[Path, int]:
        path, held = made(program)
        folder.seen.add(path.name)
        return path, held

    monkeypatch.setattr(userfolder, "make", make)
    yield folder
    assert eventually(lambda: not folder.litter()), folder.litter()
    assert eventually(lambda: not folder.processes())


def eventually(true: Callable[[], bool], seconds: float = SOON) -> bool:
    """Whether it becomes true in time."""
    end = time.monotonic() + seconds
    while not true() and time.monotonic() < end:
        time.sleep(0.05)
    return true()


def worker_of(engine: int) -> int:
    """The parent of a LibreOffice."""
    return int(Path(f"/proc/{engine}/stat").read_text("ascii").rpartition(")")[2].split()[1])


def test_killed_while_idle(temporary: Temporary) -> None:
    """A LibreOffice that died between two jobs costs the next job nothing, however often."""
    with Pool(1) as pool:
        for number in range(4):
            assert shown(pool.run(push_sums(number))) == truth(number)
            os.kill(pool.engine_pids()[0], signal.SIGKILL)
            time.sleep(0.1)


def test_killed_once_during_a_job(temporary: Temporary, tmp_path: Path) -> None:
    """The job is done again on a fresh one."""
    with Pool(1) as pool:
        pool.run(push_sums(1.0))
        engine = pool.engine_pids()[0]
        os.kill(engine, signal.SIGSTOP)
        future = pool.submit(write_sums(tmp_path / "a.xlsx", 2.0))
        time.sleep(0.2)
        os.kill(engine, signal.SIGKILL)
        assert shown(future.result(30)) == truth(2.0)
        assert pool.engine_pids() != [engine]


@pytest.mark.parametrize("number", [signal.SIGSEGV, signal.SIGABRT, signal.SIGTERM], ids=["SEGV", "ABRT", "TERM"])
def test_crashed(temporary: Temporary, tmp_path: Path, number: signal.Signals) -> None:
    """Between two jobs and during one: a crash is noticed at once, whatever LibreOffice does about it."""
    with Pool(1) as pool:
        pool.run(push_sums(1.0))
        os.kill(pool.engine_pids()[0], number)
        assert shown(pool.run(push_sums(2.0))) == truth(2.0)
        first = pool.engine_pids()
        future = pool.submit(slow_book(tmp_path / "slow.xlsx"))
        time.sleep(0.5)
        os.kill(first[0], number)
        assert eventually(lambda: pool.engine_pids() not in ([], first), 20)
        assert not future.done()


def test_killed_twice_during_a_job(temporary: Temporary, tmp_path: Path) -> None:
    """That job fails, and says so; the one behind it is answered."""
    with Pool(1) as pool:
        failing, behind = pool.submit(slow_book(tmp_path / "slow.xlsx")), pool.submit(push_sums(5.0))
        killed: set[int] = set()
        while len(killed) < 2:
            assert eventually(lambda: bool(set(pool.engine_pids()) - killed), 20)
            engine = (set(pool.engine_pids()) - killed).pop()
            time.sleep(0.3)
            os.kill(engine, signal.SIGKILL)
            killed.add(engine)
        with pytest.raises(
            OfficeFailed, match=r"slow\.xlsx: office failed twice \(LibreOffice was killed by signal 9\)"
        ):
            failing.result(30)
        assert shown(behind.result(30)) == truth(5.0)


def test_hung_once(temporary: Temporary) -> None:
    """A LibreOffice that answers nothing is given up after the time limit, and the job done on a fresh one."""
    with Pool(1, Limits(job=2.0)) as pool:
        pool.run(push_sums(1.0))
        os.kill(pool.engine_pids()[0], signal.SIGSTOP)
        started = time.monotonic()
        assert shown(pool.run(push_sums(2.0))) == truth(2.0)
        assert 2.0 <= time.monotonic() - started < 10


def test_a_stopped_worker_is_a_hung_one(temporary: Temporary) -> None:
    """The same when it is the worker that does not answer."""
    with Pool(1, Limits(job=2.0)) as pool:
        pool.run(push_sums(1.0))
        os.kill(worker_of(pool.engine_pids()[0]), signal.SIGSTOP)
        assert shown(pool.run(push_sums(2.0))) == truth(2.0)


def test_a_file_that_never_ends(temporary: Temporary, tmp_path: Path) -> None:
    """It is given up twice, named with its reason, and does not hold up the others."""
    with Pool(1, Limits(job=1.5)) as pool:
        with pytest.raises(OfficeFailed, match=r"slow\.xlsx: office failed twice \(.*time limit") as caught:
            pool.run(slow_book(tmp_path / "slow.xlsx"))
        assert "\n" not in str(caught.value)
        assert shown(pool.run(push_sums(3.0))) == truth(3.0)


def test_killed_worker(temporary: Temporary) -> None:
    """Its LibreOffice goes with it, and the next job is answered by another."""
    with Pool(1) as pool:
        pool.run(push_sums(1.0))
        engine = pool.engine_pids()[0]
        os.kill(worker_of(engine), signal.SIGKILL)
        assert eventually(lambda: not temporary.processes())
        assert shown(pool.run(push_sums(2.0))) == truth(2.0)


def test_a_worker_told_to_end_leaves_nothing(temporary: Temporary) -> None:
    """SIGTERM to the worker, even while LibreOffice hangs: no process, no folder, without any help of the client."""
    with Pool(1) as pool:
        pool.run(push_sums(1.0))
        engine = pool.engine_pids()[0]
        os.kill(engine, signal.SIGSTOP)
        os.kill(worker_of(engine), signal.SIGTERM)
        assert eventually(lambda: not temporary.processes() and not temporary.litter())


@pytest.fixture
def client(temporary: Temporary) -> Iterator[Callable[[str], subprocess.Popen[str]]]:
    """Start a client that has its LibreOffice running."""
    started: list[subprocess.Popen[str]] = []

    def start(how: str) -> subprocess.Popen[str]:
        environment = {**os.environ, "PYTHONPATH": f"{HERE}:{HERE.parent.parent}"}
        command = [sys.executable, str(HERE / "client.py"), how]
        one = subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=environment)
        started.append(one)
        assert one.stdout is not None
        assert one.stdout.readline() == "ready\n"
        return one

    yield start
    for one in started:
        one.kill()
        one.communicate()


@pytest.mark.parametrize("number", [signal.SIGKILL, signal.SIGTERM, signal.SIGINT], ids=["KILL", "TERM", "INT"])
def test_killed_client(temporary: Temporary, client: Callable[[str], Any], number: signal.Signals) -> None:
    """No LibreOffice, no worker, no folder a moment later."""
    one = client("wait")
    assert temporary.litter()
    assert temporary.processes()
    one.send_signal(number)
    started = time.monotonic()
    assert eventually(lambda: not temporary.processes() and not temporary.litter())
    print(f"all gone {time.monotonic() - started:.2f} s after {number.name}")


@pytest.mark.parametrize("how", ["return", "raise"])
def test_a_client_that_ends_without_closing(temporary: Temporary, client: Callable[[str], Any], how: str) -> None:
    """At its end, by an exception or not, everything is gone."""
    client(how).wait(20)
    assert not temporary.litter()
    assert not temporary.processes()


def test_client_and_worker_killed_at_once(temporary: Temporary, client: Callable[[str], Any]) -> None:
    """LibreOffice dies with them; the folder nobody could remove is swept at the next start, a held one is not."""
    with Pool(1) as held:
        held.run(push_sums(1.0))
        before = temporary.litter()
        one = client("wait")
        others = [each for each in temporary.processes() if "worker.py" in command_line(each)]
        workers = [each for each in others if each != worker_of(held.engine_pids()[0])]
        os.kill(one.pid, signal.SIGSTOP)
        for each in workers:
            os.kill(each, signal.SIGKILL)
        one.kill()
        assert eventually(lambda: len(temporary.processes()) == 2)
        assert len(temporary.litter()) > len(before)
        with Pool(1):
            assert temporary.litter() == before
        assert shown(held.run(push_sums(2.0))) == truth(2.0)


def command_line(process: int) -> str:
    """What a process was called with; nothing when it is gone."""
    try:
        return Path(f"/proc/{process}/cmdline").read_text("utf-8")
    except OSError:
        return ""


def test_sweeping_leaves_alone_what_is_not_litter(temporary: Temporary) -> None:
    """A folder held by a living process, and one just being made, stay; an old one without a lock goes."""
    kept, held = userfolder.make(find_place().program)
    young, old = temporary.path / f"{PREFIX}young", temporary.path / f"{PREFIX}old"
    young.mkdir()
    old.mkdir()
    os.utime(old, (0, 0))
    userfolder.sweep()
    assert sorted(temporary.path.iterdir()) == sorted([kept, young])
    os.close(held)
    userfolder.sweep()
    assert list(temporary.path.iterdir()) == [young]
    young.rmdir()


def test_idle_and_worn_ones_give_way(temporary: Temporary, tmp_path: Path) -> None:
    """An idle LibreOffice ends by itself, one that has opened its share of files is replaced; nobody waits for it."""
    with Pool(1, Limits(idle=0.5, documents=3)) as pool:
        seen = set()
        for number in range(7):
            assert shown(pool.run(write_sums(tmp_path / "a.xlsx", number))) == truth(number)
            seen.update(pool.engine_pids())
        assert len(seen) == 3
        assert eventually(lambda: not pool.engine_pids() and not temporary.processes())
        assert shown(pool.run(push_sums(1.0))) == truth(1.0)


def test_one_that_takes_too_much_memory_gives_way(temporary: Temporary) -> None:
    """Measured after every job; the next has a fresh one."""
    with Pool(1, Limits(memory=1 << 20)) as pool:
        seen = set()
        for number in range(3):
            assert shown(pool.run(push_sums(number))) == truth(number)
            seen.update(pool.engine_pids())
        assert len(seen) == 3


def test_many_threads_share_one_pool(temporary: Temporary, tmp_path: Path) -> None:
    """Two LibreOffices, six threads: each gets its own answers."""
    wrong: list[str] = []

    def work(pool: Pool, base: int) -> None:
        for number in range(base, base + 6):
            job = (
                push_sums(number, f"key{number % 3}") if number % 2 else write_sums(tmp_path / f"{number}.xlsx", number)
            )
            if shown(pool.run(job)) != truth(number):
                wrong.append(str(number))

    with Pool(2) as pool:
        threads = [threading.Thread(target=work, args=(pool, 100 * one)) for one in range(6)]
        for one in threads:
            one.start()
        for one in threads:
            one.join()
        assert len(pool.engine_pids()) == 2
    assert wrong == []


def test_kills_at_random(temporary: Temporary, tmp_path: Path, sizes: dict[str, Any]) -> None:
    """LibreOffice is killed again and again during a batch: every answer is true, or two kills hit its job."""
    jobs, kills = sizes["office_kill_jobs"], sizes["office_kills"]
    numbers = iter(range(jobs))
    futures: list[Future[Answer]] = []
    killed: set[int] = set()
    with Pool(2) as pool:
        for _ in range(kills):
            futures += [pool.submit(_either(tmp_path, number)) for number in islice(numbers, jobs // kills)]
            killed.add(_kill_one(pool, killed, random.Random(len(killed))))
        futures += [pool.submit(_either(tmp_path, number)) for number in numbers]
        results = [one.exception(120) for one in futures]
    failed = [one for one in results if one is not None]
    assert (len(futures), len(killed)) == (jobs, kills)
    assert all(isinstance(one, OfficeFailed) and "office failed twice" in str(one) for one in failed)
    right = [shown(one.result()) == truth(number) for number, one in enumerate(futures) if one.exception() is None]
    assert all(right)
    assert len(right) >= jobs - kills // 2
    print(f"{kills} kills over {jobs} jobs: {len(right)} true answers, {len(failed)} said to have failed twice")


def _either(folder: Path, number: int) -> Any:
    return push_sums(number) if number % 2 else write_sums(folder / f"{number}.xlsx", number)


def _kill_one(pool: Pool, killed: set[int], chance: random.Random) -> int:
    """Kill one that runs and was not killed yet, a moment after there is one."""
    assert eventually(lambda: bool(set(pool.engine_pids()) - killed), 30)
    time.sleep(chance.uniform(0.0, 0.4))
    left = sorted(set(pool.engine_pids()) - killed)
    if not left:
        return _kill_one(pool, killed, chance)
    victim = chance.choice(left)
    os.kill(victim, signal.SIGKILL)
    return victim


def test_a_pool_does_not_cross_a_fork(temporary: Temporary) -> None:
    """A child process may neither use nor end the parent's LibreOffices."""
    with Pool(1) as pool:
        pool.run(push_sums(1.0))
        child = os.fork()
        if child == 0:
            try:
                pool.close()
                pool.submit(push_sums(2.0))
            except OfficeFailed:
                os._exit(7)
            os._exit(0)
        assert os.waitstatus_to_exitcode(os.waitpid(child, 0)[1]) == 7
        assert shown(pool.run(push_sums(3.0))) == truth(3.0)


def test_a_closed_pool_says_so(temporary: Temporary) -> None:
    """No job is taken any more, and closing twice does no harm."""
    pool = Pool(1)
    pool.run(push_sums(1.0))
    pool.close()
    pool.close()
    with pytest.raises(OfficeFailed, match="closed"):
        pool.run(push_sums(2.0))


def test_an_output_that_cannot_be_written_is_named(temporary: Temporary, tmp_path: Path) -> None:
    """The output's name and the system's reason; nothing half written."""
    write_sums(tmp_path / "a.xlsx", 1.0)
    with Pool(1) as pool, pytest.raises(OfficeFailed, match=r"gone/b\.ods: cannot be written"):
        pool.run(Convert(str(tmp_path / "a.xlsx"), str(tmp_path / "gone" / "b.ods"), "ods"))
    assert sorted(one.name for one in tmp_path.iterdir()) == ["a.xlsx", "temporary"]


def test_the_pool_is_sized_by_cores_and_memory() -> None:
    """At least one; no more than cores; less where each may take much memory."""
    assert 1 <= default_size(Limits()) <= (os.cpu_count() or 1)
    assert default_size(Limits(memory=1 << 50)) == 1


def test_sums_are_what_they_are() -> None:
    """The workbook of these tests has the results its truth states, computed by nobody but Python."""
    assert sums(1.0)["Out"]["A1"].value == "=SUM(In!A1:B1)"
    assert truth(1.0)[:2] == (1.1, 1 / 3)
