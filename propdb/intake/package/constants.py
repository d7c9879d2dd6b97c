"""Readers of constants: formation enthalpies, entropies, latent heats, triple and critical points."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any, Final

from propdb.intake.package.registry import Draft
from propdb.intake.package.sheet import Row, Sheet

__all__ = [
    "albahri_gas",
    "atct",
    "crc_critical",
    "crc_fusion",
    "crc_ions",
    "crc_standard",
    "crc_vaporisation",
    "critical",
    "form_in",
    "gharagheizi_sublimation",
    "gharagheizi_vaporisation",
    "janaf_constants",
    "staveley_triple",
    "yaws_gas",
]

DATUM: Final = "elements-298K"
STATIONARY: Final = "elements-298K-electron-stationary"
REAL: Final = "to the real vapour"
IDEAL: Final = "standard, to the ideal gas"
MONOMER: Final = "to the monomer ideal gas"

#: What stands in brackets behind a name, and is a form. American and Greek spellings, and those that the seed uses.
_FORMS: Final = {
    "gray": "grey",
    "α": "alpha",
    "β": "beta",
    "γ": "gamma",
    "α-quartz": "quartz",
    "quartz, α": "quartz",
    "quartz, β": "beta-quartz",
    "cristobalite, α": "alpha-cristobalite",
    "cristobalite, β": "beta-cristobalite",
    "δ": "delta",
    "βγ": "beta-gamma",
}
_KNOWN_FORMS: Final = frozenset(
    "alpha beta gamma delta beta-gamma graphite diamond rhombic monoclinic white red black grey yellow hexagonal"
    " quartz beta-quartz alpha-cristobalite beta-cristobalite calcite aragonite valentinite senarmontite rutile anatase"
    " brookite wurtzite sphalerite cubic orthorhombic tetragonal tridymite cristobalite corundum cinnabar orthoclase"
    " microcline wollastonite pseudowollastonite sillimanite andalusite disthene mullite anorthite albite diopside"
    " pyroxene amphibole litharge massicot".split()
)
#: One form, two words: (species of the seed, the file's word) to the seed's word.
_SAME: Final = {
    ("aluminium oxide", "alpha"): "corundum",
    ("phosphorus", "yellow"): "white",
    ("calcium carbonate", "alpha"): "calcite",
    ("selenium", "grey"): "",
    ("antimony", "grey"): "",
}


def form_in(draft: Draft, text: str) -> str:
    """The form that a text names, as the seed spells it; "" where it names none."""
    word = re.sub(r"[- ]form$", "", text.strip().lower())
    word = _FORMS.get(word, word)
    word = _SAME.get((draft.name, word), word)
    return word if word in _KNOWN_FORMS else ""


def _form_of_name(draft: Draft, name: str) -> str:
    found = re.search(r"\(([^()]*)\)\s*$", name.strip())
    return form_in(draft, found.group(1)) if found else ""


def _reference_form(sheet: Sheet, draft: Draft, *, melting: bool = False) -> str:
    """Form of an element's crystal that its table does not name: the one of its schedule at 298.15 K, or at melting."""
    if len(draft.counts) != 1 or draft.charge:
        return ""
    stages = sheet.context.elements.get(draft.counts[0][0], {}).get("forms", ())
    crystals = [stage for stage in stages if stage["species"] == draft.name and stage["phase"] == "cr"]
    return str(crystals[-1 if melting else 0].get("form", "")) if crystals else ""


def crystal_form(sheet: Sheet, draft: Draft, name: str, form: str, *, melting: bool = False) -> str:
    """The form that a row is about: by its CAS RN, by its name, or the reference form of an element."""
    return form or _form_of_name(draft, name) or _reference_form(sheet, draft, melting=melting)


def atct(phase: str) -> Callable[[Sheet, Row], None]:
    """ATcT: formation enthalpies at 298.15 K and 0 K, 95 % uncertainty."""

    def read(sheet: Sheet, row: Row) -> None:
        draft, _ = sheet.place(row.text("CAS"), row.text("Chemical"), row.text("Formula"))
        doubt = sheet.number("uncertainty")
        doubt = doubt or None  # exactly 0 by definition of the elements: no uncertainty is meant
        shown: dict[str, Any] = {"uncertainty": doubt, "kind": "expanded-95"}
        sheet.constant(draft, "Hf", phase, f"Hf{phase}", datum=STATIONARY if draft.charge else DATUM, **shown)
        if phase == "g":
            sheet.constant(draft, "Hf", "g", "Hfg_0K", temperature=0.0, datum="elements-0K", **shown)
        elif row.text("Hfl_0K"):
            sheet.refuse("liquid at 0 K", "no liquid exists at 0 K, and the file does not say what is meant", "Hfl_0K")

    return read


def janaf_constants(sheet: Sheet, row: Row) -> None:
    """JANAF: liquids and gases at 298.15 K, 1 bar; the electron as an ideal gas with heat capacity."""
    sheet.context.janaf[row.text("CAS")] = (row.text("Chemical"), row.text("formula"))
    draft, _ = sheet.place(row.text("CAS"), row.text("Chemical"), row.text("formula"))
    _four(sheet, draft, {"l": "l", "g": "g"}, "")


def crc_standard(sheet: Sheet, row: Row) -> None:
    """CRC: crystal, liquid and gas at 298.15 K, 1 bar."""
    draft, form = sheet.place(row.text("CAS"), row.text("Chemical"))
    _four(sheet, draft, {"s": "cr", "l": "l", "g": "g"}, crystal_form(sheet, draft, row.text("Chemical"), form))


