"""propdb: thermochemical data with source, range and zero attached; enthalpies moved from one datum to another.

Names are loaded when they are first used, so that ``import propdb`` costs next to nothing::

    import propdb

    store = propdb.open()
    print(store.enthalpy("nitrogen", phase="g", temperature="600C", datum="gas-25C"))

Values are for engineering judgement. They do not replace local codes or licensed practice, and every value used
for design must be verified against its source.
"""

from __future__ import annotations

from importlib import import_module

from propdb._version import __version__

TYPE_CHECKING = False  # type checkers take this name for true; the typing module would double the time of this import
if TYPE_CHECKING:
    from typing import Any

    from propdb.api import Store, open
    from propdb.errors import (
        Ambiguous,
        DatumError,
        DatumMismatch,
        EquationError,
        FormulaError,
        IntegrityError,
        InvalidInput,
        NoData,
        NoSuchState,
        NotFound,
        OutOfRange,
        PressureError,
        PropdbError,
        SeedError,
        SplitError,
        StoreBusy,
        StoreError,
        StoreReadOnly,
        TemperatureError,
        TemperatureOutOfRange,
        Unbalanced,
        UnitError,
    )
    from propdb.model.answer import Answer, ReactionAnswer, ReactionTerm
    from propdb.model.records import (
        Carrier,
        Closure,
        Datum,
        Entry,
        MaySum,
        Source,
        Species,
        State,
        Step,
    )

__all__ = [
    "Ambiguous",
    "Answer",
    "Carrier",
    "Closure",
    "Datum",
    "DatumError",
    "DatumMismatch",
    "Entry",
    "EquationError",
    "FormulaError",
    "IntegrityError",
    "InvalidInput",
    "MaySum",
    "NoData",
    "NoSuchState",
    "NotFound",
    "OutOfRange",
    "PressureError",
    "PropdbError",
    "ReactionAnswer",
    "ReactionTerm",
    "SeedError",
    "Source",
    "Species",
    "SplitError",
    "State",
    "Step",
    "Store",
    "StoreBusy",
    "StoreError",
    "StoreReadOnly",
    "TemperatureError",
    "TemperatureOutOfRange",
    "Unbalanced",
    "UnitError",
    "__version__",
    "open",
]

_MODULES = {
    "propdb.api": ("Store", "open"),
    "propdb.model.answer": ("Answer", "ReactionAnswer", "ReactionTerm"),
    "propdb.model.records": (
        "Carrier",
        "Closure",
        "Datum",
        "Entry",
        "MaySum",
        "Source",
        "Species",
        "State",
        "Step",
    ),
}


def __getattr__(name: str) -> Any:
    """Load a public name from the module that defines it (PEP 562)."""
    if name not in __all__:
        raise AttributeError(f"module 'propdb' has no attribute {name!r}")
    module = next((module for module, names in _MODULES.items() if name in names), "propdb.errors")
    value = getattr(import_module(module), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    """List the public names, loaded or not."""
    return sorted({*globals(), *__all__})
