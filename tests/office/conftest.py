"""LibreOffice for the tests of this folder: one pool for all that do no harm to it."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

from sheetcal.office.pool import Pool


@pytest.fixture(scope="session")
def pool() -> Iterator[Pool]:
    """One LibreOffice, shared. A test that kills or wears one out makes its own pool."""
    with Pool(1) as one:
        yield one