def _four(sheet: Sheet, draft: Draft, phases: dict[str, str], form: str) -> None:
    for letter, phase in phases.items():
        own = form if phase == "cr" else ""
        sheet.constant(draft, "Hf", phase, f"Hf{letter}", datum=DATUM, form=own)
        sheet.constant(draft, "Gf", phase, f"Gf{letter}", datum=DATUM, form=own)
        sheet.constant(draft, "S", phase, f"S0{letter}", form=own)
        sheet.constant(draft, "Cp", phase, f"Cp{letter}", form=own)


def crc_ions(sheet: Sheet, row: Row) -> None:
    """CRC: ions at infinite dilution, 298.15 K; the hydrogen ion is 0."""
    draft, _ = sheet.place(row.text("CAS"), row.text("Name"), row.text("Formula"))
    sheet.constant(draft, "Hf", "aq", "Hf(aq)", datum=DATUM)
    sheet.constant(draft, "Gf", "aq", "Gf(aq)", datum=DATUM)
    sheet.constant(draft, "S", "aq", "S(aq)")
    sheet.constant(draft, "Cp", "aq", "Cp(aq)")


def albahri_gas(sheet: Sheet, row: Row) -> None:
    """Formation enthalpies of gases after the API Technical Data Book."""
    draft, _ = sheet.place(row.text("CAS"), row.text("Compound"))
    sheet.constant(draft, "Hf", "g", "Hfg", datum=DATUM)


def yaws_gas(sheet: Sheet, row: Row) -> None:
    """Yaws: formation enthalpies and entropies of gases, many of them estimates."""
    draft, _ = sheet.place(row.text("CAS"), row.text("name"))
    sheet.constant(draft, "Hf", "g", "Hfg", datum=DATUM, status="estimate")
    sheet.constant(draft, "S", "g", "S0g", status="estimate")


def crc_vaporisation(sheet: Sheet, row: Row) -> None:
    """CRC: boiling point, and enthalpies of vaporisation there and at 298.15 K, to the real vapour."""
    draft, _ = sheet.place(row.text("CAS"), row.text("Chemical"), row.text("Formula"))
    boiling = sheet.number("Tb")
    sheet.constant(draft, "Tb", "l", "Tb", temperature=None, conditions="at 101.325 kPa")
    if boiling is None and row.text("HvapTb"):
        sheet.refuse("no temperature", "an enthalpy at the boiling point without the boiling point", "HvapTb")
    else:
        sheet.constant(draft, "Hvap", "l", "HvapTb", temperature=boiling, conditions=REAL)
    sheet.constant(draft, "Hvap", "l", "Hvap298", conditions=REAL)


def crc_fusion(sheet: Sheet, row: Row) -> None:
    """CRC: enthalpies of fusion at the melting point, which the file does not give."""
    name = row.text("Chemical")
    draft, form = sheet.place(row.text("CAS"), name, row.text("Formula"))
    sheet.constant(
        draft,
        "Hfus",
        "cr",
        "Hfus",
        temperature=None,
        conditions="at the melting point",
        form=crystal_form(sheet, draft, name, form, melting=True),
    )


def gharagheizi_vaporisation(sheet: Sheet, row: Row) -> None:
    """Standard enthalpies of vaporisation at 298.15 K."""
    draft, _ = sheet.place(row.text("CAS"), row.text("Chemical"))
    conditions = MONOMER if draft.vapour == "associating" else IDEAL
    sheet.constant(draft, "Hvap", "l", "Hvap298", conditions=conditions)


def gharagheizi_sublimation(sheet: Sheet, row: Row) -> None:
    """Standard enthalpies of sublimation at 298.15 K."""
    draft, form = sheet.place(row.text("CAS"), row.text("Chemical"))
    conditions = MONOMER if draft.vapour == "associating" else IDEAL
    form = crystal_form(sheet, draft, row.text("Chemical"), form)
    doubt = sheet.number("error")
    sheet.constant(
        draft, "Hsub", "cr", "Hsub", conditions=conditions, form=form, uncertainty=doubt or None, kind="expanded-95"
    )


def staveley_triple(sheet: Sheet, row: Row) -> None:
    """Triple points, taken for melting points."""
    draft, _ = sheet.place(row.text("CAS"), row.text("Chemical"))
    sheet.constant(draft, "Tm", "cr", "Tt", temperature=None, conditions="triple point")


def critical(sheet: Sheet, row: Row) -> None:
    """Critical temperature and pressure, and the acentric factor where there is one."""
    draft, _ = sheet.place(row.text("CAS"), row.text("Chemical"))
    sheet.constant(draft, "Tc", "l", "Tc", temperature=None)
    sheet.constant(draft, "Pc", "l", "Pc", temperature=None)
    if "omega" in row.cells:
        sheet.constant(draft, "omega", "l", "omega", temperature=None)


def crc_critical(sheet: Sheet, row: Row) -> None:
    """CRC: critical temperature and pressure with their errors."""
    draft, _ = sheet.place(row.text("CAS"), row.text("Chemical"))
    for quantity in ("Tc", "Pc"):
        doubt = sheet.number(f"{quantity}_error")
        sheet.constant(draft, quantity, "l", quantity, temperature=None, uncertainty=doubt or None, kind="expanded-95")
