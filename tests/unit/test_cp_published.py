"""Published values of heat capacities, enthalpies and entropies, and that a wrong coefficient would show.

Coefficients are typed from memory of the source named beside them and held to values of a second source.
"""

from __future__ import annotations

import copy
import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

import pytest

from propdb.cp import Equation, LatentHeat, build, h298_error, joint_errors

Params = dict[str, Any]


@dataclass(frozen=True)
class Check:
    """A number that an equation must give, with its source and half of what it may differ by."""

    what: str
    source: str
    value: float
    within: float
    of: Callable[[Any], float]


# --- nitrogen, nine coefficients ------------------------------------------------------------------------------------
# McBride, Zehe and Gordon (2002), NASA/TP-2002-211556, record N2.
NITROGEN_9: Params = {
    "intervals": [
        {
            "tmin": 200.0,
            "tmax": 1000.0,
            "a": [
                22103.71497,
                -381.846182,
                6.08273836,
                -0.00853091441,
                1.384646189e-05,
                -9.62579362e-09,
                2.519705809e-12,
            ],
            "b": [710.846086, -10.76003744],
        },
        {
            "tmin": 1000.0,
            "tmax": 6000.0,
            "a": [
                587712.406,
                -2239.249073,
                6.06694922,
                -0.00061396855,
                1.491806679e-07,
                -1.923105485e-11,
                1.061954386e-15,
            ],
            "b": [12832.10415, -15.86640027],
        },
        {
            "tmin": 6000.0,
            "tmax": 20000.0,
            "a": [
                831013916.0,
                -642073.354,
                202.0264635,
                -0.03065092046,
                2.486903333e-06,
                -9.70595411e-11,
                1.437538881e-15,
            ],
            "b": [4938707.04, -1672.09974],
        },
    ]
}

# The record's own checksums, and Chase (1998), NIST-JANAF Thermochemical Tables, 4th ed., nitrogen.
_JANAF = "Chase (1998), NIST-JANAF, 4th ed., N2(g)"
_RECORD = "the record itself"
NITROGEN_9_CHECKS = [
    Check("Hf(298.15 K)", _RECORD, 0.0, 0.02, lambda e: e.h(298.15)),
    Check("H(1000 K) - H(298.15 K)", _JANAF, 21463.0, 0.0015 * 21463.0, lambda e: e.dh(298.15, 1000.0)),
    Check("H(2000 K) - H(298.15 K)", _JANAF, 56137.0, 0.0015 * 56137.0, lambda e: e.dh(298.15, 2000.0)),
    Check("Cp(298.15 K)", _JANAF, 29.124, 0.002, lambda e: e.cp(298.15)),
    Check("S(298.15 K)", _JANAF, 191.609, 0.005, lambda e: e.s(298.15)),
    Check("S(1000 K)", _JANAF, 228.170, 0.01, lambda e: e.s(1000.0)),
    *(
        Check(f"{what} at joint {n}", _RECORD, 0.0, 2e-6, lambda e, n=n, what=what: getattr(joint_errors(e)[n], what))
        for n in (0, 1)
        for what in ("cp", "h", "s")
    ),
]

# --- nitrogen, seven coefficients -----------------------------------------------------------------------------------
# Smith et al. (1999), GRI-Mech 3.0 thermodynamic file, record N2 (computed with R = 8.314510).
NITROGEN_7: Params = {
    "intervals": [
        {
            "tmin": 300.0,
            "tmax": 1000.0,
            "a": [3.298677, 1.4082404e-3, -3.963222e-6, 5.641515e-9, -2.444854e-12],
            "b": [-1020.8999, 3.950372],
        },
        {
            "tmin": 1000.0,
            "tmax": 5000.0,
            "a": [2.92664, 1.4879768e-3, -5.68476e-7, 1.0097038e-10, -6.753351e-15],
            "b": [-922.7977, 5.980528],
        },
    ]
}
NITROGEN_7_CHECKS = [
    # the record begins at 300 K; continued to 298.15 K it gives 1.43 J/mol
    Check("Hf(298.15 K)", _RECORD, 0.0, 2.0, lambda e: e.h(298.15)),
    Check("H(1000 K) - H(298.15 K)", _JANAF, 21463.0, 0.0015 * 21463.0, lambda e: e.dh(298.15, 1000.0)),
    Check("S(298.15 K)", _JANAF, 191.609, 0.1, lambda e: e.s(298.15)),
    *(
        Check(f"{what} at the joint", _RECORD, 0.0, 2e-6, lambda e, what=what: getattr(joint_errors(e)[0], what))
        for what in ("cp", "h", "s")
    ),
]

