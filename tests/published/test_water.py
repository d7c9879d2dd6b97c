"""Water by IAPWS-95."""

from __future__ import annotations

import pytest
from chemicals import iapws

from propdb.api import Store
from propdb.errors import NoSuchState, TemperatureOutOfRange
from propdb.levels import water

#: IAPWS R6-95(2018), table 8 (saturation): T [K], saturated liquid and vapour [kJ/kg].
TABLE_8 = [(275.0, 7.75972202, 2504.28995), (450.0, 749.161585, 2774.41078), (625.0, 1686.26976, 2550.71625)]

#: IAPWS R6-95(2018), table 8: T [K], pressure [MPa], densities of liquid and vapour [kg/m3].
TABLE_8_DENSITIES = [
    (275.0, 0.698451167e-3, 0.999887406e3, 0.550664919e-2),
    (450.0, 0.932203564, 0.890341250e3, 0.481200360e1),
    (625.0, 0.169082693e2, 0.567090385e3, 0.118290280e3),
]


@pytest.mark.parametrize(("temperature", "liquid", "vapour"), TABLE_8)
def test_saturation_enthalpies(temperature: float, liquid: float, vapour: float) -> None:
    for expected, kind in ((liquid, "liquid"), (vapour, "vapour")):
        h = water.enthalpy(temperature=temperature, saturated=kind) / water.M_WATER / 1e3  # type: ignore[arg-type]
        assert h == pytest.approx(expected, rel=1e-8)


@pytest.mark.parametrize(("temperature", "pressure", "liquid", "vapour"), TABLE_8_DENSITIES)
def test_saturation_pressure_and_volumes(temperature: float, pressure: float, liquid: float, vapour: float) -> None:
    p, _, _, v_l, v_g = water.saturation(temperature=temperature)
    assert p / 1e6 == pytest.approx(pressure, rel=2e-8)
    assert water.M_WATER / v_l == pytest.approx(liquid, rel=1e-8)
    assert water.M_WATER / v_g == pytest.approx(vapour, rel=1e-8)


def test_a_perturbed_formulation_fails(monkeypatch: pytest.MonkeyPatch) -> None:
    """The check above would notice a residual part that is off by 1e-6."""
    original = iapws.iapws95_dAr_dtau
    monkeypatch.setattr(iapws, "iapws95_dAr_dtau", lambda tau, delta: original(tau, delta) * (1.0 + 1e-6))
    h = water._at(450.0, 0.890341250e3)[0] / 1e3
    assert abs(h / 749.161585 - 1.0) > 1e-7


def test_saturation_temperature_inverts_saturation_pressure() -> None:
    for temperature in (273.16, 300.0, 373.124, 523.5, 640.0):
        p = water.saturation(temperature=temperature)[0]
        assert water.saturation_temperature(pressure=p) == pytest.approx(temperature, abs=1e-7)
    assert water.saturation_temperature(pressure=22.064e6) == water.T_CRITICAL


def test_boiling_point_at_one_atmosphere() -> None:
    # IAPWS SR1-86(1992): 373.124 K at 101.325 kPa on ITS-90 (also 99.974 C in IAPWS tables)
    assert water.saturation_temperature(pressure=101325.0) == pytest.approx(373.124, abs=1e-3)


def test_ice_point_and_critical_point_have_bounds() -> None:
    with pytest.raises(TemperatureOutOfRange):
        water.saturation(temperature=270.0)
    with pytest.raises(NoSuchState):
        water.saturation(temperature=650.0)
    with pytest.raises(NoSuchState):
        water.saturation_temperature(pressure=23e6)
    with pytest.raises(NoSuchState):
        water.enthalpy(temperature=300.0)


def test_steam_at_40_bar(store: Store) -> None:
    # Common practice, no source: steam tables give 2800.8 kJ/kg for saturated steam at 40 bar.
    answer = store.enthalpy(
        "water", phase="fluid", pressure="40bar", saturated="vapour", datum="steam-triple-point", unit="kJ/kg"
    )
    assert answer.value == pytest.approx(2800.8, rel=5e-4)
    by_formulation = water.enthalpy(temperature=water.saturation_temperature(pressure=40e5), saturated="vapour")
    assert answer.value == pytest.approx(by_formulation / water.M_WATER / 1e3, rel=1e-9)


