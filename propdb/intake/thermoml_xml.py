"""A ThermoML file to plain records: what it says, before anything is made of it.

Element names and their order are those of the schema of the IUPAC standard: M. Frenkel et al., "XML-based IUPAC
standard for experimental, predicted, and critically evaluated thermodynamic property data storage and capture
(ThermoML)", Pure Appl. Chem. 78 (2006), and its update of 2011.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from typing import Any

from propdb.errors import InvalidInput
from propdb.intake.files import UserFile
from propdb.intake.plan import control_character
from propdb.intake.thermoml_records import (
    Citation,
    Compound,
    Condition,
    DataSet,
    Document,
    Property,
    Uncertainty,
    Value,
)

__all__ = ["NAMESPACE", "VERSIONS", "read_xml"]

NAMESPACE = "http://www.iupac.org/namespaces/ThermoML"
#: Major numbers of the published schema versions.
VERSIONS = (2, 3, 4)
_NUMBER = re.compile(r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_MAX_TEXT = 2000


def read_xml(file: UserFile) -> Document:
    """Read a ThermoML file. Nothing outside it is looked up, and no entity is expanded.

    Raises
    ------
    InvalidInput
        The optional dependency is missing; not XML; declares a document type or entities; not ThermoML of a known
        version; without a citation; an element that the schema asks for is missing.
    """
    root = _parse(file)
    if _local(root.tag) != "DataReport":
        raise InvalidInput(
            f"the root element is {_local(root.tag)!r:.60}", where=file.name, hint="ThermoML: DataReport"
        )
    namespace = root.tag.partition("}")[0].lstrip("{") if "}" in root.tag else ""
    if namespace not in ("", NAMESPACE):
        raise InvalidInput(f"the namespace is {namespace[:80]!r}", where=file.name, hint=f"ThermoML has {NAMESPACE}")
    reader = _Reader(file.name)
    version = reader.version(root)
    citation = reader.citation(root)
    compounds = {one.number: one for one in map(reader.compound, _children(root, "Compound"))}
    data = []
    for name, title in (("PureOrMixtureData", "data set"), ("ReactionData", "reaction")):
        for index, node in enumerate(_children(root, name), start=1):
            data.append(reader.data_set(node, title, index, compounds))
    return Document(file.name, version, citation, compounds, tuple(data))


def _parse(file: UserFile) -> Any:
    try:
        from defusedxml import DefusedXmlException
        from defusedxml.ElementTree import ParseError, fromstring
    except ImportError:
        raise InvalidInput(
            "reading ThermoML needs the package defusedxml", where=file.name, hint='pip install "propdb[thermoml]"'
        ) from None
    try:
        return fromstring(file.text, forbid_dtd=True)  # text that is UTF-8, whatever encoding it declares
    except DefusedXmlException:
        raise InvalidInput(
            "the file declares a document type or entities", where=file.name, hint="ThermoML has none; remove them"
        ) from None
    except ParseError as error:
        line, column = error.position
        where = f"{file.name}, line {line}, column {column + 1}"
        raise InvalidInput(f"is not XML: {str(error).partition(':')[0]}", where=where, hint="check the file") from None
    except (ValueError, LookupError, RecursionError) as error:
        raise InvalidInput(f"is not XML that is read here: {error}", where=file.name, hint="save it as UTF-8") from None


# -- elements ---------------------------------------------------------------------------------------------------------


def _local(tag: Any) -> str:
    return str(tag).rpartition("}")[2]


def _children(node: Any, *names: str) -> Iterator[Any]:
    return (child for child in node if _local(child.tag) in names)


def _child(node: Any, name: str) -> Any:
    return next(_children(node, name), None)


def _leaf(node: Any, *path: str) -> str:
    for name in path:
        if node is None:
            return ""
        node = _child(node, name)
    return "" if node is None else " ".join((node.text or "").split())


def _deep(node: Any, name: str) -> Any:
    return next((child for child in node.iter() if _local(child.tag) == name), None)


class _Reader:
    """Elements to records, with the name of the file in every complaint."""

    def __init__(self, file: str) -> None:
        self.file = file

    def bad(self, place: str, problem: str, hint: str = "") -> InvalidInput:
        return InvalidInput(problem, where=", ".join(filter(None, (self.file, place))), hint=hint)

    def text(self, node: Any, place: str, *path: str, needed: bool = False) -> str:
        """Text of an element."""
        found = _leaf(node, *path)
        odd = control_character(found)
        if odd:
            raise self.bad(f"{place}, {path[-1]}", f"a control character {odd}", "leave it out")
        if len(found) > _MAX_TEXT:
            raise self.bad(f"{place}, {path[-1]}", f"a text of {len(found)} characters", f"at most {_MAX_TEXT}")
        if needed and not found:
            raise self.bad(place, f"{path[-1]} is missing", "the schema of ThermoML asks for it")
        return found

    def number(self, node: Any, place: str, *path: str, needed: bool = False) -> str:
        """Text of an element that holds a finite number; "" where it is missing."""
        found = self.text(node, place, *path, needed=needed)
        if found and (_NUMBER.fullmatch(found) is None or not math.isfinite(float(found))):
            comma = f"the decimal point is '.': {found.replace(',', '.')}" if found.count(",") == 1 else ""
            raise self.bad(f"{place}, {path[-1]}", f"{found[:40]!r} is not a number", comma or "write a finite number")
        return found

    def version(self, root: Any) -> str:
        """The version of the schema."""
        node = _child(root, "Version")
        major = self.number(node, "Version", "nVersionMajor", needed=True) if node is not None else ""
        minor = self.number(node, "Version", "nVersionMinor") if node is not None else ""
        known = f"known are versions {VERSIONS[0]} to {VERSIONS[-1]}"
        if not major:
            raise self.bad("", "the file does not say its version of ThermoML", known)
        if major not in map(str, VERSIONS) or not (minor or "0").isdigit() or len(minor) > 3:
            raise self.bad("Version", f"there is no ThermoML {major[:20]}.{(minor or '0')[:20]}", known)
        return f"{major}.{minor or 0}"

    def citation(self, root: Any) -> Citation:
        """Where the data appeared."""
        node = _child(root, "Citation")
        if node is None:
            raise self.bad("", "there is no Citation", "a value without a source is not taken")
        place = "Citation"
        authors = []
        for one in _children(node, "sAuthor"):
            name = " ".join((one.text or "").split())
            odd = control_character(name)
            if odd:
                raise self.bad("Citation, sAuthor", f"a control character {odd}", "leave it out")
            authors.append(name[:_MAX_TEXT])
        fields = {
            "journal": self.text(node, place, "sPubName"),
            "volume": self.text(node, place, "sVol"),
            "pages": self.text(node, place, "sPage"),
            "doi": self.text(node, place, "sDOI"),
            "url": self.text(node, place, "urlCit"),
        }
        year = self.text(node, place, "yrPubYr") or self.text(node, place, "TRCRefID", "yrYrPub")
        return Citation(
            title=self.text(node, place, "sTitle", needed=True),
            authors=tuple(filter(None, authors)),
            year=year,
            dated=self.text(node, place, "dateCit"),
            kind=self.text(node, place, "eType"),
            fields={name: text for name, text in fields.items() if text},
        )

    def compound(self, node: Any) -> Compound:
        """A compound."""
        number = self.text(node, "Compound", "RegNum", "nOrgNum", needed=True)
        place = f"compound {number}"
        cas = self.text(node, place, "RegNum", "nCASRNum") or self.text(node, place, "nCASRNum")
        if cas.isdigit() and 5 <= len(cas) <= 10:  # an integer in the schema: 64175 is 64-17-5
            cas = f"{cas[:-3]}-{cas[-3:-1]}-{cas[-1]}"
        names = []
        for child in _children(node, "sCommonName", "sIUPACName", "sCASName"):
            name = " ".join((child.text or "").split())
            odd = control_character(name)
            if odd:
                raise self.bad(f"{place}, {_local(child.tag)}", f"a control character {odd}", "leave it out")
            if name:
                names.append(name[:300])
        key = self.text(node, place, "sStandardInChIKey")
        formula = self.text(node, place, "sFormulaMolec")
        return Compound(number, cas, key, formula, tuple(dict.fromkeys(names)))

    def data_set(self, node: Any, title: str, index: int, compounds: dict[str, Compound]) -> DataSet:
        """One set of data."""
        given = _leaf(node, "nPureOrMixtureDataNumber") or _leaf(node, "nReactionDataNumber")
        number = int(given) if given.isdigit() and len(given) < 9 else index
        place = f"{title} {number}"
        members = []
        for child in _children(node, "Component", "Participant"):
            org = self.text(child, place, "RegNum", "nOrgNum", needed=True)
            if org not in compounds:
                raise self.bad(place, f"there is no compound {org[:20]!r}", "Compound, RegNum, nOrgNum lists them")
            count = self.number(child, place, "nStoichiometricCoef")
            members.append((org, count, self.text(child, place, "ePhase")))
        if not members:
            raise self.bad(place, "no compound is named", "the schema asks for Component or Participant")
        properties = tuple(self.property(child, place) for child in _children(node, "Property"))
        if not properties:
            raise self.bad(place, "there is no Property", "the schema of ThermoML asks for it")
        known = {one.number for one in properties}
        conditions = [self.constraint(child, place) for child in _children(node, "Constraint")]
        variables = [self.variable(child, place) for child in _children(node, "Variable")]
        values: list[Value] = []
        for row, child in enumerate(_children(node, "NumValues"), start=1):
            values.extend(self.row(child, f"{place}, NumValues {row}", row, known, {v.number for v in variables}))
        return DataSet(
            place=place,
            number=number,
            reaction=self.text(node, place, "eReactionType") if title == "reaction" else "",
            members=tuple(members),
            phases=tuple(self.text(child, place, "ePhase") for child in _children(node, "PhaseID")),
            properties=properties,
            conditions=(*conditions, *variables),
            values=tuple(values),
        )

    def property(self, node: Any, place: str) -> Property:
        """What is measured."""
        number = self.text(node, place, "nPropNumber", needed=True)
        place = f"{place}, property {number}"
        group = _deep(node, "PropertyGroup")
        inner = next(iter(group), None) if group is not None else None
        if inner is None:
            raise self.bad(place, "PropertyGroup is missing", "the schema of ThermoML asks for it")
        name, _, unit = self.text(inner, place, "ePropName", needed=True).rpartition(", ")
        phase = next((self.text(child, place, "ePropPhase") for child in _children(node, "PropPhaseID")), "")
        return Property(
            number=number,
            name=name or unit,
            unit=unit if name else "",
            method=self.text(inner, place, "eMethodName") or self.text(inner, place, "sMethodName"),
            phase=phase,
            presentation=self.text(node, place, "ePresentation"),
            uncertainties=self.uncertainties(node, place),
        )

    def uncertainties(self, node: Any, place: str) -> tuple[Uncertainty, ...]:
        """What is said of uncertainty, combined ones first."""
        found = []
        for child in _children(node, "CombinedUncertainty", "PropUncertainty"):
            combined = _local(child.tag) == "CombinedUncertainty"
            start = "nComb" if combined else "n"
            found.append(
                Uncertainty(
                    combined=combined,
                    number=self.text(child, place, f"{start}UncertAssessNum"),
                    standard=self.number(child, place, f"{start}StdUncertValue"),
                    expanded=self.number(child, place, f"{start}ExpandUncertValue"),
                    level=self.number(child, place, f"{start}UncertLevOfConfid"),
                    coverage=self.number(child, place, f"{start}CoverageFactor"),
                )
            )
        return tuple(sorted(found, key=lambda one: not one.combined))

    def constraint(self, node: Any, place: str) -> Condition:
        """Something held constant."""
        what = self.kind(node, "ConstraintType", place)
        return Condition("", what, self.number(node, f"{place}, {what}", "nConstraintValue", needed=True))

    def variable(self, node: Any, place: str) -> Condition:
        """Something varied."""
        number = self.text(node, place, "nVarNumber", needed=True)
        return Condition(number, self.kind(node, "VariableType", place))

    def kind(self, node: Any, group: str, place: str) -> str:
        """``Temperature, K`` of the only child of a type."""
        found = _deep(node, group)
        inner = next(iter(found), None) if found is not None else None
        if inner is None:
            raise self.bad(place, f"{group} is missing", "the schema of ThermoML asks for it")
        return " ".join((inner.text or "").split())

    def row(self, node: Any, place: str, row: int, known: set[str], variables: set[str]) -> Iterator[Value]:
        """The values of one ``NumValues``."""
        at: dict[str, str] = {}
        for child in _children(node, "VariableValue"):
            number = self.text(child, place, "nVarNumber", needed=True)
            if number not in variables:
                raise self.bad(place, f"there is no variable {number[:20]!r}", "Variable, nVarNumber lists them")
            at[number] = self.number(child, place, "nVarValue", needed=True)
        for child in _children(node, "PropertyValue"):
            number = self.text(child, place, "nPropNumber", needed=True)
            if number not in known:
                raise self.bad(place, f"there is no property {number[:20]!r}", "Property, nPropNumber lists them")
            value = self.number(child, place, "nPropValue", needed=True)
            yield Value(row, number, value, at, self.uncertainties(child, place))