# --- carbon dioxide, Shomate ----------------------------------------------------------------------------------------
# Fit to Chase (1998), NIST-JANAF, 4th ed., 298 to 1200 K.
CARBON_DIOXIDE: Params = {
    "intervals": [
        {
            "tmin": 298.0,
            "tmax": 1200.0,
            "coefficients": [
                24.99735, 55.18696, -33.69137, 7.948387, -0.136638, -403.6075, 228.2431, -393.5224,
            ],
        }
    ]
}  # fmt: skip
_JANAF_CO2 = "Chase (1998), NIST-JANAF, 4th ed., CO2(g)"
CARBON_DIOXIDE_CHECKS = [
    Check("Cp(298.15 K)", _JANAF_CO2, 37.129, 0.01, lambda e: e.cp(298.15)),
    Check("Cp(1000 K)", _JANAF_CO2, 54.308, 0.01, lambda e: e.cp(1000.0)),
    Check("H(1000 K) - H(298.15 K)", _JANAF_CO2, 33397.0, 20.0, lambda e: e.dh(298.15, 1000.0)),
    Check("Hf(298.15 K)", _JANAF_CO2, -393522.0, 20.0, lambda e: e.h(298.15)),
    Check("S(1000 K)", _JANAF_CO2, 269.299, 0.03, lambda e: e.s(1000.0)),
]

# --- methane, a handbook polynomial ---------------------------------------------------------------------------------
# Smith, Van Ness and Abbott, Introduction to Chemical Engineering Thermodynamics, table of ideal-gas heat capacities:
# Cp/R = 1.702 + 9.081e-3 T - 2.164e-6 T^2, and the worked example that heats methane from 260 to 600 C: 19 778 J/mol.
_R = 8.314
METHANE: Params = {
    "exponents": [0, 1, 2],
    "coefficients": [1.702 * _R, 9.081e-3 * _R, -2.164e-6 * _R],
    "tmin": 298.15,
    "tmax": 1500.0,
}
METHANE_CHECKS = [
    Check("260 C to 600 C", "Smith, Van Ness and Abbott", 19778.0, 2.0, lambda e: e.dh(533.15, 873.15)),
]

# --- nitrogen, the table itself -------------------------------------------------------------------------------------
NITROGEN_TABLE: Params = {
    "T": [298.15, 300.0, 350.0, 400.0, 450.0, 500.0, 600.0, 700.0, 800.0, 900.0, 1000.0],
    "cp": [29.124, 29.125, 29.165, 29.249, 29.387, 29.580, 30.110, 30.754, 31.433, 32.090, 32.697],
}
NITROGEN_TABLE_CHECKS = [
    # printed to 0.001 kJ/mol and 0.001 J/mol/K; the cp of the table are rounded too
    Check("Cp(298.15 K)", _JANAF, 29.124, 0.0005, lambda e: e.cp(298.15)),
    Check("H(400 K) - H(298.15 K)", _JANAF, 2971.0, 1.0, lambda e: e.h(400.0)),
    Check("H(500 K) - H(298.15 K)", _JANAF, 5911.0, 1.0, lambda e: e.h(500.0)),
    Check("H(600 K) - H(298.15 K)", _JANAF, 8894.0, 1.5, lambda e: e.h(600.0)),
    Check("H(1000 K) - H(298.15 K)", _JANAF, 21463.0, 1.5, lambda e: e.h(1000.0)),
    Check("S(1000 K) - S(298.15 K)", _JANAF, 228.170 - 191.609, 0.003, lambda e: e.s(1000.0)),
]

