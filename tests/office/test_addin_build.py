"""The add-in is built from sources: the same bytes each time, cell functions unchanged, nothing binary."""

from __future__ import annotations

import ast
import json
import subprocess
import sys
import zipfile
from io import BytesIO
from pathlib import Path
from xml.etree import ElementTree

import pytest

from sheetcal.cells import registry
from sheetcal.office.addin import build
from sheetcal.office.addin.build import INSIDE, PACKAGE, PARTS, files
from sheetcal.office.addin.manifest import KINDS
from sheetcal.office.find import program_folder, uno_python

pytestmark = pytest.mark.office
FOREIGN = sorted([*PARTS.rglob("*.py"), *INSIDE.rglob("*.py"), PACKAGE / "office" / "addin" / "manage.py"])
UNO = {"uno", "unohelper", "com", "sheetcal"}


def test_the_same_sources_give_the_same_bytes() -> None:
    first = build.build()
    code = "import sys; from sheetcal.office.addin.build import build; sys.stdout.buffer.write(build())"
    again = subprocess.run([sys.executable, "-c", code], capture_output=True, check=True, cwd=PACKAGE.parent).stdout
    assert first == again and len(first) < 400_000
    assert {member.date_time for member in zipfile.ZipFile(BytesIO(first)).infolist()} == {(1980, 1, 1, 0, 0, 0)}


def test_where_sheetcal_is_goes_along() -> None:
    told = {"python": "/opt/py/bin/python3", "sheetcal": "/opt/sheetcal", "version": "9.9"}
    with zipfile.ZipFile(BytesIO(build.build(told))) as archive:
        assert json.loads(archive.read("where.json")) == told


def test_everything_is_text_and_nothing_is_forgotten() -> None:
    made = files()
    for path, content in made.items():
        assert content.decode("utf-8"), path
    for source in [*sorted((PACKAGE / "cells").glob("*.py")), PACKAGE / "errors.py", *INSIDE.rglob("*.py")]:
        assert made[f"pythonpath/sheetcal/{source.relative_to(PACKAGE).as_posix()}"] == source.read_bytes()
    assert not [path for path in made if "__pycache__" in path]


def test_the_wheel_takes_every_source_along() -> None:
    """The wheel holds what git does not ignore; words and parts are no Python modules and must be there too."""
    sources = [path for path in (PACKAGE / "office" / "addin").rglob("*") if path.is_file()]
    sources = [str(path) for path in sources if "__pycache__" not in path.parts]
    assert {Path(path).suffix for path in sources} >= {".py", ".toml", ".components"}
    command = ["git", "check-ignore", "--no-index", *sources]
    ignored = subprocess.run(command, capture_output=True, text=True, check=False, cwd=PACKAGE.parent).stdout
    assert not ignored


def test_the_manifest_names_every_file_that_must_be_registered() -> None:
    made = files()
    rows = ElementTree.fromstring(made["META-INF/manifest.xml"])
    space = "{http://openoffice.org/2001/manifest}"
    named = {row.get(f"{space}full-path"): row.get(f"{space}media-type") for row in rows}
    expected = {path: KINDS[Path(path).suffix] for path in made if "/" not in path and Path(path).suffix in KINDS}
    assert named == expected and len(expected) >= 3
    ordered = [Path(str(path)).suffix for path in named]
    assert ordered.index(".idl") < ordered.index(".components")  # types before what is made of them


def test_all_xml_is_well_formed_and_every_function_is_in_both_descriptions() -> None:
    made = files()
    trees = {path: ElementTree.fromstring(made[path]) for path in made if Path(path).suffix in (".xml", ".xcu")}
    assert len(trees) >= 3
    name = "{http://openoffice.org/2001/registry}name"
    nodes = {node.get(name): node for node in trees["CalcAddIns.xcu"].iter("node")}
    for function in registry.all():
        assert f"any {function.name}(" in made["XFunctions.idl"].decode()
        assert function.name in nodes


@pytest.mark.parametrize("path", FOREIGN, ids=lambda path: path.name)
def test_what_runs_inside_libreoffice_keeps_to_older_syntax_and_the_standard_library(path: Path) -> None:
    tree = ast.parse(path.read_text("utf-8"), feature_version=(3, 9))
    for node in ast.walk(tree):
        names = [one.name for one in node.names] if isinstance(node, ast.Import) else []
        names += [node.module or ""] if isinstance(node, ast.ImportFrom) else []
        for one in names:
            assert one.split(".")[0] in {*sys.stdlib_module_names, *UNO}, (path.name, one)
            if one.startswith("sheetcal"):
                assert one.startswith(("sheetcal.cells", "sheetcal.errors", "sheetcal.office.addin.inside")), one


def test_the_cell_functions_run_unchanged_in_libreoffices_python(tmp_path: Path) -> None:
    """By the interpreter that LibreOffice embeds, from the unpacked extension alone."""
    folder = build.unpack(tmp_path)
    code = (
        f"import sys; sys.path.insert(0, {str(folder / 'pythonpath')!r})\n"
        "from sheetcal.cells import registry\n"
        "from sheetcal.office.addin.inside.answers import answer\n"
        "assert all(one.startswith(sys.path[0]) for one in [registry.__file__])\n"
        "print(len(registry.all()), answer(registry.get('HEAT_FROM_RISE'), [180.0, 4.18, 5.0]))\n"
        "print(sorted({name.split('.')[0] for name in sys.modules} & {'numpy', 'pint', 'openpyxl', 'pyoo'}))"
    )
    python = uno_python(program_folder())
    done = subprocess.run([str(python), "-I", "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    assert done.stdout.splitlines() == [f"{len(registry.all())} 3762.0", "[]"]
