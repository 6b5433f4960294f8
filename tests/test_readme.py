"""README.md and DEVELOPERS.md are true: every command runs, every generated part and table is as the code has it."""

from __future__ import annotations

import re
import shlex
import shutil
import subprocess
from pathlib import Path

import pytest
import readme_parts
from test_architecture import ALLOWED

from sheetcal.cli import build_parser, main
from sheetcal.verbs import Output

ROOT = Path(__file__).parent.parent
README = (ROOT / "README.md").read_text("utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text("utf-8")
CONSOLE = re.compile(r"```console\n(.*?)```", re.DOTALL)
COMMANDS = {name for action in build_parser()._actions for name in action.choices or ()}
OWN = re.compile(r"\bmy-")  # a file of the reader's own: the command is parsed, not run
Played = tuple[Path, Output]


def shown() -> list[tuple[list[str], list[str]]]:
    """(command line, the output lines shown below it) of every example."""
    found: list[tuple[list[str], list[str]]] = []
    for block in CONSOLE.findall(README):
        for line in block.splitlines():
            if line.startswith("$ "):
                found.append((shlex.split(line[2:]), []))
            else:
                found[-1][1].append(line)
    return found


def test_every_command_has_an_example() -> None:
    """Every command, each with one example at least, spelled so that it can be typed."""
    assert {words[1] for words, _ in shown()} == COMMANDS
    for words, _ in shown():
        assert words[0] == "sheetcal"
        build_parser().parse_args(words[1:])


def test_every_example_runs(
    played: Played, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """In the folder that the demonstration leaves: no refusal, and the output shown is the output."""
    shutil.copytree(played[0], tmp_path / "sheetcal-demo", ignore=shutil.ignore_patterns("archive"))
    monkeypatch.chdir(tmp_path)
    home = tmp_path / "home"  # the add-in is installed and removed there, not where the reader has it
    home.mkdir()
    monkeypatch.setenv("HOME", str(home))
    monkeypatch.delenv("XDG_CONFIG_HOME", raising=False)
    capsys.readouterr()
    ran = 0
    for words, lines in shown():
        if OWN.search(" ".join(words)):
            continue
        code = main(words[1:])
        said = capsys.readouterr()
        assert code in (0, 1), f"{shlex.join(words)}: {said.err}"
        for line in lines:
            assert line in said.out.splitlines(), f"{shlex.join(words)}: {line}"
        ran += 1
    assert ran >= 11
    assert (tmp_path / "cup-filled.xlsx").exists() and (tmp_path / "moved" / "changes.csv").exists()


def test_the_page_shown_is_the_page_printed(played: Played) -> None:
    """Every line of the excerpt stands in what the demonstration prints."""
    excerpt = README.split("<!-- output of the demonstration")[1].split("```text\n")[1].split("```")[0].splitlines()
    assert len(excerpt) >= 4
    for line in excerpt:
        assert line in played[1].lines, line


def test_generated_parts_are_as_they_would_be_today() -> None:
    """The table of kinds and the count of cell functions; `python tests/readme_parts.py` writes them."""
    assert readme_parts.filled(README) == README
    assert readme_parts.kinds() in README and readme_parts.cells() in README


def test_the_table_of_kinds_says_what_kinds_says(capsys: pytest.CaptureFixture[str]) -> None:
    """Name, version and purpose of each line of `sheetcal kinds` stand in one row of the table."""
    assert main(["kinds"]) == 0
    lines = capsys.readouterr().out.splitlines()
    for line in lines:
        name, version, purpose = re.split(r"\s+", line, maxsplit=2)
        assert f"| {name} | {version} | {purpose} |" in README
    assert README.count("\n| ") >= len(lines)


def test_the_two_scripts_are_there() -> None:
    """bash workbooks/demo.sh and bash tests/run.sh: present, and good shell."""
    for script in ("workbooks/demo.sh", "tests/run.sh"):
        assert f"bash {script}" in README
        assert subprocess.run(["bash", "-n", script], cwd=ROOT, check=False).returncode == 0


def test_the_first_screen_has_the_job_the_commands_and_a_result() -> None:
    """All three within the first forty lines."""
    first = "\n".join(README.splitlines()[:40])
    assert "issues" in first and "checks" in first and "recomputes" in first
    assert "bash workbooks/demo.sh" in first and "MJ/kg" in first


def test_exit_codes_verdicts_and_standings_are_all_named() -> None:
    """What a person must know to rely on an answer stands in the README."""
    for word in ("**0**", "**1**", "**2**", "**130**", "unreadable", "reject", "incomplete", "hold", "sound"):
        assert word in README
    for word in ("*derived*", "*published*", "*memory*", "interlocks"):
        assert word in README


def table(text: str, heading: str) -> list[list[str]]:
    """Rows of the first table below a heading, without its head."""
    lines = text.split(heading, 1)[1].splitlines()
    start = next(number for number, line in enumerate(lines) if line.startswith("|---"))
    rows = []
    for line in lines[start + 1 :]:
        if not line.startswith("|"):
            break
        rows.append([cell.strip() for cell in line.strip("|").split("|")])
    return rows


def test_the_import_table_is_the_one_that_is_held() -> None:
    """DEVELOPERS.md and tests/test_architecture.py have the same table; verbs may import everything."""
    rows = table(DEVELOPERS, "## Who may import whom")
    listed = {layer.strip("`"): set(re.findall(r"`(\w+)`", may)) for layer, may in rows}
    assert listed.pop("verbs") == set()
    assert listed == {layer: may for layer, may in ALLOWED.items() if not layer.startswith("__")}


def test_files_that_the_documents_name_exist() -> None:
    """Every path of the repository that README, DEVELOPERS and tests/README name is there."""
    listed = subprocess.run(
        ["git", "ls-files", "-co", "--exclude-standard"], capture_output=True, text=True, cwd=ROOT, check=True
    )
    files = set(listed.stdout.splitlines())
    folders = {str(parent) for one in files for parent in Path(one).parents}
    checked = 0
    for document in ("README.md", "DEVELOPERS.md", "tests/README.md"):
        text = (ROOT / document).read_text("utf-8")
        for path in re.findall(r"`((?:sheetcal|tests|workbooks|\.ci)/[\w./-]*)`", text):
            assert path.rstrip("/") in files | folders, f"{document} names {path}"
            checked += 1
    assert checked >= 25


def test_every_test_folder_has_its_line() -> None:
    """tests/README.md says of each folder of tests what goes there."""
    text = (ROOT / "tests" / "README.md").read_text("utf-8")
    for folder in (ROOT / "tests").iterdir():
        if folder.is_dir() and any(folder.glob("test_*.py")):
            assert f"tests/{folder.name}/" in text, folder.name