# --- water, Watson --------------------------------------------------------------------------------------------------
# Smith, Van Ness and Abbott, worked example: 2257 J/g at 100 C gives 1371 J/g at 300 C, with Tr = 0.577 and 0.886
# as rounded there: 0.0005 in 1 - 0.886 moves the result by 0.17 %.
_M = 18.015
WATER: Params = {"dh": 2257.0 * _M, "T1": 373.15, "Tc": 647.1, "exponent": 0.38}
WATER_CHECKS = [
    Check("at 300 C", "Smith, Van Ness and Abbott", 1371.0 * _M, 0.002 * 1371.0 * _M, lambda e: e.dh(573.15)),
    Check("at 100 C", "the point given", 2257.0 * _M, 1e-6, lambda e: e.dh(373.15)),
]

# --- gases by the equation of the Thermodynamics Research Center ---------------------------------------------------
# Frenkel et al. (1994), Thermodynamics of Organic Compounds in the Gas State, against the tables of Chase (1998),
# NIST-JANAF, 4th ed.; both as carried by the chemicals library 1.5.2. CF4 without its constant I, ClO2 without its J.
_JANAF_TABLES = "Chase (1998), NIST-JANAF, 4th ed."
TETRAFLUOROMETHANE: Params = {
    "a": [4.0, 283000.0, 504.0, 11.638, -2.554, -3270000.0, 124.0, 100.0],
    "tmin": 50.0,
    "tmax": 3000.0,
    "J": 7.08,
}
TETRAFLUOROMETHANE_CHECKS = [
    Check("S(298.15 K)", _JANAF_TABLES, 261.419, 0.05, lambda e: e.s(298.15)),
    *(
    # the fit is less close below 250 K
    Check(f"Cp({t} K)", _JANAF_TABLES, cp, (0.0005 if t > 250.0 else 0.0015) * cp, lambda e, t=t: e.cp(t))
    for t, cp in [(100.0, 34.745), (200.0, 47.370), (298.15, 61.054), (400.0, 72.400), (500.0, 80.712), (700.0, 91.209),
                  (1000.0, 98.797), (1500.0, 103.669), (2000.0, 105.540), (3000.0, 106.935)]
    ),
]  # fmt: skip
# The full equation, with constants: ClO2 is the example of the library's own functions for it.
_LIBRARY = "chemicals 1.5.2, heat_capacity: an implementation of its own"
CHLORINE_DIOXIDE: Params = {
    "a": [4.0, 765000.0, 720.0, 3.565, -0.052, -1550000.0, 52.0, 201.0],
    "tmin": 50.0,
    "tmax": 3000.0,
    "I": 1.2,
}
CHLORINE_DIOXIDE_CHECKS = [
    Check("Cp(300 K)", _LIBRARY, 42.065271080974654, 1e-9, lambda e: e.cp(300.0)),
    Check("H(298.15 K) - H(0 K)", _LIBRARY, 10802.536262068483, 1e-6, lambda e: e.h(298.15)),
    Check("Cp(298.15 K)", _JANAF_TABLES, 41.995, 0.02, lambda e: e.cp(298.15)),
]

# --- steam by hyperbolic functions ----------------------------------------------------------------------------------
# Perry's Chemical Engineers' Handbook, 8th ed. (2007), ideal-gas heat capacities, water; typed from memory of it.
STEAM: Params = {"coefficients": [33.363, 26.790, 2610.5, 8.896, 1169.0], "tmin": 100.0, "tmax": 2273.15}
_JANAF_H2O = "Chase (1998), NIST-JANAF, 4th ed., H2O(g)"
STEAM_CHECKS = [
    Check("Cp(298.15 K)", _JANAF_H2O, 33.590, 0.02, lambda e: e.cp(298.15)),
    Check("Cp(500 K)", _JANAF_H2O, 35.226, 0.01, lambda e: e.cp(500.0)),
    Check("Cp(1000 K)", _JANAF_H2O, 41.268, 0.08, lambda e: e.cp(1000.0)),
    Check("H(1000 K) - H(298.15 K)", _JANAF_H2O, 26000.0, 0.001 * 26000.0, lambda e: e.dh(298.15, 1000.0)),
    Check("H(2000 K) - H(298.15 K)", _JANAF_H2O, 72790.0, 0.001 * 72790.0, lambda e: e.dh(298.15, 2000.0)),
    Check("S(1000 K) - S(298.15 K)", _JANAF_H2O, 232.738 - 188.834, 0.04, lambda e: e.ds(298.15, 1000.0)),
]

