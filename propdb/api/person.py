"""Who adds, checks and approves: a name from ``PROPDB_USER`` or the configuration file, never guessed."""

from __future__ import annotations

import os
import unicodedata
from pathlib import Path

from propdb.errors import InvalidInput

__all__ = ["config_path", "who", "who_if_named"]

_LONGEST = 100


def config_path() -> Path:
    """The configuration file: ``PROPDB_CONFIG``, else ``config.toml`` in the user-configuration directory."""
    given = os.environ.get("PROPDB_CONFIG")
    if given:
        return Path(given)
    import platformdirs

    return Path(platformdirs.user_config_dir("propdb", appauthor=False)) / "config.toml"


def who() -> str:
    """The name that goes into the log: ``PROPDB_USER``, else ``user`` of the configuration file.

    Raises
    ------
    InvalidInput
        Nobody is named (the login of the machine is not taken: a log of reviews must say who was meant), a name that
        is none, or a configuration file that cannot be read.
    """
    name = who_if_named()
    if not name:
        raise InvalidInput(
            "nobody is named who does this",
            hint=f'set PROPDB_USER to your name, or write user = "your name" in {config_path()}',
        )
    return name


def who_if_named() -> str:
    """As :func:`who`; "" where nobody is named."""
    given = os.environ.get("PROPDB_USER")
    if given is not None and given.strip():
        return _name(given, "PROPDB_USER")
    place = config_path()
    settings = _read(place)
    for key in settings:
        if key != "user":
            raise InvalidInput(f"unknown setting {key!r}", where=str(place), hint='it may hold user = "your name"')
    if "user" not in settings:
        return ""
    if not isinstance(settings["user"], str):
        raise InvalidInput("user is not a text", where=str(place), hint='write user = "your name"')
    return _name(settings["user"], str(place))


def _name(text: str, where: str) -> str:
    name = " ".join(text.split())
    if any(unicodedata.category(char) in ("Cc", "Cf", "Cs", "Zl", "Zp") for char in name):
        raise InvalidInput(f"the name {text!r} holds a control character", where=where, hint="leave it out")
    if len(name) > _LONGEST:
        raise InvalidInput(f"a name of {len(name)} characters", where=where, hint=f"use up to {_LONGEST}")
    return name


def _read(place: Path) -> dict[str, object]:
    import tomllib

    try:
        text = place.read_text(encoding="utf-8-sig")
    except FileNotFoundError:
        return {}
    except UnicodeDecodeError as error:
        raise InvalidInput(
            "not text in UTF-8", where=str(place), hint='save it again; it holds user = "name"'
        ) from error
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or error
        raise InvalidInput(f"the configuration cannot be read: {reason}", where=str(place)) from error
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise InvalidInput(f"not TOML: {error}", where=str(place), hint='write user = "your name"') from error
