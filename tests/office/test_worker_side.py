"""The worker's side keeps to what LibreOffice's Python may offer, and takes nothing of the user's along."""

from __future__ import annotations

import ast
import sys
from pathlib import Path

import pytest
from office_books import push_sums

import sheetcal
from sheetcal.office.jobs import (
    Answer,
    Block,
    Convert,
    Done,
    Header,
    Job,
    Open,
    Push,
    Template,
    Values,
    answer_document,
    answer_of,
    job_document,
    job_of,
)
from sheetcal.office.pool import Pool

OFFICE = Path(sheetcal.__file__).parent / "office"
WORKER_SIDE = ("worker", "engine", "documents", "printing", "confine", "userfolder", "jobs")


@pytest.mark.parametrize("name", WORKER_SIDE)
def test_worker_files_keep_to_older_syntax(name: str) -> None:
    """Python 3.9 can parse them, and they call nothing that came later."""
    text = (OFFICE / f"{name}.py").read_text("utf-8")
    ast.parse(text, feature_version=(3, 9))
    assert "strict=" not in text
    assert "from __future__ import annotations" in text


@pytest.mark.parametrize("name", WORKER_SIDE)
def test_worker_files_need_only_the_standard_library_and_each_other(name: str) -> None:
    """Beside uno, nothing that LibreOffice's Python has not got."""
    found = set()
    for node in ast.walk(ast.parse((OFFICE / f"{name}.py").read_text("utf-8"))):
        if isinstance(node, ast.Import):
            found |= {one.name for one in node.names}
        elif isinstance(node, ast.ImportFrom) and node.module == "sheetcal.office":
            found |= {f"sheetcal.office.{one.name}" for one in node.names}
        elif isinstance(node, ast.ImportFrom):
            found.add(str(node.module))
    own = {f"sheetcal.office.{one}" for one in WORKER_SIDE}
    assert not {one for one in found - own if one.split(".")[0] not in {*sys.stdlib_module_names, "uno"}}


def test_nothing_of_the_user_goes_along(monkeypatch: pytest.MonkeyPatch) -> None:
    """Neither worker nor LibreOffice has a variable, a home or a module path of ours."""
    monkeypatch.setenv("A_SECRET", "of the user")
    with Pool(1) as pool:
        pool.run(push_sums(1.0))
        engine = Path(f"/proc/{pool.engine_pids()[0]}")
        worker = Path("/proc") / engine.joinpath("stat").read_text("ascii").rpartition(")")[2].split()[1]
        known = {"PATH", "HOME", "LANG", "TMPDIR", "SAL_USE_VCLPLUGIN"}
        for process in (engine, worker):
            variables = dict(one.split("=", 1) for one in (process / "environ").read_text("utf-8").split("\0") if one)
            assert set(variables) <= known
            assert Path(variables["HOME"]).name.startswith("sheetcal-office-")
        assert "-I" in (worker / "cmdline").read_text("utf-8").split("\0")


@pytest.mark.parametrize(
    "job",
    [
        Open("/a/b.xlsx", (("T", "A1:B2"),)),
        Convert("/a/b.xlsx", "/a/c.pdf", "pdf", Header("left", "right")),
        Convert("/a/b.xlsx", "/a/c.ods", "ods"),
    ],
)
def test_jobs_travel_whole(job: Job) -> None:
    """A job comes out of its document as it went in."""
    assert job_of(job_document(job)) == job


def test_a_push_travels_with_its_template() -> None:
    """The bytes too, when they are wanted."""
    job = Push(Template("key", lambda: b"PK\0bytes"), (Block("T", "A1", ((1.5, "x", None),)),), (("T", "A1:B2"),))
    back = job_of(job_document(job, job.template.make()))
    assert isinstance(back, Push)
    assert (back.template.key, back.template.make()) == ("key", b"PK\0bytes")
    assert (back.writes, back.reads) == (job.writes, job.reads)


@pytest.mark.parametrize("answer", [Done(), Values((Block("T", "A1", ((0.1 + 0.2, "é", None), ())),))])
def test_answers_travel_whole(answer: Answer) -> None:
    """Numbers keep every bit."""
    assert answer_of(answer_document(answer)) == answer
