"""`office install`, `status` and `remove`: a person's Calc has the functions, and afterwards nothing is left."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest
from calc_client import PREFIX, Calc

from sheetcal import __version__
from sheetcal.office.addin.places import OXT

pytestmark = pytest.mark.office
CALL = f"={PREFIX}HEAT_FROM_RISE(180;4.18;5)"
NEXT = "Calc has its functions when it is started next."


class Person:
    """Somebody with a home of their own, at the command line."""

    def __init__(self, home: Path, **environment: str) -> None:
        self.home = home
        self.environment = {**os.environ, "HOME": str(home), **environment}
        self.environment.pop("XDG_CONFIG_HOME", None)

    def types(self, *words: str) -> tuple[int, list[str], str]:
        """Exit code, standard output as lines, standard error."""
        command = [sys.executable, "-m", "sheetcal", "office", *words]
        done = subprocess.run(command, capture_output=True, text=True, env=self.environment, check=False)
        return done.returncode, done.stdout.splitlines(), done.stderr

    def status(self) -> str | None:
        told = json.loads("\n".join(self.types("status", "--json")[1]))
        return None if told["add-in"] is None else str(told["add-in"])

    def left(self, *names: str) -> list[Path]:
        """Files and folders that bear one of the names, or files that hold it."""
        everything = [path for path in self.home.rglob("*") if "pack" not in path.parts]  # LibreOffice's own backup
        return [path for path in everything if any(name in path.name or _holds(path, name) for name in names)]


def _holds(path: Path, name: str) -> bool:
    return path.is_file() and name.encode() in path.read_bytes()


@pytest.fixture
def person(tmp_path: Path) -> Person:
    (tmp_path / "home").mkdir()
    return Person(tmp_path / "home")


def shown(calc: Calc, formula: str = CALL) -> object:
    calc.new(document="one")
    calc.formulas(document="one", tab="Sheet1", column=0, row=0, texts=[formula])
    found = calc.read(document="one", tab="Sheet1", cells="A1")[0][0]
    calc.close(document="one")
    return found


def test_from_installing_to_removing(person: Person) -> None:
    assert person.status() is None
    code, lines, _ = person.types("install")
    assert (code, lines) == (0, [f"installed the add-in {__version__} for this user", NEXT])
    assert person.status() == f"{__version__}, for this user"
    with Calc(None, home=person.home) as calc:
        assert shown(calc) == 3762.0
        assert "WIRE_HEAT" in calc.wizard()
    where = json.loads(next(person.home.rglob(f"{OXT}/where.json")).read_text())
    started = subprocess.run(
        [where["python"], "-m", "sheetcal", "--version"], cwd=where["sheetcal"] or "/", capture_output=True, text=True,
        check=True,
    )  # fmt: skip
    assert started.stdout.strip() == f"sheetcal {where['version']}"
    code, lines, _ = person.types("remove")
    assert (code, lines) == (0, [f"removed the add-in {__version__} for this user"])
    assert person.status() is None
    assert not person.left("sheetcal")
    with Calc(None, home=person.home) as calc:
        assert shown(calc) == "#NAME?"
    assert person.types("remove")[:2] == (0, ["no add-in is installed for this user"])


def test_installing_again_replaces_an_older_version(person: Person) -> None:
    person.types("install")
    found = next(person.home.rglob(f"{OXT}/description.xml"))
    found.write_text(found.read_text().replace(f'version value="{__version__}"', 'version value="0.0.1"'))
    assert person.status() == "0.0.1, for this user"
    code, lines, _ = person.types("install")
    assert code == 0 and lines[0].startswith(f"installed the add-in {__version__} for this user, in place of ")
    assert person.status() == f"{__version__}, for this user"
    folders = [path for path in person.home.rglob(OXT) if path.is_dir()]
    assert len(folders) == 1, folders
    person.types("remove")
    assert not person.left("sheetcal")


def test_a_running_libreoffice_goes_on_and_must_be_restarted(person: Person) -> None:
    with Calc(None, home=person.home) as calc:
        code, lines, _ = person.types("install")
        assert code == 0 and lines[1] == "LibreOffice is running: close all of its windows and start it again."
        assert shown(calc, "=1+1") == 2.0  # it lives
    with Calc(None, home=person.home) as calc:
        assert shown(calc) == 3762.0
        code, lines, _ = person.types("remove")
        assert code == 0 and lines[1].startswith("LibreOffice is running")
    with Calc(None, home=person.home) as calc:
        assert shown(calc) == "#NAME?"


def test_for_all_users(tmp_path: Path) -> None:
    """Into a folder that stands for the one of all users, by LibreOffice's own variable."""
    (tmp_path / "home").mkdir()
    (tmp_path / "all").mkdir()
    store = (tmp_path / "all" / "cache").as_uri()
    person = Person(tmp_path / "home", UNO_SHARED_PACKAGES_CACHE=store)
    code, lines, _ = person.types("install", "--shared")
    assert (code, lines) == (0, [f"installed the add-in {__version__} for all users", NEXT])
    assert person.status() == f"{__version__}, for all users"
    assert not list(person.home.rglob("*libreoffice*"))  # nobody's own folder is touched
    option = f"-env:UNO_SHARED_PACKAGES_CACHE={store}"
    with Calc(tmp_path / "another", option) as calc:
        assert shown(calc) == 3762.0
    assert person.types("remove")[1] == ["no add-in is installed for this user"]
    assert person.types("remove", "--shared")[1] == [f"removed the add-in {__version__} for all users"]
    assert not [path for path in (tmp_path / "all").rglob("*") if path.is_file()]
    with Calc(tmp_path / "another", option) as calc:
        assert shown(calc) == "#NAME?"