# --- liquids --------------------------------------------------------------------------------------------------------
# Zabransky et al. (1996), as carried by the chemicals library; CRC Handbook, 95th ed., Cp of liquids at 298.15 K.
WATER_CUBIC: Params = {"a": [20.9634, -10.1344, 2.8253, -0.256738], "tmin": 273.6, "tmax": 380.0}
WATER_CUBIC_CHECKS = [
    Check("Cp(298.15 K)", "CRC Handbook, 95th ed.", 75.3, 0.05, lambda e: e.cp(298.15)),
    Check("H(373.15 K) - H(298.15 K)", "IAPWS-95: 419.17 less 104.92 J/g", 5661.2, 8.0, lambda e: e.dh(298.15, 373.15)),
]
TOLUENE: Params = {
    "a": [-3.12743, 0.0857315, 13.7282, 1.28971, 6.42297, 4.10989],
    "Tc": 591.79,
    "tmin": 162.0,
    "tmax": 570.0,
}
TOLUENE_CHECKS = [
    Check("Cp(298.15 K)", "CRC Handbook, 95th ed.", 157.3, 0.3, lambda e: e.cp(298.15)),
    Check("Cp(330 K)", _LIBRARY, 165.472878778683, 1e-9, lambda e: e.cp(330.0)),
    Check("H(300 K) - H(200 K)", _LIBRARY, 14662.031376528757, 1e-6, lambda e: e.dh(200.0, 300.0)),
]
# Perry's Handbook, 8th ed. (2007), table 2-153 and Tc of table 2-150, as carried by the chemicals library.
HEPTANE: Params = {
    "coefficients": [61.26, 314410.0, 1824.6, -2547.9],
    "Tc": 540.2,
    "tmin": 182.57,
    "tmax": 520.0,
    "scale": 0.001,
}
HEPTANE_CHECKS = [
    Check("Cp(298.15 K)", "CRC Handbook, 95th ed.", 224.7, 0.4, lambda e: e.cp(298.15)),
]

# --- enthalpies of vaporisation -------------------------------------------------------------------------------------
# Perry's Handbook, 8th ed., table 2-150, and VDI Heat Atlas, 2nd ed. (2010), as carried by the chemicals library.
# IAPWS-95 at saturation [J/g]; Perry's fit departs from it by up to 0.4 % over this range, and 0.7 % at 0 C.
_IAPWS = "IAPWS-95, saturation"
WATER_PERRY: Params = {
    "coefficients": [52053.0, 0.3199, -0.212, 0.25795], "Tc": 647.096, "tmin": 273.16, "tmax": 647.096,
}  # fmt: skip
WATER_PERRY_CHECKS = [
    Check(f"at {t} K", _IAPWS, dh * 18.015268, 0.005 * dh * 18.015268, lambda e, t=t: e.dh(t))
    for t, dh in [(298.15, 2441.7), (373.15, 2256.4), (473.15, 1939.7), (573.15, 1404.8), (623.15, 892.7)]
]
TOLUENE_VDI: Params = {"coefficients": [4.60584, 13.97224, -10.592315, 2.120205, 4.277128], "Tc": 591.75}
_CRC_VAPORISATION = "CRC Handbook, 95th ed., enthalpy of vaporisation"
TOLUENE_VDI_CHECKS = [
    Check(
        "at 300 K",
        "chemicals 1.5.2, phase_change: an implementation of its own",
        37948.76862035925,
        1e-6,
        lambda e: e.dh(300.0),
    ),
    Check("at 298.15 K", _CRC_VAPORISATION, 38010.0, 150.0, lambda e: e.dh(298.15)),
    Check("at 383.78 K", _CRC_VAPORISATION, 33180.0, 150.0, lambda e: e.dh(383.78)),
]