def test_saturated_vapour_at_the_triple_point_is_not_zero(store: Store) -> None:
    vapour = store.enthalpy(
        "water", phase="fluid", temperature=273.16, saturated="vapour", datum="steam-triple-point", unit="kJ/kg"
    )
    liquid = store.enthalpy(
        "water", phase="fluid", temperature=273.16, saturated="liquid", datum="steam-triple-point", unit="kJ/kg"
    )
    # IAPWS steam tables: 2500.9 kJ/kg; the internal energy of the liquid is 0, so its enthalpy is p v = 0.000612 kJ/kg
    assert vapour.value == pytest.approx(2500.9, abs=0.05)
    assert liquid.value == pytest.approx(0.000611782, rel=1e-4)


def test_superheated_steam(store: Store) -> None:
    # Common practice, no source: steam tables give 3674.9 kJ/kg at 40 bar and 600 C (3674.85 by IAPWS-IF97).
    answer = store.enthalpy(
        "water", phase="fluid", pressure="40bar", temperature="600C", datum="steam-triple-point", unit="kJ/kg"
    )
    assert answer.value == pytest.approx(3674.9, rel=5e-5)


def test_compressed_liquid(store: Store) -> None:
    # IAPWS R7-97(2012), table 5: 300 K, 3 MPa: h = 115.331273 kJ/kg, and 300 K, 80 MPa: 184.142828 kJ/kg. IF97 follows
    # IAPWS-95 within its tolerance for enthalpy (0.2 kJ/kg).
    for pressure, expected in (("3MPa", 115.331273), ("80MPa", 184.142828)):
        answer = store.enthalpy(
            "water", phase="fluid", pressure=pressure, temperature="300K", datum="steam-triple-point", unit="kJ/kg"
        )
        assert answer.value == pytest.approx(expected, abs=0.2)


def test_steam_on_the_elements(store: Store) -> None:
    # Common practice, no source: 2800.8 kJ/kg, saturated steam at 40 bar, with CODATA's -285.830 kJ/mol for the liquid.
    answer = store.convert(
        "2800.8 kJ/kg", species="water", from_="steam-triple-point", to="elements-298K", to_unit="kJ/mol"
    )
    assert answer.value == pytest.approx(-237.263, abs=0.01)
    assert answer.may_sum.reaction
    back = store.convert(
        f"{answer.value!r} kJ/mol", species="water", from_="elements-298K", to="steam-triple-point", to_unit="kJ/kg"
    )
    assert back.value == pytest.approx(2800.8, rel=1e-12)


def test_ideal_gas_limit_closes_with_the_formation_enthalpies(store: Store) -> None:
    """CODATA 1989 Hf(g) - Hf(l) = 44.004 kJ/mol against IAPWS-95 at zero density, within 0.02 kJ/mol."""
    limit = water.gas_enthalpy(temperature=298.15) - water.liquid_enthalpy(temperature=298.15)
    gas = store.show("water", quantity="Hf", phase="g", source="codata-1989").entries[0].value
    liquid = store.show("water", quantity="Hf", phase="l", source="codata-1989").entries[0].value
    assert (gas, liquid) == (-241826.0, -285830.0)  # CODATA 1989
    assert gas - liquid == pytest.approx(limit, abs=20.0)
    answer = store.enthalpy("water", phase="g", temperature=298.15, datum="elements-298K")
    closing = [c for c in answer.closures if c.source == "codata-1989"]
    assert closing
    assert all(abs(c.difference) < 0.02 for c in closing)


#: ISO 6976:2016: enthalpy of vaporisation of water at 0, 15, 20, 25 C [kJ/mol].
VAPORISATION = [("0C", 45.064), ("15C", 44.431), ("20C", 44.222), ("25C", 44.013)]


@pytest.mark.parametrize(("temperature", "expected"), VAPORISATION)
def test_vapour_on_the_gross_datum(store: Store, temperature: str, expected: float) -> None:
    answer = store.enthalpy("water", phase="g", temperature=temperature, datum=f"combustion-gross-{temperature}")
    assert answer.value == pytest.approx(expected, abs=0.003)
    other = store.enthalpy("water", phase="l", temperature=temperature, datum=f"combustion-gross-{temperature}")
    assert other.value == pytest.approx(0.0, abs=1e-9)
