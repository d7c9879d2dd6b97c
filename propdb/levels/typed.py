"""States as they are typed: text with units, or numbers in SI."""

from __future__ import annotations

from propdb.errors import InvalidInput, NotFound
from propdb.model.records import PHASES, Species, State
from propdb.units import parse_pressure, parse_temperature

__all__ = ["Pressure", "Temperature", "read_phase", "read_state", "read_temperature"]

Temperature = str | float  # "600C", or K
Pressure = str | float  # "40bar", or Pa


def read_temperature(value: Temperature) -> float:
    """A temperature [K] from text with its unit, or from a number in K. Raises TemperatureError."""
    return parse_temperature(value if isinstance(value, str) else f"{value!r} K")


def read_phase(text: str) -> str:
    """A phase of :data:`~propdb.model.records.PHASES`. Raises NotFound, with what was probably meant."""
    if text in PHASES:
        return text
    words = {
        "gas": "g", "vapour": "fluid", "vapor": "fluid", "steam": "fluid", "liquid": "l", "solid": "cr", "s": "cr",
        "crystal": "cr", "amorphous": "am", "glass": "am", "aqueous": "aq", "c": "cr", "v": "fluid",
    }  # fmt: skip
    low = text.lower()
    near = low if low in PHASES else words.get(low)
    hint = f"did you mean {near}?" if near else "phases are cr, am, l, g (ideal gas), fluid (real fluid) and aq"
    raise NotFound(f"no phase {text!r}", hint=hint, candidates=PHASES)


def read_state(
    record: Species,
    phase: str,
    form: str | None,
    temperature: Temperature | None,
    pressure: Pressure | None,
    saturated: str | None,
) -> State:
    """A state from what was typed.

    Raises
    ------
    InvalidInput
        What contradicts itself: a saturated crystal, a saturated state with both temperature and pressure.
    NotFound, TemperatureError, PressureError
        A phase, temperature or pressure that cannot be read.
    """
    read_phase(phase)
    t = None if temperature is None else read_temperature(temperature)
    p = None
    if pressure is not None:
        p = parse_pressure(pressure if isinstance(pressure, str) else f"{pressure!r} Pa")
    kind: str = saturated or ""
    if kind not in ("", "liquid", "vapour"):
        near = {"vapor": "vapour", "gas": "vapour", "steam": "vapour", "l": "liquid", "g": "vapour"}.get(kind.lower())
        raise InvalidInput(
            f"saturated {kind!r}",
            hint=f"did you mean {near}?" if near else "it is liquid or vapour",
            where="--saturated",
        )
    if kind and phase not in ("fluid", "l"):
        raise InvalidInput(f"a saturated state of phase {phase}", hint="use --phase fluid", where="--saturated")
    if kind == "vapour" and phase == "l":
        raise InvalidInput("a saturated vapour of phase l", hint="use --phase fluid", where="--saturated")
    if kind and t is not None and p is not None:
        raise InvalidInput(
            "a saturated state has a temperature or a pressure, not both", hint="leave one out", where="--saturated"
        )
    if t is None and not (kind and p is not None):
        raise InvalidInput(f"the state of {record.name} has no temperature", hint="give --temperature, e.g. 25C")
    if t is None:
        phase = "fluid"  # the temperature follows from the pressure
    return State(phase, t, form or "", p, kind)  # type: ignore[arg-type]
