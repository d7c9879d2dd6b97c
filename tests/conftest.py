"""What all tests share: where the files of the project are, a store of their own, and ``--full``."""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

if TYPE_CHECKING:
    from propdb.api import Store
    from propdb.intake.package import Package

ROOT = Path(__file__).resolve().parent.parent

#: Fixtures that read all the files of the chemicals library, a quarter of a minute: one worker runs all that need them.
OPEN_DATA = {"package", "full_store"}


def pytest_addoption(parser: pytest.Parser) -> None:
    parser.addoption("--full", action="store_true", help="run the long soak, kill and fuzz tests too")


def pytest_collection_modifyitems(config: pytest.Config, items: list[pytest.Item]) -> None:
    for item in items:
        if "full" in item.keywords and not config.getoption("--full"):
            item.add_marker(pytest.mark.skip(reason="long; runs with --full"))
        if OPEN_DATA & set(getattr(item, "fixturenames", ())):
            item.add_marker(pytest.mark.xdist_group("open-data"))


@pytest.fixture(scope="session")
def root() -> Path:
    """The files of the project beside the package: README, NOTICE, seeds, scripts."""
    return ROOT


@pytest.fixture(scope="session", autouse=True)
def _no_user_data(tmp_path_factory: pytest.TempPathFactory) -> Iterator[None]:
    """Keep every test away from the store, the configuration and the name of the person who runs it."""
    with pytest.MonkeyPatch.context() as patch:
        patch.delenv("PROPDB_USER", raising=False)
        patch.setenv("PROPDB_CONFIG", str(tmp_path_factory.getbasetemp() / "config.toml"))
        if "PROPDB_STORE" not in os.environ:
            patch.setenv("PROPDB_STORE", str(tmp_path_factory.getbasetemp() / "propdb.db"))
        path = Path(os.environ["PROPDB_STORE"])
        if not path.exists():  # what was typed and cross-checked; the open data are in ``full_store``
            from propdb.api.opening import build_seed

            build_seed(path, None, open_data=False)
        yield


@pytest.fixture(scope="session")
def package() -> Package:
    """Seed and package files as a build reads them; about as slow as a build."""
    from propdb.intake.package import load_package
    from propdb.intake.seeds import load_seed
    from propdb.intake.where import seed_root

    return load_package(load_seed(seed_root(), identifiers=False), seed_root())


@pytest.fixture(scope="session")
def full_store(package: Package, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Store]:
    """A store with the packages."""
    import propdb
    from propdb.store.write import build

    path = tmp_path_factory.mktemp("full") / "propdb.db"
    build(path, package.content, versions={"chemicals": package.version})
    with propdb.open(path) as opened:
        yield opened
