"""What all tests share: the sample sizes, and the laboratory's LibreOffice."""

from __future__ import annotations

import os
import subprocess
import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest

if TYPE_CHECKING:
    from sheetcal.verbs import Output

HERE = Path(__file__).parent


@pytest.fixture(scope="session")
def sizes() -> dict[str, Any]:
    """The column of sizes.toml that this run takes."""
    document = tomllib.loads((HERE / "sizes.toml").read_text("utf-8"))
    return dict(document[os.environ.get("SHEETCAL_TEST_SIZES", "ci")])


@pytest.fixture(scope="session")
def played(tmp_path_factory: pytest.TempPathFactory, sizes: dict[str, Any]) -> tuple[Path, Output]:
    """The demonstration week, played once for all tests: its folder, and what it printed. Not to be altered."""
    from sheetcal.verbs.playing import run as play

    folder = tmp_path_factory.mktemp("demo") / "week"
    return folder, play(str(folder), sheets=sizes["demo_archive"])


@pytest.fixture(scope="session")
def convert(tmp_path_factory: pytest.TempPathFactory) -> Callable[[list[Path], str, Path], None]:
    """Re-save files through a real LibreOffice: `convert(files, "xlsx", folder)`, one call for all files."""
    profile = tmp_path_factory.mktemp("office-profile")

    def run(files: list[Path], form: str, folder: Path) -> None:
        command = ["soffice", f"-env:UserInstallation={profile.as_uri()}", "--headless", "--convert-to", form]
        subprocess.run(
            [*command, "--outdir", str(folder), *map(str, files)], check=True, capture_output=True, timeout=600
        )

    return run
