"""Own-state datums typed in place: ``own:PHASE[:FORM][,saturated][,PRESSURE]@TEMPERATURE[=ENTHALPY]``."""

from __future__ import annotations

import difflib
from typing import Literal

from propdb.datum.quantities import read_enthalpy, read_pressure, read_temperature, write_temperature
from propdb.errors import DatumError
from propdb.model.records import BOILING, PHASES, Datum, ZeroState

__all__ = ["INLINE_PREFIX", "PHASE_WORDS", "parse_inline"]

INLINE_PREFIX = "own:"
_EXAMPLES = "e.g. own:l@65C, own:cr:graphite@298.15K, own:l,saturated@0C=200kJ/kg"

#: How a sentence calls each phase.
PHASE_WORDS = {
    "cr": "crystal",
    "am": "amorphous solid",
    "l": "liquid",
    "g": "ideal gas",
    "fluid": "real fluid",
    "aq": "aqueous solute at infinite dilution",
    "stable": "phase stable",
}


def parse_inline(text: str) -> Datum:
    """Read an inline own-state datum.

    Parameters
    ----------
    text : str
        ``own:l@65C``, ``own:g@60F``, ``own:l,saturated@0C=200kJ/kg``, ``own:cr:graphite@298.15K``, ``own:g@0K``,
        ``own:stable@20C``, ``own:l,saturated@boiling``, ``own:fluid,40bar@25C``.

    Raises
    ------
    DatumError
        The text does not have this shape; the message names the part.
    TemperatureError, PressureError, UnitError
        A temperature, pressure or enthalpy that cannot be read.
    """
    name = text.strip()
    if not name.startswith(INLINE_PREFIX):
        raise DatumError(f"{text!r} is not an inline datum: it does not begin with {INLINE_PREFIX!r}", hint=_EXAMPLES)
    head, at, tail = name[len(INLINE_PREFIX) :].partition("@")
    if not at:
        raise DatumError(f"inline datum {text!r} has no temperature", hint=f"put it behind @, {_EXAMPLES}")
    temperature_text, equals, h0_text = tail.partition("=")
    if equals and not h0_text.strip():
        raise DatumError(f"inline datum {text!r} has nothing behind =", hint="write an enthalpy, e.g. =200kJ/kg")
    temperature: float | Literal["same", "boiling"]
    temperature = BOILING if temperature_text.strip() == BOILING else read_temperature(temperature_text.strip())
    state, *words = [part.strip() for part in head.split(",")]
    phase, _, form = state.partition(":")
    phase, form = phase.strip(), form.strip()
    _check_phase(phase, form, text)
    saturated: Literal["", "liquid", "vapour"] = ""
    pressure: float | None = None
    for word in words:
        if word.startswith("saturated"):
            saturated = _saturated(word, phase, text)
        elif word[:1].isdigit():
            pressure = read_pressure(word)
        else:
            raise DatumError(f"{word!r} in inline datum {text!r} is neither 'saturated' nor a pressure", hint=_EXAMPLES)
    if temperature == BOILING:
        if phase not in ("l", "fluid"):
            raise DatumError(f"inline datum {text!r}: boiling is a state of l or fluid", hint="own:l,saturated@boiling")
        saturated, pressure = saturated or "liquid", pressure or 101325.0
    if phase == "fluid" and not saturated and pressure is None:
        raise DatumError(
            f"inline datum {text!r}: a real fluid needs a pressure, or saturated", hint="own:fluid,40bar@25C"
        )
    h0, h0_unit = read_enthalpy(h0_text.strip()) if equals else (0.0, "J/mol")
    zero = ZeroState(phase, temperature, form=form, pressure=pressure, saturated=saturated)
    return Datum(
        name=name,
        kind="own",
        sentence=_sentence(zero, h0_text.strip() if equals else ""),
        source="common-practice",
        temperature=temperature,
        zero=zero,
        h0=h0,
        h0_unit=h0_unit,
        inline=True,
    )


def _check_phase(phase: str, form: str, text: str) -> None:
    known = (*PHASES, "stable")
    if phase not in known:
        near = difflib.get_close_matches(phase, known, n=1, cutoff=0.5)
        hint = f"did you mean {near[0]!r}?" if near else f"phases are {', '.join(known)}"
        raise DatumError(f"{phase!r} in inline datum {text!r} is not a phase", hint=hint)
    if form and phase != "cr":
        raise DatumError(f"inline datum {text!r} names a form of phase {phase}", hint="only cr has forms")


def _saturated(word: str, phase: str, text: str) -> Literal["liquid", "vapour"]:
    sides: dict[str, Literal["liquid", "vapour"]] = {"": "liquid", "liquid": "liquid", "vapour": "vapour"}
    side = word.removeprefix("saturated").strip()
    if side not in sides or phase not in ("l", "fluid") or (phase == "l" and side == "vapour"):
        raise DatumError(
            f"{word!r} does not fit phase {phase} in inline datum {text!r}",
            hint="own:l,saturated, own:fluid,saturated liquid or own:fluid,saturated vapour",
        )
    return sides[side]


def _sentence(zero: ZeroState, h0: str) -> str:
    state = PHASE_WORDS[zero.phase]
    if zero.form:
        state = zero.form
    if zero.saturated:
        state = f"saturated {zero.saturated}"
    if zero.temperature == BOILING:
        place = "at its normal boiling point"
    else:
        place = f"at {write_temperature(zero.temperature)}"
        if zero.phase == "stable":
            place += " and 1 bar"
        elif zero.pressure is not None and not zero.saturated:
            place += f" and {zero.pressure / 1e5:.6g} bar"
    return f"Each species itself, as {state} {place}, has enthalpy {h0 or 'zero'}."