CASES: dict[str, tuple[str, Params, list[Check]]] = {
    "nitrogen by nine coefficients": ("nasa9", NITROGEN_9, NITROGEN_9_CHECKS),
    "nitrogen by seven coefficients": ("nasa7", NITROGEN_7, NITROGEN_7_CHECKS),
    "carbon dioxide by Shomate": ("shomate", CARBON_DIOXIDE, CARBON_DIOXIDE_CHECKS),
    "methane by a polynomial": ("polynomial", METHANE, METHANE_CHECKS),
    "nitrogen by a table": ("table", NITROGEN_TABLE, NITROGEN_TABLE_CHECKS),
    "water by Watson": ("watson", WATER, WATER_CHECKS),
    "tetrafluoromethane by the TRC equation": ("trc-gas", TETRAFLUOROMETHANE, TETRAFLUOROMETHANE_CHECKS),
    "chlorine dioxide by the TRC equation": ("trc-gas", CHLORINE_DIOXIDE, CHLORINE_DIOXIDE_CHECKS),
    "steam by Aly and Lee": ("aly-lee", STEAM, STEAM_CHECKS),
    "water by Zabransky's cubic": ("zabransky-cubic", WATER_CUBIC, WATER_CUBIC_CHECKS),
    "toluene by Zabransky's quasi-polynomial": ("zabransky-quasi", TOLUENE, TOLUENE_CHECKS),
    "heptane by Perry's equation": ("perry-liquid", HEPTANE, HEPTANE_CHECKS),
    "water by Perry's power": ("perry-vaporisation", WATER_PERRY, WATER_PERRY_CHECKS),
    "toluene by the VDI's powers": ("vdi-vaporisation", TOLUENE_VDI, TOLUENE_VDI_CHECKS),
}


@pytest.mark.parametrize(
    "name, params, check",
    [
        pytest.param(name, params, check, id=f"{case}: {check.what}")
        for case, (name, params, checks) in CASES.items()
        for check in checks
    ],
)
def test_published_value(name: str, params: Params, check: Check) -> None:
    assert check.of(build(name, params)) == pytest.approx(check.value, abs=check.within), check.source


def _places(node: Any, path: tuple[Any, ...] = ()) -> Iterator[tuple[Any, ...]]:
    """Paths of every coefficient; ranges and exponents are not coefficients."""
    if isinstance(node, dict):
        for key, value in node.items():
            if key not in ("tmin", "tmax", "exponents", "T"):
                yield from _places(value, (*path, key))
    elif isinstance(node, list):
        for number, value in enumerate(node):
            yield from _places(value, (*path, number))
    else:
        yield path


def _changed(params: Params, path: tuple[Any, ...], factor: float) -> Params:
    params = copy.deepcopy(params)
    node: Any = params
    for key in path[:-1]:
        node = node[key]
    node[path[-1]] *= factor
    return params


@pytest.mark.parametrize(
    "name, params, checks, path",
    [
        pytest.param(name, params, checks, path, id=f"{case}: {path}")
        for case, (name, params, checks) in CASES.items()
        for path in _places(params)
        # H of Shomate's equation is subtracted by the source and not used.
        if not (name == "shomate" and path[-1] == 7)
    ],
)
def test_a_wrong_coefficient_fails_a_published_value(
    name: str, params: Params, checks: list[Check], path: tuple[Any, ...]
) -> None:
    # One percent, as a slip in the third digit makes.
    wrong = build(name, _changed(params, path, 1.01))
    assert any(abs(check.of(wrong) - check.value) > check.within for check in checks)


def test_checksums_of_a_record() -> None:
    nitrogen = build("nasa9", NITROGEN_9)
    assert isinstance(nitrogen, Equation)
    assert not isinstance(nitrogen, LatentHeat)
    assert [joint.T for joint in joint_errors(nitrogen)] == [1000.0, 6000.0]
    # The two constants swapped, as a careless reader of the record would.
    swapped = copy.deepcopy(NITROGEN_9)
    swapped["intervals"][0]["b"].reverse()
    wrong = build("nasa9", swapped)
    assert isinstance(wrong, Equation)
    assert abs(h298_error(wrong, 0.0)) > 5000.0
    assert abs(joint_errors(wrong)[0].s) > 0.5
    # What the record is not: another species' formation enthalpy.
    assert h298_error(nitrogen, -1000.0) == pytest.approx(1000.0, abs=0.02)


def test_inverse_temperature_gives_logarithms() -> None:
    equation = build("polynomial", {"exponents": [-1], "coefficients": [700.0], "tmin": 10.0, "tmax": 1000.0})
    assert isinstance(equation, Equation)
    assert equation.dh(100.0, 300.0) == pytest.approx(700.0 * math.log(3.0), rel=1e-15)
    assert equation.ds(100.0, 300.0) == pytest.approx(700.0 * (1 / 100.0 - 1 / 300.0), rel=1e-15)
