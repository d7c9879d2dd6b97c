"""Enthalpies on any datum: of a state, of a tabulated number, of a reaction."""

from __future__ import annotations

from typing import TYPE_CHECKING

from propdb.api.core import Core
from propdb.errors import InvalidInput, Unbalanced
from propdb.model.records import State
from propdb.store.search import resolve

if TYPE_CHECKING:
    from propdb.model.answer import Answer, ReactionAnswer

__all__ = ["Enthalpies"]

Temperature = str | float
Pressure = str | float


class Enthalpies(Core):
    """``enthalpy``, ``convert``, ``reaction``."""

    def enthalpy(
        self,
        species: str,
        *,
        phase: str,
        form: str | None = None,
        temperature: Temperature | None = None,
        pressure: Pressure | None = None,
        saturated: str | None = None,
        datum: str,
        unit: str = "kJ/mol",
        source: str | None = None,
        extrapolate: bool = False,
        crosscheck: bool = False,
    ) -> Answer:
        """Enthalpy of a state on a datum.

        Parameters
        ----------
        species : str
            Name, synonym, formula, CAS RN or InChIKey.
        phase : str
            ``cr``, ``am``, ``l``, ``g`` (ideal gas), ``fluid`` (real fluid) or ``aq``.
        form : str, optional
            Of a crystal: ``graphite``.
        temperature : str or float
            ``"600C"``, or a number in K.
        pressure : str or float, optional
            Absolute: ``"40bar"``, or a number in Pa.
        saturated : str, optional
            ``liquid`` or ``vapour``.
        datum : str
            Named or inline.
        unit : str
            Of the answer: ``kJ/mol``, ``kJ/kg``, ``BTU/lb`` ...
        source : str, optional
            Key of a source, or several with commas, to prefer; what they cannot supply is named in the answer.
        extrapolate : bool
            Go beyond the ranges; marked in the answer.
        crosscheck : bool
            Compare the heat capacities with other compilations over the way itself, beside what is stored with the
            entries.

        Raises
        ------
        PropdbError
            NotFound, Ambiguous, OutOfRange, NoData, InvalidInput: one line each, with the next thing to type.
        """
        from propdb.levels.answers import enthalpy
        from propdb.levels.typed import read_state
        from propdb.units import parse_unit

        record = resolve(self._reader, species)
        per = parse_unit(unit)
        levels = self._engine(source, extrapolate)
        state = read_state(record, phase, form, temperature, pressure, saturated)
        zero = self.datum_show(datum)
        answer = enthalpy(levels, species=record, state=state, datum=zero, unit=per, stamp=self._stamp)
        answer = self._with_changes(answer, levels.policy)
        return self._at_state(answer) if crosscheck else answer

    def convert(
        self,
        value: str | float,
        unit: str | None = None,
        *,
        species: str,
        from_: str,
        to: str,
        phase: str | None = None,
        form: str | None = None,
        temperature: Temperature | None = None,
        to_unit: str | None = None,
        source: str | None = None,
        extrapolate: bool = False,
        crosscheck: bool = False,
    ) -> Answer:
        """A tabulated enthalpy moved from one datum to another: H_B = H_A + Z_A - Z_B.

        Parameters
        ----------
        value, unit : str or float, str
            ``"2800.8 kJ/kg"``, or ``2800.8, "kJ/kg"``.
        species, source, extrapolate, crosscheck
            As in :meth:`enthalpy`.
        from_, to : str
            Datums, named or inline.
        phase, form, temperature : optional
            Of the state; needed only where a datum depends on it (same temperature; aqueous ions).
        to_unit : str, optional
            Of the answer; as given if left out.

        Raises
        ------
        PropdbError
            As :meth:`enthalpy`; NoData names the formation enthalpy or latent heat that is missing.
        """
        from propdb.levels.answers import convert
        from propdb.levels.typed import read_phase, read_temperature
        from propdb.units import parse_quantity, parse_unit

        text = f"{value} {unit}" if unit else str(value)
        quantity = parse_quantity(text)
        record = resolve(self._reader, species)
        per = parse_unit(to_unit) if to_unit else quantity.unit
        levels = self._engine(source, extrapolate)
        answer = convert(
            levels,
            species=record,
            value=quantity.unit.to_si(quantity.value, molar_mass=record.molar_mass),
            given=f"{quantity.text} {quantity.unit.text}",
            source_datum=self.datum_show(from_),
            target_datum=self.datum_show(to),
            unit=per,
            stamp=self._stamp,
            phase=read_phase(phase) if phase else "g",
            temperature=None if temperature is None else read_temperature(temperature),
        )
        answer = self._with_changes(answer, levels.policy)
        return self._at_state(answer) if crosscheck else answer

    def reaction(
        self,
        equation: str,
        *,
        temperature: Temperature,
        datum: str = "elements-298K",
        unit: str = "kJ/mol",
        source: str | None = None,
        extrapolate: bool = False,
        crosscheck: bool = False,
    ) -> ReactionAnswer:
        """Enthalpy of a reaction by the formation route and by sensible heats plus heat of reaction.

        Parameters
        ----------
        equation : str
            Balanced, each species with its phase: ``CO(g) + 1/2 O2(g) -> CO2(g)``.
        temperature : str or float
            Of all species; a number is in K.
        datum : str
            An elements or basis-species datum; the heat of reaction is the same on each.
        unit : str
            Per mole of reaction as written: ``kJ/mol``.

        Raises
        ------
        DatumMismatch
            An own-state datum, on which enthalpies may not be summed across a reaction.
        Unbalanced
            With the imbalance of each element and of charge.
        FormulaError
            An equation that cannot be read.
        PropdbError
            As :meth:`enthalpy`.
        """
        from propdb.levels.reactions import Participant, reaction
        from propdb.levels.typed import read_phase, read_temperature
        from propdb.model.equation import imbalance, parse_equation
        from propdb.units import parse_unit

        parsed = parse_equation(equation)
        t = read_temperature(temperature)
        per = parse_unit(unit)
        if per.basis == "mass":
            raise InvalidInput(f"a heat of reaction in {per.text}", hint="it is per mole of reaction: use kJ/mol")
        participants = []
        for coefficient, term in parsed.signed:
            record = resolve(self._reader, term.name)
            if not term.phase:
                raise InvalidInput(
                    f"{term.name} has no phase in the equation", hint=f"write e.g. {term.name}(g) or {term.name}(l)"
                )
            participants.append(Participant(coefficient, record, State(read_phase(term.phase), t, term.form)))
        excess = imbalance((p.coefficient, dict(p.species.composition), p.species.charge) for p in participants)
        if excess:
            shown = ", ".join(f"{what} {'+' if n > 0 else ''}{n}" for what, n in sorted(excess.items()))
            raise Unbalanced(
                f"the equation does not balance: products less reactants {shown}",
                hint="correct the coefficients",
                imbalance={what: str(n) for what, n in excess.items()},
            )
        levels = self._engine(source, extrapolate)
        answer = reaction(
            levels,
            equation=str(parsed),
            participants=participants,
            temperature=t,
            datum=self.datum_show(datum),
            unit=per,
            stamp=self._stamp,
        )
        answer = self._with_changes(answer, levels.policy)
        return self._at_state(answer) if crosscheck else answer
