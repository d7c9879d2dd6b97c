"""Optional packages, loaded when they are needed."""

from __future__ import annotations

from importlib import import_module
from typing import Any

from propdb.errors import PropdbError

__all__ = ["need"]


def need(module: str, *, extra: str, what: str) -> Any:
    """Import an optional package. Raises PropdbError with the one command that installs it."""
    try:
        return import_module(module)
    except ImportError:
        package = module.partition(".")[0]
        raise PropdbError(
            f"{what} needs {package}, which is not installed", hint=f"type: pip install 'propdb[{extra}]'"
        ) from None
