"""ThermoML files for the tests, written by hand after the schema of the IUPAC standard. All numbers are invented."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

CITATION = (
    "<Citation><eType>journal</eType><eSourceType>Original</eSourceType><sAuthor>Nobody, A.</sAuthor>"
    "<sAuthor>Noone, B.</sAuthor><sPubName>Journal of Invented Numbers</sPubName><yrPubYr>2011</yrPubYr>"
    "<sTitle>Invented numbers of invented samples</sTitle><sDOI>10.9999/invented.1</sDOI><sVol>1</sVol>"
    "<sPage>1-2</sPage></Citation>"
)
VERSION = "<Version><nVersionMajor>4</nVersionMajor><nVersionMinor>0</nVersionMinor></Version>"
HEAT_CAPACITY = "Molar heat capacity at constant pressure, J/K/mol"
VAPORISATION = "Molar enthalpy of vaporization or sublimation, kJ/mol"
FUSION = "Molar enthalpy of transition or fusion, kJ/mol"
REACTION = "Molar enthalpy of reaction, kJ/mol"
DENSITY = "Mass density, kg/m3"
FORMATION = "Formation of a compound from elements in their stable state"
_GROUPS = {
    HEAT_CAPACITY: "HeatCapacityAndDerivedProp",
    VAPORISATION: "PhaseTransition",
    FUSION: "PhaseTransition",
    REACTION: "ReactionStateChangeProp",
    DENSITY: "VolumetricProp",
}


def compound(number: int, name: str = "", formula: str = "", cas: str = "", key: str = "") -> str:
    """A compound; CAS RN as the schema has it, an integer."""
    cas = f"<nCASRNum>{cas.replace('-', '')}</nCASRNum>" if cas else ""
    parts = (("sStandardInChIKey", key), ("sCommonName", name), ("sFormulaMolec", formula))
    inner = "".join(f"<{tag}>{text}</{tag}>" for tag, text in parts if text)
    return f"<Compound><RegNum>{cas}<nOrgNum>{number}</nOrgNum></RegNum>{inner}</Compound>"


ETHANOL = compound(1, "ethanol", "C2H6O", "64-17-5", "LFQSCWFLJHTTHZ-UHFFFAOYSA-N")
INVENTANE = compound(2, "inventane", "C30H62O7")


def uncertainty(
    value: str = "", *, tag: str = "Expand", level: str = "", coverage: str = "", combined: bool = True
) -> str:
    """An uncertainty, of a value or (without one) of the property."""
    start = "nComb" if combined else "n"
    outer = "CombinedUncertainty" if combined else "PropUncertainty"
    inner = f"<{start}UncertAssessNum>1</{start}UncertAssessNum>"
    if level:
        inner += f"<{start}UncertLevOfConfid>{level}</{start}UncertLevOfConfid>"
    if coverage:
        inner += f"<{start}CoverageFactor>{coverage}</{start}CoverageFactor>"
    if value:
        inner += f"<{start}{tag}UncertValue>{value}</{start}{tag}UncertValue>"
    return f"<{outer}>{inner}</{outer}>"


def data_set(
    name: str,
    phase: str,
    values: Iterable[Sequence[str]],
    *,
    number: int = 1,
    of: Sequence[int] = (1,),
    phases: Sequence[str] = (),
    pressure: str = "101.3",
    stated: str = "",
    variable: str = "Temperature, K",
    reaction: str = "",
    members: str = "",
    presentation: str = "Direct value, X",
) -> str:
    """``values``: temperature, value, and elements of uncertainty."""
    group = _GROUPS.get(name, "VolumetricProp")
    outer = "ReactionData" if reaction else "PureOrMixtureData"
    count = "nReactionDataNumber" if reaction else "nPureOrMixtureDataNumber"
    who = members or "".join(f"<Component><RegNum><nOrgNum>{one}</nOrgNum></RegNum></Component>" for one in of)
    kind = f"<eReactionType>{reaction}</eReactionType>" if reaction else ""
    prop = (
        f"<Property><nPropNumber>1</nPropNumber><Property-MethodID><PropertyGroup><{group}><ePropName>{name}</ePropName>"
        f"<eMethodName>Invented calorimetry</eMethodName></{group}></PropertyGroup></Property-MethodID>"
        f"<PropPhaseID><ePropPhase>{phase}</ePropPhase></PropPhaseID><ePresentation>{presentation}</ePresentation>"
        f"{stated}</Property>"
    )
    listed = "".join(f"<PhaseID><ePhase>{one}</ePhase></PhaseID>" for one in phases)
    held = (
        "<Constraint><nConstraintNumber>1</nConstraintNumber><ConstraintID><ConstraintType><ePressure>Pressure, kPa"
        f"</ePressure></ConstraintType></ConstraintID><nConstraintValue>{pressure}</nConstraintValue></Constraint>"
        if pressure
        else ""
    )
    varied = (
        "<Variable><nVarNumber>1</nVarNumber><VariableID><VariableType><eTemperature>"
        f"{variable}</eTemperature></VariableType></VariableID></Variable>"
    )
    rows = "".join(
        f"<NumValues><VariableValue><nVarNumber>1</nVarNumber><nVarValue>{t}</nVarValue></VariableValue>"
        f"<PropertyValue><nPropNumber>1</nPropNumber><nPropValue>{value}</nPropValue>{''.join(rest)}</PropertyValue>"
        "</NumValues>"
        for t, value, *rest in values
    )
    return f"<{outer}><{count}>{number}</{count}>{who}{kind}{prop}{listed}{held}{varied}{rows}</{outer}>"


def participant(number: int, count: str, phase: str) -> str:
    """A member of a reaction."""
    return (
        f"<Participant><RegNum><nOrgNum>{number}</nOrgNum></RegNum><nStoichiometricCoef>{count}</nStoichiometricCoef>"
        f"<ePhase>{phase}</ePhase></Participant>"
    )


def report(*parts: str, compounds: str = ETHANOL + INVENTANE, version: str = VERSION, citation: str = CITATION) -> str:
    """A whole file."""
    return (
        '<?xml version="1.0" encoding="UTF-8"?>\n<!-- All numbers are invented. -->\n'
        '<DataReport xmlns="http://www.iupac.org/namespaces/ThermoML">\n'
        f"{version}\n{citation}\n{compounds}\n" + "\n".join(parts) + "\n</DataReport>\n"
    )


def curve(**options: object) -> str:
    """A liquid heat capacity of ethanol at three temperatures."""
    values = [("290", "110.0"), ("300", "113.0"), ("310", "116.5")]
    return data_set(HEAT_CAPACITY, "Liquid", values, phases=("Liquid",), **options)  # type: ignore[arg-type]
