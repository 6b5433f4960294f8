"""LibreOffice for the tests of this folder: one pool for all that do no harm to it."""

from __future__ import annotations

from collections.abc import Iterator

import pytest
from calc_client import Calc

from sheetcal.office.addin.build import unpack
from sheetcal.office.pool import Pool


@pytest.fixture(scope="session")
def pool() -> Iterator[Pool]:
    """One LibreOffice, shared. A test that kills or wears one out makes its own pool."""
    with Pool(1) as one:
        yield one


@pytest.fixture(scope="session")
def calc(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Calc]:
    """A Calc that has the add-in, shared by the tests that only calculate in documents of their own."""
    folder = tmp_path_factory.mktemp("addin")
    unpack(folder / "bundled")
    with Calc(folder / "user", f"-env:BUNDLED_EXTENSIONS={(folder / 'bundled').as_uri()}") as one:
        yield one
