"""Published checks: each expected number names its source; tolerances are those of the digits or of the source."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

import propdb
from propdb.api import Store


@pytest.fixture(scope="session")
def store() -> Iterator[Store]:
    with propdb.open() as opened:
        yield opened
