"""Where the seed data are: in the wheel as ``propdb/_seed``, in a checkout as ``seeds_data``."""

from __future__ import annotations

from pathlib import Path

from propdb.errors import SeedError

__all__ = ["seed_root"]

_PACKAGE = Path(__file__).resolve().parent.parent


def seed_root() -> Path:
    """The directory of the seed data that came with this installation.

    Raises
    ------
    SeedError
        Neither place has it: the installation is incomplete.
    """
    places = (_PACKAGE / "_seed", _PACKAGE.parent / "seeds_data")
    for place in places:
        if (place / "datums.toml").is_file():
            return place
    raise SeedError("the seed data did not come with this installation", hint="install propdb again")