def _one_line(person: Person, *words: str) -> str:
    code, lines, said = person.types(*words)
    assert code == 2 and not lines and len(said.splitlines()) == 1, (code, lines, said)
    return said


def test_each_hindrance_is_one_line(tmp_path: Path) -> None:
    """No LibreOffice, no Python for it, options that do not go together."""
    absent = Person(tmp_path, SHEETCAL_SOFFICE=str(tmp_path / "nowhere"))
    assert "SHEETCAL_SOFFICE" in _one_line(absent, "install")
    wrong = Person(tmp_path, SHEETCAL_UNO_PYTHON=sys.executable + "-none")
    assert "SHEETCAL_UNO_PYTHON" in _one_line(wrong, "install")
    assert "--json" in _one_line(Person(tmp_path), "install", "--json")
    assert "--shared" in _one_line(Person(tmp_path), "status", "--shared")


def test_a_home_that_cannot_be_written_is_one_line(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Root may write everywhere, so the question is answered for it; a full disk likewise."""
    from sheetcal.errors import Refused
    from sheetcal.office.addin import install

    monkeypatch.setenv("HOME", str(tmp_path))
    with monkeypatch.context() as patch, pytest.raises(Refused, match=r"may not be written.*Set HOME"):
        patch.setattr("os.access", lambda path, mode: False)
        install.install()
    full = os.statvfs_result((4096, 4096, 1000, 10, 10, 10, 10, 10, 0, 255))
    with monkeypatch.context() as patch, pytest.raises(Refused, match=r"no space left.*Free some"):
        patch.setattr("os.statvfs", lambda path: full)
        install.install()
    assert not list(tmp_path.rglob("*libreoffice*"))


def test_a_user_folder_that_is_none_is_one_line(tmp_path: Path) -> None:
    """A file stands where LibreOffice's folder must be."""
    (tmp_path / ".config").mkdir()
    (tmp_path / ".config" / "libreoffice").write_text("not a folder")
    assert ".config/libreoffice: is no folder" in _one_line(Person(tmp_path), "install")
